"""Exposures of many nights: totals, what is done of what was asked, one target's history."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, fields
from datetime import date

from engine.logbook import Logbook
from engine.night import Progress, plans
from engine.past.carry import carried
from engine.past.index import PastIndex
from engine.past.nights import ALWAYS, Period


@dataclass(frozen=True, slots=True)
class Total:
    """What was taken of one target in one filter and length over all nights, by outcome.

    ``credit`` is what the exposures are worth, in planned ones; first and last as UTC MJD.
    """

    target: str
    programme: str
    filter: str
    seconds: float
    outcome: str
    count: int
    exposed_s: float
    credit: float
    first_mjd: float
    last_mjd: float
    nights: int


_TOTAL = ", ".join(each.name for each in fields(Total))


def totals(index: PastIndex, target: str | None = None) -> tuple[Total, ...]:
    """Return all totals, or those of one target, in order of names."""
    where, params = ("", ()) if target is None else (" WHERE target = ?", (target,))
    rows = index.ask(
        f"SELECT {_TOTAL} FROM total{where} ORDER BY target, programme, filter, seconds, outcome",
        params,
    )
    return tuple(Total(*row) for row in rows)


@dataclass(frozen=True, slots=True)
class Asked:
    """One line of a target's plan: what was asked, and what all nights have done of it."""

    programme: str
    target: str
    line: Progress


def asked(index: PastIndex, logbook: Logbook) -> tuple[Asked, ...]:
    """Return what is done and what remains of every plan, by the console's own counting."""
    names = [target.name for target in logbook.targets]
    done = plans(logbook.targets, carried(index, date.min, names))
    return tuple(
        Asked(target.programme, target.name, line)
        for target in logbook.targets
        for line in done[target.name]
    )


@dataclass(frozen=True, slots=True)
class ProgrammeTotal:
    """A programme's plans together, in exposures; ``done`` counts no more than was asked for.

    ``credit`` is the depth that was reached, in planned exposures, ``remaining_h`` the open shutter
    that the rest takes.
    """

    programme: str
    targets: int
    finished: int
    asked: int
    done: int
    credit: float
    remaining_h: float


def programme_totals(lines: Sequence[Asked]) -> tuple[ProgrammeTotal, ...]:
    """Return the sums of plans by programme, in order of names."""
    names = sorted({each.programme for each in lines})
    return tuple(_programme(name, [e for e in lines if e.programme == name]) for name in names)


def _programme(name: str, lines: Sequence[Asked]) -> ProgrammeTotal:
    targets = {each.target for each in lines}
    unfinished = {each.target for each in lines if each.line.remaining}
    return ProgrammeTotal(
        programme=name,
        targets=len(targets),
        finished=len(targets - unfinished),
        asked=sum(each.line.planned for each in lines),
        done=sum(each.line.planned - each.line.remaining for each in lines),
        credit=sum(each.line.credit for each in lines),
        remaining_h=sum(each.line.remaining * each.line.seconds for each in lines) / 3600.0,
    )


@dataclass(frozen=True, slots=True)
class PastExposure:
    """One exposure of the past and its conditions; ``judged`` says why it was judged anew."""

    log: str
    n: int
    target: str
    programme: str
    filter: str
    seconds: float
    exposed_s: float
    start_mjd: float
    end_mjd: float
    airmass_mid: float | None
    altitude_deg: float | None
    hour_angle_h: float | None
    moon_separation_deg: float | None
    moon_altitude_deg: float | None
    moon_illumination: float | None
    image_size_arcsec: float | None
    measured_fwhm_arcsec: float | None
    sky_mag_arcsec2: float | None
    seeing_arcsec: float | None
    frame: str
    outcome: str
    credit: float | None
    why: str
    judged: str

    @property
    def night(self) -> str:
        """The night in whose log it stands."""
        return self.log.removesuffix(".toml")


PAST_COLUMNS = ", ".join(
    "night.name" if each.name == "log" else f"e.{each.name}" for each in fields(PastExposure)
)
_OF_ITS_NIGHT = "exposure e JOIN night ON night.id = e.night"


def limit(most: int | None) -> int:
    """Return how many rows SQLite is to give at most; it takes a negative number for all."""
    return -1 if most is None else most


def history(index: PastIndex, target: str, period: Period = ALWAYS) -> tuple[PastExposure, ...]:
    """Return every exposure of a target, whatever became of it, the oldest first."""
    rows = index.ask(
        f"SELECT {PAST_COLUMNS} FROM {_OF_ITS_NIGHT} WHERE e.target = ? "
        "AND night.name >= ? AND night.name <= ? ORDER BY night.name, e.place",
        (target, *period.limits),
    )
    return tuple(PastExposure(*row) for row in rows)


@dataclass(frozen=True, slots=True)
class Refused:
    """Exposures that do not count, by outcome and by the reason that was given."""

    outcome: str
    reason: str
    count: int


def refused(index: PastIndex, period: Period = ALWAYS) -> tuple[Refused, ...]:
    """Return how many exposures do not count, and why, the most frequent first."""
    within = ""
    params: tuple[str, ...] = ()
    if period != ALWAYS:
        within = "AND night IN (SELECT id FROM night WHERE name >= ? AND name <= ?) "
        params = period.limits
    rows = index.ask(
        "SELECT outcome, CASE WHEN judged <> '' THEN judged ELSE why END AS reason, count(*) "
        f"FROM exposure WHERE outcome <> 'good' {within}"
        "GROUP BY outcome, reason ORDER BY 3 DESC, 1, 2",
        params,
    )
    return tuple(Refused(*row) for row in rows)


def frames_refused(
    index: PastIndex, period: Period = ALWAYS, most: int | None = None
) -> tuple[PastExposure, ...]:
    """Return the exposures that do not count, the newest first; at most so many if any most."""
    rows = index.ask(
        f"SELECT {PAST_COLUMNS} FROM night CROSS JOIN exposure e "
        "ON e.night = night.id AND e.outcome <> 'good' "
        "WHERE night.name >= ? AND night.name <= ? "
        "ORDER BY night.name DESC, e.place DESC LIMIT ?",
        (*period.limits, limit(most)),
    )
    return tuple(PastExposure(*row) for row in rows)
