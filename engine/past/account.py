"""Where the dark time of a night went: every second of it under one heading, and only one.

Dark is while the Sun is lower than the most patient filter of the wheel allows, by the observatory
as the log's own header describes it.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np

from engine.log import (
    Close,
    Event,
    Exposure,
    Header,
    LostTime,
    Pointing,
    RunStart,
    RunStop,
    Word,
)
from engine.logbook import Site
from engine.positions import spans_above, sun
from engine.times import SECONDS_PER_DAY, night_span_mjd

# Where the header does not say it: nautical twilight, the default of a filter's own limit.
DARK_SUN_DEG = -12.0

# Under what time is booked; where two hold at once the earlier one in this list has it.
HEADINGS: tuple[Word, ...] = (
    Word("open", "open", "The shutter was open."),
    Word("lost", "lost", "Time was said to be lost."),
    Word("between", "between", "Within a run, shutter closed: read-out, change of filter."),
    Word("moving", "moving", "The telescope was on its way to a target."),
    Word("ready", "ready", "On a target, and no run under way."),
    Word("idle", "idle", "The telescope was sent nowhere, or the console was closed."),
)
BACKGROUND = "idle"

# The Sun's altitude bends too little in half an hour to hide anything from the finder.
STEP_DAYS = 0.5 / 24.0

Span = tuple[float, float]


@dataclass(frozen=True, slots=True)
class Account:
    """A night's dark time in seconds: all of it, by heading, and what was lost by its cause.

    The headings add up to ``dark_s``, the causes to the heading ``lost``.
    """

    dark_s: float
    spent_s: dict[str, float] = field(default_factory=dict)
    lost_s: dict[str, float] = field(default_factory=dict)


def site_of(header: Header) -> Site | None:
    """Return where a log's night was; None when its header does not tell."""
    try:
        return Site.model_validate(header.observatory.get("site"))
    except (ValueError, OverflowError, KeyError):
        return None


def dark_spans_of(header: Header) -> tuple[Span, ...] | None:
    """Return the dark spans (UTC MJD) of a log's night; None when its header does not tell."""
    filters = header.observatory.get("filter", [])
    limits_deg = [
        float(limit)
        for each in (filters if isinstance(filters, list) else [])
        if isinstance(each, dict)
        and isinstance(limit := each.get("maximum_sun_altitude_deg"), int | float)
    ]
    limit_deg = max(limits_deg, default=DARK_SUN_DEG)
    site = site_of(header)
    if site is None:
        return None
    try:
        begin_mjd, end_mjd = night_span_mjd(header.night, site.timezone)
    except (ValueError, OverflowError, KeyError):
        return None
    return tuple(
        spans_above(
            lambda mjd: limit_deg - sun(mjd, site).altitude_deg, begin_mjd, end_mjd, STEP_DAYS
        )
    )


def account(events: Sequence[Event], dark: Sequence[Span]) -> Account:
    """Return where the dark time went, from the events that stand (see `engine.log.effective`)."""
    booked = _spans_by_heading(events)
    causes = {heading: spans for heading, spans in booked.items() if heading.startswith("lost ")}
    ranked: list[tuple[str, list[Span]]] = []
    for word in HEADINGS[:-1]:
        if word.value == "lost":
            ranked += sorted(causes.items())
        else:
            ranked.append((word.value, booked.get(word.value, [])))
    seconds = _shared_out(ranked, dark)
    lost_s = {name.removeprefix("lost "): seconds[name] for name in causes if seconds[name] > 0.0}
    spent_s = {
        word.value: sum(lost_s.values(), 0.0) if word.value == "lost" else seconds[word.value]
        for word in HEADINGS
    }
    return Account(sum(spent_s.values()), spent_s, lost_s)


def _shared_out(ranked: list[tuple[str, list[Span]]], dark: Sequence[Span]) -> dict[str, float]:
    """Return the dark seconds each name has, the first in rank first, the rest to the last."""
    spans = [span for _, found in ranked for span in found]
    edges = np.unique([edge for span in (*spans, *dark) for edge in span])
    holder = np.full(max(edges.size - 1, 0), len(ranked))
    for rank in range(len(ranked) - 1, -1, -1):
        for begin, end in ranked[rank][1]:
            holder[np.searchsorted(edges, begin) : np.searchsorted(edges, end)] = rank
    is_dark = np.zeros(holder.size, dtype=bool)
    for begin, end in dark:
        is_dark[np.searchsorted(edges, begin) : np.searchsorted(edges, end)] = True
    lengths_s = np.diff(edges) * SECONDS_PER_DAY * is_dark
    names = [*(name for name, _ in ranked), BACKGROUND]
    sums = np.bincount(holder, weights=lengths_s, minlength=len(names)) if holder.size else None
    return {name: 0.0 if sums is None else float(sums[i]) for i, name in enumerate(names)}


def _spans_by_heading(events: Sequence[Event]) -> dict[str, list[Span]]:
    """Return when what was the case; lost time under ``lost CAUSE``.

    What was never said to end lasts to the night's last entry.
    """
    spans: dict[str, list[Span]] = {}
    since: dict[str, float] = {}

    def begin(heading: str, mjd: float) -> None:
        since.setdefault(heading, mjd)

    def end(heading: str, mjd: float) -> None:
        if (from_mjd := since.pop(heading, mjd)) < mjd:
            spans.setdefault(heading, []).append((from_mjd, mjd))

    timed = [event for event in events if event.t_mjd == event.t_mjd]
    for event in timed:
        match event:
            case Exposure():
                if event.start_mjd < event.end_mjd:
                    spans.setdefault("open", []).append((event.start_mjd, event.end_mjd))
            case Pointing():
                end("moving" if event.on_target else "ready", event.t_mjd)
                begin("ready" if event.on_target else "moving", event.t_mjd)
            case RunStart():
                begin("between", event.t_mjd)
            case RunStop():
                end("between", event.t_mjd)
            case LostTime():
                for heading in [name for name in since if name.startswith("lost ")]:
                    end(heading, event.t_mjd)
                if event.phase == "begin":
                    begin(f"lost {event.cause}", event.t_mjd)
            case Close():
                for heading in ("between", "moving", "ready"):
                    end(heading, event.t_mjd)
            case _:
                pass
    last_mjd = max((event.t_mjd for event in timed), default=0.0)
    for heading in list(since):
        end(heading, last_mjd)
    return spans
