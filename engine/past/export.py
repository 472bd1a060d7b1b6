"""Answers as CSV: one line a dataclass, moments in ISO UTC, units in the names of the columns."""

from __future__ import annotations

import csv
import io
import json
from collections.abc import Sequence
from dataclasses import fields, is_dataclass
from pathlib import Path
from typing import Any

from engine.errors import WarmroomError
from engine.times import iso_from_mjd

MJD = "_mjd"


def as_csv(rows: Sequence[Any]) -> str:
    """Return dataclasses of one kind as CSV; the fields of one within another get its name first.

    What has no number is empty; what is a table or list stands as JSON.
    """
    text = io.StringIO()
    records = [_record(row) for row in rows]
    names = list(dict.fromkeys(name for record in records for name in record))
    writer = csv.DictWriter(text, names, restval="", lineterminator="\n")
    writer.writeheader()
    writer.writerows(records)
    return text.getvalue()


def write_csv(path: Path, rows: Sequence[Any]) -> None:
    """Write `as_csv` into a new file; WarmroomError when it can't be, or when there is one."""
    try:
        with path.open("x", encoding="utf-8", newline="") as file:
            file.write(as_csv(rows))
    except FileExistsError:
        raise WarmroomError(f"{path} is there already; nothing was written") from None
    except OSError as error:
        raise WarmroomError(f"{path}: {error.strerror}; nothing was written") from None


def _record(row: Any) -> dict[str, object]:
    record: dict[str, object] = {}
    for each in fields(row):
        value = getattr(row, each.name)
        if is_dataclass(value) and not isinstance(value, type):
            record |= {f"{each.name}_{name}": inner for name, inner in _record(value).items()}
        elif each.name == "mjd" or each.name.endswith(MJD):
            name = each.name.removesuffix(MJD) if each.name != "mjd" else "time"
            record[name] = "" if value is None or value != value else iso_from_mjd(value)
        else:
            record[each.name] = _cell(value)
    return record


def _cell(value: object) -> object:
    if value is None:
        return ""
    if isinstance(value, dict | list | tuple):
        return json.dumps(value, ensure_ascii=False)
    return value
