"""The list of a night: the logbook's targets, and those that came into the night by themselves."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import replace

from pydantic import ValidationError

from engine.log import TargetAdded
from engine.logbook import Logbook, Target


def listed(logbook: Logbook, added: Iterable[TargetAdded]) -> Logbook:
    """Return the logbook with a night's added targets behind its own.

    One whose name the logbook has by now is the logbook's; one that this observatory can't take
    (an entry made by hand, or the wheel has changed) is left out.
    """
    taken = {target.name for target in logbook.targets}
    wheel = {each.name for each in logbook.observatory.filters}
    more: list[Target] = []
    for event in added:
        target = _target(event)
        if target is None or target.name in taken:
            continue
        if all(each.filter in wheel for each in target.exposures):
            taken.add(target.name)
            more.append(target)
    return replace(logbook, targets=(*logbook.targets, *more))


def added_event(target: Target) -> TargetAdded:
    """Return the event by which a target comes into the night."""
    return TargetAdded(
        name=target.name,
        programme=target.programme,
        ra_deg=target.ra_deg,
        dec_deg=target.dec_deg,
        priority=target.priority,
        filters=tuple(each.filter for each in target.exposures),
        seconds=tuple(each.seconds for each in target.exposures),
        counts=tuple(each.count for each in target.exposures),
    )


def _target(event: TargetAdded) -> Target | None:
    steps = zip(event.filters, event.seconds, event.counts, strict=False)
    try:
        return Target.model_validate(
            {
                "name": event.name,
                "programme": event.programme,
                "ra": event.ra_deg,
                "dec": event.dec_deg,
                "priority": event.priority,
                "exposures": [
                    {"filter": name, "seconds": seconds, "count": count}
                    for name, seconds, count in steps
                ],
            }
        )
    except ValidationError:
        return None
