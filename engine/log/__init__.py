"""The night on disk, and the state of the night as a fold over it.

``NightLog.open`` locks and recovers a log, ``LogWorker`` appends to it off the clock's path,
``read_log`` reads any log and changes none, `Follower` reads on in one that grows, ``fold`` turns
events into a `NightState`.
"""

from engine.log.disk import Disk
from engine.log.events import (
    KINDS,
    Amendment,
    Calibration,
    ClockStep,
    Close,
    Conditions,
    Event,
    Exposure,
    ExposureStart,
    Focus,
    Foreign,
    LostTime,
    Note,
    OrderProposed,
    Override,
    Pointing,
    Recovery,
    RunStart,
    RunStop,
    TargetAdded,
)
from engine.log.follow import Follower
from engine.log.header import Header
from engine.log.reader import LogReading, audit, night_logs, read_log
from engine.log.state import (
    Latest,
    Lost,
    Measured,
    NightState,
    OpenExposure,
    Run,
    RunStep,
    effective,
    fold,
    last_undoable,
)
from engine.log.steps import StepWatch
from engine.log.titles import title
from engine.log.vocabulary import LOST_CAUSES, OUTCOMES, OVERRIDES, Word
from engine.log.worker import LogWorker
from engine.log.writer import NightLog

__all__ = [
    "KINDS",
    "LOST_CAUSES",
    "OUTCOMES",
    "OVERRIDES",
    "Amendment",
    "Calibration",
    "ClockStep",
    "Close",
    "Conditions",
    "Disk",
    "Event",
    "Exposure",
    "ExposureStart",
    "Focus",
    "Follower",
    "Foreign",
    "Header",
    "Latest",
    "LogReading",
    "LogWorker",
    "Lost",
    "LostTime",
    "Measured",
    "NightLog",
    "NightState",
    "Note",
    "OpenExposure",
    "OrderProposed",
    "Override",
    "Pointing",
    "Recovery",
    "Run",
    "RunStart",
    "RunStep",
    "RunStop",
    "StepWatch",
    "TargetAdded",
    "Word",
    "audit",
    "effective",
    "fold",
    "last_undoable",
    "night_logs",
    "read_log",
    "title",
]
