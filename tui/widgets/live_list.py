"""The live list: many rows, few of which change at a time; the cursor keeps to its row's key."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from textual.events import Click, MouseScrollDown, MouseScrollUp, Resize
from textual.message import Message

from tui.paint.spans import Line, Span, fitted
from tui.widgets.sheet import Sheet


@dataclass(frozen=True, slots=True)
class Column:
    """A column: its title, its width in cells, its side, and how soon it gives way.

    Columns with a higher ``rank`` are left out first when the list is narrow.
    """

    title: str
    width: int
    right: bool = False
    rank: int = 0


@dataclass(frozen=True, slots=True)
class Row:
    """A row: its key, a cell for each column, or a heading that can't be chosen."""

    key: str
    cells: tuple[Span, ...]
    heading: bool = False


class LiveList(Sheet):
    """A list with a cursor. The first line of the sheet is the columns' titles."""

    class Moved(Message):
        """The cursor came to stand on another row."""

        def __init__(self, key: str) -> None:
            super().__init__()
            self.key = key

    def __init__(self, columns: Sequence[Column], *, id: str | None = None) -> None:
        super().__init__(id=id)
        self._columns = tuple(columns)
        self._rows: list[Row] = []
        self._key: str | None = None
        self._top = 0

    @property
    def key(self) -> str | None:
        """The key of the row under the cursor."""
        return self._key

    def set_columns(self, columns: Sequence[Column]) -> None:
        """Show other columns."""
        self._columns = tuple(columns)

    def set_rows(self, rows: Sequence[Row]) -> None:
        """Show other rows; the cursor stays on its key, or in its place where that is gone."""
        before = [row.key for row in self._rows if not row.heading]
        self._rows = list(rows)
        if self._place() is None:
            self._key = self._nearest_left(before)
        self._paint()

    def _nearest_left(self, before: Sequence[str]) -> str | None:
        """Return the next row below the cursor's that is still there, else the last above it."""
        keys = [row.key for row in self._rows if not row.heading]
        at = before.index(self._key) if self._key in before else 0
        left = set(keys)
        for key in (*before[at:], *reversed(before[:at])):
            if key in left:
                return key
        return keys[0] if keys else None

    def move_to(self, key: str) -> None:
        """Put the cursor on a row by its key, if it is there."""
        if any(row.key == key and not row.heading for row in self._rows):
            self._set_key(key)

    def move(self, by: int, unit: str = "rows") -> None:
        """Move the cursor by so many "rows" or "screens", or to an end of the list ("ends")."""
        steps = {"rows": 1, "screens": max(self._room() - 1, 1), "ends": len(self._rows)}
        keys = [row.key for row in self._rows if not row.heading]
        if keys:
            at = keys.index(self._key) if self._key in keys else 0
            self._set_key(keys[min(max(at + by * steps[unit], 0), len(keys) - 1)])

    def on_resize(self, event: Resize) -> None:
        """Paint anew in the new size."""
        self._paint()

    def on_click(self, event: Click) -> None:
        """Put the cursor where the mouse was clicked."""
        place = self._top + event.y - 1
        if event.y > 0 and place < len(self._rows) and not self._rows[place].heading:
            self._set_key(self._rows[place].key)

    def on_mouse_scroll_down(self, event: MouseScrollDown) -> None:
        """Move on with the wheel."""
        self.move(3)

    def on_mouse_scroll_up(self, event: MouseScrollUp) -> None:
        """Move back with the wheel."""
        self.move(-3)

    def _set_key(self, key: str) -> None:
        if key != self._key:
            self._key = key
            self._paint()
            self.post_message(self.Moved(key))

    def _place(self) -> int | None:
        return next(
            (at for at, row in enumerate(self._rows) if row.key == self._key and not row.heading),
            None,
        )

    def _room(self) -> int:
        return max(self.size.height - 1, 1)

    def _paint(self) -> None:
        place, room = self._place(), self._room()
        if place is not None:
            # A heading just above the cursor stays in sight with it.
            above = place - 1 if place and self._rows[place - 1].heading else place
            self._top = min(self._top, above)
            self._top = max(self._top, place - room + 1)
        self._top = max(min(self._top, len(self._rows) - room), 0)
        shown = self._shown_columns()
        title = self._line(tuple(Span(c.title, "dim") for c in self._columns), shown)
        rows = self._rows[self._top : self._top + room]
        lines = [title]
        for row in rows:
            if row.heading:
                lines.append((Span(fitted(row.cells[0].text, self.size.width), "title"),))
            elif row.key == self._key:
                text = "".join(span.text for span in self._line(row.cells, shown))
                lines.append((Span(fitted(text, self.size.width), "cursor"),))
            else:
                lines.append(self._line(row.cells, shown))
        self.show(lines)

    def _shown_columns(self) -> tuple[int, ...]:
        places = list(range(len(self._columns)))
        while len(places) > 1 and self._width(places) > self.size.width:
            places.remove(max(places, key=lambda at: (self._columns[at].rank, at)))
        return tuple(places)

    def _width(self, places: Sequence[int]) -> int:
        return sum(self._columns[at].width + 1 for at in places)

    def _line(self, cells: tuple[Span, ...], shown: tuple[int, ...]) -> Line:
        spans: list[Span] = []
        for at in shown:
            column, cell = self._columns[at], cells[at]
            width = column.width
            if at == shown[-1] and not column.right:
                width = max(width, self.size.width - self._width(shown[:-1]) - 1)
            text = cell.text.rjust(width) if column.right else cell.text
            spans += [Span(fitted(text, width), cell.role), Span(" ")]
        return tuple(spans)
