"""``warmroom check``: every fault in the logbook, or what it holds."""

from __future__ import annotations

import argparse
from dataclasses import asdict

from engine.errors import Fault, LogbookFaults
from engine.light import zero_point_doubt
from engine.log import audit
from engine.logbook import describe, load_logbook, reference_rows
from tui.commands.output import print_columns, print_json


def run(arguments: argparse.Namespace) -> int:
    """Print every fault of every file on stderr (status 2), or what the logbook holds.

    With a night, of the logs only that night's. With ``--keys`` the logbook is not looked at.
    """
    if arguments.keys:
        _print_keys(arguments.json)
        return 0
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


def _print_keys(as_json: bool) -> None:
    """Print every key of the logbook's files: what it takes, what it is when left out."""
    rows = reference_rows()
    if as_json:
        print_json({"keys": [asdict(row) for row in rows]})
        return
    tables = dict.fromkeys((row.file, row.table) for row in rows)
    for file, table in tables:
        print(f"{file} {table}")
        own = [row for row in rows if (row.file, row.table) == (file, table)]
        print_columns(
            ("  key", "left out", "what it is, and what it takes"),
            [(f"  {row.key}", row.default, f"{row.help}: {row.expects}") for row in own],
            left=2,
        )
        print()


def _as_json(fault: Fault) -> dict[str, object]:
    return {"path": str(fault.path), "line": fault.line, "key": fault.key, "what": fault.what}
