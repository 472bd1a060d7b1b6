"""On which line of a TOML file does a key stand?

The standard parser does not say, so a text that it has accepted is walked once more here, taking
note only of where each key and each place of a list begins. A test holds the paths found against
the standard parser's on texts of every kind.
"""

from __future__ import annotations

import re
import tomllib
from bisect import bisect_right
from dataclasses import dataclass

Path = tuple[str | int, ...]

# Blanks, line ends and comments between statements and inside lists.
_GAP = re.compile(r"(?:[ \t\n]|#[^\n]*)*")
_COMMENT = re.compile(r"#[^\n]*")
_KEY = re.compile(r"""[ \t]*(?:([A-Za-z0-9_-]+)|("(?:[^"\\\n]|\\.)*")|'([^'\n]*)')[ \t]*""")
_STRING = re.compile(
    r'''"""(?:[^\\]|\\.)*?""""{0,2}|\'\'\'.*?\'\'\'\'{0,2}|"(?:[^"\\\n]|\\.)*"|'[^'\n]*\'''',
    re.DOTALL,
)
_SCALAR = re.compile(r"[^,\]}#\n]+")


class LineIndex:
    """The lines (from 1) on which the keys of one sound TOML text begin.

    The text is walked when the first line is asked for; a text without faults never is.
    """

    def __init__(self, text: str) -> None:
        self._text = text
        self._lines: dict[Path, int] | None = None

    def line_of(self, path: Path) -> int:
        """Return the line where a path of keys and places (from 0) begins.

        A path that is not there gets the line of the longest part of it that is; 1 for none.
        """
        if self._lines is None:
            self._lines = lines_of_keys(self._text)
        for length in range(len(path), 0, -1):
            line = self._lines.get(path[:length])
            if line:
                return line
        return 1


def lines_of_keys(text: str) -> dict[Path, int]:
    """Return the line on which each path of a sound TOML text begins."""
    walk = _Walk(text.replace("\r\n", "\n"))
    walk.document()
    return walk.lines


@dataclass(frozen=True, slots=True)
class Spans:
    """Where what stands in a sound TOML text, as offsets into it with all line ends ``\\n``.

    ``pairs`` are the keys that stand before an equals sign, each with its value; ``heads`` are the
    ends of the headers of tables, ``comments`` the comments.
    """

    pairs: dict[Path, tuple[int, int]]
    heads: dict[Path, int]
    comments: list[tuple[int, int]]


def spans_of_keys(text: str) -> Spans:
    """Return where the keys of a sound TOML text begin and their values end."""
    walk = _Walk(text.replace("\r\n", "\n"))
    walk.document()
    return walk.spans


class _Walk:
    """One walk through a text that is known to be TOML: it checks nothing."""

    def __init__(self, text: str) -> None:
        self.lines: dict[Path, int] = {}
        self.spans = Spans({}, {}, [])
        self._text = text
        self._at = 0
        self._ends = [found.start() for found in re.finditer("\n", text)]
        self._lengths: dict[Path, int] = {}  # how many [[tables]] a list has so far

    def document(self) -> None:
        """Walk from the beginning to the end."""
        table: Path = ()
        self._skip(_GAP)
        while self._at < len(self._text):
            if self._text[self._at] == "[":
                table = self._header()
            else:
                self._pair(table)
            self._skip(_GAP)

    def _header(self) -> Path:
        begin, is_list = self._at, self._text.startswith("[[", self._at)
        self._at += 2 if is_list else 1
        names = self._keys()
        self._at += 2 if is_list else 1
        path: Path = ()
        for place, name in enumerate(names):
            path = (*path, name)
            self._note(path, begin)
            if is_list and place == len(names) - 1:
                self._lengths[path] = self._lengths.get(path, 0) + 1
            if path in self._lengths:
                path = (*path, self._lengths[path] - 1)
                self._note(path, begin)
        self.spans.heads[path] = self._at
        return path

    def _pair(self, table: Path) -> None:
        begin, path = self._at, table
        for name in self._keys():
            path = (*path, name)
            self._note(path, begin)
        self._at += 1  # the equals sign
        self._skip(_GAP)
        self._value(path)
        value = self._text[begin : self._at].rstrip(" \t")
        self.spans.pairs.setdefault(path, (begin, begin + len(value)))

    def _value(self, path: Path) -> None:
        opening = self._text[self._at]
        if opening in "[{":
            self._inside(path, opening)
        else:
            self._skip(_STRING if opening in "\"'" else _SCALAR)

    def _inside(self, path: Path, opening: str) -> None:
        """Walk through a list or an inline table."""
        closing, place = ("]" if opening == "[" else "}"), 0
        self._at += 1
        self._skip(_GAP)
        while self._text[self._at] != closing:
            if opening == "[":
                self._note((*path, place), self._at)
                self._value((*path, place))
                place += 1
            else:
                self._pair(path)
            self._skip(_GAP)
            if self._text[self._at] == ",":
                self._at += 1
                self._skip(_GAP)
        self._at += 1

    def _keys(self) -> list[str]:
        names = []
        while True:
            found = _KEY.match(self._text, self._at)
            if found is None:
                raise ValueError(f"no key at {self._at}, expected a text that tomllib accepts")
            bare, basic, literal = found.groups()
            names.append(tomllib.loads(f"k={basic}")["k"] if basic else bare or literal or "")
            self._at = found.end()
            if self._text[self._at] != ".":
                return names
            self._at += 1

    def _skip(self, pattern: re.Pattern[str]) -> None:
        found = pattern.match(self._text, self._at)
        if found is None:
            return
        if pattern is _GAP and "#" in found[0]:
            comments = _COMMENT.finditer(self._text, self._at, found.end())
            self.spans.comments.extend(each.span() for each in comments)
        self._at = found.end()

    def _note(self, path: Path, position: int) -> None:
        self.lines.setdefault(path, bisect_right(self._ends, position - 1) + 1)
