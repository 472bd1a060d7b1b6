"""What can happen in a night: one dataclass a kind, and how each stands in the file.

The fields are the key table. In the file a field named ``..._mjd`` is a UTC date-time under the
name without that ending (``t_mjd`` is ``t``, ``start_mjd`` is ``start``); None and empty text are
left out; tuples are lists. To add a kind, add a dataclass here: reading, writing, checking and the
reference page follow.
"""

from __future__ import annotations

import math
import types
import typing
from dataclasses import MISSING, dataclass, field, fields, replace
from datetime import datetime
from typing import Any, ClassVar, Self

from engine.log.blocks import Value
from engine.times import datetime_from_mjd, mjd_from_datetime

MJD = "_mjd"


@dataclass(frozen=True, slots=True, kw_only=True)
class Event:
    """What all events share: one counter for all kinds, and the moment of logging (UTC MJD).

    ``extra`` holds keys that this version does not know; they are kept and shown.
    """

    kind: ClassVar[str] = ""

    n: int = 0
    t_mjd: float = math.nan
    extra: dict[str, Value] = field(default_factory=dict)

    def stamped(self, n: int, t_mjd: float) -> Self:
        """Return the event with its number and its moment."""
        return replace(self, n=n, t_mjd=t_mjd)


@dataclass(frozen=True, slots=True, kw_only=True)
class RunStart(Event):
    """A run begins: so many exposures in each filter in turn, on one target."""

    kind: ClassVar[str] = "run_start"
    target: str
    filters: tuple[str, ...]
    seconds: tuple[float, ...]
    counts: tuple[int, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class RunStop(Event):
    """A run is over; ``of`` is the n of its beginning."""

    kind: ClassVar[str] = "run_stop"
    of: int
    why: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Pointing(Event):
    """The telescope is sent to a target, or has come to stand on it (``on_target``)."""

    kind: ClassVar[str] = "pointing"
    target: str
    ra_deg: float | None = None
    dec_deg: float | None = None
    on_target: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class ExposureStart(Event):
    """The shutter opens; ``run`` is the n of its run, 0 for none."""

    kind: ClassVar[str] = "exposure_start"
    run: int = 0
    target: str
    programme: str = ""
    filter: str
    seconds: float
    start_mjd: float
    frame: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Exposure(Event):
    """The full record of one exposure, written when it has ended; ``of`` is the n of its start.

    ``image_size_arcsec`` is predicted, with its terms; ``measured_fwhm_arcsec`` what was found.
    ``credit`` is what it is worth, as a share of a planned exposure.
    """

    kind: ClassVar[str] = "exposure"
    of: int
    run: int = 0
    target: str
    programme: str = ""
    filter: str
    seconds: float
    exposed_s: float
    start_mjd: float
    mid_mjd: float
    end_mjd: float
    airmass_start: float | None = None
    airmass_mid: float | None = None
    airmass_end: float | None = None
    airmass_effective: float | None = None
    altitude_deg: float | None = None
    azimuth_deg: float | None = None
    hour_angle_h: float | None = None
    moon_separation_deg: float | None = None
    moon_altitude_deg: float | None = None
    moon_illumination: float | None = None
    image_size_arcsec: float | None = None
    image_atmosphere_arcsec: float | None = None
    image_diffraction_arcsec: float | None = None
    image_optics_arcsec: float | None = None
    image_tracking_arcsec: float | None = None
    image_dispersion_arcsec: float | None = None
    image_sampling_arcsec: float | None = None
    measured_fwhm_arcsec: float | None = None
    sky_mag_arcsec2: float | None = None
    seeing_arcsec: float | None = None
    frame: str = ""
    outcome: str
    credit: float | None = None
    why: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Conditions(Event):
    """Anything measured or judged about the sky and the air; only what was entered is there.

    ``seeing_arcsec`` is at the zenith and 500 nm; when it follows from a ``measured_fwhm_arcsec``,
    that and where it was measured (``of`` an exposure) stand beside it.
    """

    kind: ClassVar[str] = "conditions"
    seeing_arcsec: float | None = None
    measured_fwhm_arcsec: float | None = None
    target: str = ""
    filter: str = ""
    airmass: float | None = None
    of: int | None = None
    cloud_percent: float | None = None
    wind_m_per_s: float | None = None
    humidity_percent: float | None = None
    temperature_c: float | None = None
    dew_point_c: float | None = None
    pressure_hpa: float | None = None
    sky_mag_arcsec2: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Focus(Event):
    """The focus was set, and what it gave."""

    kind: ClassVar[str] = "focus"
    position: float | None = None
    fwhm_arcsec: float | None = None
    temperature_c: float | None = None
    filter: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Calibration(Event):
    """Frames taken for calibration: bias, darks, flats."""

    kind: ClassVar[str] = "calibration"
    what: str
    filter: str = ""
    seconds: float | None = None
    count: int = 1
    level_adu: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class LostTime(Event):
    """Time begins or ceases to be lost; ``phase`` is "begin" or "end"."""

    kind: ClassVar[str] = "lost_time"
    phase: str
    cause: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Note(Event):
    """Whatever the observer wants to say, perhaps about a target or an event (``of``)."""

    kind: ClassVar[str] = "note"
    text: str
    target: str = ""
    of: int | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class OrderProposed(Event):
    """What was proposed from now on and why, written when it changed."""

    kind: ClassVar[str] = "order"
    targets: tuple[str, ...]
    starts_mjd: tuple[float, ...]
    value: float | None = None
    why: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Override(Event):
    """What the observer decided instead; ``action`` is one of the registry's."""

    kind: ClassVar[str] = "override"
    action: str
    target: str = ""
    instead_of: str = ""
    filter: str = ""
    until_mjd: float | None = None
    at_mjd: float | None = None
    why: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Amendment(Event):
    """An earlier event (``of``) is withdrawn, or has other values: those in ``changes``.

    In the file the changes stand as plain keys of the amended kind. ``with_n`` ties it to another
    event whose withdrawal withdraws it too.
    """

    kind: ClassVar[str] = "amendment"
    of: int
    withdrawn: bool = False
    with_n: int | None = None
    why: str = ""

    @property
    def changes(self) -> dict[str, Value]:
        """The new values, by key."""
        return self.extra


@dataclass(frozen=True, slots=True, kw_only=True)
class ClockStep(Event):
    """The computer's clock jumped by so many seconds."""

    kind: ClassVar[str] = "clock_step"
    seconds: float
    why: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Recovery(Event):
    """A torn tail was set aside when the log was opened."""

    kind: ClassVar[str] = "recovery"
    offset: int
    removed_bytes: int
    set_aside: str
    why: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Close(Event):
    """The console was left; the night may be taken up again."""

    kind: ClassVar[str] = "close"
    why: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Foreign(Event):
    """An event of a kind this version does not know, or one that lacks what its kind needs."""

    kind: ClassVar[str] = "foreign"
    kind_in_file: str
    complaint: str = ""


KINDS: dict[str, type[Event]] = {
    each.kind: each
    for each in (
        RunStart, RunStop, Pointing, ExposureStart, Exposure, Conditions, Focus, Calibration,
        LostTime, Note, OrderProposed, Override, Amendment, ClockStep, Recovery, Close,
    )
}  # fmt: skip


@dataclass(frozen=True, slots=True)
class Key:
    """One key of a kind: the field behind it, what may stand there, whether it must."""

    name: str
    field: str
    types: tuple[type, ...]
    is_time: bool
    is_list: bool
    required: bool


def _keys_of(kind: type[Event]) -> tuple[Key, ...]:
    """Return the key table of a kind, in the order in which the keys are written."""
    hints = typing.get_type_hints(kind)
    table = []
    for each in fields(kind):
        if each.name == "extra":
            continue
        hint = hints[each.name]
        parts = typing.get_args(hint) if isinstance(hint, types.UnionType) else (hint,)
        parts = tuple(part for part in parts if part is not type(None))
        is_list = typing.get_origin(parts[0]) is tuple
        inner = typing.get_args(parts[0])[0] if is_list else parts[0]
        is_time = each.name.endswith(MJD)
        allowed = (datetime,) if is_time else (float, int) if inner is float else (inner,)
        required = each.default is MISSING and each.name not in ("n", "t_mjd")
        table.append(
            Key(each.name.removesuffix(MJD), each.name, allowed, is_time, is_list, required)
        )
    return tuple(table)


KEYS: dict[str, tuple[Key, ...]] = {name: _keys_of(kind) for name, kind in KINDS.items()}


def to_values(event: Event) -> tuple[str, dict[str, Value]]:
    """Return an event's kind and its keys and values as they stand in the file."""
    if isinstance(event, Foreign):
        return event.kind_in_file, {"n": event.n, "t": _moment(event.t_mjd), **event.extra}
    values: dict[str, Value] = {}
    for key in KEYS[event.kind]:
        value = getattr(event, key.field)
        empty = value is None or value is False or (isinstance(value, str | tuple) and not value)
        if empty and not key.required:
            continue
        values[key.name] = _written(value, key)
    return event.kind, values | event.extra


def _written(value: Any, key: Key) -> Value:
    if key.is_list:
        return [_moment(each) if key.is_time else each for each in value]
    written: Value = _moment(value) if key.is_time else value
    if isinstance(written, float) and not math.isfinite(written):
        raise ValueError(f"{key.name} is {written}, expected a finite number")
    return written


def _moment(mjd: float) -> datetime:
    return datetime_from_mjd(mjd)


def from_values(kind: str, values: dict[str, Value]) -> Event:
    """Return the event that keys and values of a kind stand for.

    Never raises: what is of an unknown kind, or lacks a key its kind needs, or holds a value of the
    wrong type, comes back as `Foreign` with the complaint.
    """
    n, t = values.get("n"), values.get("t")
    stamp: dict[str, Any] = {
        "n": n if isinstance(n, int) and not isinstance(n, bool) else 0,
        "t_mjd": mjd_from_datetime(t) if isinstance(t, datetime) and t.tzinfo else math.nan,
    }
    said = {key: value for key, value in values.items() if key not in ("n", "t")}
    made = KINDS.get(kind)
    if made is None:
        return Foreign(**stamp, kind_in_file=kind, complaint="unknown kind", extra=said)
    arguments: dict[str, Any] = {}
    rest = dict(said)
    for key in KEYS[kind]:
        if key.name in ("n", "t"):
            continue
        if key.name in rest:
            read = _read(rest.pop(key.name), key)
            if read is None:
                complaint = f"{key.name} is of the wrong type"
                return Foreign(**stamp, kind_in_file=kind, complaint=complaint, extra=said)
            arguments[key.field] = read
        elif key.required:
            complaint = f"{key.name} is missing"
            return Foreign(**stamp, kind_in_file=kind, complaint=complaint, extra=said)
    return made(**stamp, **arguments, extra=rest)


def _read(value: Value, key: Key) -> Any:
    if key.is_list:
        if not isinstance(value, list):
            return None
        parts = [_read_one(each, key) for each in value]
        return None if None in parts else tuple(parts)
    return _read_one(value, key)


def _read_one(value: Any, key: Key) -> Any:
    if not isinstance(value, key.types) or (isinstance(value, bool) and bool not in key.types):
        return None
    if isinstance(value, datetime):
        return mjd_from_datetime(value) if value.tzinfo else None
    if isinstance(value, int) and float in key.types:
        return float(value)
    return value
