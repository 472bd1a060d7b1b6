"""One log boiled down to what questions about many nights need.

A pure function of the log's bytes and name, through the log's own reader and fold: amendments,
withdrawals and rejections count here exactly as they do in the console.
"""

from __future__ import annotations

import json
import math
import zlib
from collections.abc import Sequence
from dataclasses import astuple, dataclass, field
from operator import attrgetter
from pathlib import Path
from zoneinfo import ZoneInfo

import numpy as np

from engine.errors import LogError
from engine.log import (
    Amendment,
    Conditions,
    Event,
    Exposure,
    Foreign,
    LogReading,
    NightState,
    Note,
    Override,
    TargetAdded,
    Word,
    effective,
    fold,
)
from engine.log.header import SCHEMA
from engine.log.reader import read_log_bytes
from engine.past.account import Account, account, dark_spans_of
from engine.seeing import SeeingMeasurement, summary
from engine.times import datetime_from_mjd

# How a log was found. The first that is true is said.
STATES: tuple[Word, ...] = (
    Word("unreadable", "unreadable", "It can't be read, or is no night log: counted nowhere."),
    Word("foreign", "foreign", "Another version wrote in it: used as far as it is known."),
    Word("torn", "half written", "Its end is torn or just being written: used up to there."),
    Word("altered", "altered", "Changed by hand or damaged: what is sound is used."),
    Word("sound", "sound", "Every entry is as it was written."),
)

# The fields of an exposure that are kept, as columns in this order.
FIELDS = (
    "n", "target", "programme", "filter", "seconds", "exposed_s", "start_mjd", "mid_mjd", "end_mjd",
    "airmass_mid", "altitude_deg", "azimuth_deg", "hour_angle_h", "moon_separation_deg",
    "moon_altitude_deg", "moon_illumination", "image_size_arcsec", "measured_fwhm_arcsec",
    "sky_mag_arcsec2", "seeing_arcsec", "frame", "outcome", "credit", "why",
)  # fmt: skip
# Those that a search may set limits to.
QUANTITIES = (
    "seconds", "airmass_mid", "altitude_deg", "hour_angle_h", "moon_separation_deg",
    "moon_altitude_deg", "moon_illumination", "image_size_arcsec", "measured_fwhm_arcsec",
    "sky_mag_arcsec2", "seeing_arcsec", "credit",
)  # fmt: skip
# Columns of the two tables of numbers kept for each night; a filter is a place in its filters.
SEEING_COLUMNS = ("mjd", "zenith_arcsec", "local_h", "filter", "airmass", "measured_arcsec")
IMAGE_COLUMNS = ("mjd", "filter", "airmass", "seeing_arcsec", "predicted_arcsec", "measured_arcsec")
FINDINGS_KEPT = 20

Row = tuple[object, ...]


@dataclass(frozen=True, slots=True)
class Text:
    """Something an observer wrote: where, when (UTC MJD), about what."""

    n: int
    mjd: float
    kind: str
    target: str
    text: str


@dataclass(frozen=True, slots=True)
class Digest:
    """What is kept of one log. ``exposures`` are rows of ``FIELDS`` and why each was judged so.

    ``counts`` says of each outcome how many exposures and how many seconds; ``seeing_in_short`` is
    count, best, lower quartile, median, upper quartile, worst (arcsec), or nothing.
    ``seeing`` and ``images`` are the bytes of float64 tables with the columns named above.
    """

    name: str
    night: str
    state: str
    findings: tuple[str, ...] = ()
    observers: tuple[str, ...] = ()
    site: str = ""
    entries: int = 0
    account: Account | None = None
    counts: dict[str, tuple[int, float]] = field(default_factory=dict)
    seeing_in_short: tuple[float, ...] = ()
    exposures: tuple[Row, ...] = ()
    tally: tuple[Row, ...] = ()
    extents: tuple[Row, ...] = ()
    texts: tuple[Text, ...] = ()
    filters: tuple[str, ...] = ()
    seeing: bytes = b""
    images: bytes = b""
    events: dict[str, int] = field(default_factory=dict)


def fingerprint(data: bytes) -> int:
    """Return the check sum by which the content of a log is told from another."""
    return zlib.crc32(data)


def digest(path: Path, data: bytes) -> Digest:
    """Return what is kept of a log; never raises for what stands in it."""
    try:
        reading = read_log_bytes(path, data)
    except LogError as error:
        said = str(error).removeprefix(f"{path}:").removeprefix("1:").strip()
        return Digest(path.name, path.stem, "unreadable", (said,))
    stands = effective(reading.events)
    state = fold(reading.events)
    exposures = state.exposures
    filters = sorted(
        {each.filter for each in exposures}
        | {each.filter for each in stands if isinstance(each, Conditions)}
    )
    dark = dark_spans_of(reading.header)
    judged = _judgements(stands)
    kinds = [event.kind for event in reading.events]
    return Digest(
        name=path.name,
        night=reading.header.night.isoformat(),
        state=_state(reading),
        findings=_findings(reading),
        observers=reading.header.observers,
        site=_site(reading),
        entries=len(reading.events),
        account=None if dark is None else account(stands, dark),
        counts=_counts(exposures),
        seeing_in_short=_in_short(state),
        exposures=tuple((*_fields(each), judged.get(each.n, "")) for each in exposures),
        tally=_tally(exposures),
        extents=_extents(exposures),
        texts=tuple(_texts(stands, exposures, judged)),
        filters=tuple(filters),
        seeing=_seeing_table(stands, state, filters, _zone(reading)),
        images=_image_table(exposures, filters),
        events={kind: kinds.count(kind) for kind in sorted(set(kinds))},
    )


_fields = attrgetter(*FIELDS)


def _findings(reading: LogReading) -> tuple[str, ...]:
    """Return what is wrong with a log, a line each: the first of it, and how much more there is."""
    said = [str(each).removeprefix(f"{reading.path}:") for each in reading.findings]
    more = len(said) - FINDINGS_KEPT
    return (*said[:FINDINGS_KEPT], *([f"and {more} more"] if more > 0 else []))


def _state(reading: LogReading) -> str:
    if reading.schema != SCHEMA or any(isinstance(each, Foreign) for each in reading.events):
        return "foreign"
    if reading.torn:
        return "torn"
    return "altered" if reading.findings else "sound"


def _site(reading: LogReading) -> str:
    site = reading.header.observatory.get("site")
    name = site.get("name") if isinstance(site, dict) else None
    return name if isinstance(name, str) else ""


def _zone(reading: LogReading) -> ZoneInfo | None:
    site = reading.header.observatory.get("site")
    name = site.get("timezone") if isinstance(site, dict) else None
    try:
        return ZoneInfo(name) if isinstance(name, str) else None
    except (ValueError, OSError):
        return None


def _judgements(stands: Sequence[Event]) -> dict[int, str]:
    """Return why exposures were judged anew, by the number of the exposure."""
    return {
        event.of: event.why
        for event in stands
        if isinstance(event, Amendment) and "outcome" in event.changes and event.why
    }


def _counts(exposures: Sequence[Exposure]) -> dict[str, tuple[int, float]]:
    counts: dict[str, tuple[int, float]] = {}
    for each in exposures:
        count, seconds = counts.get(each.outcome, (0, 0.0))
        counts[each.outcome] = (count + 1, seconds + each.exposed_s)
    return counts


def _in_short(state: NightState) -> tuple[float, ...]:
    found = summary([SeeingMeasurement(each.mjd, each.zenith_arcsec) for each in state.seeing])
    return () if found is None else astuple(found)


def _tally(exposures: Sequence[Exposure]) -> tuple[Row, ...]:
    """Return counts and sums of exposures by target, programme, filter, length and outcome.

    An exposure of unknown worth counts as one, as it does in a plan.
    """
    sums: dict[tuple[str, str, str, float, str], list[float]] = {}
    for each in exposures:
        key = (each.target, each.programme, each.filter, each.seconds, each.outcome)
        row = sums.setdefault(key, [0, 0.0, 0.0, each.start_mjd, each.end_mjd])
        row[0] += 1
        row[1] += each.exposed_s
        row[2] += 1.0 if each.credit is None else each.credit
        row[3] = min(row[3], each.start_mjd)
        row[4] = max(row[4], each.end_mjd)
    return tuple((*key, *row) for key, row in sums.items())


def _extents(exposures: Sequence[Exposure]) -> tuple[Row, ...]:
    """Return the least and the greatest value of each quantity."""
    rows: list[Row] = []
    for name in QUANTITIES:
        values = [value for each in exposures if (value := getattr(each, name)) is not None]
        if values:
            rows.append((name, min(values), max(values)))
    return tuple(rows)


def _texts(
    stands: Sequence[Event], exposures: Sequence[Exposure], judged: dict[int, str]
) -> list[Text]:
    """Return everything that was written in words, in the order of the log."""
    found: list[Text] = []
    for event in stands:
        match event:
            case Note():
                found.append(Text(event.n, event.t_mjd, "note", event.target, event.text))
            case Override() | TargetAdded() if event.why:
                target = event.name if isinstance(event, TargetAdded) else event.target
                found.append(Text(event.n, event.t_mjd, event.kind, target, event.why))
            case _:
                pass
    for each in exposures:
        said = "; ".join(text for text in (each.why, judged.get(each.n, "")) if text)
        if said:
            found.append(Text(each.n, each.end_mjd, each.outcome, each.target, said))
    return sorted(found, key=lambda text: text.n)


def _seeing_table(
    stands: Sequence[Event], state: NightState, filters: list[str], zone: ZoneInfo | None
) -> bytes:
    entered = [
        event
        for event in stands
        if isinstance(event, Conditions) and event.seeing_arcsec is not None
    ]
    rows = [
        (
            seen.mjd,
            seen.zenith_arcsec,
            _local_h(seen.mjd, zone),
            filters.index(event.filter),
            math.nan if event.airmass is None else event.airmass,
            math.nan if event.measured_fwhm_arcsec is None else event.measured_fwhm_arcsec,
        )
        for event, seen in zip(entered, state.seeing, strict=True)
    ]
    return np.array(rows, dtype=np.float64).tobytes()


def _local_h(mjd: float, zone: ZoneInfo | None) -> float:
    """Return the local time of an MJD in hours; NaN when it is not known."""
    if zone is None or mjd != mjd:
        return math.nan
    local = datetime_from_mjd(mjd).astimezone(zone)
    return local.hour + local.minute / 60.0 + local.second / 3600.0


def _image_table(exposures: Sequence[Exposure], filters: list[str]) -> bytes:
    """Return the images that were both predicted and measured and are not known to be bad."""
    rows = [
        (
            each.mid_mjd,
            filters.index(each.filter),
            each.airmass_mid,
            math.nan if each.seeing_arcsec is None else each.seeing_arcsec,
            each.image_size_arcsec,
            each.measured_fwhm_arcsec,
        )
        for each in exposures
        if each.outcome == "good"
        and None not in (each.airmass_mid, each.image_size_arcsec, each.measured_fwhm_arcsec)
    ]
    return np.array(rows, dtype=np.float64).tobytes()


def table(data: bytes, columns: Sequence[str]) -> np.ndarray[tuple[int, int], np.dtype[np.float64]]:
    """Return the bytes of one or more nights' tables as an array, a column for each name."""
    return np.frombuffer(data, dtype=np.float64).reshape(-1, len(columns))


def as_json(value: object) -> str:
    """Return a value as one compact line of JSON, for a column of the index."""
    return json.dumps(value, ensure_ascii=False, separators=(",", ":"))
