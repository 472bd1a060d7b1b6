"""The foot: the keys that are needed first, as many as fit whole; and the line of the views."""

from __future__ import annotations

from collections.abc import Collection, Iterable, Mapping, Sequence

from tui.console.actions import cap
from tui.console.keys import Keys
from tui.console.views import VIEWS
from tui.paint.spans import Line, Span, cut, width_of

Caps = list[tuple[str, str]]
# How many of the footer's actions stand before the keys of the views.
BEFORE_VIEWS = 2


def foot_keys(
    in_force: Keys,
    labels: Mapping[str, str] | None = None,
    own: Sequence[tuple[str, str]] = (),
    without: Collection[str] = (),
) -> Caps:
    """Return the foot's keys and words, the most needed first.

    ``labels`` holds other words for actions by name, ``own`` the keys of the view that is shown,
    ``without`` names actions that do nothing now.
    """
    said = labels or {}
    keys = [
        (cap(a.keys[0]), said.get(a.name, a.label))
        for a in in_force.footer()
        if a.name not in without
    ]
    of_views = [in_force.cap_of(each.action) for each in VIEWS]
    views = [(f"{of_views[0]}-{of_views[-1]}", "views")] if len(of_views) > 1 else []
    # A view may have given a key of the table another meaning while it is shown.
    taken = {key for key, _ in own}
    rest = [(key, word) for key, word in keys[BEFORE_VIEWS:] if key not in taken]
    return [*keys[:BEFORE_VIEWS], *views, *own, *rest]


def foot_line(keys: Iterable[tuple[str, str]], width: int) -> Line:
    """Return the foot: each key and its word, leaving out what does not fit whole."""
    spans: list[Span] = []
    for key, word in keys:
        entry = [Span(f" {key}", "accent"), Span(f" {word} ", "dim")]
        if width_of([*spans, *entry]) <= width:
            spans += entry
    return tuple(spans)


def views_line(shown: str, width: int, in_force: Keys) -> Line:
    """Return the line that names every view with its key, the one shown in capitals."""
    spans: list[Span] = []
    for each in VIEWS:
        key = in_force.cap_of(each.action)
        title = each.title.upper() if each.name == shown else each.title
        spans += [Span(f" {key}", "accent"), Span(f" {title} ", _role(each.name == shown))]
    return cut(tuple(spans), width)


def _role(is_shown: bool) -> str:
    return "strong" if is_shown else "dim"
