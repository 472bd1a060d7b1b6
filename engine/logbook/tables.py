"""Targets from tables: CSV, ECSV and VOTable, one row a target, through astropy.

Columns have the names of the keys of ``[[target]]``. Exposures are written ``B:120x5 V:60x5``,
windows ``2027-03-14T11:00:00Z/2027-03-14T12:20:00Z``, several of either with blanks between. An
empty cell is a key left out. A column of numbers that says its unit (ECSV, VOTable) is turned into
the key's own.
"""

from __future__ import annotations

import csv
import io
import re
import warnings
from dataclasses import dataclass, field
from datetime import datetime
from typing import Any

from engine.logbook.faults import KeyPath, expected, field_key, unknown
from engine.logbook.files import Unreadable
from engine.logbook.targets import EXPOSURES_WORD, Target
from engine.logbook.text import one_line
from engine.logbook.votable import scan_votable

MOST_COLUMNS = 100
# The head of an ECSV is YAML, and its reader is slow.
LONGEST_HEAD = 20_000

_FIELDS = {field_key(name, each): each for name, each in Target.model_fields.items()}
_TEXT_KEYS = frozenset({"name", "programme", "role"})
_WHOLE_KEYS = frozenset({"priority", "visits"})
_YES_OR_NO = frozenset({"each_night"})
_WHOLE = re.compile(r"[+-]?[0-9]{1,18}\Z")
_ASTROPY_PLACE = re.compile(r"[^\s:]*:([0-9]+):[0-9]+: (?:[WE][0-9]+: )?")
_DELIMITER = re.compile(r"^# delimiter: '?(,|\s)", re.MULTILINE)


@dataclass(frozen=True, slots=True)
class TargetTable:
    """The rows of a table as TOML would give them, and what is wrong with the table itself."""

    rows: list[dict[str, Any]]
    head_line: int
    row_lines: list[int]
    problems: list[tuple[KeyPath, str]] = field(default_factory=list)
    refused: set[str] = field(default_factory=set)  # columns missing or in a wrong unit: told once

    def line_of(self, path: KeyPath) -> int:
        """Return the line of the row in which a path stands; the head's for any other."""
        match path:
            case ("target", int() as place, *_) if place < len(self.row_lines):
                return self.row_lines[place]
        return self.head_line

    def refuse(self, column: str, what: str) -> None:
        """Note what is wrong with a whole column; its rows have nothing more to say."""
        self.problems.append(((column,), what))
        self.refused.add(column)


def read_table(text: str, ending: str) -> TargetTable:
    """Return the table in the text of a ``.csv``, ``.ecsv`` or ``.vot`` file.

    Unreadable, with the reason, when it is no such table.
    """
    if ending == ".vot":
        head_line, row_lines = scan_votable(text)
        table = _through_astropy(io.BytesIO(text.encode()), "votable", use_names_over_ids=True)
    else:
        lines = text.replace("\r\n", "\n").split("\n")
        head_line, row_lines = _scan_lines(lines, ending)
        options = {} if ending == ".ecsv" else {"fast_reader": False, "converters": _as_text()}
        table = _through_astropy(lines, f"ascii.{ending[1:]}", guess=False, **options)
    found = TargetTable([{} for _ in range(len(table))], head_line, row_lines)
    for name in table.colnames:
        _take_column(name, table[name], found)
    for name, known in _FIELDS.items():
        if known.is_required() and name not in table.colnames:
            found.refuse(name, f"no such column, expected one ({known.description})")
    return found


def _through_astropy(source: Any, form: str, **options: Any) -> Any:
    from astropy.table import Table

    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")
            return Table.read(source, format=form, **options)
    except Exception as error:  # noqa: BLE001 - astropy's readers raise whatever a bad file provokes
        place = _ASTROPY_PLACE.match(str(error))
        line = max(int(place[1]), 1) if place else 1
        reason = one_line(str(error)[place.end() if place else 0 :], 120) or type(error).__name__
        raise Unreadable(f"{reason}, expected a table with one row a target", line) from None


def _as_text() -> dict[str, Any]:
    """Return the converters that keep each cell of a CSV as it stands: a name may be a number."""
    from astropy.io.ascii import convert_numpy

    return {"*": [convert_numpy(str)]}


def _scan_lines(lines: list[str], ending: str) -> tuple[int, list[int]]:
    """Return the lines (from 1) of the head and of each row; Unreadable when cells do not fit."""
    skipped, delimiter = 0, ","
    if ending == ".ecsv":
        skipped = next((n for n, line in enumerate(lines) if not line.startswith("#")), len(lines))
        head = "\n".join(lines[:skipped])
        if len(head) > LONGEST_HEAD:
            raise Unreadable("too long a head, expected the short description of a few columns")
        given = _DELIMITER.search(head)
        delimiter = given[1] if given else " "
    found: list[tuple[int, int]] = []
    reader = csv.reader((f"{line}\n" for line in lines[skipped:]), delimiter=delimiter)
    while True:
        line = skipped + reader.line_num + 1
        try:
            cells = next(reader)
        except StopIteration:
            break
        except csv.Error as error:
            raise Unreadable(f"{one_line(str(error))}, expected cells of a table", line) from None
        if len(cells) > 1 or any(each.strip() for each in cells):
            found.append((line, len(cells)))
    if not found:
        raise Unreadable("no head, expected a line with the names of the columns")
    head_line, width = found[0]
    if width > MOST_COLUMNS:
        raise Unreadable(f"{width} columns, expected the keys of [[target]]", head_line)
    other = next((each for each in ";\t" if each in lines[head_line - 1]), None)
    if width == 1 and other:
        raise Unreadable(f"cells apart by {other!r}, expected commas", head_line)
    for line, count in found[1:]:
        if count > width or (ending == ".ecsv" and count != width):
            raise Unreadable(f"{count} cells, expected {width} as in the head", line)
    return head_line, [line for line, _ in found[1:]]


def _take_column(name: str, column: Any, table: TargetTable) -> None:
    """Put the cells of a column into the rows; what is wrong with the column is noted."""
    known = _FIELDS.get(name)
    if known is None:
        table.refuse(name, unknown(name, list(_FIELDS)))
        return
    cells = column.tolist() if hasattr(column, "tolist") else list(column)
    factor = 1.0
    if getattr(column, "unit", None) is not None and column.dtype.kind in "iuf":
        wanted = str((known.json_schema_extra or {}).get("unit", ""))  # type: ignore[union-attr]
        found = _factor(column.unit, wanted)
        if found is None:
            unit = one_line(str(column.unit), 20)
            table.refuse(name, f"in '{unit}', expected {expected(known)}")
            return
        factor = found
    for row, cell in zip(table.rows, cells, strict=False):
        value = _value(name, cell, factor)
        if value is not None:
            row[name] = value


def _factor(unit: Any, wanted: str) -> float | None:
    """Return what turns numbers of a unit into the wanted one; None when nothing does."""
    from astropy import units

    try:
        return float(unit.to(units.Unit(wanted))) if wanted else None
    except (ValueError, TypeError, units.UnitsError):
        return None


def _value(key: str, cell: Any, factor: float) -> Any:
    """Return a cell as TOML would give it; None for an empty one."""
    if isinstance(cell, bytes):
        cell = cell.decode("utf-8", "replace")
    if key in _TEXT_KEYS:
        return str(cell).strip() or None if cell is not None else None
    if isinstance(cell, str):
        return _as_wanted(key, value_from_text(key, cell.strip()))
    if isinstance(cell, float | int) and not isinstance(cell, bool) and factor != 1.0:
        cell = cell * factor
    return _as_wanted(key, cell)


def _as_wanted(key: str, value: Any) -> Any:
    """Return a number as TOML would give it where a table's column had to make it another."""
    if key in _YES_OR_NO and value in (0, 1):
        return bool(value)
    if isinstance(value, float) and key in _WHOLE_KEYS and value.is_integer():
        return int(value)
    return value


def value_from_text(key: str, cell: str) -> Any:
    """Return what the text of a cell stands for, as TOML would give it; None for nothing."""
    if not cell:
        return None
    if key in _YES_OR_NO and cell.casefold() in ("true", "false"):
        return cell.casefold() == "true"
    if key == "exposures":
        return [_exposures(part) for part in cell.split()]
    if key == "windows":
        return [_window(part) for part in cell.split()]
    if _WHOLE.match(cell):
        return int(cell)
    try:
        return float(cell)
    except ValueError:
        return cell


def _exposures(text: str) -> Any:
    found = EXPOSURES_WORD.match(text)
    if found is None:
        return text
    return {"filter": found[1], "seconds": float(found[2]), "count": int(found[3])}


def _window(text: str) -> Any:
    begin, _, end = text.partition("/")
    try:
        return [datetime.fromisoformat(begin), datetime.fromisoformat(end)]
    except ValueError:
        return text
