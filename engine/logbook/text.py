"""Text from files, headers and keyboards is hostile until it has been through here."""

from __future__ import annotations

import difflib
import math
import unicodedata
from collections.abc import Iterable
from datetime import date, datetime, time

NAME_LENGTH = 80
NOTE_LENGTH = 10_000
SHOWN = 60
LOG10_2 = math.log10(2.0)

# Cc, Cf, Cs: control characters, invisible format marks (bidi, zero width), lone surrogates.
# Zl, Zp: the line separators that some terminals and parsers take for a new line.
_UNSAFE = frozenset({"Cc", "Cf", "Cs", "Zl", "Zp"})


def _is_unsafe(character: str) -> bool:
    return unicodedata.category(character) in _UNSAFE


def visible(text: str) -> str:
    r"""Return the text with everything a terminal could act on shown as an escape (``\x1b``)."""
    return "".join(
        character.encode("unicode_escape", "surrogatepass").decode("ascii")
        if _is_unsafe(character)
        else character
        for character in text
    )


def clean_name(text: str) -> str:
    """Return a name as Unicode composes it, so that what looks the same is the same.

    ValueError when it can't be shown safely on one line.
    """
    if any(_is_unsafe(character) for character in text):
        raise ValueError(f"{shown(text)}, expected no control or invisible characters")
    if len(text) > NAME_LENGTH:
        raise ValueError(f"{len(text)} characters, expected at most {NAME_LENGTH}")
    if text != text.strip():
        raise ValueError(f"{shown(text)}, expected no blanks at either end")
    return unicodedata.normalize("NFC", text)


def one_line(text: str, length: int = NOTE_LENGTH) -> str:
    """Return text fit for one line of screen or log: line ends as blanks, the unsafe escaped."""
    return visible(" ".join(text.split()))[:length]


def shown(value: object) -> str:
    """Return a value from a file as it is shown: short, on one line, nothing a terminal obeys."""
    match value:
        case str():
            return f"'{_cut(visible(value[: SHOWN + 1]))}'"
        case bool():
            return "true" if value else "false"
        case int() if abs(value) >= 10**SHOWN:
            return f"a number of {int(value.bit_length() * LOG10_2) + 1} digits or so"
        case datetime():
            return value.isoformat().replace("+00:00", "Z")
        case date() | time():
            return value.isoformat()
        case dict():
            return "a table"
        case list() | tuple():
            inside = ", ".join("[...]" if isinstance(e, list) else shown(e) for e in value[:2])
            return _cut(f"[{inside}]" if len(value) <= 2 else f"[{inside}, and so on]")
        case _:
            return _cut(visible(repr(value)))


def nearest(name: str, known: Iterable[str]) -> str:
    """Return ``, nearest is 'x'`` for the known name most like one, or nothing."""
    close = difflib.get_close_matches(name[:NAME_LENGTH], list(known)[:600], n=1, cutoff=0.5)
    return f", nearest is {shown(close[0])}" if close else ""


def _cut(text: str) -> str:
    return text if len(text) <= SHOWN else text[:SHOWN] + "..."
