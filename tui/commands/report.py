"""``warmroom report``: one past night, for its investigators, its reducer and the next observer."""

from __future__ import annotations

import argparse

from engine.errors import NoAnswer, WarmroomError
from engine.log import night_logs
from engine.report import NightReport, night_report, save
from engine.report.markdown import as_markdown
from engine.report.plain import as_data
from tui.commands.output import print_json


def run(arguments: argparse.Namespace) -> int:
    """Print a night's report, or write it; status 1 when there is no such night."""
    report = _report(arguments)
    for path in arguments.save:
        save(report, path)
        print(f"{path} written")
    if arguments.json:
        print_json(as_data(report))
    elif not arguments.save:
        print(as_markdown(report), end="")
    return 0


def _report(arguments: argparse.Namespace) -> NightReport:
    folder = arguments.logbook
    if not folder.is_dir():
        raise WarmroomError(f"{folder}: there is no such folder")
    nights = {path.stem: path for path in night_logs(folder)}
    if not nights:
        raise NoAnswer(f"{folder} has no night yet")
    night = arguments.night.isoformat() if arguments.night else max(nights)
    if night not in nights:
        raise NoAnswer(f"no log of the night of {night}; the last one is {max(nights)}")
    return night_report(nights[night])
