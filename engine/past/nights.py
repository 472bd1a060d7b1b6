"""Nights: what each was like, and where the time of many went."""

from __future__ import annotations

import json
from collections.abc import Sequence
from dataclasses import dataclass, field
from datetime import date
from typing import Any

from engine.past.index import PastIndex
from engine.seeing import SeeingSummary

SECONDS_PER_HOUR = 3600.0


@dataclass(frozen=True, slots=True)
class Period:
    """From one night to another, both counted in; None for no bound."""

    since: date | None = None
    until: date | None = None

    @property
    def limits(self) -> tuple[str, str]:
        """The file names between which the logs of the period lie."""
        least = self.since.isoformat() if self.since else ""
        return least, f"{self.until.isoformat()}.toml" if self.until else ":"


ALWAYS = Period()


@dataclass(frozen=True, slots=True)
class NightLine:
    """One night's log in a line.

    ``state`` is how the log was found (`STATES`), ``findings`` what is wrong with it. Hours are
    those of the dark time and add up to ``dark_h``: ``spent_h`` by heading (`HEADINGS`), ``lost_h``
    by cause; None and empty when the log's header does not say where it was written. ``open_h`` and
    ``counts`` are of all exposures, in the dark or not, by outcome.
    """

    name: str
    night: str
    state: str
    findings: tuple[str, ...]
    observers: tuple[str, ...]
    entries: int
    dark_h: float | None
    spent_h: dict[str, float] = field(default_factory=dict)
    lost_h: dict[str, float] = field(default_factory=dict)
    open_h: float = 0.0
    counts: dict[str, int] = field(default_factory=dict)
    seeing: SeeingSummary | None = None

    @property
    def is_used(self) -> bool:
        """Whether anything of it could be read."""
        return self.state != "unreadable"

    @property
    def exposures(self) -> int:
        """How many exposures were taken, whatever became of them."""
        return sum(self.counts.values())

    @property
    def kept(self) -> int:
        """How many exposures count for their plans."""
        return self.counts.get("good", 0)


def nights(index: PastIndex, period: Period = ALWAYS) -> tuple[NightLine, ...]:
    """Return a line for every night log of a period, the oldest first."""
    rows = index.ask(
        "SELECT name, night, state, entries, dark_s, line FROM night "
        "WHERE name >= ? AND name <= ? ORDER BY name",
        period.limits,
    )
    return tuple(_line(row) for row in rows)


def _line(row: tuple[Any, ...]) -> NightLine:
    name, night, state, entries, dark_s, line = row
    findings, observers, spent_s, lost_s, by_outcome, in_short, _ = json.loads(line)
    return NightLine(
        name=name,
        night=night,
        state=state,
        findings=tuple(findings),
        observers=tuple(observers),
        entries=entries,
        dark_h=None if dark_s is None else dark_s / SECONDS_PER_HOUR,
        spent_h=_hours(spent_s),
        lost_h=_hours(lost_s),
        open_h=sum(seconds for _, seconds in by_outcome.values()) / SECONDS_PER_HOUR,
        counts={outcome: count for outcome, (count, _) in by_outcome.items()},
        seeing=SeeingSummary(*in_short) if in_short else None,
    )


def _hours(seconds: dict[str, float]) -> dict[str, float]:
    return {name: value / SECONDS_PER_HOUR for name, value in seconds.items()}


@dataclass(frozen=True, slots=True)
class Efficiency:
    """Where the dark hours of a period went; ``spent_h`` adds up to ``dark_h``.

    ``nights`` is how many nights tell it, ``untold`` how many logs do not.
    """

    nights: int
    untold: int
    dark_h: float
    spent_h: dict[str, float]
    lost_h: dict[str, float]

    @property
    def open_share(self) -> float | None:
        """Open shutter over dark time; None without any."""
        return self.spent_h.get("open", 0.0) / self.dark_h if self.dark_h > 0.0 else None

    @property
    def open_share_unlost(self) -> float | None:
        """Open shutter over the dark time that was not lost; None without any."""
        usable_h = self.dark_h - self.spent_h.get("lost", 0.0)
        return self.spent_h.get("open", 0.0) / usable_h if usable_h > 0.0 else None


def efficiency(lines: Sequence[NightLine]) -> Efficiency:
    """Return where the dark time of some nights went, from their lines."""
    told = [line for line in lines if line.dark_h is not None]
    spent_h: dict[str, float] = {}
    lost_h: dict[str, float] = {}
    for line in told:
        for sums, hours in ((spent_h, line.spent_h), (lost_h, line.lost_h)):
            for name, value in hours.items():
                sums[name] = sums.get(name, 0.0) + value
    dark_h = sum(line.dark_h or 0.0 for line in told)
    return Efficiency(len(told), len(lines) - len(told), dark_h, spent_h, lost_h)
