"""What happens in a night, and how much planning it is worth.

Measured on simulated nights: planning anew for lost time or an edited list buys 4 to 8 %, for a
smooth change of the seeing next to nothing; and an observer can't follow a list that reshuffles.
So most of what happens only sets new times, and an order is changed for clear gains.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import IntEnum

from engine.log import (
    Amendment,
    Conditions,
    Event,
    Exposure,
    LostTime,
    Override,
    Pointing,
    RunStart,
    RunStop,
    TargetAdded,
)


class Work(IntEnum):
    """How much planning is asked for; when several things happen the greatest is done.

    Whatever was asked for, an order of which much has become impossible is searched afresh.
    """

    REFINE = 0
    """Look for a better order in an idle moment; it is shown for a clear gain only."""
    RETIME = 1
    """Set new times and fill what became free."""
    CARRY_ON = 2
    """Search from the order in force, and change it for a clear gain."""
    AFRESH = 3
    """Try an order made from nothing against the one in force as well."""


# An end that came as planned only moves times. What was entered about the sky changes what
# everything is worth. A decision, lost time or another list can change everything.
_AFTER: dict[type[Event], Work] = {
    Exposure: Work.RETIME,
    RunStart: Work.RETIME,
    RunStop: Work.RETIME,
    Pointing: Work.RETIME,
    Conditions: Work.CARRY_ON,
    Amendment: Work.AFRESH,
    LostTime: Work.AFRESH,
    Override: Work.AFRESH,
    TargetAdded: Work.AFRESH,
}


def work_after(event: Event) -> Work:
    """Return how much planning an event asks for."""
    return _AFTER.get(type(event), Work.RETIME)


@dataclass(frozen=True, slots=True)
class Wish:
    """A plan that is wanted: how much work, why, and the decision whose cost is to be told."""

    work: Work
    because: str
    decision: Override | None = None

    def and_then(self, later: Wish) -> Wish:
        """Return one wish for two: the greater work and its reason, the later decision."""
        greater = later if later.work >= self.work and later.because else self
        work = max(self.work, later.work)
        return Wish(work, greater.because, later.decision or self.decision)
