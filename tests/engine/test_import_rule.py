"""The engine never reaches the interface, and nothing slow is imported before it is needed."""

from __future__ import annotations

import subprocess
import sys

import pytest

WALK = """
import importlib, pkgutil, sys
import engine
for module in pkgutil.walk_packages(engine.__path__, "engine."):
    importlib.import_module(module.name)
interface = sorted({name.split(".")[0] for name in sys.modules} & {"tui", "textual", "rich"})
assert not interface, f"importing all of engine brought in {interface}"
print(sum(name.startswith("engine.") for name in sys.modules))
"""


def test_the_whole_engine_imports_without_the_interface() -> None:
    """Import every module of the engine in a fresh process and look into `sys.modules`."""
    done = subprocess.run([sys.executable, "-c", WALK], capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stderr
    assert int(done.stdout) > 20


@pytest.mark.parametrize(
    ("module", "unwanted"),
    [
        ("tui.command", ("textual", "astropy", "numpy", "pydantic", "engine.logbook")),
        ("tui.console.app", ("astropy", "erfa", "pydantic", "engine.logbook", "engine.night")),
    ],
)
def test_what_must_start_quickly_imports_little(module: str, unwanted: tuple[str, ...]) -> None:
    """The parser loads neither interface nor engine; the console paints before astropy loads."""
    code = (
        f"import {module}, sys; found = [m for m in {unwanted!r} if m in sys.modules];"
        "assert not found, found"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stderr
