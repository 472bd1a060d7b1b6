"""``warmroom keys``: every key of the console, the name of what it does, and where to change it."""

from __future__ import annotations

import argparse
import sys

from tui.commands.output import print_columns, print_json
from tui.console.actions import cap
from tui.console.keys import keys_path, load_keys


def run(arguments: argparse.Namespace) -> int:
    """Print the keys in force; status 2 when the file of the observer's own has faults."""
    keys = load_keys()
    for fault in keys.faults:
        print(fault, file=sys.stderr)
    if arguments.json:
        print_json(
            {
                "file": str(keys_path()),
                "keys": {each.name: list(each.keys) for each in keys.actions},
            }
        )
    else:
        rows = [
            (each.name, " ".join(cap(key) for key in each.keys), each.sentence)
            for each in keys.actions
        ]
        print_columns(("action", "key", "what"), rows, left=2)
        print(f"to change a key: [keys] in {keys_path()}")
    return 2 if keys.faults else 0
