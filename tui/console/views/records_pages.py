"""The log as lines: a row an entry, and everything that is known of one. Plain data in."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import date, datetime

from engine.log import Amendment, Event, Foreign, title
from engine.log.keys import to_values
from engine.log.values import Value
from engine.logbook.text import visible
from tui.paint.spans import BLANK, Line, Span, cut, fitted, line, width_of, wrapped

WORDS = {
    "exposure": "exposure",
    "exposure_start": "begins",
    "run_start": "run",
    "run_stop": "run",
    "pointing": "pointing",
    "conditions": "sky, air",
    "lost_time": "lost",
    "override": "decision",
    "amendment": "amended",
    "target": "target",
    "calibration": "calibr.",
    "clock_step": "clock",
    "recovery": "recovery",
}
KIND_WIDTH = 8
KEY_WIDTH = 24
# From this width on short values stand in two columns.
TWO_COLUMNS = 76


@dataclass(frozen=True, slots=True)
class Entry:
    """One entry of the log: as written, and as it stands (None when it is withdrawn)."""

    written: Event
    stands: Event | None
    amendments: tuple[Amendment, ...] = ()

    @property
    def shown(self) -> Event:
        """What a row tells: as it stands, or what was withdrawn."""
        return self.stands if self.stands is not None else self.written

    @property
    def is_amended(self) -> bool:
        """Whether it has other values than were written."""
        return self.stands is not None and self.stands is not self.written


@dataclass(frozen=True, slots=True)
class Marks:
    """What a row is marked with: on disk, found by a search, under the cursor."""

    is_on_disk: bool
    is_found: bool
    is_chosen: bool


def entry_row(entry: Entry, time: str, marks: Marks, width: int) -> Line:
    """Return an entry as one row: when, its number, what became of it, what it says."""
    written = entry.written
    kind = WORDS.get(written.kind, written.kind)
    state, role = ("✓", "good") if marks.is_on_disk else ("…", "warn")
    fate, text_role = " ", "text"
    if entry.stands is None:
        fate, text_role = "×", "dim"
    elif entry.is_amended:
        fate, text_role = "~", "text"
    words = title(entry.shown) + (", withdrawn" if entry.stands is None else "")
    parts = (
        Span(f"{'»' if marks.is_found else ' '}{time} ", "accent" if marks.is_found else "dim"),
        Span(f"{written.n:>5} ", "dim"),
        Span(state, role),
        Span(f"{fate} ", "warn"),
        Span(fitted(kind, KIND_WIDTH) + " ", "dim"),
        Span(words, _role(written, text_role)),
    )
    if marks.is_chosen:
        text = "".join(span.text for span in parts)
        return (Span(fitted(text, width), "cursor"),)
    return cut(parts, width)


def _role(event: Event, role: str) -> str:
    if role == "text" and event.kind in ("exposure_start", "order", "run_start", "run_stop"):
        return "dim"
    return role


def detail_page(entry: Entry, head: str, on_disk: str, width: int) -> list[Line]:
    """Return everything that is known of an entry: the disk's word, every key, what amended it."""
    written, stands = entry.written, entry.stands
    lines = [
        line(
            Span(f" entry {written.n}  {_kind(written)}", "title"),
            Span(f"  {head} local; below UTC", "dim"),
        ),
        *wrapped(title(entry.shown), width - 2, "strong", 3, indent=1),
        *wrapped(on_disk, width - 2, "dim", 2, indent=1),
    ]
    if stands is None:
        lines.append(line(Span(" × withdrawn: it does not count; d restores it", "warn")))
    lines.append(BLANK)
    lines += _values(written, entry.shown, width)
    if entry.amendments:
        lines += [BLANK, line(Span(f" amended by  {len(entry.amendments)}", "title"))]
        for each in entry.amendments:
            lines += _amendment(each, width)
    return [cut(each, width) for each in lines]


def _kind(event: Event) -> str:
    return event.kind_in_file if isinstance(event, Foreign) else event.kind


def _values(written: Event, shown: Event, width: int) -> list[Line]:
    (_, old), (_, new) = _safely(written), _safely(shown)
    half = width // 2 if width >= TWO_COLUMNS else width
    short: list[Line] = []
    lines: list[Line] = []
    for key in [*old, *(key for key in new if key not in old)]:
        if key == "n":
            continue
        before, now = _said(old.get(key)), _said(new.get(key))
        label = Span(f" {fitted(visible(key), KEY_WIDTH)} ", "dim")
        one: Line = (label, Span(now, "text"))
        if before != now:
            one = (label, Span("~ ", "warn"), Span(now, "strong"), Span(f"  was {before}", "dim"))
        if width_of(one) < half:
            short.append(one)
        elif before != now:
            lines.append(one)
        else:
            more = wrapped(now, max(width - KEY_WIDTH - 3, 8), "text", 4)
            pad = Span(" " * (KEY_WIDTH + 2))
            lines += [(label, *more[0]), *((pad, *each) for each in more[1:])]
    if half == width:
        return [*short, *lines]
    rows = (len(short) + 1) // 2
    right = [*short[rows:], *[BLANK] * (2 * rows - len(short))]
    pairs = zip(short[:rows], right, strict=True)
    return [*((*a, Span(" " * (half - width_of(a))), *b) for a, b in pairs), *lines]


def _safely(event: Event) -> tuple[str, dict[str, Value]]:
    """Return an entry's keys and values; what can't be written again is told as it is."""
    try:
        return to_values(event)
    except ValueError:
        return event.kind, dict(event.extra)


def _said(value: Value | None) -> str:
    match value:
        case None:
            return "nothing"
        case datetime():
            return f"{value:%H:%M:%S}.{value.microsecond // 1000:03d}"
        case float():
            return f"{value:.10g}"
        case list() if value and all(isinstance(each, datetime) for each in value):
            return ", ".join(f"{each:%H:%M:%S}" for each in value)
        case list():
            return ", ".join(_said(each) for each in value) or "none"
        case bool():
            return "yes" if value else "no"
        case date() | int():
            return str(value)
        case _:
            return visible(value)


def _amendment(each: Amendment, width: int) -> list[Line]:
    changes = ", ".join(f"{key} = {_said(value)}" for key, value in each.changes.items())
    what = "withdrawn" if each.withdrawn else changes or "nothing"
    why = f" ({visible(each.why)})" if each.why else ""
    return wrapped(f"entry {each.n}: {visible(what)}{why}", width - 2, "text", 3, indent=1)


def head_line(parts: Sequence[tuple[str, str]], width: int) -> Line:
    """Return the view's head: what is shown of how much, and what the keys look for."""
    return cut(tuple(Span(f" {text} ", role) for text, role in parts if text), width)
