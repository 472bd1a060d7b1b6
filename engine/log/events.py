"""What can happen in a night: one dataclass a kind.

The fields are the key table (see `engine.log.keys`). To add a kind, add a dataclass here and to
``KINDS``: reading, writing, checking and the reference page follow.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, field, replace
from typing import ClassVar, Self

from engine.log.values import Value


@dataclass(frozen=True, slots=True, kw_only=True)
class Event:
    """What all events share: one counter for all kinds, and the moment of logging (UTC MJD).

    ``extra`` holds keys that this version does not know, and values that don't fit their keys; they
    are kept and shown.
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
class TargetAdded(Event):
    """A target came into the night that is in no file: where it is (ICRS), what is wanted of it."""

    kind: ClassVar[str] = "target"
    name: str
    programme: str = ""
    ra_deg: float
    dec_deg: float
    priority: int
    filters: tuple[str, ...]
    seconds: tuple[float, ...]
    counts: tuple[int, ...]
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
        LostTime, Note, OrderProposed, Override, TargetAdded, Amendment, ClockStep, Recovery, Close,
    )
}  # fmt: skip
