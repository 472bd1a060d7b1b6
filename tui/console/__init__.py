"""The console: what the observer keeps open from dusk to dawn.

app      the frame: widgets, keys, looks, timers; paints before the engine is loaded
deeds    what each key does, in terms of the watch
view     what every panel shows, from the watch
panels   one module a panel: painted lines
actions  the one table of keys
"""

from __future__ import annotations

import argparse


def run(arguments: argparse.Namespace) -> int:
    """Open tonight's console; return the exit status."""
    from tui.console.start import open_console

    return open_console(arguments)
