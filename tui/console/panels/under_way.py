"""What is under way: the stage of the night, legible from across the room."""

from __future__ import annotations

from collections.abc import Callable

from engine.order import Visit
from engine.times import MINUTES_PER_DAY, SECONDS_PER_DAY
from engine.watch import Stage, Watch, acts
from tui.console.panels.local import ahead, arcsec, hhmm
from tui.paint.figures import bar, large, minutes_seconds
from tui.paint.spans import Line, Span, cut, line, wrapped

# Title, three rows of figures, the bar, and what is next.
LARGE_ROWS = 6

Painter = Callable[[Watch, int], list[Line]]


def paint_under_way(watch: Watch, width: int, height: int) -> list[Line]:
    """Return the panel: a large count-down while exposing if there is room, else two lines."""
    if watch.plan is None:
        return [line(Span(" working out the night ...", "dim"))]
    painter = _PAINTERS[watch.stage]
    lines = painter(watch, width)
    if watch.stage is Stage.EXPOSING and height >= LARGE_ROWS:
        lines = _large(watch, width)
    return [cut(each, width) for each in lines[:height]]


def go_on_label(watch: Watch) -> str:
    """Return what the one key of the common round does now."""
    return {
        Stage.IDLE: "accept",
        Stage.MOVING: "on target",
        Stage.READY: "start the run" if acts.lines_now(watch) else "accept the next",
        Stage.LOST: "go on, time is no longer lost",
        Stage.EXPOSING: "(exposing)",
        Stage.BETWEEN: "(between two)",
        Stage.CUT_OFF: "K keep, L lost",
    }[watch.stage]


def _proposal(watch: Watch, visit: Visit | None, width: int) -> list[Line]:
    if visit is None:
        return [line(Span(" NEXT  ", "title"), "nothing more can be observed tonight")]
    what = "  ".join(f"{e.filter} {e.seconds:g}s×{e.count}" for e in visit.exposures)
    wait_min = (_first_start(visit) - watch.clock.now_mjd()) * MINUTES_PER_DAY
    when = f" from {hhmm(watch, _first_start(visit))}" if wait_min > 10 else ""
    return [
        line(
            Span(" NEXT  ", "title"),
            Span(visit.target, "strong"),
            Span(f"  {what}", "text"),
            Span(when, "warn"),
        ),
        *wrapped(
            f"{arcsec(visit.image_size_arcsec)} at airmass {visit.airmass_start:.2f}; "
            f"{visit.reason}",
            width,
            "dim",
            2,
            indent=1,
        ),
    ]


def _first_start(visit: Visit) -> float:
    return visit.exposures[0].start_mjd


def _next(watch: Watch) -> Visit | None:
    """Return the visit that comes after what is under way."""
    here = watch.state.pointing.target if watch.state.pointing else None
    busy = watch.stage in (Stage.EXPOSING, Stage.BETWEEN, Stage.MOVING, Stage.READY)
    return next((v for v in ahead(watch) if not (busy and v.target == here)), None)


def _idle(watch: Watch, width: int) -> list[Line]:
    return _proposal(watch, _next(watch), width)


def _moving(watch: Watch, width: int) -> list[Line]:
    there = watch.state.pointing
    name = there.target if there else ""
    return [
        line(
            Span(" MOVING TO  ", "title"),
            Span(name, "strong"),
            Span("   space: on target", "accent"),
        ),
        *_proposal(watch, _next(watch), width)[:1],
    ]


def _ready(watch: Watch, width: int) -> list[Line]:
    there = watch.state.pointing
    name = there.target if there else ""
    left = "  ".join(
        f"{each.filter} {each.seconds:g}s×{each.remaining}" for each in acts.lines_now(watch)
    )
    label = "space: start " + left if left else "its plan is finished; space: accept the next"
    return [
        line(Span(" ON TARGET  ", "title"), Span(name, "strong"), Span(f"   {label}", "accent")),
        *_proposal(watch, _next(watch), width),
    ]


def _exposing(watch: Watch, width: int) -> list[Line]:
    exposing = watch.state.exposing
    if exposing is None:
        return []
    gone_s = (watch.clock.now_mjd() - exposing.start_mjd) * SECONDS_PER_DAY
    left_s = exposing.seconds - gone_s
    return [
        line(
            Span(" EXPOSING  ", "title"),
            Span(f"{minutes_seconds(left_s)} ", "now"),
            Span(bar(gone_s / exposing.seconds, 14), "now"),
            Span(f" {exposing.filter} {exposing.seconds:g} s", "strong"),
            Span(f"{_number(watch)}  {exposing.target}", "text"),
        ),
        *_proposal(watch, _next(watch), width)[:1],
    ]


def _large(watch: Watch, width: int) -> list[Line]:
    exposing = watch.state.exposing
    if exposing is None:
        return []
    gone_s = (watch.clock.now_mjd() - exposing.start_mjd) * SECONDS_PER_DAY
    figures = large(minutes_seconds(exposing.seconds - gone_s))
    ends = hhmm(watch, exposing.start_mjd + exposing.seconds / SECONDS_PER_DAY)
    beside = (
        Span(f"   {exposing.filter}  {exposing.seconds:g} s{_number(watch)}", "strong"),
        Span(f"   {exposing.target}", "strong"),
        Span(f"   ends {ends}", "dim"),
    )
    return [
        line(Span(" EXPOSING", "title")),
        *((Span(" "), *row, extra) for row, extra in zip(figures, beside, strict=True)),
        line(" ", Span(bar(gone_s / exposing.seconds, width - 2), "now")),
        *_proposal(watch, _next(watch), width)[:2],
    ]


def _number(watch: Watch) -> str:
    """Return which exposure of the run's filter is under way: `` 3 of 5``."""
    run, exposing = watch.state.run, watch.state.exposing
    if run is None or exposing is None:
        return ""
    for step in run.steps:
        if step.filter == exposing.filter and step.taken < step.count:
            return f"  {step.taken + 1} of {step.count}"
    return ""


def _between(watch: Watch, width: int) -> list[Line]:
    due = watch.next_exposure()
    if due is None:
        return [line(Span(" RUN OVER", "title")), *_proposal(watch, _next(watch), width)[:1]]
    step, start_mjd = due
    wait_s = (start_mjd - watch.clock.now_mjd()) * SECONDS_PER_DAY
    return [
        line(
            Span(f" STARTS IN {max(wait_s, 0):.0f} s  ", "title"),
            Span(f"{step.filter} {step.seconds:g} s", "strong"),
            Span(f"  {step.number} of {step.of}", "text"),
        ),
        *_proposal(watch, _next(watch), width)[:1],
    ]


def _lost(watch: Watch, width: int) -> list[Line]:
    lost = watch.state.lost_since
    if lost is None:
        return []
    minutes = (watch.clock.now_mjd() - lost.begin_mjd) * MINUTES_PER_DAY
    return [
        line(
            Span(" LOST TIME  ", "bad"),
            Span(f"{lost.cause} since {hhmm(watch, lost.begin_mjd)}, {minutes:.0f} min", "strong"),
            Span("   space: go on", "accent"),
        ),
        *_proposal(watch, _next(watch), width)[:1],
    ]


def _cut_off(watch: Watch, width: int) -> list[Line]:
    exposing = watch.state.exposing
    if exposing is None:
        return []
    end_mjd = exposing.start_mjd + exposing.seconds / SECONDS_PER_DAY
    left_s = (end_mjd - watch.clock.now_mjd()) * SECONDS_PER_DAY
    when = f"{minutes_seconds(left_s)} left" if left_s > 0 else "its time is over"
    return [
        line(
            Span(" CUT OFF  ", "bad"),
            Span(f"{exposing.filter} {exposing.seconds:g} s on {exposing.target}", "strong"),
            Span(f", begun {hhmm(watch, exposing.start_mjd)}, {when}", "text"),
        ),
        line(
            " The console was away; the camera was not watched.  ",
            Span("K", "accent"), " keep it   ", Span("L", "accent"), " it is lost",
        ),
    ]  # fmt: skip


_PAINTERS: dict[Stage, Painter] = {
    Stage.IDLE: _idle,
    Stage.MOVING: _moving,
    Stage.READY: _ready,
    Stage.EXPOSING: _exposing,
    Stage.BETWEEN: _between,
    Stage.LOST: _lost,
    Stage.CUT_OFF: _cut_off,
}
