"""The targets by programme: what is done of each, and changes of the logbook in its night."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING

from engine.errors import LogbookFaults, NotNow
from engine.log import last_undoable
from engine.logbook import Target
from engine.logbook.edit import standing
from engine.logbook.faults import field_key
from engine.logbook.fields import typed_field, typed_place
from engine.logbook.text import nearest, one_line
from engine.watch import Watch, book
from tui.console.views.base import View
from tui.console.views.records import beside
from tui.console.views.targets_pages import (
    Group,
    detail_page,
    group_row,
    groups,
    target_row,
    value_as_typed,
)
from tui.paint.spans import BLANK, Line, Span, line, wrapped

if TYPE_CHECKING:
    from tui.console.app import Console

WIDE, LIST_SHARE = 130, 0.58
# The letter that edits each key; a name is not edited, since logs call a target by it.
LETTERS: dict[str, str] = {
    "exposures": "x", "priority": "p", "programme": "g", "ra": "r", "dec": "d", "magnitude": "m",
    "maximum_airmass": "a", "maximum_image_size_arcsec": "i", "minimum_moon_separation_deg": "o",
    "windows": "w", "contiguous_min": "c", "role": "l", "visits": "v", "least_gap_min": "1",
    "greatest_gap_min": "2", "each_night": "n", "pm_ra_mas_per_yr": "3", "pm_dec_mas_per_yr": "4",
    "epoch_yr": "e",
}  # fmt: skip
FIELDS = {field_key(name, known): name for name, known in Target.model_fields.items()}


class Targets(View):
    """All targets of the night by programme; the cursor is the console's."""

    def __init__(self, console: Console, watch: Watch) -> None:
        super().__init__(console, watch)
        self._is_open = False
        self._top = 0
        self._scroll = 0
        self._height = 12
        self._done: book.Done | None = None
        self._faults: tuple[str, ...] = ()
        self._stood: tuple[tuple[str, int], str] | None = None

    @property
    def hints(self) -> tuple[tuple[str, str], ...]:
        """The view's own keys."""
        if self._faults:
            return (("esc", "put the faults aside"),)
        return (
            ("i", "add"),
            ("e", "edit"),
            ("m", "import"),
            ("y", "read files anew"),
            ("tab", "the list" if self._is_open else "in full"),
            ("/", "search"),
        )

    # What is shown

    def paint(self, width: int, height: int) -> list[Line]:
        """Return the rows in sight, the chosen target in full, or the faults of what was tried."""
        self._height = max(height, 1)
        if self._faults:
            return self._fault_page(width)[:height]
        found = self._groups()
        if not found:
            text = self.console.find_text
            return [line(Span(f" no target holds '{text}'" if text else " ...", "dim"))]
        if self._is_open and width < WIDE:
            return self._in_full(width)
        if width < WIDE:
            rows = self._rows(found, width)
            # A short list leaves room for the chosen target.
            return [*rows, BLANK, *self._in_full(width)][:height]
        left = int(width * LIST_SHARE)
        return beside(self._rows(found, left), self._in_full(width - left - 2), left, height)

    def _groups(self) -> list[Group]:
        planner = self.watch.planner
        return groups(planner.night.targets, planner.logbook.programmes, self.console.find_text)

    def _rows(self, found: list[Group], width: int) -> list[Line]:
        """Return the part of the list around the cursor; only that is painted."""
        places: list[Group | Target] = []
        for group in found:
            places += [group, *group.targets]
        chosen = self.console.chosen
        at = next(
            (n for n, e in enumerate(places) if isinstance(e, Target) and e.name == chosen), 0
        )
        # The first row is always the heading of what is below it.
        self._top = max(min(self._top, at - 1), at - self._height + 1)
        self._top = max(min(self._top, len(places) - self._height), 0)
        begin = next(n for n in range(self._top, -1, -1) if isinstance(places[n], Group))
        shown = [places[begin], *places[self._top + 1 : self._top + self._height]]
        plans = self.watch.plans()
        return [
            group_row(each, plans, width)
            if isinstance(each, Group)
            else target_row(each, plans.get(each.name, ()), each.name == chosen, width)
            for each in shown
        ]

    def _in_full(self, width: int) -> list[Line]:
        target = self._target()
        if target is None:
            return [BLANK]
        plan = self.watch.plans().get(target.name, ())
        page = detail_page(target, plan, self._where(target.name), LETTERS, width)
        self._scroll = max(min(self._scroll, len(page) - self._height), 0)
        return page[self._scroll : self._scroll + self._height]

    def _fault_page(self, width: int) -> list[Line]:
        count = len(self._faults)
        head = f" {count} fault{'s' if count > 1 else ''}: nothing was changed"
        lines = [line(Span(head, "bad"))]
        for each in self._faults:
            lines += wrapped(each, width - 2, "text", 3, indent=1)
        return lines

    def _where(self, name: str) -> str:
        """Return where a target stands, in words; looked up once for each state of the night."""
        key = (name, self.watch.version)
        if self._stood is None or self._stood[0] != key:
            found = standing(self._folder, name)
            said = "in no file: of this night alone"
            if found is not None:
                said = f"{found.path.relative_to(self._folder)}, line {found.line}"
            self._stood = (key, said)
        return self._stood[1]

    @property
    def _folder(self) -> Path:
        return self.watch.planner.logbook.folder

    def _target(self) -> Target | None:
        name = self.console.chosen
        return next((each for each in self.watch.planner.night.targets if each.name == name), None)

    # Where it stands

    def move(self, by: int, unit: str) -> bool:
        """Move the console's cursor in this view's order; by screens through one in full."""
        if self._is_open and unit == "screens":
            self._scroll = max(self._scroll + by * max(self._height - 1, 1), 0)
            return True
        names = [each.name for group in self._groups() for each in group.targets]
        if names:
            chosen = self.console.chosen
            at = names.index(chosen) if chosen in names else 0
            step = {"rows": 1, "screens": max(self._height - 1, 1), "ends": len(names)}[unit]
            self._scroll = 0
            self.console.choose(names[min(max(at + by * step, 0), len(names) - 1)])
        return True

    def take_key(self, key: str, character: str | None) -> bool:
        """Edit, import, read anew, or put faults aside."""
        if key == "escape" and (self._faults or self._is_open):
            self._faults, self._is_open = (), bool(self._faults) and self._is_open
            return True
        deeds: dict[str, Callable[[], None]] = {
            "e": self._edit,
            "m": self._import,
            "y": self._read_anew,
        }
        deed = deeds.get(character or "")
        if deed is None:
            return False
        self._faults = ()
        deed()
        return True

    def take_action(self, name: str) -> bool:
        """Show a target in full, add one to the logbook, take back a change with its file."""
        if name == "insert":
            self._faults = ()
            self._add()
            return True
        if name == "next_panel":
            self._is_open, self._scroll = not self._is_open, 0
            return True
        if name == "undo" and self._done is not None and self._is_last(self._done):
            done, self._done = self._done, None
            self._carry_out(lambda: book.put_back(self.watch, done), "the logbook is as it was")
            return True
        return False

    def _is_last(self, done: book.Done) -> bool:
        """Whether a change of the logbook is what undo would take back."""
        last = last_undoable(self.watch.state)
        return last is not None and last.n == done[1].n

    # Adding

    def _add(self) -> None:
        """Ask for name, place, programme and exposures, one line each."""
        logbook = self.watch.planner.logbook

        def name(text: str) -> str:
            found = str(typed_field("name", text, logbook))
            if any(each.name == found for each in self.watch.planner.night.targets):
                raise ValueError(f"a target is called {found} already")
            return found

        self.ask("new target: its name", name, lambda value: self._add_place({"name": value}))

    def _add_place(self, values: dict[str, object]) -> None:
        def then(place: tuple[object, object]) -> None:
            self._add_exposures({**values, "ra": place[0], "dec": place[1]})

        label = f"where is {one_line(str(values['name']), 20)} (RA Dec)"
        self.ask(label, typed_place, then)

    def _add_exposures(self, values: dict[str, object]) -> None:
        logbook = self.watch.planner.logbook
        wheel = " ".join(each.name for each in logbook.observatory.filters)
        self.ask(
            f"exposures, such as V:60x5 ({wheel})",
            lambda text: typed_field("exposures", text, logbook),
            lambda plan: self._add_programme({**values, "exposures": plan}),
        )

    def _add_programme(self, values: dict[str, object]) -> None:
        beside_it = self._target()
        logbook = self.watch.planner.logbook

        def then(programme: object) -> None:
            full = {**values, "programme": programme} if programme else values
            name = str(full["name"])
            self._carry_out(lambda: book.add(self.watch, full), f"{name} is in the logbook")

        self.ask(
            "programme; nothing for none",
            lambda text: typed_field("programme", text, logbook),
            then,
            text=beside_it.programme if beside_it is not None else "",
        )

    # Editing

    def _edit(self) -> None:
        """Ask which key, by its letter, then its value."""
        target = self._target()
        if target is None:
            raise NotNow("no target is under the cursor")
        where = standing(self._folder, target.name)
        if where is None:
            raise NotNow(f"{target.name} stands in no file: it came into this night alone")
        if where.is_in_table:
            raise NotNow(
                f"{target.name} is a row of {where.path.name}, line {where.line}: change it there,"
                " then y"
            )
        name = target.name
        self.ask(f"edit which key of {name}", _key, lambda key: self._edit_key(name, key))

    def _edit_key(self, name: str, key: str) -> None:
        target = next((e for e in self.watch.planner.night.targets if e.name == name), None)
        if target is None:
            return
        logbook = self.watch.planner.logbook
        before = value_as_typed(key, getattr(target, FIELDS[key]), target)

        def then(value: object) -> None:
            said = f"{key} of {name} was {before or 'not given'}"
            self._carry_out(
                lambda: book.change(self.watch, name, key, value, said), f"{name} is edited"
            )

        self.ask(
            f"{key} of {name}", lambda text: typed_field(key, text, logbook), then, text=before
        )

    # Files

    def _import(self) -> None:
        """Ask for a file, check all of it, and copy it into the logbook."""

        def take_in(path: Path) -> None:
            self._carry_out(lambda: book.take_in(self.watch, path), f"{path.name} came in")

        self.ask("import which file of targets (.csv .ecsv .vot .toml)", _path, take_in)

    def _read_anew(self) -> None:
        self._carry_out(lambda: book.reload(self.watch), "the logbook's files are read anew")

    def _carry_out(self, act: Callable[[], object], said: str) -> None:
        """Change the logbook; its faults are shown whole, and then nothing was changed."""
        try:
            done = act()
        except LogbookFaults as found:
            folder = f"{self._folder}/"
            self._faults = tuple(str(each).removeprefix(folder) for each in found.faults)
            self.console.tell(f"nothing was changed: {len(self._faults)} faults", "bad")
            return
        if isinstance(done, tuple):
            self._done = done
            said = f"{said}; u takes it back"
        self.console.tell(said, "good")


def _key(text: str) -> str:
    """Return a key by its letter or its name."""
    text = text.strip()
    key = next((key for key, letter in LETTERS.items() if letter == text), text)
    if key not in LETTERS:
        hint = nearest(text, LETTERS) or ", such as p for priority; tab shows all letters"
        raise ValueError(f"expected a letter or a key{hint}")
    return key


def _path(text: str) -> Path:
    path = Path(text.strip()).expanduser()
    if not text.strip():
        raise ValueError("expected a file's path")
    if not path.is_file():
        raise ValueError("there is no such file")
    return path
