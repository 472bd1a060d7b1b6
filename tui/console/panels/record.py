"""The order ahead, and the log as it grows."""

from __future__ import annotations

from engine.log import Event, title
from engine.order import Visit
from engine.seeing import SeeingMeasurement, summary
from engine.watch import Watch
from tui.console.panels.local import ahead, arcsec, hhmm, local
from tui.paint.spans import Line, Span, cut, line, phrases, whole_phrases, width_of, wrapped

# What the console writes by itself and what every exposure says twice: not worth a line here.
NOT_SHOWN = ("exposure_start", "order")
REASON_LINES, NAMES_LINES = 2, 6
# The time of an entry and the mark that it is on disk.
ENTRY_HEAD = 12


def paint_order(watch: Watch, width: int, height: int) -> list[Line]:
    """Return the order from now on: when, what, how soft, why."""
    if watch.plan is None:
        return []
    lines = [line(Span(" the order ahead", "title"), Span(f"  {watch.plan.because}", "dim"))]
    for number, visit in enumerate(ahead(watch), start=1):
        lines += _visit_lines(watch, number, visit, width)
    lines += left_out_lines(watch, width)
    return [cut(each, width) for each in lines[:height]]


def _visit_lines(watch: Watch, number: int, visit: Visit, width: int) -> list[Line]:
    """Return a visit in one line, without its filters if need be; its reason is never cut."""
    what = " ".join(f"{e.filter}×{e.count}" for e in visit.exposures)
    head = line(
        Span(f"{number:>3} ", "accent"),
        Span(hhmm(watch, visit.start_mjd), "text"),
        Span(f"  {visit.target:<12}", "strong"),
        Span(f" {arcsec(visit.image_size_arcsec)} ", "text"),
    )
    filters, why = line(Span(f"{what:<15} ", "dim")), line(Span(visit.reason, "dim"))
    for shown in ((*head, *filters, *why), (*head, *why)):
        if width_of(shown) <= width:
            return [shown]
    return [(*head, *filters), *wrapped(visit.reason, width, "dim", REASON_LINES, indent=11)]


def left_out_lines(watch: Watch, width: int) -> list[Line]:
    """Return what the order leaves out, those of one reason together."""
    left = watch.plan.order.left_out if watch.plan else ()
    if not left:
        return []
    names: dict[str, list[str]] = {}
    for each in left:
        names.setdefault(each.reason, []).append(each.target)
    lines = [line(Span(f" left out  {len(left)}", "title"))]
    for reason, targets in names.items():
        lines += wrapped(f"{reason}:", width - 1, "dim", REASON_LINES, indent=1)
        lines += wrapped(", ".join(targets), width - 1, "text", NAMES_LINES, indent=3)
    return lines


def paint_log(watch: Watch, width: int, height: int) -> list[Line]:
    """Return the last entries of the log, the newest at the bottom."""
    state = watch.state
    shown = [event for event in state.events if event.kind not in NOT_SHOWN]
    last_on_disk = len(state.events) - watch.unwritten
    written = {event.n for event in state.events[:last_on_disk]}
    head = phrases(
        width,
        line(Span(" the log", "title")),
        line(Span(f"  {len(state.events)} entries", "dim")),
        line(Span(_seeing_so_far(watch), "dim")),
    )
    lines = [_entry(watch, event, written, width) for event in shown[-max(height - 1, 1) :]]
    return [cut(each, width) for each in [head, *lines]]


def _seeing_so_far(watch: Watch) -> str:
    """Return the night's seeing so far in a few numbers."""
    measured = [SeeingMeasurement(each.mjd, each.zenith_arcsec) for each in watch.state.seeing]
    said = summary(measured)
    if said is None:
        return ""
    return (
        f'; seeing {said.best_arcsec:.2f}"-{said.worst_arcsec:.2f}", '
        f'median {said.median_arcsec:.2f}", {said.count} measured'
    )


def _entry(watch: Watch, event: Event, written: set[int], width: int) -> Line:
    gone = event.n in watch.state.withdrawn
    said = f"{'withdrawn: ' if gone else ''}{title(event)}"
    mark = Span("✓", "good") if event.n in written else Span("…", "warn")
    return line(
        Span(f" {local(watch, event.t_mjd):%H:%M:%S} ", "dim"),
        mark,
        Span(f" {whole_phrases(said, width - ENTRY_HEAD)}", "dim" if gone else "text"),
    )
