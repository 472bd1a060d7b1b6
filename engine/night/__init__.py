"""The night: one room where positions, image sizes, sky and limits meet as tables.

``open_night`` builds the tables of a night, ``Outlooks`` what a seeing forecast means for them,
``targets_at`` reads one moment out of both, and ``plans`` says what of every plan is done.
"""

from engine.night.moment import FilterNow, TargetNow, targets_at
from engine.night.outlook import Outlook, Outlooks
from engine.night.progress import Plans, Progress, Taken, is_finished, plans
from engine.night.reasons import REASONS, Reason, bit_of, reason_coded, reasons_in
from engine.night.series import Series, TakenTonight, series_of
from engine.night.stretches import Stretch, runs, stretches
from engine.night.tables import Night, open_night, tables

__all__ = [
    "REASONS",
    "FilterNow",
    "Night",
    "Outlook",
    "Outlooks",
    "Plans",
    "Progress",
    "Reason",
    "Series",
    "Stretch",
    "Taken",
    "TakenTonight",
    "TargetNow",
    "bit_of",
    "is_finished",
    "open_night",
    "plans",
    "reason_coded",
    "reasons_in",
    "runs",
    "series_of",
    "stretches",
    "tables",
    "targets_at",
]
