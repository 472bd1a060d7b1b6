"""On which line of a TOML file does a key stand? Found with the standard parser alone."""

from __future__ import annotations

import re
import tomllib
from typing import Any

Path = tuple[str | int, ...]

_AT_LINE = re.compile(r"\s*\(at line (\d+), column \d+\)")


class LineFinder:
    """Finds lines in one TOML text by parsing ever shorter beginnings of it.

    The line of a path is the last line of the shortest beginning, cut between lines, in which the
    path exists. A cut inside a value over several lines does not parse; the beginning before that
    value stands for it.
    """

    def __init__(self, text: str) -> None:
        self._lines = text.splitlines(keepends=True)
        self._parsed: dict[int, Any] = {}

    def line_of(self, path: Path) -> int:
        """Return the line (from 1) where a path of keys and places (from 0) first exists.

        A path that is not there gets the line of the longest part of it that is; 1 for none.
        """
        for length in range(len(path), 0, -1):
            found = self._first_with(path[:length])
            if found:
                return found
        return 1

    def _first_with(self, path: Path) -> int:
        low, high = 0, len(self._lines)
        if not self._has(high, path):
            return 0
        while high - low > 1:
            middle = (low + high) // 2
            if self._has(middle, path):
                high = middle
            else:
                low = middle
        return high

    def _has(self, count: int, path: Path) -> bool:
        value = self._parse(count)
        for part in path:
            if isinstance(part, int) != isinstance(value, list):
                return False
            try:
                value = value[part]
            except (KeyError, IndexError, TypeError):
                return False
        return True

    def _parse(self, count: int) -> Any:
        """Return the tables of the first lines, fewer of them when the cut splits a value."""
        for shorter in range(count, -1, -1):
            if shorter in self._parsed:
                break
            try:
                self._parsed[shorter] = tomllib.loads("".join(self._lines[:shorter]))
                break
            except (ValueError, RecursionError):
                continue
        return self._parsed.get(shorter, {})


def split_syntax_error(message: str) -> tuple[int, str]:
    """Return the line in a TOML parser's message (1 when it names none) and what is left of it."""
    found = _AT_LINE.search(message)
    line = int(found[1]) if found else 1
    what = _AT_LINE.sub("", message).replace(" (at end of document)", " at the end of the file")
    return line, what[:1].lower() + what[1:]
