"""Targets from tables: CSV, ECSV and VOTable, one row a target, through astropy.

Columns have the names of the keys of ``[[target]]``. Exposures are written ``B:120x5 V:60x5``,
windows ``2027-03-14T11:00:00Z/2027-03-14T12:20:00Z``, several of either with blanks between. An
empty cell is a key left out.
"""

from __future__ import annotations

import re
import warnings
from datetime import datetime
from pathlib import Path
from typing import Any

FORMATS = {".csv": "ascii.csv", ".ecsv": "ascii.ecsv", ".vot": "votable"}

_EXPOSURES = re.compile(r"(\S+):(\d+(?:\.\d*)?)x(\d+)\Z")
_TEXT_KEYS = ("name", "programme", "role")
_WHOLE_KEYS = ("priority",)


def read_rows(path: Path) -> list[tuple[int, dict[str, Any]]]:
    """Return the rows of a table as (line, keys and values) pairs, values as TOML would give them.

    The line is that of the row in the file; 1 in a VOTable, whose rows have no lines of their own.
    ValueError, with the reason, when the file is no such table.
    """
    from engine.positions import prepare_astropy

    prepare_astropy()
    from astropy.table import Table

    # Everything as text where the format allows: a name may look like a number.
    options = (
        {} if path.suffix == ".vot" else {"fast_reader": False} if path.suffix == ".csv" else {}
    )
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")
            table = Table.read(path, format=FORMATS[path.suffix], **options)
    except Exception as error:  # noqa: BLE001 - astropy's readers raise whatever a bad file provokes
        reason = str(error).strip().splitlines() or [type(error).__name__]
        raise ValueError(f"no {path.suffix[1:]} table: {reason[0][:120]}") from None
    first = 1 if path.suffix == ".vot" else _first_row_line(path)
    step = 0 if path.suffix == ".vot" else 1
    return [(first + step * number, _row(table.colnames, row)) for number, row in enumerate(table)]


def _first_row_line(path: Path) -> int:
    """Return the line of the first row: the one behind the head, which follows any comments."""
    lines = path.read_text(encoding="utf-8-sig").splitlines()
    head = next(i for i, line in enumerate(lines) if line.strip() and not line.startswith("#"))
    return head + 2


def _row(names: list[str], row: Any) -> dict[str, Any]:
    import numpy as np

    values: dict[str, Any] = {}
    for name in names:
        cell = row[name]
        if cell is np.ma.masked or str(cell).strip() in ("", "--"):
            continue
        values[name] = _value(name, cell.item() if hasattr(cell, "item") else cell)
    return values


def _value(key: str, cell: Any) -> Any:
    if isinstance(cell, bytes):
        cell = cell.decode("utf-8", "replace")
    if key in _TEXT_KEYS:
        return str(cell).strip()
    if key == "exposures":
        return [_exposures(part) for part in str(cell).split()]
    if key == "windows":
        return [_window(part) for part in str(cell).split()]
    if key in _WHOLE_KEYS and isinstance(cell, float) and cell.is_integer():
        return int(cell)
    return cell.strip() if isinstance(cell, str) else cell


def _exposures(text: str) -> Any:
    found = _EXPOSURES.match(text)
    if found is None:
        return text
    return {"filter": found[1], "seconds": float(found[2]), "count": int(found[3])}


def _window(text: str) -> Any:
    begin, _, end = text.partition("/")
    try:
        return [datetime.fromisoformat(begin), datetime.fromisoformat(end)]
    except ValueError:
        return text
