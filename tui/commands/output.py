"""How the commands print: JSON for scripts, aligned columns for people."""

from __future__ import annotations

import json
import math
import sys
from collections.abc import Iterable, Sequence
from datetime import tzinfo
from typing import Any

from engine import times
from engine.times import iso_from_mjd


def print_json(value: Any) -> None:
    """Print a value as JSON; what is not a finite number becomes null."""
    is_plain = "utf" not in (sys.stdout.encoding or "").lower()
    print(json.dumps(_finite(value), ensure_ascii=is_plain, indent=1, allow_nan=False))


def _finite(value: Any) -> Any:
    if isinstance(value, dict):
        return {name: _finite(each) for name, each in value.items()}
    if isinstance(value, list | tuple):
        return [_finite(each) for each in value]
    if isinstance(value, float):
        return value if math.isfinite(value) else None
    return value


def iso_or_none(mjd: float | None) -> str | None:
    """Return an MJD as ISO UTC, or None for none."""
    return None if mjd is None else iso_from_mjd(mjd)


def clock_time(mjd: float | None, zone: tzinfo) -> str:
    """Return the local time of an MJD as ``21:04``, to the nearest minute; a dash for none."""
    return "--:--" if mjd is None else times.clock_time(mjd, zone)


def number(value: float | None, form: str = ".2f") -> str:
    """Return a number in a format, or a dash where there is none."""
    return "-" if value is None or not math.isfinite(value) else format(value, form)


def print_columns(head: Sequence[str], rows: Iterable[Sequence[str]], left: int = 1) -> None:
    """Print rows under a heading: the first ``left`` columns to the left, the rest to the right.

    The last column is text of any length and is not padded.
    """
    lines = [tuple(head), *(tuple(row) for row in rows)]
    widths = [max(len(line[i]) for line in lines) for i in range(len(head) - 1)]
    for line in lines:
        cells = [
            cell.ljust(width) if i < left else cell.rjust(width)
            for i, (cell, width) in enumerate(zip(line[:-1], widths, strict=True))
        ]
        print("  ".join([*cells, line[-1]]).rstrip())
