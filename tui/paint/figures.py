"""Large figures for a count-down that is read from across the room, and bars for small shares."""

from __future__ import annotations

from tui.paint.spans import Line, Span

# Three rows of three cells each, out of half blocks.
_FIGURES = {
    "0": ("█▀█", "█ █", "▀▀▀"),
    "1": ("▀█ ", " █ ", "▀▀▀"),
    "2": ("▀▀█", "█▀▀", "▀▀▀"),
    "3": ("▀▀█", " ▀█", "▀▀▀"),
    "4": ("█ █", "▀▀█", "  ▀"),
    "5": ("█▀▀", "▀▀█", "▀▀▀"),
    "6": ("█▀▀", "█▀█", "▀▀▀"),
    "7": ("▀▀█", "  █", "  ▀"),
    "8": ("█▀█", "█▀█", "▀▀▀"),
    "9": ("█▀█", "▀▀█", "▀▀▀"),
    ":": (" ▄ ", " ▄ ", "   "),
    " ": ("   ", "   ", "   "),
}
ROWS = 3


def large(text: str, role: str = "now") -> list[Line]:
    """Return figures and colons in three rows; other characters are left out."""
    figures = [_FIGURES[character] for character in text if character in _FIGURES]
    return [(Span(" ".join(figure[row] for figure in figures), role),) for row in range(ROWS)]


def minutes_seconds(seconds: float) -> str:
    """Return a span of time as ``2:05``, or ``1:02:05`` from an hour on; never negative."""
    whole = max(int(seconds + 0.999), 0)
    hours, rest = divmod(whole, 3600)
    minutes, left = divmod(rest, 60)
    return f"{hours}:{minutes:02d}:{left:02d}" if hours else f"{minutes}:{left:02d}"


def bar(share: float, width: int) -> str:
    """Return a bar filled to a share (0 to 1) of so many cells, in eighths of a cell."""
    eighths = round(min(max(share, 0.0), 1.0) * width * 8)
    whole, part = divmod(eighths, 8)
    tail = " ▏▎▍▌▋▊▉"[part] if part else ""
    return ("█" * whole + tail).ljust(width)


def pips(done: int, planned: int, most: int = 12) -> str:
    """Return exposures as pips, those done filled; as figures where they are too many."""
    if planned > most:
        return f"{done}/{planned}"
    return "●" * min(done, planned) + "○" * max(planned - done, 0)
