"""Invented logs for tests: a header, whole nights, any event at all, and disks that fail."""

from __future__ import annotations

import math
import tomllib
import zlib
from collections.abc import Callable
from datetime import UTC, date, datetime, timedelta
from pathlib import Path
from typing import Any

from hypothesis import strategies as st

from engine.log import KINDS, Disk, Event, Exposure, ExposureStart, Header, NightLog
from engine.log.blocks import block_bytes
from engine.log.header import header_bytes
from engine.log.keys import KEYS, to_values
from engine.logbook import load_logbook, sample_logbook
from engine.times import SECONDS_PER_DAY, mjd_from_datetime

NIGHT = date(2027, 3, 14)
DUSK_MJD = mjd_from_datetime(datetime(2027, 3, 14, 9, 0, tzinfo=UTC))
NAME = f"{NIGHT.isoformat()}.toml"


def header() -> Header:
    """Return the header of an invented night at the sample's observatory."""
    return Header(
        NIGHT,
        ("R. Okonjo", "I. Varga"),
        "warmroom 0.1.0",
        {
            "site": {"name": "Kestrel Ridge", "latitude_deg": -31.27, "horizon": [[0.0, 14.0]]},
            "telescope": {"name": "80 cm", "aperture_m": 0.8},
            "camera": {"pixel_um": 9.0, "columns": 2048},
            "filter": [{"name": "B", "wavelength_nm": 438.0}, {"name": "V", "change_s": 6.0}],
            "seeing": {"typical_arcsec": 1.6},
        },
    )


def full_header() -> Header:
    """Return the header made from the sample logbook's own observatory."""
    observatory = load_logbook(sample_logbook()).observatory
    return Header.of(observatory, NIGHT, ("R. Okonjo",), "warmroom 0.1.0")


def open_log(folder: Path, disk: Disk | None = None) -> NightLog:
    """Open the invented night's log in a folder, ten hours into the night."""
    return NightLog.open(folder, header(), at(600.0), disk)


def blocks_of(events: list[Event]) -> bytes:
    """Return events as they stand in a log behind its header."""
    return b"".join(block_bytes(*to_values(event)) for event in events)


def log_bytes(events: list[Event]) -> bytes:
    """Return a whole log."""
    return header_bytes(header()) + blocks_of(events)


def at(minutes: float) -> float:
    """Return a moment of the night (UTC MJD) by minutes after dusk, to a whole millisecond."""
    moment = datetime(2027, 3, 14, 9, 0, tzinfo=UTC) + timedelta(
        milliseconds=round(minutes * 60_000.0)
    )
    return mjd_from_datetime(moment)


def exposure(n: int, minutes: float, **other: Any) -> Exposure:
    """Return the full record of an invented exposure of 60 s that ends at a minute."""
    value = 1.0 + 0.001 * (n % 700)
    numbers = {
        key.field: round(value + 0.0137 * place, 4)
        for place, key in enumerate(KEYS["exposure"].values())
        if key.type is float and not key.is_required
    }
    said: dict[str, Any] = {
        "of": n - 1,
        "target": "KR 12",
        "programme": "Short-period binaries",
        "filter": "BV"[n % 2],
        "seconds": 60.0,
        "exposed_s": 60.0,
        "start_mjd": at(minutes - 1.0),
        "mid_mjd": at(minutes - 0.5),
        "end_mjd": at(minutes),
        "frame": f"kr12_{n:05d}.fits",
        "outcome": "good",
        **numbers,
        **other,
    }
    return Exposure(n=n, t_mjd=at(minutes), **said)


def night(exposures: int) -> list[Event]:
    """Return the events of a night of so many exposures, begun and ended one by one."""
    events: list[Event] = []
    for count in range(exposures):
        n = 2 * count + 1
        minutes = 1.2 * count
        events.append(
            ExposureStart(
                n=n,
                t_mjd=at(minutes),
                target="KR 12",
                programme="Short-period binaries",
                filter="BV"[(n + 1) % 2],
                seconds=60.0,
                start_mjd=at(minutes),
            )
        )
        events.append(exposure(n + 1, minutes + 1.0))
    return events


def read_plainly(data: bytes) -> list[tuple[str, dict[str, Any]]]:
    """Return every entry of a log in order of n, by tomllib and zlib alone.

    Fails when the file is not TOML, or a check sum counted here is not the one that stands there.
    """
    tables = tomllib.loads(data.decode("utf-8"))
    entries = [
        (kind, dict(block))
        for kind, table in tables.items()
        if isinstance(table, list)
        for block in table
        if "n" in block
    ]
    bodies = data.split(b"\n\n[[")[1:]
    events = [b"[[" + body for body in bodies if not body.startswith(b"filter]]")]
    assert len(events) == len(entries)
    for raw in events:
        body, _, told = raw.partition(b'crc = "')
        assert told[:8].decode() == f"{zlib.crc32(body):08x}"
    for _, block in entries:
        block.pop("crc")
    return sorted(entries, key=lambda entry: entry[1]["n"])


# Any text at all: what keyboards, file names and other programs may hand over.
TEXTS = st.text(max_size=40) | st.text(
    st.sampled_from('"\\\n\r\t\x00\x1b\x7f\x85\u2028\u202e\u200b\ud800\udfff\U000e0041[]=#'),
    max_size=12,
)
FLOATS = st.floats(allow_nan=False, allow_infinity=False)
INTS = st.integers(-(2**63), 2**63 - 1)
MJDS = st.integers(0, 12 * 3600 * 1000).map(
    lambda ms: mjd_from_datetime(datetime(2027, 3, 14, 9, tzinfo=UTC) + timedelta(milliseconds=ms))
)
_BY_TYPE: dict[type, st.SearchStrategy[Any]] = {
    str: TEXTS,
    float: FLOATS,
    int: INTS,
    bool: st.booleans(),
    datetime: MJDS,
}


@st.composite
def any_event(draw: st.DrawFn, n: int = 1, kind: str | None = None) -> Event:
    """Draw an event of any kind with any values its keys allow."""
    kind = kind or draw(st.sampled_from(sorted(KINDS)))
    said: dict[str, Any] = {}
    for key in KEYS[kind].values():
        if key.field in ("n", "t_mjd"):
            continue
        if not key.is_required and draw(st.booleans()):
            continue
        value = _BY_TYPE[key.type]
        said[key.field] = draw(st.lists(value, max_size=4).map(tuple) if key.is_list else value)
    return KINDS[kind](**said).stamped(n, draw(MJDS))


class FailingDisk(Disk):
    """A disk on which chosen calls fail, as ``fail[name]`` says: called first, it may raise."""

    def __init__(self) -> None:
        self.fail: dict[str, Callable[[], None]] = {}
        self.calls: list[str] = []

    def _call(self, name: str) -> None:
        self.calls.append(name)
        if name in self.fail:
            self.fail[name]()

    def write(self, fd: int, data: bytes) -> int:
        """Write, unless told to fail; ``short`` writes only part of it first."""
        self._call("write")
        if "short" in self.fail and len(data) > 1:
            return super().write(fd, data[: len(data) // 2])
        return super().write(fd, data)

    def sync(self, fd: int) -> None:
        """Sync, unless told to fail."""
        self._call("sync")
        super().sync(fd)

    def truncate(self, fd: int, size: int) -> None:
        """Truncate, unless told to fail."""
        self._call("truncate")
        super().truncate(fd, size)

    def link(self, source: Path, path: Path) -> None:
        """Link, unless told to fail."""
        self._call("link")
        super().link(source, path)

    def sync_folder(self, folder: Path) -> None:
        """Sync a folder, unless told to fail."""
        self._call("sync_folder")
        super().sync_folder(folder)


def raising(number: int, times: float = math.inf) -> Callable[[], None]:
    """Return a failure that raises OSError of a number, so many times, and then no more."""
    left = [times]

    def fail() -> None:
        if left[0] > 0:
            left[0] -= 1
            raise OSError(number, f"errno {number}")

    return fail


def later(mjd: float, seconds: float) -> float:
    """Return a moment some seconds after another (UTC MJD)."""
    return mjd + seconds / SECONDS_PER_DAY
