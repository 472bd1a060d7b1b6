"""The chosen target: where it is, its night as a curve, its plan, and which blur is to blame."""

from __future__ import annotations

import math

import numpy as np

from engine.night import FilterNow, TargetNow
from engine.watch import Scene, Watch, reach
from tui.console.panels.graphs import airmass_marks, lowest_deg, night_axis, picks
from tui.console.panels.local import arcsec, hhmm
from tui.paint.canvas import Stroke
from tui.paint.chart import Chart, Curve, paint_chart
from tui.paint.figures import bar, pips
from tui.paint.spans import Line, Span, line, phrases

LEAST_CHART_ROWS, MOST_CHART_ROWS = 6, 14
MOST_PIPS = 12
TERM_BAR = 11


def paint_target(watch: Watch, name: str | None, width: int, height: int) -> list[Line]:
    """Return the panel for one target in so many rows."""
    now = next((each for each in watch.targets_now() if each.target.name == name), None)
    if now is None:
        return [line(Span(" no target is chosen", "dim"))]
    head = _head(watch, now, width)
    tail = [*_plan(now, width), *_terms(watch, now, width)]
    reached = _reach(watch, now, width)
    # On a small screen the curve is worth more than what an exposure reaches.
    if height - len(head) - len(tail) - len(reached) >= LEAST_CHART_ROWS:
        tail += reached
    rows = min(height - len(head) - len(tail), MOST_CHART_ROWS)
    chart = _chart(watch, now, width, rows) if rows >= LEAST_CHART_ROWS else []
    return [*head, *chart, *tail][:height]


def _head(watch: Watch, now: TargetNow, width: int) -> list[Line]:
    target = now.target
    magnitude = f"  mag {target.magnitude:g}" if target.magnitude is not None else ""
    return [
        phrases(
            width,
            line(Span(f" {target.name}", "strong")),
            line(Span(f"  {target.programme}", "text")),
            line(Span(f"  priority {target.priority}", "dim")),
            line(Span(magnitude, "dim")),
        ),
        phrases(
            width,
            line(Span(f" alt {now.apparent_altitude_deg:.1f}°")),
            line(Span(f"  az {now.azimuth_deg:.0f}°")),
            line(Span(f"  HA {now.hour_angle_h:+.2f}h")),
            line(Span(f"  airmass {_number(now.airmass)}")),
            line(Span(f"  parallactic {now.parallactic_angle_deg:+.0f}°")),
        ),
        _may_be_observed(watch, now, width),
    ]


def _may_be_observed(watch: Watch, now: TargetNow, width: int) -> Line:
    moon = line(Span(f"   Moon {now.moon_separation_deg:.0f}° away", "moon"))
    best = line(Span(_best(watch, now), "dim"))
    if now.observable:
        return phrases(width, line(Span(" may be observed", "good")), moon, best)
    first, *more = (reason.sentence for reason in now.reasons)
    also = [line(Span(f"; {each}", "bad")) for each in more]
    return phrases(width, line(Span(f" {first}", "bad")), *also[:1], moon, best)


def _best(watch: Watch, now: TargetNow) -> str:
    """Return when the target stands best in the dark part of the night."""
    night = watch.planner.night
    usable = np.where(night.limits[now.index] == 0, night.airmass[now.index], np.inf)
    at = int(np.argmin(usable))
    if not math.isfinite(usable[at]):
        return "   never within its limits tonight"
    return f"   best airmass {usable[at]:.2f} at {hhmm(watch, float(night.mjd[at]))}"


def _plan(now: TargetNow, width: int) -> list[Line]:
    return [_plan_line(now, each, width) for each in now.filters]


def _done(done: int, planned: int) -> str:
    """Return what is done as pips, or as a bar where they are too many."""
    if planned > MOST_PIPS:
        return bar(done / planned, MOST_PIPS)
    return pips(done, planned).ljust(MOST_PIPS)


def _plan_line(now: TargetNow, one: FilterNow, width: int) -> Line:
    limit = now.target.maximum_image_size_arcsec
    plan = one.progress
    return phrases(
        width,
        line(
            Span(f" {plan.filter:<3}", "title"),
            Span(f"{plan.seconds:>4g} s  ", "text"),
            Span(_done(plan.done, plan.planned), "good"),
            Span(f" {plan.done}/{plan.planned}", "text"),
        ),
        line(Span(f"  depth {plan.credit:.1f}", "dim")),
        line(Span(f"   {arcsec(one.image_size_arcsec)}", "bad" if one.soft else "strong")),
        line(Span(f" limit {limit:g}" if limit else "", "dim")),
        line(Span(f"   sky {_number(one.sky_mag_arcsec2, 1)}", "dim")),
    )


def _terms(watch: Watch, now: TargetNow, width: int) -> list[Line]:
    """Return the blurs of the first filter still needed, as bars on one scale."""
    if not math.isfinite(now.airmass) or watch.plan is None:
        return []
    first = _first_needed(now)
    image = watch.planner.model.breakdown(first.filter_index, _seeing(watch), now.airmass)
    terms = image.terms
    pairs = (
        ("atmosphere", terms.atmosphere),
        ("diffraction", terms.diffraction),
        ("optics", terms.optics),
        ("tracking", terms.tracking),
        ("dispersion", terms.dispersion),
        ("sampling", terms.sampling),
    )
    most = max(value for _, value in pairs)
    blame = image.blame
    without = getattr(image.without, blame)
    rows = [
        phrases(
            width,
            line(Span(f" what makes {first.progress.filter} {arcsec(image.size_arcsec)}", "dim")),
            line(Span(f", {image.size_px:.1f} px", "warn" if image.undersampled else "dim")),
            line(Span(" (undersampled)" if image.undersampled else "", "warn")),
            line(Span(f"; without {blame} {arcsec(without)}", "dim")),
            line(Span(f", {image.elongation:.2f} long" if image.elongation > 1.02 else "", "dim")),
        )
    ]
    for left, right in zip(pairs[::2], pairs[1::2], strict=True):
        spans = [Span(" ")]
        for label, value in (left, right):
            spans += [
                Span(f"{label:<12}", "dim"),
                Span(bar(value / most, TERM_BAR), "accent" if label == blame else "text"),
                Span(f" {value:.2f}  ", "text"),
            ]
        rows.append(tuple(spans))
    return rows


def _reach(watch: Watch, now: TargetNow, width: int) -> list[Line]:
    """Return what an exposure in the first filter still needed will reach."""
    if not math.isfinite(now.airmass) or watch.plan is None:
        return []
    one = _first_needed(now)
    scene = Scene(one.filter_index, _seeing(watch), now.airmass, one.sky_mag_arcsec2)
    plan, observatory = one.progress, watch.planner.logbook.observatory
    found = reach(observatory, watch.planner.model, scene, plan.seconds, now.target.magnitude)
    star = (
        f"  S/N {found.signal_to_noise:.0f} at mag {found.magnitude:g}"
        if math.isfinite(found.magnitude)
        else ""
    )
    parts = found.parts
    saturates = f"  saturates in {found.saturation_s:.0f} s" if found.saturates else ""
    return [
        phrases(
            width,
            line(
                Span(f" {plan.filter} {plan.seconds:g} s reaches", "dim"),
                Span(f" mag {found.limiting_magnitude:.1f}", "strong"),
            ),
            line(Span(saturates, "bad")),
            line(Span(star)),
        ),
        phrases(
            width,
            line(Span(f" sky-limited from {found.sky_limited_s:.0f} s", "dim")),
            line(Span(f"; as {parts.count} × {parts.seconds:.0f} s", "dim")),
            line(Span(f", read noise +{parts.read_noise_share:.0%}", "dim")),
        ),
    ]


def _first_needed(now: TargetNow) -> FilterNow:
    """Return the first filter of the plan with something left; the first when nothing is."""
    return next((each for each in now.filters if each.progress.remaining), now.filters[0])


def _seeing(watch: Watch) -> float:
    """Return the zenith seeing of this minute's outlook (arcsec)."""
    assert watch.plan is not None
    at = watch.planner.night.index_at(watch.clock.now_mjd())
    return float(watch.plan.outlook.seeing_arcsec[at])


def _chart(watch: Watch, now: TargetNow, width: int, rows: int) -> list[Line]:
    night = watch.planner.night
    at = picks(night)
    chart = Chart(
        curves=(
            Curve(night.moon.altitude_deg[at].tolist(), Stroke("moon", 3), ("Moon",)),
            Curve(
                night.apparent_altitude_deg[now.index, at].tolist(),
                Stroke("accent"),
                (now.target.name,),
            ),
        ),
        axis=night_axis(watch),
        limit_deg=lowest_deg(night, now.index)[at].tolist(),
        airmass_marks=airmass_marks(night),
    )
    return paint_chart(chart, width, rows)


def _number(value: float, places: int = 2) -> str:
    return f"{value:.{places}f}" if math.isfinite(value) else "-"
