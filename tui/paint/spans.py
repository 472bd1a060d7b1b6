"""Lines of text with a role each: what painters make and sheets show. No Textual in here."""

from __future__ import annotations

from collections.abc import Iterable
from typing import NamedTuple

from rich.cells import cell_len, set_cell_size


class Span(NamedTuple):
    """A piece of a line and the role it plays."""

    text: str
    role: str = "text"


Line = tuple[Span, ...]
BLANK: Line = ()


def line(*parts: Span | str) -> Line:
    """Return a line of spans; plain text gets the role "text"."""
    return tuple(Span(part) if isinstance(part, str) else part for part in parts)


def width_of(spans: Iterable[Span]) -> int:
    """Return how many cells a line takes."""
    return sum(cell_len(span.text) for span in spans)


def fitted(text: str, width: int) -> str:
    """Return text in exactly so many cells: cut with an ellipsis, or filled with blanks."""
    if width <= 0:
        return ""
    if cell_len(text) > width:
        return set_cell_size(text, width - 1) + "…"
    return set_cell_size(text, width)


def cut(spans: Line, width: int) -> Line:
    """Return a line cut to at most so many cells."""
    kept: list[Span] = []
    room = width
    for span in spans:
        length = cell_len(span.text)
        if length > room:
            if room > 0:
                kept.append(Span(fitted(span.text, room), span.role))
            break
        kept.append(span)
        room -= length
    return tuple(kept)


def whole_phrases(text: str, width: int) -> str:
    """Return text, or as many of its phrases (parted by commas) as fit; the first at least."""
    parts = text.split(", ")
    while len(parts) > 1 and cell_len(", ".join(parts)) > width:
        parts.pop()
    return ", ".join(parts)


def phrases(width: int, *parts: Line) -> Line:
    """Return parts one after the other, leaving out every one that does not fit whole."""
    kept: list[Span] = []
    for part in parts:
        if width_of((*kept, *part)) <= width:
            kept += part
    return tuple(kept)


def spread(left: Line, right: Line, width: int) -> Line:
    """Return a line with one part at the left edge and one at the right; the left gives way."""
    right = cut(right, width)
    room = width - width_of(right)
    left = cut(left, max(room - 1, 0))
    return (*left, Span(" " * (room - width_of(left))), *right)


def wrapped(
    text: str, width: int, role: str = "text", lines: int = 3, indent: int = 0
) -> list[Line]:
    """Return text broken between words into at most so many lines, each behind so many blanks."""
    room = width - indent
    out: list[str] = [""]
    for word in text.split():
        longer = f"{out[-1]} {word}".strip()
        if cell_len(longer) <= room or not out[-1]:
            out[-1] = longer
        else:
            out.append(word)
    if len(out) > lines:
        out = [*out[: lines - 1], " ".join(out[lines - 1 :])]
    return [(Span(" " * indent + fitted(each, room).rstrip(), role),) for each in out]
