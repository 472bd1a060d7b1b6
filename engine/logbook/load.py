"""Reading a logbook's folder: everything, checked, or every fault at once."""

from __future__ import annotations

import tomllib
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import Any, TypeVar

from pydantic import ValidationError

from engine.errors import Fault, LogbookFaults
from engine.logbook.faults import Path as KeyPath
from engine.logbook.faults import key_text, nearest, problems, shown
from engine.logbook.lines import LineFinder, split_syntax_error
from engine.logbook.observatory import FileModel, Observatory
from engine.logbook.tables import FORMATS, read_rows
from engine.logbook.targets import Programme, Target

Model = TypeVar("Model", bound=FileModel)

# No list of targets is longer; what is was put there by mistake.
LARGEST_BYTES = 16_000_000


@dataclass(frozen=True, slots=True)
class Logbook:
    """A logbook as it was read: the observatory, the programmes, the targets."""

    folder: Path
    observatory: Observatory
    programmes: tuple[Programme, ...]
    targets: tuple[Target, ...]

    def with_target(self, target: Target) -> Logbook:
        """Return the logbook with one more target; nothing is written."""
        return Logbook(self.folder, self.observatory, self.programmes, (*self.targets, target))


_MODELS: dict[str, type[Programme] | type[Target]] = {"programme": Programme, "target": Target}


@dataclass(frozen=True, slots=True)
class _OneLine:
    """Where a table's row stands: every key of it on one line."""

    line: int

    def line_of(self, path: KeyPath) -> int:
        """Return the row's line."""
        return self.line


@dataclass(frozen=True, slots=True)
class _Found:
    """A target or programme, and where it stands."""

    item: Target | Programme
    path: Path
    lines: LineFinder | _OneLine
    key: KeyPath

    @property
    def line(self) -> int:
        """The line on which it begins."""
        return self.lines.line_of(self.key)

    def fault(self, what: str, *where: str | int) -> Fault:
        """Return a fault of one of its keys."""
        key = (*self.key, *where)
        return Fault(self.path, self.lines.line_of(key), key_text(key), what)


def load_logbook(folder: Path) -> Logbook:
    """Return the logbook in a folder; LogbookFaults with all that is wrong in any of its files."""
    faults: list[Fault] = []
    observatory, wheel = _observatory(folder / "observatory.toml", faults)
    found: list[_Found] = []
    files = list(_target_files(folder))
    if not files and folder.is_dir():
        faults.append(
            Fault(folder / "targets.toml", 1, "", "is missing, expected a list of targets")
        )
    for path in files:
        found += _from_toml(path, faults) if path.suffix == ".toml" else _from_table(path, faults)
    _check_names(found, faults)
    _check_filters(found, wheel, faults)
    if faults or observatory is None:
        raise LogbookFaults(faults)
    return Logbook(
        folder,
        observatory,
        tuple(each.item for each in found if isinstance(each.item, Programme)),
        tuple(each.item for each in found if isinstance(each.item, Target)),
    )


def _target_files(folder: Path) -> Iterator[Path]:
    endings = (".toml", *FORMATS)
    yield from (path for end in endings if (path := folder / f"targets{end}").exists())
    inside = folder / "targets"
    if inside.is_dir():
        yield from sorted(path for path in inside.iterdir() if path.suffix in endings)


def _text(path: Path, faults: list[Fault]) -> str | None:
    """Return a file's text, or None with the fault noted."""
    try:
        if path.is_file() and path.stat().st_size > LARGEST_BYTES:
            what = f"{path.stat().st_size} bytes, expected at most {LARGEST_BYTES}"
            faults.append(Fault(path, 1, "", what))
            return None
        return path.read_bytes().decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = error.object[: error.start].count(b"\n") + 1
        faults.append(Fault(path, line, "", "not UTF-8, expected a text file in UTF-8"))
    except FileNotFoundError:
        faults.append(Fault(path, 1, "", "is missing, expected a file"))
    except OSError as error:
        faults.append(Fault(path, 1, "", f"{error.strerror}, expected a file that can be read"))
    return None


def _tables(path: Path, faults: list[Fault]) -> tuple[dict[str, Any], LineFinder] | None:
    """Return a TOML file's tables and a finder of lines in it, or None with the fault noted."""
    text = _text(path, faults)
    if text is None:
        return None
    try:
        return tomllib.loads(text), LineFinder(text)
    except (ValueError, RecursionError) as error:
        line, what = split_syntax_error(str(error))
        faults.append(Fault(path, line, "", f"{what}, expected TOML"))
        return None


def _checked(
    values: object, model: type[Model], key: KeyPath, path: Path, line_of: Callable[[KeyPath], int]
) -> tuple[Model | None, list[Fault]]:
    """Return a table as its model, or None and what is wrong with it."""
    try:
        return model.model_validate(values, by_alias=True, by_name=False), []
    except ValidationError as error:
        return None, [
            Fault(path, line_of((*key, *where)), key_text((*key, *where)), what)
            for where, what in problems(error, model)
        ]


def _observatory(path: Path, faults: list[Fault]) -> tuple[Observatory | None, tuple[str, ...]]:
    """Return the observatory, and the names in its wheel even if something else is wrong in it."""
    read = _tables(path, faults)
    if read is None:
        return None, ()
    tables, finder = read
    observatory, found = _checked(tables, Observatory, (), path, finder.line_of)
    faults += found
    filters = tables.get("filter")
    wheel = (
        [each.get("name") for each in filters if isinstance(each, dict)]
        if isinstance(filters, list)
        else []
    )
    return observatory, tuple(name for name in wheel if isinstance(name, str))


def _from_toml(path: Path, faults: list[Fault]) -> list[_Found]:
    """Return what is sound in one targets.toml; the faults of the rest are noted."""
    read = _tables(path, faults)
    if read is None:
        return []
    tables, finder = read
    found: list[_Found] = []
    for name, items in tables.items():
        model = _MODELS.get(name)
        if model is None or not isinstance(items, list):
            what = (
                f"unknown key, expected [[programme]] or [[target]]{nearest(name, _MODELS)}"
                if model is None
                else f"{shown(items)}, expected a list of tables, [[{name}]]"
            )
            faults.append(Fault(path, finder.line_of((name,)), key_text((name,)), what))
            continue
        for place, values in enumerate(items):
            key: KeyPath = (name, place)
            item, wrong = _checked(values, model, key, path, finder.line_of)
            faults += wrong
            if item is not None:
                found.append(_Found(item, path, finder, key))
    return found


def _from_table(path: Path, faults: list[Fault]) -> list[_Found]:
    if _text(path, faults) is None:
        return []
    try:
        rows = read_rows(path)
    except ValueError as error:
        faults.append(Fault(path, 1, "", f"{error}, expected a table with one row a target"))
        return []
    found = []
    for place, (line, values) in enumerate(rows):
        key: KeyPath = ("row", place)
        where = _OneLine(line)
        target, wrong = _checked(values, Target, key, path, where.line_of)
        faults += wrong
        if target is not None:
            found.append(_Found(target, path, where, key))
    return found


def _check_names(found: list[_Found], faults: list[Fault]) -> None:
    programmes = {each.item.name for each in found if isinstance(each.item, Programme)}
    first: dict[tuple[type, str], _Found] = {}
    for each in found:
        before = first.setdefault((type(each.item), each.item.name), each)
        if before is not each:
            place = f"{before.path}:{before.line}"
            what = f"{shown(each.item.name)} stands at {place} already, expected each name once"
            faults.append(each.fault(what, "name"))
        if isinstance(each.item, Target) and programmes:
            name = each.item.programme
            if name and name not in programmes:
                what = f"{shown(name)}, expected a [[programme]]{nearest(name, programmes)}"
                faults.append(each.fault(what, "programme"))


def _check_filters(found: list[_Found], wheel: tuple[str, ...], faults: list[Fault]) -> None:
    for each in found:
        if not isinstance(each.item, Target) or not wheel:
            continue
        for place, planned in enumerate(each.item.exposures):
            if planned.filter not in wheel:
                what = (
                    f"{shown(planned.filter)} is not in the wheel, expected one of "
                    f"{', '.join(wheel)}{nearest(planned.filter, wheel)}"
                )
                faults.append(each.fault(what, "exposures", place, "filter"))
