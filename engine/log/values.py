r"""Values on one line of TOML, as they are written and as they are read back.

What is written is the careful part of TOML: date-times with ``T`` and ``Z``, which every parser
takes; text on one line, with everything a terminal or a parser could act on as an escape; no
sub-tables. What is read quickly is that part alone: anything else is left to tomllib, and both give
the same values of the same types.
"""

from __future__ import annotations

import re
import tomllib
from datetime import date, datetime
from typing import Any

import tomli_w

from engine.times import iso_from_datetime

Value = str | int | float | bool | date | datetime | list[Any]

INT_BITS = 63

# tomli_w writes these raw: tabs and control characters above ASCII (Cc), invisible and bidi format
# characters (Cf), line and paragraph separators (Zl, Zp). The ranges are those of Unicode 16.
_RAW_UNSAFE = re.compile(
    "[\t\x7f-\x9f\u00ad\u0600-\u0605\u061c\u06dd\u070f\u0890\u0891\u08e2\u180e\u200b-\u200f"
    "\u2028-\u202e\u2060-\u206f\ufeff\ufff9-\ufffb\U000110bd\U000110cd\U00013430-\U0001343f"
    "\U0001bca0-\U0001bca3\U0001d173-\U0001d17a\U000e0001\U000e0020-\U000e007f]"
)
_SURROGATE = re.compile("[\ud800-\udfff]")


def value_text(value: Value) -> str:
    """Return a value as it stands behind ``key =``; ValueError for what the log can't hold."""
    if isinstance(value, list):
        return f"[{', '.join(value_text(each) for each in value)}]"
    if isinstance(value, datetime):
        if value.tzinfo is None:
            raise ValueError(f"{value!r} has no time zone")
        return iso_from_datetime(value)
    if isinstance(value, int) and not -(2**INT_BITS) <= value < 2**INT_BITS:
        raise ValueError(f"{value} is too large for a log, expected at most 64 bits")
    text = tomli_w.dumps({"v": as_read(value)}, multiline_strings=False)
    text = text.removeprefix("v = ").removesuffix("\n")
    return _RAW_UNSAFE.sub(_escape, text)


def _escape(found: re.Match[str]) -> str:
    code = ord(found[0])
    return f"\\u{code:04X}" if code <= 0xFFFF else f"\\U{code:08X}"


def as_read(value: Value) -> Value:
    """Return a value as a reader will see it: times to the millisecond, no lone surrogates."""
    if isinstance(value, list):
        return [as_read(each) for each in value]
    if isinstance(value, datetime):
        return datetime.fromisoformat(iso_from_datetime(value))
    return _SURROGATE.sub("\ufffd", value) if isinstance(value, str) else value


# Keys of very many parts, on which tomllib takes time with the square of their number. Nothing of
# ours has parts at all; what looks so was made of a damaged file.
_PART = rb"""[A-Za-z0-9_"'-]"""
_MANY_PARTS = re.compile(rb"(?<!%b)(?:%b++[ \t]*+\.[ \t]*+){64}" % (_PART, _PART))


def parse_doubtful(data: bytes) -> dict[str, Any]:
    """Return the tables of TOML that may be damaged; ValueError for whatever is wrong with it."""
    if _MANY_PARTS.search(data):
        raise ValueError("a key has too many parts")
    try:
        return tomllib.loads(data.decode())
    except RecursionError:
        raise ValueError("it is nested too deeply") from None


# One line of what we write: bare key, then text without an escape, a UTC date-time, a float, an
# integer, a truth value, or a list (which tomllib reads).
_QUICK_LINE = (
    r"[A-Za-z0-9_-]+ = (?:"
    r'"[^"\\\x00-\x08\x0a-\x1f\x7f]*"'
    r"|\d{4}-\d\d-\d\dT\d\d:\d\d:\d\d\.\d{3}Z"
    r"|-?(?:0|[1-9]\d*)(?:\.\d+)?(?:e[+-]\d+)?"
    r"|true|false"
    r"|\[[^\n]*\]"
    r")\n"
)
_QUICK = re.compile(f"(?:{_QUICK_LINE})*+", re.ASCII)


def quick_values(body: str) -> dict[str, Value] | None:
    """Return the keys and values of lines as we write them; None for anything tomllib must read."""
    if _QUICK.fullmatch(body) is None:
        return None
    values: dict[str, Value] = {}
    lines = body.split("\n")
    lines.pop()
    try:
        for line in lines:
            key, _, text = line.partition(" = ")
            # Here and not in a function of its own: a night has tens of thousands of these lines.
            if text[0] == '"':
                values[key] = text[1:-1]
            elif text[-1] == "Z":
                values[key] = datetime.fromisoformat(text)
            elif text[0] == "[":
                values[key] = tomllib.loads(f"v = {text}\n")["v"]
            elif text[0] in "tf":
                values[key] = text[0] == "t"
            elif "." in text or "e" in text:
                values[key] = float(text)
            else:
                values[key] = int(text)
    except ValueError:
        return None
    # A key that stands twice is an error for tomllib to find.
    return values if len(values) == len(lines) else None
