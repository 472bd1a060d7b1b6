"""Stays: visits in the making, each with its runs. Minutes are those of the problem."""

from __future__ import annotations

from dataclasses import dataclass, field


@dataclass(frozen=True, slots=True)
class Run:
    """So many exposures of one line, one after the other; the filter is in when it begins."""

    line: int
    count: int
    begin_min: float


@dataclass(slots=True)
class Stay:
    """One stay on one target: when the way there begins, its runs, and when the last is read."""

    target: int
    begin_min: float
    end_min: float
    runs: list[Run] = field(default_factory=list)


def without_break(before: Stay, after: Stay) -> bool:
    """Say whether two stays are one: a meridian flip or a wait between makes them two."""
    gap_min = after.runs[0].begin_min - before.end_min
    return before.target == after.target and gap_min < 1.0
