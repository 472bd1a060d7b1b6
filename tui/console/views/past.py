"""Past nights: a list with a picture of each, a night again, a target's history, the site's seeing.

The index is opened and asked off the loop the first time, since a large archive takes a while to
be read for the first time; after that each question is a few milliseconds.
"""

from __future__ import annotations

import sqlite3
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

from engine.errors import WarmroomError
from engine.log import NightState
from engine.past import PastIndex
from engine.past.export import write_csv
from engine.past.exposures import PastExposure, history
from engine.past.nights import NightLine, nights
from engine.past.replay import Replay, open_replay
from engine.past.search import FoundWords, find_words
from engine.past.seeing import SiteSeeing, measurements, site_seeing
from engine.report import FORMS, night_report, save
from engine.watch import Watch
from tui.console.views.base import View
from tui.console.views.past_pages import (
    found_page,
    night_page,
    nights_head,
    nights_page,
    seeing_groups,
    seeing_page,
    target_page,
)
from tui.paint.figures import bar
from tui.paint.spans import BLANK, Line, Span, cut, line
from tui.widgets.entry import Question

if TYPE_CHECKING:
    from textual.worker import Worker

    from tui.console.app import Console

# The pages that follow each other by the panel key; the others are reached from one of them.
ROUND = ("nights", "target", "seeing")
BAR_CELLS = 30
SCREEN_ROWS = 15


@dataclass(frozen=True, slots=True)
class _Read:
    """What was read once: the open index, its nights (the newest first), the site's seeing."""

    index: PastIndex
    nights: tuple[NightLine, ...]
    head: tuple[Line, ...]
    seeing: SiteSeeing


class Past(View):
    """What all nights of the logbook have been, from the index of their logs."""

    def __init__(self, console: Console, watch: Watch) -> None:
        super().__init__(console, watch)
        self._folder: Path = watch.planner.logbook.folder
        self._progress = (0, 0)
        self._worker: Worker[_Read] | None = None
        self._page = "nights"
        self._cursors: dict[str, int] = {}
        self._replay: Replay | None = None
        self._stood: tuple[tuple[Path, int], NightState] | None = None
        self._from = "nights"
        self._taken: tuple[str | None, tuple[PastExposure, ...]] = (None, ())
        self._text = ""
        self._found: tuple[FoundWords, ...] = ()
        self._height = SCREEN_ROWS

    # What is shown

    def paint(self, width: int, height: int) -> list[Line]:
        """Return the page in exactly so many rows."""
        self._height = height
        shown = self._lines(width, height)[:height]
        return [*(cut(each, width) for each in shown), *[BLANK] * (height - len(shown))]

    def _lines(self, width: int, height: int) -> list[Line]:
        read = self._read
        if isinstance(read, str):
            return [line(Span(f" {read}", "dim"))]
        cursor = self._cursor
        match self._page:
            case "night" if self._replay is not None:
                return night_page(self._replay, cursor, self._state(cursor), width, height)
            case "target":
                return target_page(self.console.chosen, self._history(read), cursor, width, height)
            case "seeing":
                return seeing_page(read.seeing, cursor, width, height)
            case "found":
                return found_page(self._text, self._found, cursor, width, height)
            case _:
                return nights_page(read.nights, read.head, cursor, width, height)

    def _state(self, place: int) -> NightState:
        """Return the state of the night that is looked at, kept while its cursor stands still."""
        if self._replay is None:
            return NightState()
        key = (self._replay.path, place)
        if self._stood is None or self._stood[0] != key:
            self._stood = (key, self._replay.at(place))
        return self._stood[1]

    @property
    def hints(self) -> tuple[tuple[str, str], ...]:
        """The view's own keys: what they do here."""
        if self._page == "night":
            return (("esc", "back"), ("e", "report"))
        if self._page == "target":
            return (("← →", "target"), ("enter", "open"), ("tab", "seeing"), ("e", "export"))
        return (("enter", "open"), ("tab", "target, seeing"), ("/", "find"), ("e", "export"))

    @property
    def _read(self) -> _Read | str:
        """What was read, or what to say while or because it is not there; begins to read."""
        worker = self._worker
        if worker is None:
            self._worker = self.console.run_worker(
                self._open, name="past", group="past", thread=True, exit_on_error=False
            )
            return "reading past nights ..."
        if not worker.is_finished:
            done, of = self._progress
            share = bar(done / of, BAR_CELLS) if of else ""
            return f"reading past nights ... {share} {done} of {of} logs" if of else "reading ..."
        if worker.result is None:
            return f"past nights can't be read: {worker.error}"
        return worker.result

    def _open(self) -> _Read:
        """Open the index and ask what every page needs: on a thread of its own."""

        def note(done: int, of: int) -> None:
            self._progress = (done, of)

        index = PastIndex(self._folder, progress=note)
        tonight = f"{self.watch.planner.night.almanac.night.isoformat()}.toml"
        past = tuple(each for each in nights(index) if each.name != tonight)
        return _Read(index, past[::-1], nights_head(past), site_seeing(measurements(index)))

    def _history(self, read: _Read) -> tuple[PastExposure, ...]:
        name = self.console.chosen
        if name != self._taken[0]:
            self._taken = (name, self._ask(lambda: history(read.index, name or ""))[::-1])
            self._cursors["target"] = 0
        return self._taken[1]

    def _ask(self, question: Callable[[], tuple[Any, ...]]) -> tuple[Any, ...]:
        try:
            return question()
        except sqlite3.Error as error:
            self.console.tell(f"the index of past nights: {error}", "warn")
            return ()

    # Where it stands

    @property
    def _rows(self) -> Sequence[object]:
        """What the cursor of the page moves over."""
        read = self._read
        if isinstance(read, str):
            return ()
        match self._page:
            case "nights":
                return read.nights
            case "night":
                return self._replay.events if self._replay else ()
            case "target":
                return self._history(read)
            case "found":
                return self._found
            case _:
                return seeing_groups(read.seeing)

    @property
    def _cursor(self) -> int:
        return min(self._cursors.get(self._page, 0), max(len(self._rows) - 1, 0))

    def move(self, by: int, unit: str) -> bool:
        """Move the cursor of the page; on a night, through its entries."""
        count = len(self._rows)
        step = {"rows": by, "screens": by * max(self._height - 8, 1), "ends": by * count}[unit]
        self._cursors[self._page] = min(max(self._cursor + step, 0), max(count - 1, 0))
        return True

    def take_key(self, key: str, character: str | None) -> bool:
        """Go back, or export what is shown."""
        if key in ("escape", "backspace", "left") and self._page not in ROUND:
            self._page = self._from if self._page == "night" else "nights"
            return True
        if key in ("left", "right") and self._page == "target":
            self._choose_beside(1 if key == "right" else -1)
            return True
        if character == "e":
            self._export()
            return True
        return False

    def _choose_beside(self, by: int) -> None:
        """Put the console's cursor on the next target of the list, or the one before."""
        names = [target.name for target in self.watch.planner.night.targets]
        if names:
            name = self.console.chosen
            at = names.index(name) if name in names else 0
            self.console.choose(names[(at + by) % len(names)])

    def take_action(self, name: str) -> bool:
        """Open what is under the cursor, show the next page, search: this view's own ways."""
        match name:
            case "choose":
                self._open_under_cursor()
            case "next_panel":
                at = ROUND.index(self._page) if self._page in ROUND else -1
                self._page = ROUND[(at + 1) % len(ROUND)]
            case "find":
                self.console.ask(Question("find in notes and reasons", _some_text, self._find))
            case _:
                return False
        return True

    def _open_under_cursor(self) -> None:
        rows = self._rows
        if not rows or self._page in ("night", "seeing"):
            return
        row: Any = rows[self._cursor]
        name = row.name if isinstance(row, NightLine) else row.log
        self._replay = open_replay(self._folder / name)
        at = 0 if isinstance(row, NightLine) else self._replay.place_of(row.n)
        self._from, self._page = self._page, "night"
        self._cursors["night"] = at

    def _find(self, text: str) -> None:
        read = self._read
        if isinstance(read, str):
            return
        self._text = text
        self._found = self._ask(lambda: find_words(read.index, text))
        self._page = "found"
        self._cursors["found"] = 0

    def _export(self) -> None:
        """Write what is shown into a file that the observer names: a night as its report."""
        if self._page == "night" and self._replay is not None:
            log = self._replay.path
            label = f"write the night's report to ({' '.join(FORMS)})"
            self.console.ask(Question(label, _report_file, lambda path: self._report(log, path)))
            return
        rows = self._rows
        if not rows:
            self.console.tell("there is nothing to export here", "dim")
            return

        def write(path: Path) -> None:
            write_csv(path, rows)
            self.console.tell(f"{len(rows)} rows in {path}", "good")

        self.console.ask(Question(f"write {len(rows)} rows as CSV to", _file, write))

    def _report(self, log: Path, path: Path) -> None:
        """Write a night's report off the loop: its charts and tables take a second."""

        def work() -> None:
            try:
                save(night_report(log), path)
                told = (f"the night of {log.stem} is in {path}", "good")
            except WarmroomError as error:
                told = (str(error), "warn")
            self.console.call_from_thread(self.console.tell, *told)

        self.console.run_worker(work, name="report", thread=True, exit_on_error=False)


def _some_text(text: str) -> str:
    if not text.strip():
        raise ValueError("expected a word or two")
    return text.strip()


def _file(text: str) -> Path:
    """Return where to write, from what was typed."""
    if not text.strip():
        raise ValueError("expected a file name such as past.csv")
    return Path(text.strip()).expanduser()


def _report_file(text: str) -> Path:
    """Return where to write a report, from what was typed."""
    path = _file(text)
    if path.suffix.lower() not in FORMS:
        raise ValueError(f"expected a name that ends in {', '.join(FORMS)}")
    return path
