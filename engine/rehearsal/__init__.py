"""Rehearsals: an invented night over the sample logbook, and somebody who observes it.

For the demo, for the sample's own past nights, and for tests that need a whole night.
"""

from engine.rehearsal.player import Player
from engine.rehearsal.rehearse import (
    NIGHT,
    OBSERVER,
    Rehearsal,
    open_rehearsal,
    play_unwatched,
    prepare,
    resume_mjd,
)
from engine.rehearsal.weather import InventedNight, invent_night

__all__ = [
    "NIGHT",
    "OBSERVER",
    "InventedNight",
    "Player",
    "Rehearsal",
    "invent_night",
    "open_rehearsal",
    "play_unwatched",
    "prepare",
    "resume_mjd",
]
