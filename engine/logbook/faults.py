"""What a validator found, said to a person: what is wrong, and what was expected."""

from __future__ import annotations

import difflib
import types
import typing
from collections.abc import Mapping
from typing import Any

import annotated_types
from pydantic import BaseModel, ValidationError
from pydantic.fields import FieldInfo

from engine.logbook.text import visible

Path = tuple[str | int, ...]

_UNIT_WORDS = {
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
}
SHOWN = 60


def problems(error: ValidationError, model: type[BaseModel]) -> list[tuple[Path, str]]:
    """Return each problem a validator found as its path in the file and a sentence."""
    found = []
    for each in error.errors(include_url=False):
        path = tuple(each["loc"])
        found.append((path, _sentence(each, path, model)))
    return found


def key_text(path: Path) -> str:
    """Return a path as it is shown: ``target[3].exposures[1].filter``, places counted from 1."""
    text = ""
    for part in path:
        text += (
            f"[{part + 1}]"
            if isinstance(part, int)
            else f".{visible(part)}"
            if text
            else visible(part)
        )
    return text[:200]


def shown(value: object) -> str:
    """Return a value from a file as it is shown: short, on one line, nothing a terminal obeys."""
    text = visible(value if isinstance(value, str) else repr(value))
    text = text if len(text) <= SHOWN else text[:SHOWN] + "..."
    return f"'{text}'" if isinstance(value, str) else text


def nearest(name: str, known: typing.Iterable[str]) -> str:
    """Return ``, nearest is 'x'`` for the known name most like one, or nothing."""
    close = difflib.get_close_matches(name, list(known), n=1, cutoff=0.5)
    return f", nearest is '{close[0]}'" if close else ""


def _sentence(error: Mapping[str, Any], path: Path, model: type[BaseModel]) -> str:
    kind, value = error["type"], error.get("input")
    if kind == "extra_forbidden":
        parent = _model_at(model, path[:-1])
        known = [] if parent is None else [_key(n, f) for n, f in parent.model_fields.items()]
        return f"unknown key, expected one of the contract's{nearest(str(path[-1]), known)}"
    field = _field_at(model, path)
    if kind == "missing":
        return f"is missing, expected {_expected(field)}"
    if kind == "value_error":
        return visible(str(error["ctx"]["error"]))
    if kind in ("literal_error", "too_short"):
        return f"{shown(value)}, expected {error['ctx'].get('expected', 'at least one')}"
    return f"{shown(value)}, expected {_expected(field)}"


def _key(name: str, field: FieldInfo) -> str:
    return field.alias or name


def _field_at(model: type[BaseModel], path: Path) -> FieldInfo | None:
    names = [part for part in path if isinstance(part, str)]
    parent = _model_at(model, path[: path.index(names[-1])]) if names else None
    if parent is None:
        return None
    return next((f for n, f in parent.model_fields.items() if _key(n, f) == names[-1]), None)


def _model_at(model: type[BaseModel], path: Path) -> type[BaseModel] | None:
    current: type[BaseModel] | None = model
    for part in path:
        if current is None or isinstance(part, int):
            continue
        field = next((f for n, f in current.model_fields.items() if _key(n, f) == part), None)
        current = None if field is None else _model_in(field.annotation)
    return current


def _model_in(annotation: Any) -> type[BaseModel] | None:
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        return annotation
    for part in typing.get_args(annotation):
        found = _model_in(part)
        if found is not None:
            return found
    return None


def _expected(field: FieldInfo | None) -> str:
    """Return what a field takes, in words: ``degrees from -90 to 90 (geodetic latitude, ...)``."""
    if field is None:
        return "a table of keys"
    extra = field.json_schema_extra
    unit = str(extra.get("unit", "")) if isinstance(extra, dict) else ""
    what = _type_words(field.annotation, _UNIT_WORDS.get(unit, unit))
    note = f" ({field.description})" if field.description else ""
    return f"{what}{_range(field)}{note}"


def _type_words(annotation: Any, unit: str) -> str:
    parts = (
        typing.get_args(annotation) if isinstance(annotation, types.UnionType) else (annotation,)
    )
    kind = next(part for part in parts if part is not type(None))
    if typing.get_origin(kind) is typing.Literal:
        return "one of " + ", ".join(repr(each) for each in typing.get_args(kind))
    if _model_in(kind) is not None:
        return "a table" if isinstance(kind, type) else "a list of tables"
    words = {str: "text", int: "a whole number", float: "a number", bool: "true or false"}
    if kind not in words:
        return f"a list in {unit}" if unit else "a list"
    return f"{words[kind]} in {unit}" if unit and kind is not str else words[kind]


def _range(field: FieldInfo) -> str:
    said = []
    for each in field.metadata:
        match each:
            case annotated_types.Ge(ge=low):
                said.append(f"{low:g} or more")
            case annotated_types.Gt(gt=low):
                said.append(f"more than {low:g}")
            case annotated_types.Le(le=high):
                said.append(f"{high:g} or less")
            case annotated_types.Lt(lt=high):
                said.append(f"less than {high:g}")
    return (", " + " and ".join(said)) if said else ""
