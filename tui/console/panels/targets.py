"""The live list of targets: rows for the list widget."""

from __future__ import annotations

import math

from engine.night import TargetNow
from engine.watch import Watch
from tui.console.panels.local import ahead, hhmm
from tui.paint.figures import pips
from tui.paint.spans import Span
from tui.widgets import Column, Row

DONE_WIDTH, WHY_WIDTH = 17, 22
COLUMNS = (
    Column("", 2),
    Column("target", 14),
    Column("at", 5, rank=3),
    Column("alt", 4, right=True, rank=1),
    Column("air", 5, right=True),
    Column("HA", 6, right=True, rank=4),
    Column("FWHM", 6, right=True),
    Column("limit", 5, right=True, rank=5),
    Column("done", DONE_WIDTH, rank=2),
    Column("", WHY_WIDTH, rank=6),
)
# A predicted size this near its limit is shown as a warning.
NEAR_LIMIT = 0.9


def target_rows(watch: Watch, text: str) -> list[Row]:
    """Return the list's rows: the order first, then what else may be observed, then the rest.

    ``text``, when given, keeps targets whose name or programme holds it.
    """
    seen = [each for each in watch.targets_now() if _matches(each, text)]
    if watch.plan is None:
        return []
    # A target with two visits shows its first: the later ones are set before it.
    numbered = list(enumerate(ahead(watch), start=1))
    begins = {visit.target: (number, visit.start_mjd) for number, visit in reversed(numbered)}
    planned = sorted(
        (each for each in seen if each.target.name in begins),
        key=lambda each: begins[each.target.name][0],
    )
    others = [each for each in seen if each.target.name not in begins]
    free = sorted(
        (each for each in others if each.observable), key=lambda each: -each.apparent_altitude_deg
    )
    shut = sorted(
        (each for each in others if not each.observable),
        key=lambda each: (each.reasons[0].bit, -each.apparent_altitude_deg),
    )
    rows: list[Row] = []
    for title, group in (("in the order", planned), ("may be observed", free), ("not now", shut)):
        if group:
            rows.append(Row(title, (Span(f"{title}  {len(group)}"),), heading=True))
            rows += [_row(watch, each, begins.get(each.target.name)) for each in group]
    return rows


def _matches(now: TargetNow, text: str) -> bool:
    wanted = text.casefold()
    return wanted in now.target.name.casefold() or wanted in now.target.programme.casefold()


def _row(watch: Watch, now: TargetNow, begins: tuple[int, float] | None) -> Row:
    name = now.target.name
    role = "text" if now.observable else "dim"
    limit = now.target.maximum_image_size_arcsec
    return Row(
        name,
        (
            _mark(watch, name, begins),
            Span(name, "strong" if begins and begins[0] == 1 else role),
            Span(hhmm(watch, begins[1]) if begins else "", "text" if begins else "dim"),
            Span(f"{now.apparent_altitude_deg:.0f}°", role),
            Span(f"{now.airmass:.2f}" if math.isfinite(now.airmass) else "-", role),
            Span(f"{now.hour_angle_h:+.1f}h", role),
            _size(now, limit, role),
            Span(f"{limit:.1f}" if limit else "", "dim"),
            Span(_done(now), role),
            Span(_why(now), "good" if now.observable else "dim"),
        ),
    )


def _mark(watch: Watch, name: str, begins: tuple[int, float] | None) -> Span:
    pointing = watch.state.pointing
    if pointing is not None and pointing.target == name:
        return Span("●" if watch.state.exposing else "▶", "now")
    if begins:
        return Span(str(begins[0]) if begins[0] < 100 else "", "accent")
    return Span(" ")


def _size(now: TargetNow, limit: float | None, role: str) -> Span:
    size = now.worst_image_size_arcsec
    if not math.isfinite(size):
        return Span("-", role)
    if any(each.soft for each in now.filters):
        return Span(f"{size:.2f}!", "bad" if now.airmass < 5 else role)
    if limit and size > NEAR_LIMIT * limit:
        return Span(f"{size:.2f}", "warn")
    return Span(f"{size:.2f}", role)


def _done(now: TargetNow) -> str:
    """Return what is done of each filter's plan; of all together where that is too long."""
    plans = [each.progress for each in now.filters]
    each_one = " ".join(f"{plan.filter}{pips(plan.done, plan.planned, 5)}" for plan in plans)
    if len(each_one) <= DONE_WIDTH:
        return each_one
    done, planned = sum(plan.done for plan in plans), sum(plan.planned for plan in plans)
    return f"{done}/{planned} in all"


def _why(now: TargetNow) -> str:
    if now.observable:
        return f"priority {now.target.priority}"
    said = now.reasons[0].label
    for reason in now.reasons[1:]:
        if len(said) + len(reason.label) + 2 <= WHY_WIDTH:
            said += f", {reason.label}"
    return said
