"""One past night as it went: what its log said at any entry of it, and the sky over it."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from engine.log import Event, Header, NightState, fold, read_log
from engine.past.account import dark_spans_of, site_of
from engine.positions import moon, sun
from engine.times import MINUTES_PER_DAY, night_span_mjd

Floats = NDArray[np.float64]
STEP_MIN = 5.0
MARGIN_DAYS = 20.0 / MINUTES_PER_DAY


@dataclass(frozen=True, slots=True)
class Replay:
    """A night's entries in their order, and the heights (deg) of Sun and Moon at moments (UTC MJD).

    ``withdrawn`` holds the numbers of what was taken back in the end. ``timezone`` is None and the
    heights are NaN where the log's header does not say where it was.
    """

    path: Path
    header: Header
    events: tuple[Event, ...]
    withdrawn: frozenset[int]
    findings: tuple[str, ...]
    timezone: str | None
    mjd: Floats
    sun_deg: Floats
    moon_deg: Floats

    def at(self, place: int) -> NightState:
        """Return the state after an entry by its place, as the observer had it then."""
        return fold(self.events[: place + 1])

    def place_of(self, n: int) -> int:
        """Return the place of the entry with a number; the last one when there is none."""
        places = [place for place, event in enumerate(self.events) if event.n == n]
        return places[0] if places else len(self.events) - 1


def open_replay(path: Path) -> Replay:
    """Return a night from its log; LogError when it can't be read."""
    reading = read_log(path)
    events = tuple(
        sorted((each for each in reading.events if each.t_mjd == each.t_mjd), key=lambda e: e.n)
    )
    begin_mjd, end_mjd = _span(reading.header, events)
    mjd = np.arange(begin_mjd, end_mjd, STEP_MIN / MINUTES_PER_DAY)
    site = site_of(reading.header)
    unknown = np.full(mjd.size, np.nan)
    return Replay(
        path=path,
        header=reading.header,
        events=events,
        withdrawn=fold(events).withdrawn,
        findings=tuple(str(each).removeprefix(f"{path}:") for each in reading.findings),
        timezone=site.timezone if site else None,
        mjd=mjd,
        sun_deg=sun(mjd, site).altitude_deg if site else unknown,
        moon_deg=moon(mjd, site).altitude_deg if site else unknown,
    )


def _span(header: Header, events: tuple[Event, ...]) -> tuple[float, float]:
    """Return from when to when to show a night: its dark, and what was logged that night."""
    moments = [edge for span in dark_spans_of(header) or () for edge in span]
    site = site_of(header)
    begin_mjd, end_mjd = -np.inf, np.inf
    if site is not None and moments:
        begin_mjd, end_mjd = night_span_mjd(header.night, site.timezone)
    moments += [each.t_mjd for each in events if begin_mjd <= each.t_mjd <= end_mjd]
    if not moments:
        return 0.0, 1.0
    first, last = min(moments), min(max(moments), min(moments) + 1.0)
    return first - MARGIN_DAYS, last + MARGIN_DAYS
