"""How much of a target's plan is done: as a count, and as depth (credit)."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, replace
from typing import Protocol

from engine.logbook import Target


class Taken(Protocol):
    """What matters here of an exposure that was taken and kept."""

    @property
    def target(self) -> str:
        """The target's name."""
        ...

    @property
    def filter(self) -> str:
        """The filter's name."""
        ...

    @property
    def seconds(self) -> float:
        """The planned length (s)."""
        ...

    @property
    def credit(self) -> float | None:
        """What it was worth, as a share of a planned exposure; None when that is not known."""
        ...


@dataclass(frozen=True, slots=True)
class Progress:
    """One line of a plan: so many exposures of so many seconds in one filter, and what is done.

    ``credit`` is the sum of what the exposures were worth, in planned exposures.
    """

    filter: str
    seconds: float
    planned: int
    done: int = 0
    credit: float = 0.0

    @property
    def remaining(self) -> int:
        """How many exposures are still to take; never negative."""
        return max(self.planned - self.done, 0)


Plans = dict[str, tuple[Progress, ...]]


def plans(
    targets: Iterable[Target], tonight: Iterable[Taken], earlier: Iterable[Taken] = ()
) -> Plans:
    """Return every target's plan with what was taken counted in, by target name.

    What was taken on earlier nights counts but for targets that are wanted anew each night.

    An exposure counts for the line of its filter and length; where a plan has several such, for
    the first that is not complete. One of another length counts for the line of its filter that
    lacks most: the observer chose that length for that plan.
    Exposures of targets or filters that are in no plan count for nothing.
    """
    targets = tuple(targets)
    anew = {target.name for target in targets if target.each_night}
    lines = {
        target.name: [
            Progress(each.filter, each.seconds, each.count * target.visits)
            for each in target.exposures
        ]
        for target in targets
    }
    for exposure in (*(each for each in earlier if each.target not in anew), *tonight):
        plan = lines.get(exposure.target, [])
        same_filter = [i for i, line in enumerate(plan) if line.filter == exposure.filter]
        if not same_filter:
            continue
        same_length = [i for i in same_filter if plan[i].seconds == exposure.seconds]
        if same_length:
            place = next((i for i in same_length if plan[i].remaining), same_length[0])
        else:
            place = max(same_filter, key=lambda i: plan[i].planned - plan[i].done)
        line = plan[place]
        worth = 1.0 if exposure.credit is None else exposure.credit
        plan[place] = replace(line, done=line.done + 1, credit=line.credit + worth)
    return {name: tuple(plan) for name, plan in lines.items()}


def is_finished(plan: tuple[Progress, ...]) -> bool:
    """Say whether nothing of a plan remains."""
    return all(line.remaining == 0 for line in plan)
