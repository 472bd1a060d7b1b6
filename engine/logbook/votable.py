"""A first look at a VOTable, before astropy reads it: is it safe to read, and where are its rows?

A VOTable may ask its reader to fetch a file from somewhere, or to make room for a billion cells.
Neither has a place in a list of targets.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from typing import NoReturn
from xml.parsers import expat

from engine.logbook.files import Unreadable

MOST_COLUMNS = 100
MOST_CELLS = 5_000_000

_COUNT = re.compile(r"[0-9]+")


def scan_votable(text: str) -> tuple[int, list[int]]:
    """Return the line (from 1) of a VOTable's table and those of its rows.

    Rows that are packed (BINARY) have no lines, and none are returned. Unreadable when the text is
    no XML or no plain VOTable with one table.
    """
    scan = _Scan()
    try:
        scan.parser.Parse(text.encode(), True)
    except expat.ExpatError as error:
        reason = expat.errors.messages[error.code]
        raise Unreadable(f"{reason}, expected a VOTable in XML", max(error.lineno, 1)) from None
    except LookupError:
        raise Unreadable("unknown encoding, expected UTF-8") from None
    scan.check_size()
    return scan.table_line, scan.row_lines


class _Scan:
    """What is noted while the parser walks through the file."""

    def __init__(self) -> None:
        self.parser = expat.ParserCreate()
        self.parser.StartElementHandler = self._begin
        self.parser.StartDoctypeDeclHandler = self._refuse_doctype
        self.table_line = 0
        self.row_lines: list[int] = []
        self._columns = 0
        self._cells_a_row = 0
        self._rows = 0

    def check_size(self) -> None:
        """Refuse a table that is not there, or that would take more room than it has rows for."""
        if not self.table_line:
            raise Unreadable("no TABLE, expected a VOTable with one")
        rows = max(self._rows, len(self.row_lines), 1)
        if self._columns > MOST_COLUMNS or rows * self._cells_a_row > MOST_CELLS:
            raise Unreadable("too large a table, expected a list of targets", self.table_line)

    def _begin(self, element: str, attributes: Mapping[str, str]) -> None:
        kind = element.rpartition(":")[2]
        if kind == "TABLE":
            if self.table_line:
                self._refuse("a second TABLE, expected one")
            self.table_line = self.parser.CurrentLineNumber
            self._rows = _largest(attributes.get("nrows", "1"))
        elif kind in ("FIELD", "PARAM"):
            self._columns += kind == "FIELD"
            self._cells_a_row += _largest(attributes.get("arraysize", "1"))
        elif kind == "TR":
            self.row_lines.append(self.parser.CurrentLineNumber)
        elif kind == "FITS":
            self._refuse("holds a FITS file, expected TABLEDATA")
        elif kind == "STREAM" and "href" in attributes:
            self._refuse("fetches its rows from elsewhere, expected them in this file")
        elif kind == "STREAM" and attributes.get("encoding") != "base64":
            self._refuse("rows packed in a way that is not read, expected TABLEDATA")

    def _refuse_doctype(self, *_: object) -> None:
        self._refuse("a DOCTYPE, expected a VOTable without one")

    def _refuse(self, what: str) -> NoReturn:
        raise Unreadable(what, self.parser.CurrentLineNumber)


def _largest(size: str) -> int:
    """Return how many cells a size such as ``3x4`` or ``10*`` asks for, at most one too many."""
    product = 1
    for each in _COUNT.findall(size[:100]):
        product = min(product * int(each), MOST_CELLS + 1)
    return product
