"""The charts of a night: time-line, altitude, seeing, image size, sky."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np

from engine.log import Exposure
from engine.positions import Air, airmass, apparent_altitude_deg, moon, sun
from engine.report.night import NightReport
from engine.report.svg import Chart, steps
from engine.report.words import clock, zone_of
from engine.seeing import SeeingMeasurement, nowcast
from engine.times import MINUTES_PER_DAY, datetime_from_mjd, mjd_from_datetime

MARGIN_DAYS = 12.0 / MINUTES_PER_DAY
# Light of the Sun on the charts: (lower than, deg) and the band's class, the brightest first.
LIGHT = ((90.0, "day"), (-0.833, "civil"), (-6.0, "nautical"), (-12.0, "astronomical"))
DARK_DEG = -18.0
# The forecast is shown as it was this long before: what could be known when it mattered.
AHEAD_MIN = 30.0
STEP_MIN = 5.0
ROW_PX = 15.0


def charts(report: NightReport) -> tuple[Chart, ...]:
    """Return the charts that a night has something for, in the order of the report."""
    taken = report.exposures
    if not taken:
        return ()
    edges = _span(report)
    made = [_timeline(report, edges), _altitude(report, edges)]
    if report.state.seeing:
        made.append(_seeing(report, edges))
    if any(each.image_size_arcsec is not None for each in taken):
        made.append(_images(report, edges))
    if any(each.sky_mag_arcsec2 is not None for each in taken):
        made.append(_sky(report, edges))
    return tuple(made)


def filters_of(report: NightReport) -> list[str]:
    """Return the filters of the night: the wheel's first, in its order."""
    wheel = [each.name for each in report.observatory.filters] if report.observatory else []
    used = {each.filter for each in report.exposures}
    return [name for name in wheel if name in used] + sorted(used - set(wheel))


def _span(report: NightReport) -> tuple[float, float]:
    """Return from when to when the charts go: what was done, and the dark around it."""
    moments = [edge for each in report.exposures for edge in (each.start_mjd, each.end_mjd)]
    times = report.times
    for name in ("nautical_dusk", "nautical_dawn"):
        edge = getattr(times, name) if times else None
        if edge is not None:
            moments.append(edge)
    first = min(moments)
    # A record with a wrong clock must not squeeze the night into a corner.
    last = min(max(moments), first + 1.0)
    return first - MARGIN_DAYS, last + MARGIN_DAYS


def _framed(report: NightReport, chart: Chart, *, with_light: bool = True) -> Chart:
    """Return a chart with its twilight, lost time and hours drawn."""
    if with_light and report.site is not None:
        mjd = np.arange(chart.x[0], chart.x[1] + 1e-9, STEP_MIN / MINUTES_PER_DAY)
        heights = sun(mjd, report.site).altitude_deg
        kinds = [_light(height) for height in heights]
        begin = 0
        for place in range(1, len(mjd) + 1):
            if place == len(mjd) or kinds[place] != kinds[begin]:
                end = float(mjd[min(place, len(mjd) - 1)])
                if kinds[begin]:
                    chart.band(float(mjd[begin]), end, kinds[begin])
                begin = place
    for lost in report.lost:
        end = lost.end_mjd if lost.end_mjd is not None else chart.x[1]
        chart.band(lost.begin_mjd, end, "lost", f"lost to {lost.cause}")
    chart.hours(_hours(report, chart.x))
    return chart


def _light(height_deg: float) -> str:
    if height_deg <= DARK_DEG:
        return ""
    return [kind for lower, kind in LIGHT if height_deg <= lower][-1]


def _hours(report: NightReport, edges: tuple[float, float]) -> list[tuple[float, str]]:
    """Return the full hours of local time between two moments."""
    zone = zone_of(report)
    first = datetime_from_mjd(edges[0]).astimezone(zone)
    mjd = mjd_from_datetime(first.replace(minute=0, second=0, microsecond=0))
    found = []
    while mjd <= edges[1]:
        if mjd >= edges[0]:
            found.append((mjd, datetime_from_mjd(mjd + 1e-6).astimezone(zone).strftime("%H")))
        mjd += 1.0 / 24.0
    return found


def _timeline(report: NightReport, edges: tuple[float, float]) -> Chart:
    names = list(dict.fromkeys(each.target for each in report.exposures))
    filters = filters_of(report)
    chart = Chart(
        "timeline",
        "What was exposed, and when",
        f"One row a target, one bar an exposure; {len(report.exposures)} exposures. Hollow bars "
        "do not count. Grey is twilight, hatched is lost time.",
        edges,
        (0.0, float(len(names))),
        height=38.0 + ROW_PX * len(names),
        left=128.0,
        right=12.0,
    )
    _framed(report, chart)
    chart.rows([name if len(name) <= 20 else f"{name[:19]}…" for name in names])
    for each in report.exposures:
        kind = f"f{filters.index(each.filter) % 6}" + ("" if each.outcome == "good" else " hollow")
        chart.block(
            each.start_mjd, each.end_mjd, names.index(each.target), kind, _said(report, each)
        )
    for begin, end, row, name in _same_filter(report.exposures, names):
        chart.write_on(begin, end, row, name)
    chart.legend(filters, marks=False)
    return chart


def _same_filter(
    exposures: Sequence[Exposure], names: list[str]
) -> list[tuple[float, float, int, str]]:
    """Return the stretches of one target in one filter: from, to (UTC MJD), row, filter."""
    found: list[tuple[float, float, int, str]] = []
    for each in exposures:
        row = names.index(each.target)
        if found and found[-1][2:] == (row, each.filter):
            found[-1] = (found[-1][0], each.end_mjd, row, each.filter)
        else:
            found.append((each.start_mjd, each.end_mjd, row, each.filter))
    return found


def _said(report: NightReport, each: Exposure) -> str:
    return f"{clock(report, each.start_mjd)} {each.target} {each.filter} {each.exposed_s:g} s"


def _altitude(report: NightReport, edges: tuple[float, float]) -> Chart:
    chart = Chart(
        "altitude",
        "Altitude and airmass",
        "Altitude of each exposure at its middle, airmass on the right; the dashed line is the "
        "Moon.",
        edges,
        (0.0, 90.0),
    )
    _framed(report, chart)
    chart.scale("altitude, deg", [0, 30, 60, 90])
    air = Air.standard(report.site.elevation_m) if report.site else None
    model = report.site.airmass_model if report.site else "pickering"
    heights = np.array([20.0, 30.0, 45.0, 90.0])
    masses = (
        airmass(apparent_altitude_deg(heights, air), model, air)
        if air
        else 1.0 / np.sin(np.radians(heights))
    )
    chart.right_scale(
        "airmass", [(float(h), f"{x:.2f}") for h, x in zip(heights, masses, strict=True)]
    )
    if report.site is not None:
        mjd = np.arange(edges[0], edges[1], STEP_MIN / MINUTES_PER_DAY)
        moon_deg = moon(mjd, report.site).altitude_deg
        chart.line(
            [
                (float(t), float(h) if h > 0.0 else math.nan)
                for t, h in zip(mjd, moon_deg, strict=True)
            ],
            "moon",
        )
    _marks(report, chart, [each.altitude_deg for each in report.exposures])
    return chart


def _marks(report: NightReport, chart: Chart, values: Sequence[float | None]) -> None:
    """Put a mark for every exposure that has a value, and name the filters."""
    filters = filters_of(report)
    for each, value in zip(report.exposures, values, strict=True):
        if value is not None:
            kind = "" if each.outcome == "good" else "hollow"
            about = f"{_said(report, each)}: {value:.2f}"
            chart.mark(each.mid_mjd, value, filters.index(each.filter), kind, about)
    chart.legend(filters)


def _seeing(report: NightReport, edges: tuple[float, float]) -> Chart:
    measured = [SeeingMeasurement(each.mjd, each.zenith_arcsec) for each in report.state.seeing]
    typical = (
        report.observatory.seeing.typical_arcsec
        if report.observatory
        else float(np.median([each.zenith_arcsec for each in measured]))
    )
    first, last = measured[0].mjd, max(each.mjd for each in measured)
    ahead_days = AHEAD_MIN / MINUTES_PER_DAY
    moments = np.arange(first, last + 1e-9, STEP_MIN / MINUTES_PER_DAY)
    foreseen = []
    for mjd in moments.tolist():
        known = [each for each in measured if each.mjd <= mjd - ahead_days]
        middle, low, high = nowcast(known, mjd - ahead_days, typical).at(mjd)
        foreseen.append((mjd, float(middle), float(low), float(high)))
    top = max([each.zenith_arcsec for each in measured] + [high for *_, high in foreseen])
    chart = Chart(
        "seeing",
        "Seeing measured and foreseen",
        "Marks are measurements at the zenith, 500 nm. The line is what was foreseen half an hour "
        "before, with its band of 68 percent.",
        edges,
        (0.0, min(top * 1.08, 2.5 * float(np.median([each.zenith_arcsec for each in measured])))),
    )
    _framed(report, chart)
    chart.scale("seeing, arcsec", steps(*chart.y, 4))
    limit = chart.y[1]
    chart.area([(t, min(lo, limit), min(hi, limit)) for t, _, lo, hi in foreseen], "band")
    chart.line([(t, min(middle, limit)) for t, middle, _, _ in foreseen], "foreseen")
    for each in measured:
        about = f'{clock(report, each.mjd)}: {each.zenith_arcsec:.2f}"'
        chart.mark(each.mjd, each.zenith_arcsec, 0, "", about)
    return chart


def _images(report: NightReport, edges: tuple[float, float]) -> Chart:
    taken = report.exposures
    sizes = [
        size
        for each in taken
        for size in (each.image_size_arcsec, each.measured_fwhm_arcsec)
        if size is not None
    ]
    chart = Chart(
        "images",
        "Image size predicted and measured",
        "Size of star images, FWHM: marks by filter as predicted, rings as measured.",
        edges,
        (0.0, min(max(sizes) * 1.08, 2.5 * float(np.median(sizes)))),
    )
    _framed(report, chart)
    chart.scale("FWHM, arcsec", steps(*chart.y, 4))
    _marks(report, chart, [each.image_size_arcsec for each in taken])
    for each in taken:
        if each.measured_fwhm_arcsec is not None:
            about = f"{_said(report, each)}: measured {each.measured_fwhm_arcsec:.2f}"
            chart.mark(each.mid_mjd, each.measured_fwhm_arcsec, 0, "ring", about)
    return chart


def _sky(report: NightReport, edges: tuple[float, float]) -> Chart:
    values = [each.sky_mag_arcsec2 for each in report.exposures]
    known = [value for value in values if value is not None]
    room = max(max(known) - min(known), 0.5)
    chart = Chart(
        "sky",
        "Brightness of the sky",
        "Predicted, where each exposure was taken, in its filter; brighter is higher up.",
        edges,
        (min(known) - 0.1 * room, max(known) + 0.1 * room),
        flipped=True,
    )
    _framed(report, chart)
    chart.scale("mag / arcsec²", steps(*chart.y, 4))
    _marks(report, chart, values)
    return chart
