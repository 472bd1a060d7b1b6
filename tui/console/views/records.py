"""The log as it grows: followed, searched, an entry in full, and put right where it stands."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from engine.errors import NotNow
from engine.log import Amendment, Exposure, effective, title
from engine.log.blocks import split_blocks
from engine.log.keys import to_values
from engine.log.values import Value
from engine.logbook.text import one_line
from engine.watch import Watch
from engine.watch.corrections import amend, reject_or_restore, withdraw_or_restore
from tui.console.panels.local import local
from tui.console.views.amending import WORDS, choices_for, key_of, reader_for, typed_as
from tui.console.views.base import View
from tui.console.views.records_pages import Entry, Marks, detail_page, entry_row, head_line
from tui.paint.spans import BLANK, Line, Span, cut, line, width_of
from tui.widgets.entry import Question

if TYPE_CHECKING:
    from tui.console.app import Console

# From this width on an entry stands in full beside the list.
WIDE, LIST_SHARE = 120, 0.56
# Keys that are about a target, which nobody sees here.
OF_A_TARGET = ("put_off", "take_next", "take_at")


@dataclass(frozen=True, slots=True)
class Filter:
    """Which kinds of entries are shown, and what that is called; without any, all but a few."""

    title: str
    kinds: tuple[str, ...] = ()
    without: tuple[str, ...] = ()

    def takes(self, kind: str) -> bool:
        """Whether an entry of a kind is shown."""
        return (not self.kinds or kind in self.kinds) and kind not in self.without


FILTERS = (
    # Without what the console writes by itself and what an exposure's own entry says again.
    Filter("in short", without=("exposure_start", "run_stop", "order")),
    Filter("everything"),
    Filter("exposures", ("exposure",)),
    Filter("sky and air", ("conditions", "focus")),
    Filter("notes", ("note",)),
    Filter("decisions", ("override", "order", "target", "pointing", "run_start", "run_stop")),
    Filter("lost time", ("lost_time",)),
    Filter("amendments", ("amendment",)),
)


class Records(View):
    """Every entry of tonight's log; the cursor is on the newest until it is moved."""

    def __init__(self, console: Console, watch: Watch) -> None:
        super().__init__(console, watch)
        self._version = -1
        self._entries: dict[int, Entry] = {}
        self._words: dict[int, tuple[object, str]] = {}
        self._shown: tuple[int, ...] = ()
        self._found: tuple[int, ...] = ()
        self._n: int | None = None  # the entry under the cursor; None follows the newest
        self._top = 0
        self._filter = 0
        self._text = ""
        self._is_open = False
        self._scroll = 0
        self._height = 12

    @property
    def hints(self) -> tuple[tuple[str, str], ...]:
        """The view's own keys."""
        found = (("← →", "matches"),) if self._text else ()
        return (
            *found,
            ("e", "amend"),
            ("x", "reject, restore"),
            ("d", "withdraw, restore"),
            ("enter", "the list" if self._is_open else "in full"),
            ("/", "search"),
            ("tab", "kind"),
        )

    # What is shown

    def paint(self, width: int, height: int) -> list[Line]:
        """Return the rows that are in sight, and the entry under the cursor where there is room."""
        self._take_in()
        self._height = max(height - 1, 1)
        head = head_line(self._head(), width)
        if self._is_open and width < WIDE:
            page = self._detail(width)
            self._scroll = min(self._scroll, max(len(page) - self._height, 0))
            return [head, *page[self._scroll : self._scroll + self._height]]
        if width < WIDE:
            # A young log leaves room for the entry under the cursor.
            return [head, *self._rows(width), BLANK, *self._detail(width)][:height]
        left = int(width * LIST_SHARE)
        rows, page = self._rows(left), self._detail(width - left - 2)
        self._scroll = min(self._scroll, max(len(page) - self._height, 0))
        return [head, *beside(rows, page[self._scroll :], left, self._height)]

    def _head(self) -> list[tuple[str, str]]:
        parts = [(f"{len(self._shown)} of {len(self._entries)} entries", "dim")]
        parts.append((FILTERS[self._filter].title, "title"))
        if self._text:
            n = self._at_n
            place = self._found.index(n) + 1 if n in self._found else 0
            where = f"{place} of {len(self._found)}" if place else f"{len(self._found)} found"
            words = f"'{self._text}': {where if self._found else 'not found'}"
            parts.append((words, "accent" if self._found else "warn"))
        parts.append(("following" if self._n is None else "end follows again", "dim"))
        return parts

    def _rows(self, width: int) -> list[Line]:
        count, n = len(self._shown), self._at_n
        at = self._shown.index(n) if n is not None else 0
        self._top = max(min(self._top, at), at - self._height + 1)
        self._top = max(min(self._top, count - self._height), 0)
        unwritten = self.watch.unwritten
        events = self.watch.state.events
        first_unwritten = events[-unwritten].n if 0 < unwritten <= len(events) else None
        found = frozenset(self._found)
        rows: list[Line] = []
        for each in self._shown[self._top : self._top + self._height]:
            marks = Marks(
                first_unwritten is None or each < first_unwritten, each in found, each == n
            )
            entry = self._entries[each]
            time = f"{local(self.watch, entry.written.t_mjd):%H:%M:%S}"
            rows.append(entry_row(entry, time, marks, width))
        return rows or [line(Span(" nothing of this kind yet", "dim"))]

    def _detail(self, width: int) -> list[Line]:
        n = self._at_n
        if n is None:
            return [BLANK]
        entry = self._entries[n]
        when = f"{local(self.watch, entry.written.t_mjd):%H:%M:%S}"
        return detail_page(entry, when, self._on_disk(n), width)

    def _on_disk(self, n: int) -> str:
        """Return what the file on the disk holds of an entry: its line, and its check sum."""
        night = self.watch.planner.night.almanac.night.isoformat()
        path = self.watch.planner.logbook.folder / f"{night}.toml"
        try:
            data = path.read_bytes()
        except OSError as error:
            return f"{path.name} can't be read: {error.strerror}"
        at = data.find(b"\nn = %d\n" % n)
        begin = data.rfind(b"[[", 0, at + 1)
        if at < 0 or begin < 0:
            return "not yet on disk"
        following = data.find(b"\n[[", at)
        raw = data[begin : following + 1 if following >= 0 else len(data)]
        block = split_blocks(raw)[0]
        row = data.count(b"\n", 0, begin) + 1
        state = "check sum good"
        if not block.is_sound:
            state = "check sum wrong: changed by hand or damaged"
        return f"line {row} of {path.name}, {state}"

    # What there is

    def _take_in(self) -> None:
        """Look at the log again when something happened."""
        if self._version == self.watch.version:
            return
        self._version = self.watch.version
        state = self.watch.state
        stands = {each.n: each for each in effective(state.events)}
        amended: dict[int, list[Amendment]] = {}
        for each in state.events:
            if isinstance(each, Amendment):
                amended.setdefault(each.of, []).append(each)
        self._entries = {
            each.n: Entry(each, stands.get(each.n), tuple(amended.get(each.n, ())))
            for each in state.events
        }
        self._look()

    def _look(self) -> None:
        """Work out which entries are shown and which are found."""
        takes = FILTERS[self._filter].takes
        self._shown = tuple(n for n, each in self._entries.items() if takes(each.written.kind))
        text = self._text.casefold()
        self._found = tuple(n for n in self._shown if text and text in self._said_by(n))
        if self._n is not None and self._n not in self._shown:
            near = [n for n in self._shown if n <= self._n]
            self._n = near[-1] if near else None

    def _said_by(self, n: int) -> str:
        """Return all that an entry says, written and as it stands, to be searched."""
        entry = self._entries[n]
        kept = self._words.get(n)
        if kept is not None and kept[0] is entry.shown:
            return kept[1]
        words = [title(entry.written), title(entry.shown)]
        for event in (entry.written, entry.shown):
            try:
                words += [str(value) for value in to_values(event)[1].values()]
            except ValueError:
                continue
        said = " ".join(words).casefold()
        self._words[n] = (entry.shown, said)
        return said

    @property
    def _at_n(self) -> int | None:
        """The number of the entry under the cursor; None when nothing is shown."""
        if self._n is not None:
            return self._n
        return self._shown[-1] if self._shown else None

    # Where it stands

    def move(self, by: int, unit: str) -> bool:
        """Move through the entries; by screens through one that is shown in full."""
        self._take_in()
        if self._is_open and unit == "screens":
            self._scroll = max(self._scroll + by * max(self._height - 1, 1), 0)
            return True
        n = self._at_n
        if n is None:
            return True
        step = {"rows": 1, "screens": max(self._height - 1, 1), "ends": len(self._shown)}[unit]
        at = min(max(self._shown.index(n) + by * step, 0), len(self._shown) - 1)
        is_last = at == len(self._shown) - 1
        self._n = None if is_last else self._shown[at]
        self._scroll = 0
        return True

    def take_key(self, key: str, character: str | None) -> bool:
        """Go to the next match or the one before, amend, or put the search aside."""
        if key in ("left", "right"):
            self._go_to_match(1 if key == "right" else -1)
        elif character == "e":
            self._ask_which()
        elif key == "escape" and self._is_open:
            self._is_open = False
        elif key == "escape" and (self._text or self._filter or self._n is not None):
            self._text, self._filter, self._n = "", 0, None
            self._look()
        else:
            return False
        return True

    def take_action(self, name: str) -> bool:
        """Do the table's actions in this view's own way: on the entry under the cursor."""
        match name:
            case "choose":
                self._is_open, self._scroll = not self._is_open, 0
            case "next_panel":
                self._filter = (self._filter + 1) % len(FILTERS)
                self._look()
            case "find":
                self.console.ask(Question("search the log for", _some_text, self._find))
            case "reject":
                self._reject()
            case "drop":
                withdraw_or_restore(self.watch, self._chosen_n())
            case _ if name in OF_A_TARGET:
                raise NotNow("that is for a target: its list is in the view of the night, 1")
            case _:
                return False
        return True

    def _find(self, text: str) -> None:
        """Search; go to the newest match not behind the cursor."""
        self._take_in()
        self._text = text
        self._look()
        n = self._at_n
        before = [each for each in self._found if n is not None and each <= n]
        if self._found:
            self._n = before[-1] if before else self._found[0]

    def _go_to_match(self, by: int) -> None:
        n = self._at_n
        if not self._found or n is None:
            self.console.tell("search first: / and a text" if not self._text else "not found")
            return
        beyond = [each for each in self._found if (each > n if by > 0 else each < n)]
        around = self._found[0] if by > 0 else self._found[-1]
        self._n = (beyond[0] if by > 0 else beyond[-1]) if beyond else around
        self._scroll = 0

    # Putting right

    def _chosen_n(self) -> int:
        self._take_in()
        n = self._at_n
        if n is None:
            raise NotNow("no entry is under the cursor")
        return n

    def _reject(self) -> None:
        n = self._chosen_n()
        event = self._entries[n].stands
        if isinstance(event, Exposure) and event.outcome == "good":
            question = f"why is {event.filter} on {one_line(event.target, 30)}, {n}, rejected"
            self.ask(question, one_line, lambda why: reject_or_restore(self.watch, n, why))
        else:
            reject_or_restore(self.watch, n)

    def _ask_which(self) -> None:
        n = self._chosen_n()
        event = self._entries[n].stands
        if event is None:
            raise NotNow("this entry is withdrawn: d restores it")
        choices = choices_for(event)
        if not choices:
            raise NotNow("nothing of this entry is for the observer to change; a note can say more")
        if len(choices) == 1:
            self._ask_value(n, choices[0][0])
            return
        self.ask(f"amend {n}", str, lambda letter: self._ask_value(n, letter), choices)

    def _ask_value(self, n: int, letter: str) -> None:
        event = self._entries[n].stands
        if event is None:
            return
        key = key_of(event, letter)
        before = typed_as(getattr(event, key))
        self.ask(
            f"{WORDS[key][1]} of {n}",
            reader_for(self.watch, event, key),
            lambda value: self._amend(n, key, value),
            text=before,
        )

    def _amend(self, n: int, key: str, value: Value) -> None:
        event = self._entries[n].stands
        if event is not None and getattr(event, key) == value:
            self.console.tell("nothing changed", "dim")
            return
        amend(self.watch, n, key, value)
        self.console.tell(f"entry {n} amended; u takes it back", "now")


def beside(left: list[Line], right: list[Line], width: int, height: int) -> list[Line]:
    """Return two columns side by side, the left one so many cells wide."""
    lines: list[Line] = []
    for row in range(min(height, max(len(left), len(right)))):
        one = cut(left[row], width) if row < len(left) else BLANK
        pad = Span(" " * (width - width_of(one)) + "│ ", "dim")
        lines.append((*one, pad, *(right[row] if row < len(right) else BLANK)))
    return lines


def _some_text(text: str) -> str:
    if not text.strip():
        raise ValueError("expected a word or two")
    return one_line(text, 80).strip()
