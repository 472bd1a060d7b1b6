"""``warmroom check``: every fault in the logbook, or what it holds."""

from __future__ import annotations

import argparse

from engine.errors import Fault, LogbookFaults
from engine.light import zero_point_doubt
from engine.log import audit
from engine.logbook import describe, load_logbook
from tui.commands.output import print_json


def run(arguments: argparse.Namespace) -> int:
    """Print every fault of every file on stderr (status 2), or what the logbook holds.

    With a night, of the logs only that night's.
    """
    faults = [
        fault
        for fault in audit(arguments.logbook)
        if arguments.night is None or fault.path.stem == arguments.night.isoformat()
    ]
    try:
        logbook = load_logbook(arguments.logbook)
    except LogbookFaults as found:
        faults += found.faults
    if arguments.json:
        print_json({"faults": [_as_json(fault) for fault in sorted(faults)]})
        return 2 if faults else 0
    if faults:
        raise LogbookFaults(faults)
    print("\n".join(describe(logbook)))
    observatory = logbook.observatory
    for each in observatory.filters:
        doubt = zero_point_doubt(each, observatory.telescope)
        if doubt:
            print(f"{each.name}: {doubt}")
    return 0


def _as_json(fault: Fault) -> dict[str, object]:
    return {"path": str(fault.path), "line": fault.line, "key": fault.key, "what": fault.what}
