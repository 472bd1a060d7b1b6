"""Which targets will be soft, and when: a band each from now to the end of the night."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.night import FilterNow, TargetNow
from engine.order import Visit
from engine.times import HOURS_PER_DAY
from engine.watch import Watch
from tui.console.panels.local import ahead, arcsec, hhmm, local
from tui.paint.canvas import joined
from tui.paint.night_axis import NightAxis, hours_line
from tui.paint.spans import Line, Span, fitted, line, phrases

NAME_WIDTH, LIMIT_WIDTH = 15, 6
SAID_WIDTH, WIDE_SAID_WIDTH, WIDE_FROM = 12, 24, 120
# A limit that is met less surely than the upper end of the 68 % band is in doubt.
SURE = 0.84

# Says which blur makes an image soft: the filter, the zenith seeing (arcsec) and the airmass.
Blame = Callable[[FilterNow, float, float], str]


@dataclass(frozen=True, slots=True)
class _Ahead:
    """One target from now on: the grid's places, and what holds at each of them."""

    now: TargetNow
    visit: tuple[int, Visit] | None
    places: NDArray[np.int64]
    allowed: NDArray[np.bool_]
    soft: NDArray[np.bool_]
    doubt: NDArray[np.bool_]


def paint_softness(
    watch: Watch, chosen: str | None, size: tuple[int, int], blame: Blame
) -> list[Line]:
    """Return a band for every target of the order, and the chosen one, in (width, height)."""
    width, height = size
    # Which blur is to blame is told where there is room for it.
    told = blame if width >= WIDE_FROM else None
    said_width = WIDE_SAID_WIDTH if told else SAID_WIDTH
    columns = max(width - NAME_WIDTH - LIMIT_WIDTH - said_width - 2, 1)
    by_name = {each.target.name: each for each in watch.targets_now()}
    visits: dict[str, tuple[int, Visit]] = {}
    for number, visit in enumerate(ahead(watch), start=1):
        visits.setdefault(visit.target, (number, visit))
    names = list(visits) if chosen is None or chosen in visits else [chosen, *visits]
    bands = [
        _band(watch, _ahead(watch, by_name[name], visits.get(name)), name == chosen, columns, told)
        for name in names[: height - 2]
        if name in by_name
    ]
    title = Span(fitted(" soft, and when", NAME_WIDTH + LIMIT_WIDTH), "title")
    return [line(title, *hours_line(_axis(watch), columns)), *bands, _legend(width)]


def _legend(width: int) -> Line:
    return phrases(
        width,
        line(Span(" ━", "good"), Span(" sharp", "dim")),
        line(Span("  ▒", "warn"), Span(" in doubt", "dim")),
        line(Span("  █", "bad"), Span(" soft", "dim")),
        line(Span("  ─", "dim"), Span(" no limit of its own", "dim")),
        line(Span("  3", "strong"), Span(" its visit begins", "dim")),
        line(Span("  nothing: not to be observed", "dim")),
    )


def _axis(watch: Watch) -> NightAxis:
    """Return the hours from now to the end of the night's tables."""
    night, now_mjd = watch.planner.night, watch.clock.now_mjd()
    begin = local(watch, now_mjd)
    hours = max((float(night.mjd[-1]) - now_mjd) * HOURS_PER_DAY, 0.1)
    return NightAxis(hours=hours, begin_hour=begin.hour + begin.minute / 60.0, now_h=0.0)


def _ahead(watch: Watch, now: TargetNow, visit: tuple[int, Visit] | None) -> _Ahead:
    assert watch.plan is not None
    night, outlook = watch.planner.night, watch.plan.outlook
    places = np.arange(night.index_at(watch.clock.now_mjd()), night.last + 1)
    needed = [each.filter_index for each in now.filters if each.progress.remaining]
    needed = needed or [each.filter_index for each in now.filters]
    allowed = night.limits[now.index, places] == 0
    return _Ahead(
        now,
        visit,
        places,
        allowed,
        outlook.soft[needed, now.index][:, places].any(axis=0) & allowed,
        (outlook.chance[needed, now.index][:, places] < SURE).any(axis=0) & allowed,
    )


def _band(watch: Watch, one: _Ahead, is_chosen: bool, columns: int, blame: Blame | None) -> Line:
    picks = np.linspace(0, len(one.places) - 1, columns).round().astype(int)
    limit = one.now.target.maximum_image_size_arcsec
    cells = [
        _state(bool(one.allowed[at]), bool(one.soft[at]), bool(one.doubt[at]), limit is not None)
        for at in picks
    ]
    if one.visit is not None:
        number, visit = one.visit
        begun = watch.planner.night.index_at(visit.start_mjd) - int(one.places[0])
        column = int(np.searchsorted(picks, max(begun, 0)))
        for offset, figure in enumerate(str(number)):
            cells[min(column + offset, columns - 1)] = Span(figure, "strong")
    name = fitted(f"{'▶' if is_chosen else ' '}{one.now.target.name}", NAME_WIDTH - 1)
    return (
        Span(f"{name} ", "strong" if is_chosen else "text"),
        Span((f'{limit:.1f}"' if limit else "").ljust(LIMIT_WIDTH), "dim"),
        *joined(cells),
        Span("  "),
        _said(watch, one, blame),
    )


def _state(allowed: bool, soft: bool, doubt: bool, limited: bool) -> Span:
    if not allowed:
        return Span(" ")
    if not limited:
        return Span("─", "dim")
    if soft:
        return Span("█", "bad")
    return Span("▒", "warn") if doubt else Span("━", "good")


def _said(watch: Watch, one: _Ahead, blame: Blame | None) -> Span:
    """Return when a target is soft first and which blur is to blame, else its size when visited."""
    assert watch.plan is not None
    night, outlook = watch.planner.night, watch.plan.outlook
    if not one.soft.any():
        if one.visit is None:
            return Span("not in order", "dim")
        visit = one.visit[1]
        return Span(f"{arcsec(visit.image_size_arcsec)} {hhmm(watch, visit.start_mjd)}", "dim")
    first = int(np.argmax(one.soft))
    place = int(one.places[first])
    when = "soft now" if first == 0 else f"soft {hhmm(watch, float(night.mjd[place]))}"
    if blame is None:
        return Span(when, "bad")
    filters = [e for e in one.now.filters if outlook.soft[e.filter_index, one.now.index, place]]
    seeing, mass = float(outlook.seeing_arcsec[place]), float(night.airmass[one.now.index, place])
    return Span(f"{when} {blame(filters[0], seeing, mass)}", "bad")
