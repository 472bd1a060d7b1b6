"""Why a target may not be observed: one registry that the screen, the order and the report read.

Codes are stable: scripts rely on them. A target's reasons at one moment are the bits of one
integer, so that a whole night of them is a small array.
"""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Reason:
    """One reason: its bit, its stable code, a label for a narrow column, and a sentence."""

    bit: int
    code: str
    label: str
    sentence: str


# The order is the order of importance: the first that holds is the one shown.
REASONS: tuple[Reason, ...] = tuple(
    Reason(1 << place, code, label, sentence)
    for place, (code, label, sentence) in enumerate(
        (
            ("finished", "finished", "its plan is finished"),
            ("dropped", "dropped", "the observer dropped it for tonight"),
            ("put_off", "put off", "the observer put it off for a while"),
            ("below_horizon", "down", "it is below the horizon"),
            ("sun_near", "Sun", "it is too close to the Sun while the Sun is up"),
            ("daylight", "light", "the Sun is too high for its filters"),
            ("skyline", "skyline", "it is behind the skyline of the site"),
            ("too_low", "low", "it is lower than the telescope may point"),
            ("too_high", "zenith", "it is higher than the telescope can track"),
            ("hour_angle", "hour angle", "it is outside the mount's hour-angle limits"),
            ("window", "window", "it is outside its own time windows"),
            ("airmass", "airmass", "its airmass is above its own limit"),
            ("moon_near", "Moon", "it is closer to the Moon than it may be"),
            ("too_soft", "soft", "its images would be larger than its own limit"),
        )
    )
)

_BY_CODE = {reason.code: reason for reason in REASONS}


def reason_coded(code: str) -> Reason:
    """Return the reason with a stable code; KeyError for an unknown one."""
    return _BY_CODE[code]


def bit_of(code: str) -> int:
    """Return the bit of the reason with a stable code; KeyError for an unknown one."""
    return _BY_CODE[code].bit


def reasons_in(bits: int) -> tuple[Reason, ...]:
    """Return the reasons an integer of bits holds, the most important first."""
    return tuple(reason for reason in REASONS if bits & reason.bit)
