"""One night as its log tells it: a frozen report, from which every form is written."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from datetime import date
from pathlib import Path
from statistics import median

from engine.log import (
    ClockStep,
    Conditions,
    Event,
    Exposure,
    Header,
    LogReading,
    Lost,
    NightState,
    Note,
    OrderProposed,
    Override,
    Pointing,
    TargetAdded,
    effective,
    fold,
    read_log,
)
from engine.logbook import Observatory, Site
from engine.past.account import Account, account, dark_spans_of, site_of
from engine.positions import Almanac, almanac
from engine.seeing import SeeingMeasurement, SeeingSummary, summary

# Quantities of `Conditions` in the order of the report: key, what it is called, unit.
QUANTITIES = (
    ("cloud_percent", "cloud", "%"),
    ("wind_m_per_s", "wind", "m/s"),
    ("humidity_percent", "humidity", "%"),
    ("temperature_c", "temperature", "°C"),
    ("dew_point_c", "dew point", "°C"),
    ("pressure_hpa", "pressure", "hPa"),
)


@dataclass(frozen=True, slots=True)
class FilterTotal:
    """What was done on one target in one filter with one length of exposure (s).

    ``taken`` counts every exposure, ``good`` those that count, with their open seconds and their
    credit in planned exposures. Airmass and sizes (arcsec) are of the good ones, None without any.
    """

    programme: str
    target: str
    filter: str
    seconds: float
    taken: int
    good: int
    good_s: float
    credit: float
    airmass_least: float | None
    airmass_greatest: float | None
    predicted_arcsec: float | None
    measured_arcsec: float | None


@dataclass(frozen=True, slots=True)
class Quantity:
    """What was entered of one quantity through the night: how often, and its range."""

    name: str
    unit: str
    count: int
    least: float
    median: float
    greatest: float


@dataclass(frozen=True, slots=True)
class NightReport:
    """A night, reported. Moments are UTC MJD, lengths of time seconds.

    ``site`` and ``times`` are None where the log's header does not say where it was; then the
    ``account`` is empty. ``state`` is the fold over the log. ``findings`` say what is not right
    about the log, ``is_open`` that the night was not closed by its last entry.
    """

    path: Path
    night: date
    header: Header
    site: Site | None
    observatory: Observatory | None
    times: Almanac | None
    account: Account
    state: NightState
    totals: tuple[FilterTotal, ...]
    conditions: tuple[Quantity, ...]
    seeing: SeeingSummary | None
    orders: int
    chosen_otherwise: int
    added: tuple[TargetAdded, ...]
    clock_steps: tuple[ClockStep, ...]
    findings: tuple[str, ...]
    is_open: bool

    @property
    def exposures(self) -> tuple[Exposure, ...]:
        """Every exposure that stands, in the order in which they began."""
        return tuple(sorted(self.state.exposures, key=lambda each: (each.start_mjd, each.n)))

    @property
    def exposed_s(self) -> float:
        """Open shutter of everything, in the dark and out of it, counted for a plan or not."""
        return sum(each.exposed_s for each in self.state.exposures)

    @property
    def refused(self) -> tuple[Exposure, ...]:
        """The exposures that do not count."""
        return tuple(each for each in self.exposures if each.outcome != "good")

    @property
    def lost(self) -> tuple[Lost, ...]:
        """Every stretch of lost time."""
        return self.state.lost

    @property
    def notes(self) -> tuple[Note, ...]:
        """What the observer wrote."""
        return self.state.notes


def night_report(path: Path) -> NightReport:
    """Return the report of a log; LogError when it can't be read or is no night log."""
    reading = read_log(path)
    stands = effective(reading.events)
    state = fold(reading.events)
    site, observatory = site_of(reading.header), _observatory(reading.header)
    return NightReport(
        path=path,
        night=reading.header.night,
        header=reading.header,
        site=site,
        observatory=observatory,
        times=almanac(site, reading.header.night) if site is not None else None,
        account=account(stands, dark_spans_of(reading.header) or ()),
        state=state,
        totals=_totals(state.exposures),
        conditions=_conditions(stands),
        seeing=summary([SeeingMeasurement(each.mjd, each.zenith_arcsec) for each in state.seeing]),
        orders=sum(isinstance(each, OrderProposed) for each in stands),
        chosen_otherwise=_count_chosen(stands),
        added=state.added,
        clock_steps=tuple(each for each in stands if isinstance(each, ClockStep)),
        findings=_findings(reading),
        is_open=not state.closed,
    )


def _totals(exposures: Sequence[Exposure]) -> tuple[FilterTotal, ...]:
    """Return the totals by programme, target, filter and length, in the order of their begin."""
    groups: dict[tuple[str, str, str, float], list[Exposure]] = {}
    for each in exposures:
        key = (each.programme, each.target, each.filter, each.seconds)
        groups.setdefault(key, []).append(each)
    return tuple(
        _total(key, groups[key]) for key in sorted(groups, key=lambda key: (key[0], key[1]))
    )


def _total(key: tuple[str, str, str, float], taken: list[Exposure]) -> FilterTotal:
    programme, target, filter_, seconds = key
    good = [each for each in taken if each.outcome == "good"]
    airmasses = _known(each.airmass_mid for each in good)
    return FilterTotal(
        programme=programme,
        target=target,
        filter=filter_,
        seconds=seconds,
        taken=len(taken),
        good=len(good),
        good_s=sum(each.exposed_s for each in good),
        credit=sum(1.0 if each.credit is None else each.credit for each in good),
        airmass_least=min(airmasses, default=None),
        airmass_greatest=max(airmasses, default=None),
        predicted_arcsec=_median(each.image_size_arcsec for each in good),
        measured_arcsec=_median(each.measured_fwhm_arcsec for each in good),
    )


def _conditions(events: Sequence[Event]) -> tuple[Quantity, ...]:
    entered = [event for event in events if isinstance(event, Conditions)]
    found = []
    for key, name, unit in QUANTITIES:
        values = _known(getattr(each, key) for each in entered)
        if values:
            found.append(
                Quantity(name, unit, len(values), min(values), median(values), max(values))
            )
    return tuple(found)


def _count_chosen(events: Sequence[Event]) -> int:
    """Return how often the observer went elsewhere than was proposed."""
    chose = [e for e in events if isinstance(e, Override) and e.action == "chose"]
    pointed = {e.target for e in events if isinstance(e, Pointing)}
    return sum(each.target in pointed for each in chose)


def _findings(reading: LogReading) -> tuple[str, ...]:
    return tuple(f"line {each.line}: {each.what}" for each in reading.findings)


def _known(values: Iterable[float | None]) -> list[float]:
    return [value for value in values if value is not None]


def _median(values: Iterable[float | None]) -> float | None:
    known = _known(values)
    return median(known) if known else None


def _observatory(header: Header) -> Observatory | None:
    try:
        return Observatory.model_validate(header.observatory)
    except ValueError:
        return None
