"""The logbook's files as text and as TOML: whatever is on the disk, an answer or one fault."""

from __future__ import annotations

import re
import tomllib
from collections.abc import Iterable, Iterator
from pathlib import Path
from typing import Any

from engine.errors import Fault
from engine.logbook.text import shown, visible

# Three thousand targets take this much. What is larger was put there by mistake, and the standard
# parser would be seconds over it.
LARGEST_BYTES = 1_000_000
DEEPEST = 50
TABLE_ENDINGS = (".csv", ".ecsv", ".vot")

_NAME = r"""(?:[A-Za-z0-9_-]+|"[^"\n]*"|'[^'\n]*')"""
# The standard parser's time grows with the square of a dotted key's length.
_LONG_KEY = re.compile(rf"(?<![A-Za-z0-9_-])(?:{_NAME}[ \t]*\.[ \t]*){{{DEEPEST}}}")
_LONG_NUMBER = re.compile(r"[0-9_]{4000}")
_AT_LINE = re.compile(r"\s*\(at line (\d+), column \d+\)")
_AT_END = re.compile(r"\s*\(at end of document\)")
_TWICE = re.compile(r"Cannot (?:declare|mutate immutable namespace) \((.*?),?\)(?: twice)?")
_PLAINLY = {
    "Cannot overwrite a value": "this key is given already, expected it once",
    "Invalid value": "no value of TOML, expected text in quotes, a number or a list",
    "Invalid statement": "no statement of TOML, expected 'key = value' or a [table]",
    "Unterminated string": "text in quotes is not closed, expected a closing quote",
    "Illegal character '\\n'": "text in quotes is not closed on its line, expected a closing quote",
    "Unclosed array": "a list is not closed, expected ]",
    "Invalid date or datetime": "no such date, expected one such as 2027-03-14T11:00:00Z",
}


class Unreadable(ValueError):
    """A file that can't be read as what it should be: why, and on which line."""

    def __init__(self, what: str, line: int = 1) -> None:
        self.line = line
        super().__init__(what)


def target_files(folder: Path, faults: list[Fault], also: Iterable[Path] = ()) -> list[Path]:
    """Return the files that hold targets; the fault is noted where there are none.

    ``also`` holds files in ``targets/`` that are not there yet.
    """
    found = list(_named_targets(folder))
    inside = folder / "targets"
    try:
        held = inside.iterdir() if inside.is_dir() else ()
        found += sorted({*also, *(each for each in held if _holds_targets(each))} - {*found})
    except OSError as error:
        faults.append(Fault(inside, 1, "", f"{_reason(error)}, expected a folder to read"))
        return found
    if not found:
        faults.append(Fault(folder / "targets.toml", 1, "", "is missing, expected a file"))
    return found


def read_text(path: Path) -> str:
    """Return a file's text, without a byte order mark; Unreadable when it is none."""
    try:
        if path.exists() and not path.is_file():
            raise Unreadable(f"{'a folder' if path.is_dir() else 'no plain file'}, expected a file")
        with path.open("rb") as file:
            raw = file.read(LARGEST_BYTES + 1)
    except FileNotFoundError:
        raise Unreadable("is missing, expected a file") from None
    except OSError as error:
        raise Unreadable(f"{_reason(error)}, expected a file that can be read") from None
    return as_text(raw)


def as_text(raw: bytes) -> str:
    """Return what a file holds as text, without a byte order mark; Unreadable when it is none."""
    if len(raw) > LARGEST_BYTES:
        raise Unreadable(f"is too large, expected at most {LARGEST_BYTES} bytes")
    try:
        text = raw.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = raw.count(b"\n", 0, error.start) + 1
        raise Unreadable("not UTF-8, expected a text file in UTF-8", line) from None
    if "\0" in text:
        line = text.count("\n", 0, text.index("\0")) + 1
        raise Unreadable("a NUL character, expected text", line)
    if not text.strip():
        raise Unreadable("is empty, expected a file with something in it")
    return text


def parse_toml(text: str) -> dict[str, Any]:
    """Return the tables of a TOML text; Unreadable, with the line, when it is none."""
    long = _LONG_KEY.search(text)
    if long:
        raise Unreadable(_too_deep(), text.count("\n", 0, long.start()) + 1)
    try:
        tables = tomllib.loads(text)
    except RecursionError:
        raise Unreadable(_too_deep(), _line_of_depth(text)) from None
    except ValueError as error:
        raise _syntax_error(str(error), text) from None
    if _is_too_deep(tables):
        raise Unreadable(_too_deep(), _line_of_depth(text))
    return tables


def _named_targets(folder: Path) -> Iterator[Path]:
    for ending in (".toml", *TABLE_ENDINGS):
        path = folder / f"targets{ending}"
        try:
            found = path.exists() or path.is_symlink()
        except OSError:  # a name too long, a folder that may not be entered
            found = False
        if found:
            yield path


def _holds_targets(path: Path) -> bool:
    # Editors leave hidden files about.
    return path.suffix.lower() in (".toml", *TABLE_ENDINGS) and not path.name.startswith(".")


def _reason(error: OSError) -> str:
    reason = error.strerror or type(error).__name__
    return reason[:1].lower() + reason[1:]


def _too_deep() -> str:
    return f"nested too deep, expected at most {DEEPEST} levels"


def _is_too_deep(tables: dict[str, Any]) -> bool:
    level: list[Any] = [tables]
    for _ in range(DEEPEST):
        inside = (each.values() if isinstance(each, dict) else each for each in level)
        level = [item for items in inside for item in items if isinstance(item, dict | list)]
    return bool(level)


def _line_of_depth(text: str) -> int:
    """Return the line on which brackets first stand too deep; a guess where strings hold some."""
    depth = 0
    for number, line in enumerate(text.split("\n"), 1):
        depth += line.count("[") + line.count("{")
        if depth > DEEPEST:
            return number
        depth -= line.count("]") + line.count("}")
    return 1


def _syntax_error(message: str, text: str) -> Unreadable:
    found = _AT_LINE.search(message)
    line = int(found[1]) if found else 1
    what = _AT_LINE.sub("", message)
    if _AT_END.search(what):
        line, what = len(text.rstrip("\r\n").split("\n")), _AT_END.sub("", what)
        end = " at the end of the file"
    else:
        end = ""
    if "integer string conversion" in what:
        long = _LONG_NUMBER.search(text)
        line = text.count("\n", 0, long.start()) + 1 if long else 1
        return Unreadable("a number of thousands of digits, expected a short one", line)
    twice = _TWICE.match(what)
    if twice:
        name = ".".join(re.findall(r"'([^']*)'", twice[1]))
        return Unreadable(f"{shown(name)} is given already, expected it once", line)
    plain = _PLAINLY.get(what)
    if plain:
        return Unreadable(plain.replace(",", f"{end},", 1), line)
    what = visible(what[:1].lower() + what[1:])
    return Unreadable(what + end + ("" if "expected" in what else ", expected TOML"), line)
