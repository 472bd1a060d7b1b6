"""A target typed in one line: coordinates, what to expose, perhaps a name.

``05:34:31.9 +22:00:52 V:60x5 R:60x5 SN in NGC 1``. Coordinates stand first, as hours and degrees
with colons, blanks or nothing between (``053431.9 +220052``), or as degrees with a decimal point;
exposures are written as in a table of targets; what is left is the name.
"""

from __future__ import annotations

import re
from collections.abc import Sequence

from pydantic import ValidationError

from engine.logbook.faults import key_text, problems
from engine.logbook.targets import EXPOSURES_WORD, Target
from engine.logbook.text import nearest, shown

_COORDINATES = re.compile(
    r"(?P<ra>[0-9]{1,3}\.[0-9]+|[0-9]{1,2}[: ][0-9]{1,2}(?:[: ][0-9]{1,2}(?:\.[0-9]*)?)?"
    r"|[0-9]{6}(?:\.[0-9]*)?)"
    r" *(?P<dec>[+-][0-9]{1,2}\.[0-9]+|[+-][0-9]{1,2}[: ][0-9]{1,2}(?:[: ][0-9]{1,2}(?:\.[0-9]*)?)?"
    r"|[+-][0-9]{6}(?:\.[0-9]*)?)(?= |\Z)"
)
_RUN_TOGETHER = re.compile(r"([+-]?)([0-9]{2})([0-9]{2})([0-9]{2}(?:\.[0-9]*)?)\Z")
EXPECTED_COORDINATES = "coordinates such as 05:34:31.9 +22:00:52 first, the second with its sign"
EXPECTED_EXPOSURES = "exposures such as V:60x5"
# Who breaks into a night does it for something that can't wait.
PRIORITY = 5


def typed_target(text: str, wheel: Sequence[str], priority: int = PRIORITY) -> Target:
    """Return the target that a line stands for; ValueError says what was expected.

    ``wheel`` holds the filters there are. Without a name it is called by its coordinates.
    """
    text = " ".join(text.split())
    found = _COORDINATES.match(text)
    if found is None:
        raise ValueError(f"expected {EXPECTED_COORDINATES}")
    words = text[found.end() :].split()
    plan = [match for word in words if (match := EXPOSURES_WORD.match(word))]
    if not plan:
        raise ValueError(f"expected {EXPECTED_EXPOSURES} behind the coordinates")
    for each in plan:
        if each[1] not in wheel:
            near = nearest(each[1], wheel) or f", expected one of {', '.join(wheel)}"
            raise ValueError(f"no filter is called {shown(each[1])}{near}")
    name = " ".join(word for word in words if not EXPOSURES_WORD.match(word))
    try:
        target = Target.model_validate(
            {
                "name": name or "?",
                "ra": _angle(found["ra"]),
                "dec": _angle(found["dec"]),
                "priority": priority,
                "exposures": [
                    {"filter": each[1], "seconds": float(each[2]), "count": int(each[3])}
                    for each in plan
                ],
            }
        )
    except ValidationError as error:
        raise ValueError(_first(error)) from None
    return target if name else target.model_copy(update={"name": _called(target)})


def _angle(text: str) -> str | float:
    """Return an angle as a logbook file would hold it."""
    together = _RUN_TOGETHER.match(text)
    if together is not None:
        sign, *parts = together.groups()
        return f"{sign}{':'.join(parts)}"
    return text.replace(" ", ":") if ":" in text or " " in text else float(text)


def _called(target: Target) -> str:
    """Return a name by coordinates: hours and minutes, degrees and minutes."""
    ra_min = round(target.ra_deg * 4.0) % 1440
    dec_min = round(abs(target.dec_deg) * 60.0)
    sign = "-" if target.dec_deg < 0 else "+"
    return f"T {ra_min // 60:02d}{ra_min % 60:02d}{sign}{dec_min // 60:02d}{dec_min % 60:02d}"


def _first(error: ValidationError) -> str:
    """Return the first fault of a target that was typed, in one line."""
    path, what = next(problems(error, Target))
    return f"{key_text(path, None)}: {what}"
