"""``warmroom past``: what many nights have done, how good they were, what remains."""

from __future__ import annotations

import argparse
import sys
from collections.abc import Callable
from dataclasses import fields, is_dataclass
from typing import Any

from engine.clock import SystemClock
from engine.errors import NoAnswer, WarmroomError
from engine.logbook import load_logbook
from engine.logbook.text import shown
from engine.past import PastIndex
from engine.past.exposures import asked, frames_refused, history, programme_totals, refused, totals
from engine.past.fit import fit_images
from engine.past.nights import Period, efficiency, nights
from engine.past.search import Condition, Wanted, condition, find_exposures, find_words
from engine.past.seeing import measurements, site_seeing
from engine.times import iso_from_mjd, night_of
from tui.commands import past_pages as pages
from tui.commands.output import print_json

BAR_CELLS = 30
# A bar for fewer logs would be gone before it is seen.
WORTH_A_BAR = 30


def run(arguments: argparse.Namespace) -> int:
    """Print one page about past nights; status 1 when there is nothing to tell."""
    folder = arguments.logbook
    if not folder.is_dir():
        raise WarmroomError(f"{folder}: there is no such folder")
    progress = show_progress if sys.stderr.isatty() else None
    with PastIndex(folder, progress=progress, afresh=arguments.afresh) as index:
        if index.note:
            print(index.note, file=sys.stderr)
        return _page(index, arguments)


def _page(index: PastIndex, arguments: argparse.Namespace) -> int:
    """Print the page that the options ask for."""
    period = Period(arguments.since, arguments.until)
    if arguments.find is not None:
        words = find_words(index, arguments.find, period, arguments.target or "", most=None)
        return _told(arguments, {"found": words}, lambda: pages.words(words), is_any=bool(words))
    if arguments.where or arguments.filter:
        wanted = Wanted(
            target=arguments.target or "",
            filter=arguments.filter or "",
            period=period,
            conditions=tuple(_condition(text) for text in arguments.where),
        )
        some = find_exposures(index, wanted, most=None)
        return _told(arguments, {"found": some}, lambda: pages.exposures(some), is_any=bool(some))
    if arguments.target is not None:
        taken = history(index, arguments.target, period)
        if not taken:
            raise NoAnswer(f"no exposure of {arguments.target!r} stands in any log")
        sums = totals(index, arguments.target)
        value = {"totals": sums, "exposures": taken}
        return _told(arguments, value, lambda: pages.target(sums, taken))
    if arguments.refused:
        why, frames = refused(index, period), frames_refused(index, period)
        value = {"refused": why, "newest": frames}
        return _told(arguments, value, lambda: pages.refused(why, frames), is_any=bool(why))
    if arguments.seeing:
        site = site_seeing(measurements(index, period))
        is_any = site.all is not None
        return _told(arguments, site, lambda: pages.seeing(site), is_any=is_any)
    if arguments.fit:
        logbook = load_logbook(arguments.logbook)
        fit = fit_images(index, logbook.observatory, period)
        return _told(arguments, fit, lambda: pages.fit(fit), is_any=not fit.missing)
    return _whole(index, arguments, period)


def _whole(index: PastIndex, arguments: argparse.Namespace, period: Period) -> int:
    """Print nights, totals and seeing: the page without any option."""
    lines = nights(index, period)
    if not lines:
        raise NoAnswer(f"{arguments.logbook}: no night log is in this logbook and period")
    logbook = load_logbook(arguments.logbook)
    # The night under way still has most of its time before it.
    timezone = logbook.observatory.site.timezone
    tonight = night_of(SystemClock().now_mjd(), timezone).isoformat()
    plans = asked(index, logbook)
    value = {
        "nights": lines,
        "time": efficiency([line for line in lines if line.night != tonight]),
        "programmes": programme_totals(plans),
        "asked": plans,
        "totals": totals(index),
        "seeing": site_seeing(measurements(index, period)),
    }
    is_all = period != Period()
    return _told(arguments, value, lambda: pages.whole(value, newest=None if is_all else 30))


def _condition(text: str) -> Condition:
    try:
        return condition(text)
    except ValueError as error:
        raise WarmroomError(f"--where {shown(text)}: {error}") from None


def _told(
    arguments: argparse.Namespace, value: Any, page: Callable[[], None], *, is_any: bool = True
) -> int:
    """Print a value as JSON or as its page; return the status."""
    if arguments.json:
        print_json(plain(value))
    else:
        page()
    return 0 if is_any else 1


def plain(value: Any) -> Any:
    """Return an answer as JSON holds it: moments in ISO UTC, under the key without ``_mjd``."""
    if is_dataclass(value) and not isinstance(value, type):
        return {
            each.name.removesuffix("_mjd") if each.name != "mjd" else "time": _moment(
                each.name, getattr(value, each.name)
            )
            for each in fields(value)
        }
    if isinstance(value, dict):
        return {name: plain(each) for name, each in value.items()}
    if isinstance(value, list | tuple):
        return [plain(each) for each in value]
    return value


def _moment(name: str, value: Any) -> Any:
    if not name.endswith("mjd"):
        return plain(value)
    return None if value is None or value != value else iso_from_mjd(value)


def show_progress(done: int, of: int) -> None:
    """Draw a bar on the terminal while many logs are read."""
    if of < WORTH_A_BAR:
        return
    cells = BAR_CELLS * done // of
    bar = "█" * cells + "░" * (BAR_CELLS - cells)
    end = "\n" if done == of else ""
    print(f"\rreading the logs {bar} {done} of {of}", end=end, file=sys.stderr, flush=True)
