"""Small pictures of past nights: where the time went, how good the seeing was. Plain data in."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from tui.paint.canvas import joined
from tui.paint.spans import Line, Span, fitted

# How each kind of time is drawn; told apart by glyph, not by colour alone, and by lines rather than
# blocks, which would be a lamp in a dark dome.
TIME_GLYPHS = {
    "open": ("━", "good"),
    "between": ("─", "dim"),
    "moving": ("›", "dim"),
    "ready": ("·", "dim"),
    "lost": ("╌", "lost"),
    "idle": (" ", "dim"),
}
# From the left edge to the right of a picture of seeing (arcsec).
SEEING_LOW, SEEING_HIGH = 0.5, 3.5
# What stands to both sides of a bar: its span, and a count of up to seven figures.
BESIDE_BAR = 20


@dataclass(frozen=True, slots=True)
class Quartiles:
    """The quartiles of something (arcsec)."""

    low: float
    median: float
    high: float


def time_picture(spent: dict[str, float], width: int) -> list[Span]:
    """Return a bar of so many cells, shared out by kind of time; blank when there is none.

    Every kind that took any time has at least the cell where it begins, if there is room.
    """
    total = sum(spent.values())
    cells = [Span(" ")] * width
    if total <= 0.0:
        return cells
    begin = 0.0
    for kind, (glyph, role) in TIME_GLYPHS.items():
        end = begin + spent.get(kind, 0.0) / total
        first, after = round(begin * width), round(end * width)
        for at in range(first, min(after, width)):
            cells[at] = Span(glyph, role)
        begin = end
    return cells


def seeing_picture(seeing: Quartiles | None, width: int) -> list[Span]:
    """Return quartiles and median on a scale of so many cells; blank when nothing was measured."""
    cells = [Span("·", "dim")] * width
    if seeing is None:
        return [Span(" ")] * width

    def cell(arcsec: float) -> int:
        share = (arcsec - SEEING_LOW) / (SEEING_HIGH - SEEING_LOW)
        return min(max(int(share * width), 0), width - 1)

    for at in range(cell(seeing.low), cell(seeing.high) + 1):
        cells[at] = Span("━", "text")
    cells[cell(seeing.median)] = Span("●", "strong")
    return cells


def pictures_row(
    before: str, time: Sequence[Span], seeing: Sequence[Span], after: str, role: str
) -> Line:
    """Return a row of a list: text, both pictures, text; under the cursor all in its role."""
    spans = (Span(before), *joined(time), Span(" "), *joined(seeing), Span(after))
    if role == "text":
        return spans
    return tuple(Span(span.text, role) for span in spans)


def time_legend() -> Line:
    """Return what the glyphs of a time picture mean."""
    spans: list[Span] = []
    for kind, (glyph, role) in TIME_GLYPHS.items():
        if glyph != " ":
            spans += [Span(f" {glyph}{glyph}", role), Span(f" {kind}", "dim")]
    return tuple(spans)


def seeing_scale(width: int) -> str:
    """Return the figures over a picture of seeing: its edges and its middle."""
    middle = f"{(SEEING_LOW + SEEING_HIGH) / 2.0:g}"
    text = f"{SEEING_LOW:g}".ljust(width // 2 - len(middle) // 2) + middle
    return fitted(text.ljust(width - 3) + f"{SEEING_HIGH:g}", width)


def histogram(edges: Sequence[float], counts: Sequence[int], width: int, rows: int) -> list[Line]:
    """Return a distribution as bars, from the first bin with anything to the last.

    A row is one bin, or as many together as it takes to show them all in so many rows.
    """
    filled = [place for place, count in enumerate(counts) if count]
    if not filled or rows < 1:
        return []
    first, after = filled[0], filled[-1] + 1
    step = -(-(after - first) // rows)
    groups = [(at, min(at + step, after)) for at in range(first, after, step)]
    sums = [sum(counts[begin:end]) for begin, end in groups]
    room = max(width - BESIDE_BAR, 1)
    return [
        (
            Span(f' {edges[begin]:.2f}-{edges[end]:.2f}" ', "dim"),
            Span("▄" * round(room * count / max(sums)), "accent"),
            Span(f" {count}", "text"),
        )
        for (begin, end), count in zip(groups, sums, strict=True)
    ]
