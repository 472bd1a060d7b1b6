"""What moved between one plan and the next, and why: a few plain sentences."""

from __future__ import annotations

from zoneinfo import ZoneInfo

from engine.night import Night, Plans
from engine.order import Order, Visit
from engine.times import MINUTES_PER_DAY, SECONDS_PER_DAY, datetime_from_mjd
from engine.watch.plan import Plan

# Changes smaller than these are not news: common practice, no source.
SEEING_SHARE = 0.03
MOVED_MIN = 20.0
# What lies further ahead than this will change again before it matters.
SOON_MIN = 150.0
SAID_AT_MOST = 6
# A decision that costs less of the night's worth than this is free.
COSTS_NOTHING = 0.01


def news(before: Plan, after: Plan, plans: Plans, under_way: str | None = None) -> tuple[str, ...]:
    """Return what an observer would want to know about a new plan, the most important first.

    ``under_way`` is the target that is being observed: what is next comes after it.
    """
    said = [
        *_next_visit(before.order, after.order, under_way),
        *_seeing(before, after),
        *_softness(before, after, plans),
        *_left_and_entered(before.order, after.order),
        *_moved(after.night, before.order, after.order),
    ]
    return tuple(said[:SAID_AT_MOST])


def cost_of(order: Order, free: Order) -> tuple[str, ...]:
    """Return what a decision costs: an order with it against one without, in plain words."""
    if free.value <= 0.0:
        return ()
    share = 1.0 - order.value / free.value
    if share < COSTS_NOTHING:
        return ("your choice costs next to nothing",)
    return (f"your choice costs {share:.0%} of what the rest of the night would bring",)


def _next_visit(before: Order, after: Order, under_way: str | None) -> list[str]:
    ahead = _to_come(before, after.from_mjd, under_way)
    to_come = _to_come(after, after.from_mjd, under_way)
    if not to_come:
        return ["nothing more can be observed tonight"] if ahead else []
    if ahead and to_come[0].target != ahead[0].target:
        return [f"next {to_come[0].target} instead of {ahead[0].target}: {to_come[0].reason}"]
    return []


def _to_come(order: Order, from_mjd: float, under_way: str | None) -> list[Visit]:
    """Return the visits of an order after the one that is under way."""
    return [v for v in order.visits if v.end_mjd > from_mjd and v.target != under_way]


def _seeing(before: Plan, after: Plan) -> list[str]:
    was, now = before.forecast.now_arcsec, after.forecast.now_arcsec
    # Without a new measurement the forecast only relaxes, as it was said to.
    same = after.forecast.count == before.forecast.count
    if same or abs(now / was - 1.0) < SEEING_SHARE:
        return []
    return [f'seeing {was:.2f}" to {now:.2f}"']


def _softness(before: Plan, after: Plan, plans: Plans) -> list[str]:
    night = after.night
    if before.night.observatory.filters != night.observatory.filters:
        return []
    # A target is judged when it was going to be exposed, or now.
    visits = {
        visit.target: visit.exposures[0].start_mjd + visit.exposures[0].seconds / SECONDS_PER_DAY
        for visit in reversed(before.order.visits)
    }
    softened, sharpened = [], []
    places = {target.name: index for index, target in enumerate(before.night.targets)}
    for index, target in enumerate(night.targets):
        if target.name not in places:
            continue  # it came in since: nothing was said of it before
        at = night.index_at(max(visits.get(target.name, 0.0), after.made_mjd))
        needed = [
            night.observatory.filter_index(line.filter)
            for line in plans[target.name]
            if line.remaining
        ]
        if not needed or night.limits[index, at]:
            continue
        was = bool(before.outlook.soft[needed, places[target.name], at].all())
        now = bool(after.outlook.soft[needed, index, at].all())
        if now and not was:
            softened.append(target.name)
        elif was and not now:
            sharpened.append(target.name)
    said = []
    if softened:
        said.append(f"too soft now: {_some(softened)}")
    if sharpened:
        said.append(f"sharp enough again: {_some(sharpened)}")
    return said


def _left_and_entered(before: Order, after: Order) -> list[str]:
    until_mjd = after.from_mjd + SOON_MIN / MINUTES_PER_DAY
    was, now = _soon(before, after.from_mjd, until_mjd), _soon(after, after.from_mjd, until_mjd)
    later = {visit.target for visit in after.visits}
    before_all = {visit.target for visit in before.visits}
    why = {each.target: each.reason for each in after.left_out}
    said = []
    gone = sorted(name for name in was if name not in later and name in why)
    if len(gone) == 1:
        said.append(f"{gone[0]} left out: {why[gone[0]]}")
    elif gone:
        said.append(f"left out: {_some(gone)}")
    entered = sorted(name for name in now if name not in before_all)
    if entered:
        said.append(f"taken in: {_some(entered)}")
    return said


def _soon(order: Order, from_mjd: float, until_mjd: float) -> set[str]:
    """Return the targets an order has between two moments."""
    return {v.target for v in order.visits if v.end_mjd > from_mjd and v.start_mjd < until_mjd}


def _moved(night: Night, before: Order, after: Order) -> list[str]:
    was: dict[str, list[float]] = {}
    for visit in before.visits:
        was.setdefault(visit.target, []).append(visit.start_mjd)
    zone = ZoneInfo(night.observatory.site.timezone)
    moved = []
    for visit in after.visits:
        # Of a target with several visits, one has moved if none of those before was near it.
        away = [abs(visit.start_mjd - old) * MINUTES_PER_DAY for old in was.get(visit.target, ())]
        if not away or min(away) < MOVED_MIN:
            continue
        if (visit.start_mjd - after.from_mjd) * MINUTES_PER_DAY > SOON_MIN:
            continue
        moment = datetime_from_mjd(visit.start_mjd).astimezone(zone)
        moved.append(f"{visit.target} to {moment:%H:%M}")
    return [f"moved: {_some(moved)}"] if moved else []


def _some(names: list[str]) -> str:
    more = len(names) - 3
    return ", ".join(names[:3]) + (f" and {more} more" if more > 0 else "")
