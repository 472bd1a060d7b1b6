"""The head of a night log: written once, whole, so that the log stands alone years later."""

from __future__ import annotations

import re
from dataclasses import dataclass
from datetime import date
from typing import TYPE_CHECKING, Any

from engine.log.blocks import crc_of
from engine.log.values import as_read, parse_doubtful, value_text

if TYPE_CHECKING:
    from engine.logbook import Observatory

SCHEMA = 1

_BYTE_ORDER_MARK = b"\xef\xbb\xbf"
_CRC_HEAD = b"\n[header]\n"
_END = re.compile(rb'\n\[header\]\r?\ncrc = "([0-9a-f]{8})"\r?\n')
# The first block that is no part of a header; where the header's own end is damaged, it ends here.
_FIRST_EVENT = re.compile(rb"^\[\[(?!filter\]\])", re.MULTILINE)


@dataclass(frozen=True, slots=True)
class Header:
    """What stands at the head of a log; ``observatory`` as the tables of observatory.toml."""

    night: date
    observers: tuple[str, ...]
    software: str
    observatory: dict[str, Any]

    @classmethod
    def of(
        cls, observatory: Observatory, night: date, observers: tuple[str, ...], software: str
    ) -> Header:
        """Return the header for a night at an observatory."""
        tables = observatory.model_dump(by_alias=True, exclude_none=True, mode="json")
        people = tuple(str(as_read(each)) for each in observers)
        return cls(night, people, software, tables)


@dataclass(frozen=True, slots=True)
class HeaderReading:
    """A header as it was read: where it ends in the file, and what is not right about it."""

    header: Header
    end: int
    findings: tuple[str, ...]
    schema: object = SCHEMA


def header_bytes(header: Header) -> bytes:
    """Return a header as it is written, its crc last."""
    night = {
        "date": header.night,
        "observers": list(header.observers),
        "software": header.software,
    }
    body = f"schema = {SCHEMA}\n" + _table("[night]", night)
    filters = header.observatory.get("filter", [])
    for name, table in header.observatory.items():
        if name != "filter":
            body += _table(f"[{name}]", table)
    body += "".join(_table("[[filter]]", each) for each in filters)
    data = body.encode()
    data += _CRC_HEAD + f'crc = "{crc_of(data)}"\n'.encode()
    read = read_header(data, header.night)
    if read.findings or read.header != header:
        raise ValueError("the header does not read back as it was meant")
    return data


def _table(head: str, values: dict[str, Any]) -> str:
    lines = "".join(f"{key} = {value_text(value)}\n" for key, value in values.items())
    return f"\n{head}\n{lines}"


def is_unfinished(data: bytes) -> bool:
    """Say whether data is the beginning of a header of ours that was never written to its end."""
    begins = f"schema = {SCHEMA}\n".encode()
    is_ours = data.startswith(begins) or begins.startswith(data)
    return is_ours and not _END.search(data) and not _FIRST_EVENT.search(data)


def read_header(data: bytes, named: date | None) -> HeaderReading:
    """Return the header at the beginning of a log's bytes.

    A damaged one never keeps the night from being read: what it lacks is said, and the night is
    ``named``, the one the file is called by, if it is called by one. ValueError when the data is no
    night log at all.
    """
    findings = []
    mark = len(_BYTE_ORDER_MARK) if data.startswith(_BYTE_ORDER_MARK) else 0
    if mark:
        findings.append("a byte-order mark stands before the header: saved by an editor")
    found = _END.search(data)
    first = _FIRST_EVENT.search(data)
    if found is not None and (first is None or found.end() <= first.start()):
        end, body = found.end(), data[mark : found.start()].replace(b"\r\n", b"\n")
        if crc_of(body.removesuffix(b"\r")) != found[1].decode():
            findings.append("the header was changed by hand or is damaged; used")
    elif first is not None:
        end = first.start()
        findings.append("the header is damaged: it does not end with its crc")
    else:
        raise ValueError("this is no night log: it has neither a whole header nor an entry")
    header, schema, missing = _read_tables(data[mark:end], named)
    return HeaderReading(header, end, (*findings, *missing), schema)


def _read_tables(data: bytes, named: date | None) -> tuple[Header, object, list[str]]:
    """Return what the tables of a header say, its schema, and what is wrong with them."""
    try:
        tables = parse_doubtful(data)
    except ValueError as error:
        what = f"the header can't be read ({error}); the file's name says which night it is"
        return Header(named or date.min, (), "", {}), SCHEMA, [what]
    schema, night = tables.pop("schema", None), tables.pop("night", {})
    tables.pop("header", None)
    findings = []
    if schema != SCHEMA:
        findings.append(f"schema {schema!r}, this version knows {SCHEMA}; read as far as known")
    night = night if isinstance(night, dict) else {}
    told, observers = night.get("date"), night.get("observers", [])
    if named is not None and told != named:
        findings.append(f"the header says night {told}, the file's name {named}")
    told = told if type(told) is date else named or date.min
    people = tuple(str(each) for each in observers) if isinstance(observers, list) else ()
    return Header(told, people, str(night.get("software", "")), tables), schema, findings
