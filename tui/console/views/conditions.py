"""Conditions: the seeing measured and foretold, the weather against its cautions, the sky.

Every value has its age beside it, and what nobody has entered is named.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from engine.log import NightState
from engine.logbook import Caution
from engine.night import TargetNow
from engine.seeing import SeeingMeasurement, summary
from engine.times import MINUTES_PER_DAY
from engine.watch import Watch
from tui.console.panels.graphs import night_axis, picks, share_of
from tui.console.panels.local import ago, local, whole_hours
from tui.console.views.base import View
from tui.paint.canvas import joined
from tui.paint.figures import bar
from tui.paint.spans import BLANK, Line, Span, fitted, line, phrases, width_of
from tui.paint.trend import Trend, paint_trend

# Older than this a value says little of now: common practice, no source.
OLD_MIN = 60.0
LEAST_CHART_ROWS, MOST_CHART_ROWS = 5, 26
WEATHER_WIDTH, WIDE_WEATHER_WIDTH = 41, 64
WIDE_FROM = 120
BAR = 20
HOUR_WIDTH = 5


class Conditions(View):
    """Seeing, weather and sky, each with its age."""

    def paint(self, width: int, height: int) -> list[Line]:
        """Return the seeing as a graph, and below it weather and sky side by side."""
        watch = self.watch
        if watch.plan is None:
            return [line(Span(" working out the night ...", "dim"))]
        targets = watch.targets_now()
        chosen = next((each for each in targets if each.target.name == self.console.chosen), None)
        left_width = WIDE_WEATHER_WIDTH if width >= WIDE_FROM else WEATHER_WIDTH
        left = _weather(watch, wide=width >= WIDE_FROM)
        right = _filters(watch, chosen, width - left_width)
        below = _side_by_side(left, right, left_width)
        rows = min(max(height - 1 - len(below), LEAST_CHART_ROWS), MOST_CHART_ROWS)
        gap = [BLANK] if height > 1 + rows + len(below) else []
        chart = paint_trend(_trend(watch), width, rows)
        return [_seeing_line(watch, width), *chart, *gap, *below][:height]


def _side_by_side(left: list[Line], right: list[Line], left_width: int) -> list[Line]:
    rows = max(len(left), len(right))
    left, right = left + [BLANK] * (rows - len(left)), right + [BLANK] * (rows - len(right))
    return [
        (*one, Span(" " * max(left_width - width_of(one), 0)), *other)
        for one, other in zip(left, right, strict=True)
    ]


# The seeing


def _seeing_line(watch: Watch, width: int) -> Line:
    assert watch.plan is not None
    now_mjd = watch.clock.now_mjd()
    forecast, measured = watch.plan.forecast, watch.state.seeing
    median, low, high = (float(value) for value in forecast.at(now_mjd))
    so_far = summary([SeeingMeasurement(each.mjd, each.zenith_arcsec) for each in measured])
    if so_far is None:
        source: Line = line(Span("  nothing measured yet, the usual value", "warn"))
        tonight: Line = BLANK
    else:
        age_min = (now_mjd - measured[-1].mjd) * MINUTES_PER_DAY
        source = line(Span(f"  measured {ago(age_min)}", "warn" if age_min > OLD_MIN else "text"))
        tonight = line(
            Span(
                f'  tonight {so_far.best_arcsec:.2f}" to {so_far.worst_arcsec:.2f}" '
                f"in {so_far.count}",
                "dim",
            )
        )
    return phrases(
        width,
        line(Span(" seeing ", "title"), Span(f'{median:.2f}"', "strong")),
        line(Span(f'  {low:.2f}" to {high:.2f}"', "text"), Span(" in 68 %", "dim")),
        source,
        tonight,
        line(Span("   zenith, 500 nm", "dim")),
    )


def _trend(watch: Watch) -> Trend:
    assert watch.plan is not None
    night, now_mjd = watch.planner.night, watch.clock.now_mjd()
    mjd = night.mjd[picks(night)]
    ahead_mjd = np.where(mjd >= now_mjd, mjd, np.nan)
    middle, low, high = (values.tolist() for values in watch.plan.forecast.at(ahead_mjd))
    typical = night.observatory.seeing.typical_arcsec
    return Trend(
        axis=night_axis(watch),
        points=tuple((share_of(night, m.mjd), m.zenith_arcsec) for m in watch.state.seeing),
        middle=middle,
        low=low,
        high=high,
        level=(typical, f"usual {typical:g}"),
    )


# The weather


@dataclass(frozen=True, slots=True)
class _Gauge:
    """One value of the weather: its age (min), how full its bar is, and where its caution is."""

    word: str
    value: float | None
    unit: str
    age_min: float = math.inf
    share: float | None = None
    caution_share: float | None = None
    limit: str = ""
    beyond: bool = False


def _gauges(state: NightState, caution: Caution, now_mjd: float) -> list[_Gauge]:
    def known(key: str) -> tuple[float | None, float]:
        latest = state.latest(key)
        if latest is None:
            return None, math.inf
        return latest.value, (now_mjd - latest.mjd) * MINUTES_PER_DAY

    wind, wind_min = known("wind_m_per_s")
    humidity, humidity_min = known("humidity_percent")
    air_c, air_min = known("temperature_c")
    dew_c, dew_min = known("dew_point_c")
    cloud, cloud_min = known("cloud_percent")
    pressure, pressure_min = known("pressure_hpa")
    margin = None if air_c is None or dew_c is None else air_c - dew_c
    # A margin is as old as the older of its two.
    return [
        _above("wind", wind, "m/s", wind_min, (caution.wind_m_per_s, 2 * caution.wind_m_per_s)),
        _above("humidity", humidity, "%", humidity_min, (caution.humidity_percent, 100.0)),
        _Gauge(
            "dew margin",
            margin,
            "°C",
            max(air_min, dew_min),
            None if margin is None else margin / (4 * caution.dew_margin_c),
            0.25,
            f"below {caution.dew_margin_c:g}",
            margin is not None and margin < caution.dew_margin_c,
        ),
        _Gauge("cloud", cloud, "%", cloud_min, None if cloud is None else cloud / 100.0),
        _Gauge("air", air_c, "°C", air_min),
        _Gauge("pressure", pressure, "hPa", pressure_min),
    ]


def _above(
    word: str, value: float | None, unit: str, age_min: float, ends: tuple[float, float]
) -> _Gauge:
    """Return the gauge of a quantity with a caution above a value, on a scale to another."""
    limit, most = ends
    share = None if value is None else value / most
    beyond = value is not None and value > limit
    return _Gauge(word, value, unit, age_min, share, limit / most, f"above {limit:g}", beyond)


def _weather(watch: Watch, *, wide: bool) -> list[Line]:
    caution = watch.planner.logbook.observatory.caution
    gauges = _gauges(watch.state, caution, watch.clock.now_mjd())
    missing = [each.word for each in gauges if each.value is None]
    lines = [line(Span(" weather", "title"), Span(f"{'caution':>22}", "dim"))]
    lines += [_gauge(each, wide) for each in gauges if each.value is not None]
    if missing:
        lines += [
            line(Span(" nobody has entered ", "warn"), Span("c enters", "dim")),
            *_in_lines(missing, (WIDE_WEATHER_WIDTH if wide else WEATHER_WIDTH) - 3),
        ]
    return lines


def _in_lines(words: list[str], width: int) -> list[Line]:
    rows: list[str] = [""]
    for word in words:
        longer = f"{rows[-1]}, {word}" if rows[-1] else word
        if len(longer) <= width:
            rows[-1] = longer
        else:
            rows.append(word)
    return [line(Span(f"   {each}", "text")) for each in rows]


def _gauge(gauge: _Gauge, wide: bool) -> Line:
    mark = "!" if gauge.beyond else " "
    old = gauge.age_min > OLD_MIN
    age = Span(f" {_short_age(gauge.age_min):>6}", "warn" if old else "dim")
    told = [
        Span(f"{mark}{gauge.word:<10}", "bad" if gauge.beyond else "dim"),
        Span(f" {gauge.value:>5.4g} {gauge.unit:<3}", "bad" if gauge.beyond else "strong"),
    ]
    if wide:
        told += _bar(gauge)
    return (*told, Span(f" {gauge.limit:<9}", "bad" if gauge.beyond else "dim"), age)


def _bar(gauge: _Gauge) -> list[Span]:
    """Return a bar with a mark at the caution."""
    if gauge.share is None:
        return [Span(" " * (BAR + 1))]
    filled = bar(gauge.share, BAR).rstrip()
    track = filled + "·" * (BAR - len(filled))
    role = "bad" if gauge.beyond else "text"
    cells = [Span(each, "dim" if each == "·" else role) for each in track]
    if gauge.caution_share is not None:
        cells[min(int(gauge.caution_share * BAR), BAR - 1)] = Span("│", "warn")
    return [Span(" "), *joined(cells)]


def _short_age(minutes: float) -> str:
    if minutes < 1.0:
        return "now"
    return f"{minutes:.0f} min" if minutes < 100 else f"{minutes / 60:.1f} h"


# The sky, and the seeing as images


def _filters(watch: Watch, chosen: TargetNow | None, width: int) -> list[Line]:
    """Return each filter's image and sky toward the chosen target, now and through the night."""
    if chosen is None or watch.plan is None:
        return []
    night, now_mjd = watch.planner.night, watch.clock.now_mjd()
    is_up = math.isfinite(chosen.airmass)
    seeing = np.array([float(value) for value in watch.plan.forecast.at(now_mjd)])
    sizes = watch.planner.model.sizes_arcsec(seeing, chosen.airmass if is_up else 1.0)
    hours = whole_hours(watch, (width - 23) // HOUR_WIDTH)
    at_now = night.index_at(now_mjd)
    where = f"airmass {chosen.airmass:.2f}" if is_up else "down; image at the zenith"
    lines = [
        line(
            Span(f"{'':3}{'image':>6} {'68 %':>7}  ", "dim"),
            Span("sky", "dim"),
            Span("".join(f"{local(watch, mjd):%H}".rjust(HOUR_WIDTH) for mjd in hours), "dim"),
        )
    ]
    for place, each in enumerate(night.observatory.filters):
        sky = night.sky_mag_arcsec2[place, chosen.index]
        size, low, high = sizes[place]
        lines.append(
            line(
                Span(fitted(each.name, 3), "title"),
                Span(f'{size:>5.2f}"', "strong"),
                Span(f" {low:>3.1f}-{high:<3.1f} ", "dim"),
                Span(_magnitude(sky[at_now]), "strong"),
                Span("".join(_magnitude(sky[night.index_at(mjd)]) for mjd in hours), "text"),
            )
        )
    toward = line(Span("toward ", "dim"), Span(chosen.target.name, "strong"))
    return [phrases(width, toward, line(Span(f"  {where}", "dim"))), *lines]


def _magnitude(value: float) -> str:
    return (f"{value:.1f}" if math.isfinite(value) else "-").rjust(HOUR_WIDTH)
