"""The keys of the logbook's files as rows, read off the models, for the reference page."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from pydantic import BaseModel
from pydantic.fields import FieldInfo

from engine.logbook.faults import expected, field_key, model_in
from engine.logbook.observatory import Observatory
from engine.logbook.targets import Programme, Target
from engine.logbook.text import shown

REQUIRED = "required"


@dataclass(frozen=True, slots=True)
class ReferenceRow:
    """One key of a file: in which table, in which unit, what it takes, and what it is for."""

    file: str
    table: str
    key: str
    unit: str
    expects: str
    default: str
    help: str


def reference_rows() -> list[ReferenceRow]:
    """Return a row for every key of ``observatory.toml`` and ``targets.toml``, in their order."""
    rows: list[ReferenceRow] = []
    for name, field in Observatory.model_fields.items():
        table = model_in(field.annotation)
        if table is not None:
            many = table is not field.annotation
            key = field_key(name, field)
            header = f"[[{key}]]" if many else f"[{key}]"
            rows += _rows("observatory.toml", header, table)
    rows += _rows("targets.toml", "[[programme]]", Programme)
    rows += _rows("targets.toml", "[[target]]", Target)
    return rows


def _rows(file: str, table: str, model: type[BaseModel]) -> Iterator[ReferenceRow]:
    for name, field in model.model_fields.items():
        key = field_key(name, field)
        unit = (
            field.json_schema_extra.get("unit") if isinstance(field.json_schema_extra, dict) else ""
        )
        yield ReferenceRow(
            file,
            table,
            key,
            str(unit or ""),
            expected(field),
            _default(field),
            field.description or "",
        )
        inside = model_in(field.annotation)
        if inside is not None:
            yield from _rows(file, f"{table} {key}", inside)


def _default(field: FieldInfo) -> str:
    if field.is_required():
        return REQUIRED
    return "none" if field.default in (None, (), "") else shown(field.default)
