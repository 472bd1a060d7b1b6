"""The sky: how high everything stands through the night, the order marked on it, and the limits.

The chosen target is a whole curve, dense within its limits. Every visit of the order, and every
stay that was made, is the piece of its target's curve that was or will be observed: one telescope
is in one place at a time, so the pieces never cover each other.
"""

from __future__ import annotations

from itertools import groupby

import numpy as np

from engine.night import Night, Stretch, TargetNow, stretches
from engine.order import Visit
from engine.watch import Watch
from tui.console.panels.graphs import (
    airmass_marks,
    lowest_deg,
    night_axis,
    picks,
    share_of,
)
from tui.console.panels.local import ahead, hhmm
from tui.console.panels.record import left_out_lines
from tui.console.views.base import View
from tui.paint.canvas import Stroke
from tui.paint.chart import Chart, Curve, paint_chart
from tui.paint.spans import BLANK, Line, Span, fitted, line, phrases

# Where there is room for a table beside the chart, and for the name of a visit on its curve.
TABLE_WIDTH, WITH_TABLE = 50, 120
NAMES_FROM = 100
NAME_WIDTH = 14
LEAST_ROWS = 3


class Sky(View):
    """Altitude through the night: the chosen target, the order, the Moon."""

    def paint(self, width: int, height: int) -> list[Line]:
        """Return the chart below a line on the chosen target, and a table beside it."""
        targets = self.watch.targets_now()
        chosen = next((each for each in targets if each.target.name == self.console.chosen), None)
        head = [_about(self.watch, chosen, width), _meaning(width)]
        rows = max(height - len(head), LEAST_ROWS)
        if width < WITH_TABLE:
            return [*head, *_chart(self.watch, chosen, width, rows)]
        chart = _chart(self.watch, chosen, width - TABLE_WIDTH, rows)
        table = _table(self.watch, targets, self.console.chosen, rows)
        table += [BLANK] * (rows - len(table))
        return [*head, *((*left, *right) for left, right in zip(chart, table, strict=True))]


def _meaning(width: int) -> Line:
    return phrases(
        width,
        line(Span(" ⣀⣀ ", "accent"), Span("within limits ", "dim")),
        line(Span(" ⡀ ⡀ ", "accent"), Span("outside ", "dim")),
        line(Span(" ⣤⣤ ", "strong"), Span("to visit ", "dim")),
        line(Span(" ⢄⢄ ", "good"), Span("observed ", "dim")),
        line(Span(" ⠄ ⠄ ", "moon"), Span("Moon ", "dim")),
        line(Span(" ╱ ╱ ", "dim"), Span("too low ", "dim")),
    )


def _about(watch: Watch, chosen: TargetNow | None, width: int) -> Line:
    """Return the chosen target in one line: where it is, until when, and what ends it."""
    if chosen is None:
        return line(Span(" no target is chosen", "dim"))
    mass = f"airmass {chosen.airmass:.2f}" if np.isfinite(chosen.airmass) else "down"
    return phrases(
        width,
        line(Span(f" {chosen.target.name}", "strong")),
        line(Span(f"  {chosen.apparent_altitude_deg:.0f}°, {mass}", "text")),
        line(Span(f"   {_window_sentence(watch, chosen.index)}", "text")),
        line(Span(f"   Moon {chosen.moon_separation_deg:.0f}° away", "moon")),
    )


def _window_sentence(watch: Watch, index: int) -> str:
    """Return when a target is within its limits from now on, and what ends that."""
    left = _left(watch, index)
    if not left:
        return "not within its limits again tonight"
    first = left[0]
    begun = first.begin_mjd <= watch.clock.now_mjd()
    since = (
        "within its limits" if begun else f"within its limits from {hhmm(watch, first.begin_mjd)}"
    )
    end = f" until {hhmm(watch, first.end_mjd)}"
    return since + end + (f" ({first.ended_by.label})" if first.ended_by else "")


def _left(watch: Watch, index: int) -> list[Stretch]:
    now_mjd = watch.clock.now_mjd()
    return [each for each in stretches(watch.planner.night, index) if each.end_mjd > now_mjd]


# The chart


def _chart(watch: Watch, chosen: TargetNow | None, width: int, rows: int) -> list[Line]:
    night = watch.planner.night
    at = picks(night)
    curves = [
        Curve(night.moon.altitude_deg[at].tolist(), Stroke("moon", 3), (_moon_label(watch),)),
    ]
    lowest = np.full(len(at), night.observatory.telescope.minimum_altitude_deg)
    if chosen is not None:
        curves += _chosen_curves(night, chosen.index)
        lowest = lowest_deg(night, chosen.index)[at]
    curves += [_stay(night, *stay) for stay in _observed(watch)]
    named = width >= NAMES_FROM
    curves += [
        _visit(night, number, visit, named) for number, visit in enumerate(ahead(watch), start=1)
    ]
    chart = Chart(
        curves=tuple(curves),
        axis=night_axis(watch),
        limit_deg=lowest.tolist(),
        airmass_marks=airmass_marks(night),
    )
    return paint_chart(chart, width, rows)


def _moon_label(watch: Watch) -> str:
    night = watch.planner.night
    lit = night.moon.illumination[night.index_at(watch.clock.now_mjd())]
    return f"Moon {lit:.0%}"


def _chosen_curves(night: Night, index: int) -> list[Curve]:
    """Return the chosen target's curve: sparse outside its limits, dense within."""
    at = picks(night)
    heights = night.apparent_altitude_deg[index, at]
    within = np.where(night.limits[index, at] == 0, heights, np.nan)
    name = night.targets[index].name
    whole = Curve(heights.tolist(), Stroke("accent", 4), (name,))
    return [whole, Curve(within.tolist(), Stroke("accent"))]


def _observed(watch: Watch) -> list[tuple[str, float, float]]:
    """Return the stays that were made: target, begin and end (UTC MJD)."""
    stays = []
    for name, group in groupby(watch.state.exposures, key=lambda each: each.target):
        exposures = list(group)
        stays.append((name, exposures[0].start_mjd, exposures[-1].end_mjd))
    return stays


def _stay(night: Night, name: str, begin_mjd: float, end_mjd: float) -> Curve:
    return Curve(_piece(night, name, begin_mjd, end_mjd), Stroke("good", 2))


def _visit(night: Night, number: int, visit: Visit, named: bool) -> Curve:
    labels = (f"{number} {visit.target}", str(number)) if named else (str(number),)
    piece = _piece(night, visit.target, visit.start_mjd, visit.end_mjd)
    return Curve(piece, Stroke("strong", double=True), labels)


def _piece(night: Night, name: str, begin_mjd: float, end_mjd: float) -> list[float]:
    """Return a target's altitudes (deg) between two moments, NaN outside; never nothing."""
    known = [target.name for target in night.targets]
    at = picks(night)
    piece = np.full(len(at), np.nan)
    if name in known:
        last = len(at) - 1
        first = min(max(int(share_of(night, begin_mjd) * last), 0), last)
        after = min(max(int(share_of(night, end_mjd) * last), first + 1), last + 1)
        piece[first:after] = night.apparent_altitude_deg[known.index(name), at[first:after]]
    return piece.tolist()


# The table


def _table(
    watch: Watch, targets: tuple[TargetNow, ...], chosen: str | None, rows: int
) -> list[Line]:
    """Return when each target of the order is within its limits, what ends that, its best."""
    by_name = {each.target.name: each for each in targets}
    numbers: dict[str, str] = {} if chosen is None else {chosen: ""}
    for number, visit in reversed(list(enumerate(ahead(watch), start=1))):
        numbers[visit.target] = str(number)
    shown = sorted(numbers, key=lambda name: int(numbers[name] or 0))
    lines = [line(Span(_columns("", "target", "within", "then", "best"), "dim"))]
    lines += [
        _table_row(watch, numbers[name], by_name[name], name == chosen)
        for name in shown
        if name in by_name
    ]
    return [*lines, BLANK, *left_out_lines(watch, TABLE_WIDTH)][:rows]


def _columns(number: str, name: str, within: str, then: str, best: str) -> str:
    return f"  {number:>2} {fitted(name, NAME_WIDTH)} {within:<11} {then:<10} {best:>4}"


def _table_row(watch: Watch, number: str, now: TargetNow, is_chosen: bool) -> Line:
    night, left = watch.planner.night, _left(watch, now.index)
    within, then = "-", ""
    if left:
        within = f"{hhmm(watch, left[0].begin_mjd)}-{hhmm(watch, left[0].end_mjd)}"
        then = left[0].ended_by.label if left[0].ended_by else ""
    allowed = night.airmass[now.index][night.limits[now.index] == 0]
    best = f"{allowed.min():.2f}" if allowed.size else "-"
    text = _columns(number, now.target.name, within, then, best)
    if is_chosen:
        return line(Span(f" ▶{text[2:]}", "strong"))
    return line(Span(text, "text"))
