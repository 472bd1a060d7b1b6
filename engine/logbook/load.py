"""Reading a logbook's folder: everything, checked, or every fault at once."""

from __future__ import annotations

import unicodedata
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Protocol, TypeVar

from pydantic import ValidationError

from engine.errors import Fault, LogbookFaults
from engine.logbook.faults import KeyPath, key_text, problems, unknown
from engine.logbook.files import (
    TABLE_ENDINGS,
    Unreadable,
    as_text,
    parse_toml,
    read_text,
    target_files,
)
from engine.logbook.lines import LineIndex
from engine.logbook.observatory import FileModel, Observatory, Site
from engine.logbook.targets import Programme, Target
from engine.logbook.text import nearest, shown

Model = TypeVar("Model", bound=FileModel)
Reader = Callable[[Path], str]

# A file with more faults than this is no logbook.
MOST_FAULTS = 200
SHORT_LIST = 12
# Clocks further from the Sun than this part the nights where it may be dark; nearer the poles the
# Sun keeps no hours.
MOST_HOURS_FROM_THE_SUN = 4.0
POLAR_LATITUDE_DEG = 66.0


@dataclass(frozen=True, slots=True)
class Logbook:
    """A logbook as it was read: the observatory, the programmes, the targets."""

    folder: Path
    observatory: Observatory
    programmes: tuple[Programme, ...]
    targets: tuple[Target, ...]


class _Lines(Protocol):
    """Something that knows on which line a key of its file stands."""

    def line_of(self, path: KeyPath) -> int:
        """Return the line of a path of keys and places."""
        ...


class _File:
    """One file of the logbook: where its keys stand, and the faults found in it."""

    def __init__(self, path: Path, values: object = None, lines: _Lines | None = None) -> None:
        self.path = path
        self.values = values
        self.faults: list[Fault] = []
        self.refused: set[str] = set()  # columns of a table that are told once, not in each row
        self._lines = lines

    @property
    def is_full(self) -> bool:
        """Whether as many faults are noted as will be told."""
        return len(self.faults) >= MOST_FAULTS

    def line_of(self, key: KeyPath) -> int:
        """Return the line on which a key stands."""
        return self._lines.line_of(key) if self._lines else 1

    def note(self, key: KeyPath, what: str) -> None:
        """Note a fault of a key."""
        if not self.is_full:
            place = key_text(key, self.values)
            self.faults.append(Fault(self.path, self.line_of(key), place, what))

    def refuse(self, why: Unreadable) -> None:
        """Note that the file can't be read at all."""
        self.faults.append(Fault(self.path, why.line, "", str(why)))

    def told(self) -> list[Fault]:
        """Return the faults, and a line that says so where no more of them were noted."""
        if not self.is_full:
            return self.faults
        last = max(each.line for each in self.faults)
        what = f"there may be more: only {MOST_FAULTS} faults of a file are told, expected none"
        return [*self.faults, Fault(self.path, last, "", what)]


@dataclass(frozen=True, slots=True)
class _Entry:
    """A target or a programme as its file gives it, sound or not."""

    file: _File
    key: KeyPath
    values: object

    def get(self, name: str) -> object:
        """Return the value of a key; None without one."""
        return self.values.get(name) if isinstance(self.values, dict) else None

    @property
    def name(self) -> str | None:
        """Its name, in one spelling where Unicode has several."""
        name = self.get("name")
        return _spelt(name) if isinstance(name, str) and name else None

    def note(self, what: str, *where: str | int) -> None:
        """Note a fault of one of its keys."""
        self.file.note((*self.key, *where), what)


def load_logbook(folder: Path, instead: Mapping[Path, bytes] | None = None) -> Logbook:
    """Return the logbook in a folder; LogbookFaults with all that is wrong in any of its files.

    ``instead`` holds what files of targets would hold after a change that is not made yet.
    """
    changed = instead or {}

    def read(path: Path) -> str:
        return as_text(changed[path]) if path in changed else read_text(path)

    head, observatory, wheel = _read_observatory(folder / "observatory.toml", read)
    faults: list[Fault] = []
    files: list[_File] = [head]
    entries: list[_Entry] = []
    for path in target_files(folder, faults, changed):
        file, found = _read_table(path, read) if _is_table(path) else _read_toml(path, read)
        files.append(file)
        entries += found
    programmes = [each for each in entries if each.key[0] == "programme"]
    targets = [each for each in entries if each.key[0] == "target"]
    sound_programmes = _sound(programmes, Programme)
    sound_targets = _sound(targets, Target)
    _check_names(programmes)
    _check_names(targets)
    _check_programmes(targets, programmes)
    _check_filters(targets, wheel)
    faults += [fault for file in files for fault in file.told()]
    if not targets and not faults:
        faults.append(Fault(files[-1].path, 1, "", "no target, expected at least one [[target]]"))
    if faults or observatory is None:
        raise LogbookFaults(faults)
    return Logbook(folder, observatory, tuple(sound_programmes), tuple(sound_targets))


def _is_table(path: Path) -> bool:
    return path.suffix.lower() in TABLE_ENDINGS


def _open_toml(path: Path, read: Reader) -> _File:
    """Return a TOML file with its values, or with the fault that kept it from being read."""
    try:
        text = read(path)
        return _File(path, parse_toml(text), LineIndex(text))
    except Unreadable as why:
        file = _File(path)
        file.refuse(why)
        return file


def _validated(model: type[Model], values: object, file: _File, key: KeyPath = ()) -> Model | None:
    """Return values as their model, or None with the faults noted."""
    try:
        return model.model_validate(values, by_alias=True, by_name=False)
    except ValidationError as error:
        for where, what in problems(error, model):
            if file.is_full:
                break
            if where[:1] not in {(name,) for name in file.refused}:
                file.note((*key, *where), what)
        return None


def _read_observatory(
    path: Path, read: Reader
) -> tuple[_File, Observatory | None, tuple[str, ...]]:
    """Return the observatory, and the names in its wheel even if something else is wrong."""
    file = _open_toml(path, read)
    if not isinstance(file.values, dict):
        return file, None, ()
    observatory = _validated(Observatory, file.values, file)
    if observatory is not None:
        _check_zone(file, observatory.site)
    filters = file.values.get("filter")
    wheel = filters if isinstance(filters, list) else []
    names = [each.get("name") for each in wheel if isinstance(each, dict)]
    return file, observatory, tuple(dict.fromkeys(n for n in names if isinstance(n, str)))


def _check_zone(file: _File, site: Site) -> None:
    """Note a zone in which the noon that parts the nights would fall into one of them."""
    apart_h = site.hours_from_the_sun
    if apart_h <= MOST_HOURS_FROM_THE_SUN or abs(site.latitude_deg) > POLAR_LATITUDE_DEG:
        return
    what = (
        f"{shown(site.timezone)} is {apart_h:.1f} h from the Sun at longitude_deg "
        f"{site.longitude_deg:g}, expected the site's own zone (nights are parted at its noon), "
        "and longitudes positive to the east"
    )
    file.note(("site", "timezone"), what)


def _read_toml(path: Path, read: Reader) -> tuple[_File, list[_Entry]]:
    """Return the entries of one TOML file of targets."""
    file = _open_toml(path, read)
    known = ["programme", "target"]
    entries: list[_Entry] = []
    for name, items in (file.values if isinstance(file.values, dict) else {}).items():
        if name not in known:
            file.note((name,), unknown(name, known))
        elif isinstance(items, list):
            entries += [_Entry(file, (name, n), item) for n, item in enumerate(items)]
        else:
            file.note((name,), f"{shown(items)}, expected a list of tables, [[{name}]]")
    return file, entries


def _read_table(path: Path, read: Reader) -> tuple[_File, list[_Entry]]:
    """Return the entries of one table of targets, one a row."""
    from engine.logbook.tables import read_table

    try:
        table = read_table(read(path), path.suffix.lower())
    except Unreadable as why:
        file = _File(path)
        file.refuse(why)
        return file, []
    file = _File(path, {"target": table.rows}, table)
    file.refused = table.refused
    for key, what in table.problems:
        file.note(key, what)
    return file, [_Entry(file, ("target", n), row) for n, row in enumerate(table.rows)]


def _sound(entries: list[_Entry], model: type[Model]) -> list[Model]:
    """Return the entries that are sound; the faults of the others are noted."""
    found = (_validated(model, each.values, each.file, each.key) for each in entries)
    return [each for each in found if each is not None]


def _check_names(entries: list[_Entry]) -> None:
    first: dict[str, _Entry] = {}
    for each in entries:
        if each.name is None:
            continue
        before = first.setdefault(each.name, each)
        if before is not each:
            place = f"{before.file.path}:{before.file.line_of((*before.key, 'name'))}"
            each.note(f"{shown(each.name)} stands at {place}, expected each name once", "name")


def _check_programmes(targets: list[_Entry], programmes: list[_Entry]) -> None:
    declared = {each.name: None for each in programmes if each.name}
    for each in targets if declared else ():
        name = each.get("programme")
        if each.file.is_full or not isinstance(name, str) or not name or _spelt(name) in declared:
            continue
        what = f"{shown(name)} is no [[programme]], {_one_of(name, tuple(declared))}"
        each.note(what, "programme")


def _check_filters(targets: list[_Entry], wheel: tuple[str, ...]) -> None:
    known = {_spelt(name) for name in wheel}
    for each in targets if wheel else ():
        plan = each.get("exposures")
        for place, planned in enumerate(plan if isinstance(plan, list) else ()):
            name = planned.get("filter") if isinstance(planned, dict) else None
            if each.file.is_full or not isinstance(name, str) or not name or _spelt(name) in known:
                continue
            what = f"{shown(name)} is not in the wheel, {_one_of(name, wheel)}"
            each.note(what, "exposures", place, "filter")


def _spelt(name: str) -> str:
    """Return a name in the one spelling that the models keep."""
    return unicodedata.normalize("NFC", name)


def _one_of(name: str, known: tuple[str, ...]) -> str:
    listed = ", ".join(shown(each) for each in known[:SHORT_LIST])
    more = " and more" if len(known) > SHORT_LIST else ""
    return f"expected one of {listed}{more}{nearest(name, known)}"
