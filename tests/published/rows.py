"""The published check values: ``published.toml``, row by row."""

from __future__ import annotations

import tomllib
from functools import cache
from pathlib import Path
from typing import Any

import pytest

Row = dict[str, Any]


@cache
def all_rows() -> tuple[Row, ...]:
    """Return every row of the file, in its order."""
    with (Path(__file__).parent / "published.toml").open("rb") as file:
        return tuple(tomllib.load(file)["check"])


def rows(*prefixes: str) -> list[Any]:
    """Return the rows whose id begins with one of the prefixes, as named pytest parameters.

    A prefix that matches nothing is an error: a check that no longer runs must not pass quietly.
    """
    chosen = []
    for prefix in prefixes:
        found = [row for row in all_rows() if row["id"].startswith(prefix)]
        assert found, f"no published row begins with {prefix!r}"
        chosen += found
    return [pytest.param(row, id=row["id"]) for row in chosen]


def agrees(row: Row, value: float) -> bool:
    """Say whether a value lies within the row's own tolerance of the published one."""
    if "tol_abs" in row:
        return bool(abs(value - row["expected"]) <= row["tol_abs"])
    return bool(abs(value - row["expected"]) <= row["tol_rel"] * abs(row["expected"]))


def told(row: Row, value: float) -> str:
    """Return what a failed check says: both numbers, the source, and how it was confirmed."""
    how = "/".join(row["how_confirmed"])
    return f"{value!r} against {row['expected']!r} ({how}): {row['source']}"
