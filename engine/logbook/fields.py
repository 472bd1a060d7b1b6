"""One key of a target, typed by a person: its value as a file would give it, or what is wrong."""

from __future__ import annotations

import re
from collections.abc import Sequence

from pydantic import ValidationError

from engine.logbook.faults import KeyPath, field_key, key_text, problems
from engine.logbook.load import Logbook
from engine.logbook.tables import value_from_text
from engine.logbook.targets import EXPOSURES_WORD, Target
from engine.logbook.text import nearest, shown

# A target that is sound, for the check of one key at a time.
_SOUND: dict[str, object] = {
    "name": "?",
    "ra": 0.0,
    "dec": 0.0,
    "exposures": [{"filter": "?", "seconds": 1.0, "count": 1}],
}
# Keys whose soundness hangs on each other: the loader sees them together.
_TOGETHER = frozenset({"visits", "least_gap_min", "greatest_gap_min"})
FIELDS: tuple[str, ...] = tuple(field_key(name, each) for name, each in Target.model_fields.items())
_TEXT = frozenset({"name", "programme", "role"})
_COORDINATES = re.compile(r"(?P<ra>.*[^\s,])[\s,]*(?P<dec>[+-].*)\Z")


def typed_field(key: str, text: str, logbook: Logbook) -> object:
    """Return what was typed for a key of a target; ValueError says what was expected.

    Nothing typed takes an optional key away: None.
    """
    text = " ".join(text.split())
    known = {field_key(name, each): each for name, each in Target.model_fields.items()}[key]
    if not text:
        if known.is_required():
            raise ValueError(f"expected {known.description}")
        return None
    if key in ("ra", "dec"):
        return _angle(key, text)
    value = text if key in _TEXT else value_from_text(key, text)
    if key == "exposures":
        _check_exposures(text, [each.name for each in logbook.observatory.filters])
    programmes = [each.name for each in logbook.programmes]
    if key == "programme" and programmes and text not in programmes:
        listed = ", ".join(programmes)
        raise ValueError(f"no such programme{nearest(text, programmes) or f', expected {listed}'}")
    _check(key, value)
    return value


def typed_place(text: str) -> tuple[object, object]:
    """Return right ascension and declination typed in one line; ValueError says what is wrong.

    Hours and degrees with colons or blanks, or degrees; the declination has its sign.
    """
    found = _COORDINATES.match(" ".join(text.split()))
    if found is None:
        raise ValueError("expected 08:51:18 +11:48:00, with its sign")
    return _angle("ra", found["ra"]), _angle("dec", found["dec"])


def _angle(key: str, text: str) -> object:
    text = text.strip(" ,")
    sexagesimal = text.replace(" ", ":")
    value: object = sexagesimal
    if ":" not in sexagesimal:
        try:
            value = float(text)
        except ValueError:
            value = text
    _check(key, value)
    return value


def _check_exposures(text: str, wheel: Sequence[str]) -> None:
    for word in text.split():
        found = EXPOSURES_WORD.match(word)
        if found is None:
            raise ValueError(f"{shown(word)}, expected such as V:60x5 B:120x3")
        if found[1] not in wheel:
            near = nearest(found[1], wheel) or f", expected one of {', '.join(wheel)}"
            raise ValueError(f"no filter is called {shown(found[1])}{near}")


def _check(key: str, value: object) -> None:
    """Say what is wrong with one value of a target that is sound otherwise."""
    others: dict[str, object] = {}
    if key in _TOGETHER and value != 1:
        others = {"visits": 2, "least_gap_min": 1e-3}
    try:
        Target.model_validate({**_SOUND, **others, key: value})
    except ValidationError as error:
        raise ValueError(_said(next(iter(problems(error, Target))))) from None


def _said(problem: tuple[KeyPath, str]) -> str:
    path, what = problem
    return what if len(path) <= 1 else f"{key_text(path, None)}: {what}"
