"""The logbook's files, checked: ``observatory.toml``, ``targets.toml`` and target tables.

``load_logbook`` reads a folder whole or raises every fault at once. The pydantic models are the
domain types of the whole engine.
"""

from engine.logbook.describe import describe, planned_hours
from engine.logbook.load import Logbook, load_logbook
from engine.logbook.observatory import (
    Camera,
    Caution,
    Filter,
    Observatory,
    Seeing,
    Site,
    Telescope,
)
from engine.logbook.reference import ReferenceRow, reference_rows
from engine.logbook.sample import sample_logbook
from engine.logbook.targets import PlannedExposures, Programme, Target
from engine.logbook.typed import typed_target

__all__ = [
    "Camera",
    "Caution",
    "Filter",
    "Logbook",
    "Observatory",
    "PlannedExposures",
    "Programme",
    "ReferenceRow",
    "Seeing",
    "Site",
    "Target",
    "Telescope",
    "describe",
    "load_logbook",
    "planned_hours",
    "reference_rows",
    "sample_logbook",
    "typed_target",
]
