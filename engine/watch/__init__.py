"""The watch: the live night, what the observer does in it, and what is advised.

``open_watch`` opens a night for writing, `Watch` is it, `engine.watch.acts` holds what the observer
can do, ``snapshot`` and ``order_of_night`` look without opening anything.
"""

from engine.watch import acts
from engine.watch.advice import CautionNow, cautions
from engine.watch.opening import Opened, open_watch
from engine.watch.plan import Plan
from engine.watch.planning import Planned, Planner
from engine.watch.reach import Reach, Scene, reach
from engine.watch.snapshot import Snapshot, order_of_night, snapshot
from engine.watch.stage import NextExposure, Stage
from engine.watch.watch import Watch

__all__ = [
    "CautionNow",
    "NextExposure",
    "Opened",
    "Plan",
    "Planned",
    "Planner",
    "Reach",
    "Scene",
    "Snapshot",
    "Stage",
    "Watch",
    "acts",
    "cautions",
    "open_watch",
    "order_of_night",
    "reach",
    "snapshot",
]
