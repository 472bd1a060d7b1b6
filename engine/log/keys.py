"""The key table: how an event's fields stand in the file, read off its dataclass.

A field named ``..._mjd`` is a UTC date-time under the name without that ending (``t_mjd`` is ``t``,
``start_mjd`` is ``start``); None, False and empty text are left out; tuples are lists. Floats are
always written as floats, so that readers with typed columns never meet an integer in one.
"""

from __future__ import annotations

import math
import types
import typing
from dataclasses import MISSING, dataclass, fields, replace
from datetime import datetime
from typing import Any

from engine.log.events import KINDS, Amendment, Event, Foreign
from engine.log.values import INT_BITS, Value
from engine.times import datetime_from_mjd, mjd_from_datetime

MJD = "_mjd"
GREATEST_INT = 2**INT_BITS
# No night has more entries: a greater number was damaged, and to go on behind it would be folly.
GREATEST_N = 10**9


@dataclass(frozen=True, slots=True)
class Key:
    """One key of a kind: the field behind it, what may stand there, whether it must."""

    name: str
    field: str
    type: type
    is_list: bool
    is_required: bool


def _keys_of(kind: type[Event]) -> dict[str, Key]:
    """Return the keys of a kind by name, in the order in which they are written."""
    hints = typing.get_type_hints(kind)
    table: dict[str, Key] = {}
    for each in fields(kind):
        if each.name == "extra":
            continue
        hint = hints[each.name]
        parts = typing.get_args(hint) if isinstance(hint, types.UnionType) else (hint,)
        first = next(part for part in parts if part is not types.NoneType)
        is_list = typing.get_origin(first) is tuple
        inner = typing.get_args(first)[0] if is_list else first
        name = each.name.removesuffix(MJD)
        made = datetime if each.name.endswith(MJD) else inner
        is_required = each.default is MISSING or each.name in ("n", "t_mjd")
        table[name] = Key(name, each.name, made, is_list, is_required)
    return table


KEYS: dict[str, dict[str, Key]] = {name: _keys_of(kind) for name, kind in KINDS.items()}

_STAMP = ("n", "t")
# What is read off the file behind number and moment, which are the same for all kinds.
_BODY = {
    kind: {name: key for name, key in table.items() if name not in _STAMP}
    for kind, table in KEYS.items()
}
_REQUIRED = {
    kind: tuple(key for key in table.values() if key.is_required) for kind, table in _BODY.items()
}


def to_values(event: Event) -> tuple[str, dict[str, Value]]:
    """Return an event's kind and its keys and values as they stand in the file.

    ValueError for a value that can't stand there: not finite, or not of its key's type.
    """
    if isinstance(event, Foreign):
        return event.kind_in_file, {"n": event.n, "t": _moment(event.t_mjd, "t"), **event.extra}
    values: dict[str, Value] = {}
    for key in KEYS[event.kind].values():
        value = getattr(event, key.field)
        if not key.is_required and (value is None or value is False or value in ("", ())):
            continue
        values[key.name] = (
            [_written(each, key) for each in value] if key.is_list else _written(value, key)
        )
    clash = values.keys() & event.extra.keys()
    if clash:
        raise ValueError(f"{sorted(clash)[0]} is a key of {event.kind} itself")
    return event.kind, values | event.extra


def _written(value: Any, key: Key) -> Value:
    if key.type is datetime:
        return _moment(value, key.name)
    if key.type is float:
        if not isinstance(value, int | float) or not math.isfinite(value):
            raise ValueError(f"{key.name} is {value!r}, expected a finite number")
        return float(value)
    if not isinstance(value, key.type) or (isinstance(value, bool) and key.type is not bool):
        raise ValueError(f"{key.name} is {value!r}, expected {key.type.__name__}")
    return typing.cast(Value, value)


def _moment(mjd: float, name: str) -> datetime:
    try:
        return datetime_from_mjd(mjd)
    except (ValueError, OverflowError):
        raise ValueError(f"{name} is {mjd!r}, expected a time (UTC MJD)") from None


def from_values(kind: str, values: dict[str, Value]) -> Event:
    """Return the event that keys and values of a kind stand for; never raises.

    One of an unknown kind, or without a key that its kind needs, comes back as `Foreign` with the
    complaint. A value that does not fit an optional key is kept in ``extra``.
    """
    stamp, said = _stamp(values)
    made = KINDS.get(kind)
    if made is None:
        return Foreign(**stamp, kind_in_file=kind, complaint="unknown kind", extra=said)
    arguments, extra = _arguments(kind, said)
    for key in _REQUIRED[kind]:
        if key.field not in arguments:
            what = f"{key.name} is {'of the wrong type' if key.name in said else 'missing'}"
            return Foreign(**stamp, kind_in_file=kind, complaint=what, extra=said)
    return made(**stamp, **arguments, extra=extra)


def changed(event: Event, changes: dict[str, Value]) -> Event:
    """Return an event with other values, by key; those that don't fit its kind are passed over."""
    if isinstance(event, Foreign):
        return event
    arguments, _ = _arguments(event.kind, changes)
    return replace(event, **arguments) if arguments else event


def _arguments(kind: str, said: dict[str, Value]) -> tuple[dict[str, Any], dict[str, Value]]:
    """Return the values that fit their keys, by field, and the rest as it is."""
    table = _BODY[kind]
    arguments: dict[str, Any] = {}
    rest: dict[str, Value] = {}
    for name, value in said.items():
        key = table.get(name)
        if key is None:
            rest[name] = value
            continue
        read = _read_list(value, key) if key.is_list else _read(value, key)
        if read is None:
            rest[name] = value
        else:
            arguments[key.field] = read
    return arguments, rest


def complaints(event: Event) -> tuple[str, ...]:
    """Return what does not fit its kind in an event as it was read, a phrase each."""
    if isinstance(event, Foreign):
        return (event.complaint,)
    if not event.extra or isinstance(event, Amendment):
        return ()
    table = KEYS[event.kind]
    return tuple(
        f"{name} is of the wrong type" if name in table else f"{name} is an unknown key; kept"
        for name in event.extra
    )


def _stamp(values: dict[str, Value]) -> tuple[dict[str, Any], dict[str, Value]]:
    """Return number and moment of an entry, and all its other keys.

    The number is 0 and the moment NaN where there is none to read.
    """
    said = dict(values)
    n, t = said.pop("n", None), said.pop("t", None)
    is_number = type(n) is int and 0 < n <= GREATEST_N
    is_moment = isinstance(t, datetime) and t.tzinfo is not None
    stamp = {
        "n": n if is_number else 0,
        "t_mjd": mjd_from_datetime(t) if is_moment else math.nan,  # type: ignore[arg-type]
    }
    if n is not None and not is_number:
        said["n"] = n
    if t is not None and not is_moment:
        said["t"] = t
    return stamp, said


def _read_list(value: Value, key: Key) -> tuple[Any, ...] | None:
    if not isinstance(value, list):
        return None
    parts = [_read(each, key) for each in value]
    return None if None in parts else tuple(parts)


def _read(value: Any, key: Key) -> Any:
    """Return a value as its field holds it; None when it does not fit."""
    found = type(value)
    if found is not key.type:
        is_number = found is int and key.type is float and abs(value) < GREATEST_INT
        return float(value) if is_number else None
    if found is float:
        return value if math.isfinite(value) else None
    if found is datetime:
        return mjd_from_datetime(value) if value.tzinfo else None
    return value
