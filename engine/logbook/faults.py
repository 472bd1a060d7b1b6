"""What a validator found, said to a person: what is wrong, and what was expected.

A key is shown as a dotted path. An item of a list is called by its name where it has one, because
that is what a person looks for: ``target['M 67'].exposures[2].filter``; otherwise by its place,
counted from 1.
"""

from __future__ import annotations

import types
import typing
from collections.abc import Iterable, Iterator, Mapping
from typing import Any

import annotated_types
from pydantic import BaseModel, ValidationError
from pydantic.fields import FieldInfo

from engine.logbook.text import NAME_LENGTH, nearest, shown, visible

__all__ = [
    "KeyPath",
    "Misfits",
    "expected",
    "field_key",
    "key_text",
    "model_in",
    "nearest",
    "problems",
    "unknown",
]

KeyPath = tuple[str | int, ...]

SHORT_LIST = 12

UNIT_WORDS = {
    "deg": "degrees",
    "m": "metres",
    "h": "hours",
    "s": "seconds",
    "min": "minutes",
    "arcsec": "arcseconds",
    "%": "percent",
    "mag": "magnitudes",
    "um": "micrometres",
    "nm": "nanometres",
    "yr": "years",
    "electron": "electrons",
    "adu": "counts",
    "deg/s": "degrees per second",
    "electron/s": "electrons per second",
    "electron/adu": "electrons per count",
    "mag/arcsec2": "magnitudes per square arcsecond",
    "m/s": "metres per second",
    "deg C": "degrees Celsius",
    "mas/yr": "milliarcseconds per year",
}


class Misfits(ValueError):
    """What a check of our own found wrong in one value: where inside it, and a sentence, each."""

    def __init__(self, parts: Iterable[tuple[KeyPath, str]]) -> None:
        self.parts = tuple(parts)
        super().__init__("; ".join(what for _, what in self.parts))


def problems(error: ValidationError, model: type[BaseModel]) -> Iterator[tuple[KeyPath, str]]:
    """Yield each problem a validator found as its path in the file and a sentence."""
    for each in error.errors(include_url=False):
        path = tuple(each["loc"])
        if each["type"] == "too_short" and each["input"]:
            continue  # pydantic counts the sound items alone; what is wrong with the others is told
        reason = each.get("ctx", {}).get("error")
        if isinstance(reason, Misfits):
            yield from (((*path, *inside), what) for inside, what in reason.parts)
        elif reason is not None:
            yield path, visible(str(reason))
        else:
            yield path, _sentence(each, path, model)


def key_text(path: KeyPath, values: object) -> str:
    """Return a path as it is shown, for the values of the file (or None) in which it stands."""
    text = ""
    for part in path:
        values = _inside(values, part)
        if isinstance(part, str):
            name = visible(part[:NAME_LENGTH])
            text += f".{name}" if text else name
            continue
        called = values.get("name") if isinstance(values, dict) else None
        text += f"[{shown(called)}]" if isinstance(called, str) and called else f"[{part + 1}]"
    return text


def expected(field: FieldInfo) -> str:
    """Return what a field takes, in words: ``degrees from -90 to 90``."""
    extra = field.json_schema_extra if isinstance(field.json_schema_extra, dict) else {}
    if extra.get("form"):
        return str(extra["form"])
    unit = str(extra.get("unit", ""))
    kind = next(part for part in _kinds(field.annotation) if part is not type(None))
    if typing.get_origin(kind) is typing.Literal:
        return "one of " + ", ".join(f"'{each}'" for each in typing.get_args(kind))
    if kind is str:
        return "text in quotes"
    if kind is bool:
        return "true or false"
    if kind not in (int, float):
        return "a table"
    words = UNIT_WORDS.get(unit, unit)
    if kind is int:
        words = f"a whole number of {words}" if words else "a whole number"
    return (words or "a number") + _range(field)


def field_key(name: str, field: FieldInfo) -> str:
    """Return the key of a field in the file."""
    return field.alias or name


def _inside(values: Any, part: str | int) -> object:
    try:
        return values[part]
    except (KeyError, IndexError, TypeError):
        return None


def _sentence(error: Mapping[str, Any], path: KeyPath, model: type[BaseModel]) -> str:
    kind, value = error["type"], error.get("input")
    if kind == "extra_forbidden":
        parent = _model_at(model, path[:-1])
        fields = parent.model_fields if parent else {}
        return unknown(str(path[-1]), [field_key(name, each) for name, each in fields.items()])
    field = _field_at(model, path)
    if field is None:
        return f"{shown(value)}, expected a table of keys"
    wanted = expected(field)
    if isinstance(path[-1], int):
        wanted = wanted.removeprefix("a list of ")
    if kind == "missing":
        note = f" ({field.description})" if field.description else ""
        return f"is missing, expected {wanted}{note}"
    if kind == "too_short":
        return f"an empty list, expected {wanted}"
    if kind == "string_too_short":
        return "an empty text, expected at least one character"
    if kind == "literal_error" and isinstance(value, str):
        choices = typing.get_args(field.annotation)
        return f"{shown(value)}, expected {wanted}{nearest(value, choices)}"
    quoted = " in quotes" if isinstance(value, str) and _is_numeric(value) else ""
    return f"{shown(value)}{quoted}, expected {wanted}"


def _is_numeric(text: str) -> bool:
    try:
        float(text)
    except ValueError:
        return False
    return True


def unknown(name: str, known: list[str]) -> str:
    """Return what is said of a name that is none of the known ones."""
    listed = ", ".join(known) if len(known) <= SHORT_LIST else f"the {len(known)} known ones"
    return f"unknown key, expected one of {listed}{nearest(name, known)}"


def _field_at(model: type[BaseModel], path: KeyPath) -> FieldInfo | None:
    places = [place for place, part in enumerate(path) if isinstance(part, str)]
    if not places:
        return None
    parent = _model_at(model, path[: places[-1]])
    if parent is None:
        return None
    wanted = path[places[-1]]
    return next((f for n, f in parent.model_fields.items() if field_key(n, f) == wanted), None)


def _model_at(model: type[BaseModel], path: KeyPath) -> type[BaseModel] | None:
    current: type[BaseModel] | None = model
    for part in path:
        if current is None or isinstance(part, int):
            continue
        field = next((f for n, f in current.model_fields.items() if field_key(n, f) == part), None)
        current = None if field is None else model_in(field.annotation)
    return current


def model_in(annotation: Any) -> type[BaseModel] | None:
    """Return the model that an annotation holds, as itself or in a list; None without one."""
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        return annotation
    return next((m for part in typing.get_args(annotation) if (m := model_in(part))), None)


def _kinds(annotation: Any) -> tuple[Any, ...]:
    is_union = isinstance(annotation, types.UnionType)
    return typing.get_args(annotation) if is_union else (annotation,)


def _range(field: FieldInfo) -> str:
    """Return `` from 1 to 5``, `` of more than 0``: what a field's limits say."""
    low, high, open_low, open_high = "", "", False, False
    for each in field.metadata:
        match each:
            case annotated_types.Ge(ge=limit):
                low = f"{limit:g}"
            case annotated_types.Gt(gt=limit):
                low, open_low = f"{limit:g}", True
            case annotated_types.Le(le=limit):
                high = f"{limit:g}"
            case annotated_types.Lt(lt=limit):
                high, open_high = f"{limit:g}", True
    above = f", more than {low}" if open_low else f" from {low}" if low else ""
    if not high:
        return above if open_low else f", {low} or more" if low else ""
    below = f"less than {high}" if open_high else high
    if not low:
        return f", {below} or less" if not open_high else f", {below}"
    return f"{above} and at most {below}" if open_low else f"{above} to {below}"
