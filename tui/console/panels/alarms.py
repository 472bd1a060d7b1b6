"""The alarm that waits longest for the observer, across the whole screen, and how many more do."""

from __future__ import annotations

from engine.watch.alarms import Alarm
from tui.paint.spans import Line, Span, cut, line, width_of

# With so many rows the label stands on its own, spaced, to be read from across the dome.
TALL = 3


def paint_alarm(waiting: tuple[Alarm, ...], key: str, width: int, rows: int) -> list[Line]:
    """Return the oldest alarm in so many rows (1 or 3) of so many cells; nothing without one.

    ``key`` is the key that acknowledges it.
    """
    if not waiting:
        return []
    first = waiting[0]
    cause = first.cause
    label = cause.label if first.stands else f"WAS: {cause.label}"
    more = f", {len(waiting) - 1} more" if len(waiting) > 1 else ""
    seen = f" {key} seen{more} "
    advice = f" {cause.advice}" if cause.advice else ""
    if rows < TALL:
        return [_bar(f" !! {label}  {cause.sentence}{advice}", seen, width)]
    spaced = " ".join(label)
    return [
        _bar(f" !!  {spaced}  !!", seen, width),
        _bar(f"     {cause.sentence}{advice}", "", width),
        _bar("", "", width),
    ]


def _bar(text: str, right: str, width: int) -> Line:
    """Return a row in the alarm's role from edge to edge, with something at its right end."""
    left = cut(line(Span(text)), max(width - len(right) - 1, 0))
    said = "".join(span.text for span in left)
    return line(Span(said + " " * max(width - width_of(left) - len(right), 0) + right, "alarm"))
