"""The head of a night log: written once, whole, so that the log stands alone years later."""

from __future__ import annotations

import tomllib
from dataclasses import dataclass
from datetime import date
from typing import TYPE_CHECKING, Any

import tomli_w

from engine.log.blocks import crc_of

if TYPE_CHECKING:
    from engine.logbook import Observatory

SCHEMA = 1
_CRC_HEAD = b"\n[header]\n"


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
        return cls(night, observers, software, tables)


def header_bytes(header: Header) -> bytes:
    """Return a header as it is written, its crc last."""
    tables: dict[str, Any] = {
        "schema": SCHEMA,
        "night": {
            "date": header.night,
            "observers": list(header.observers),
            "software": header.software,
        },
        **{name: table for name, table in header.observatory.items() if name != "filter"},
    }
    body = tomli_w.dumps(tables).encode()
    # An array of tables as its own blocks: tomli_w would write short ones inline.
    for each in header.observatory.get("filter", []):
        body += b"\n[[filter]]\n" + tomli_w.dumps(each).encode()
    return body + _CRC_HEAD + f'crc = "{crc_of(body)}"\n'.encode()


def header_end(data: bytes) -> int | None:
    """Return where the header of a log ends, or None when it has no whole one."""
    start = data.find(_CRC_HEAD)
    if start < 0:
        return None
    end = data.find(b"\n", start + len(_CRC_HEAD))
    return None if end < 0 else end + 1


def read_header(data: bytes) -> tuple[Header, bool]:
    """Return the header in its bytes, and whether its crc is right.

    ValueError, with the reason, when it is not a header this version can read.
    """
    try:
        tables = tomllib.loads(data.decode())
        night = tables.pop("night")
        header = Header(
            night=night["date"],
            observers=tuple(night.get("observers", ())),
            software=str(night.get("software", "")),
            observatory=tables,
        )
        crc = str(tables.pop("header")["crc"])
        schema = tables.pop("schema")
    except (KeyError, TypeError, AttributeError, RecursionError) as error:
        raise ValueError(f"the header lacks {error}") from None
    if schema != SCHEMA:
        raise ValueError(f"schema {schema!r}, expected {SCHEMA}")
    if not isinstance(header.night, date):
        raise ValueError(f"date {header.night!r}, expected a date")
    return header, crc_of(data[: data.find(_CRC_HEAD)]) == crc
