"""The observer's standing decisions, read off the night's overrides."""

from __future__ import annotations

from dataclasses import dataclass, field, replace

from engine.log import NightState, Override, RunStart, RunStop
from engine.order import Rules


@dataclass(slots=True)
class _Standing:
    """What stands of the decisions up to one point of the night, by target or filter."""

    dropped: set[str] = field(default_factory=set)
    put_off: dict[str, float] = field(default_factory=dict)
    forbidden: set[str] = field(default_factory=set)
    pinned: dict[str, float] = field(default_factory=dict)
    next: Override | None = None
    held: Override | None = None

    def take(self, each: Override) -> None:
        """Take one more decision in; a later one of a target stands for the earlier."""
        match each.action:
            case "drop":
                self.release(each.target)
                self.dropped.add(each.target)
            case "put_off" if each.until_mjd is not None:
                self.release(each.target)
                self.put_off[each.target] = each.until_mjd
            case "pin":
                self.release(each.target)
                if each.at_mjd is None:
                    self.next = each
                else:
                    self.pinned[each.target] = each.at_mjd
            case "hold":
                self.held = each
            case "forbid":
                self.forbidden.add(each.filter)
            case "release":
                self.release(each.target)
                self.forbidden.discard(each.filter)

    def release(self, target: str) -> None:
        """Undo what was decided about a target."""
        self.dropped.discard(target)
        self.put_off.pop(target, None)
        self.pinned.pop(target, None)
        if self.next is not None and self.next.target == target:
            self.next = None
        if self.held is not None and self.held.target == target:
            self.held = None


def rules_from(state: NightState, now_mjd: float) -> Rules:
    """Return the rules in force at a moment (UTC MJD).

    A later decision about a target takes the place of an earlier one; "release" undoes it. A pin
    has served when a run on its target began after it; being held ends with the next pointing.
    """
    standing = _standing(state)
    first, hold = _first(state, standing)
    return Rules(
        dropped=frozenset(standing.dropped),
        put_off={name: until for name, until in standing.put_off.items() if until > now_mjd},
        forbidden_filters=frozenset(standing.forbidden),
        first=first,
        hold=hold,
        pinned=dict(standing.pinned),
    )


def without(rules: Rules, decision: Override) -> Rules:
    """Return the rules as they would be had the observer not decided something."""
    name = decision.target
    match decision.action:
        case "drop":
            return replace(rules, dropped=rules.dropped - {name})
        case "put_off":
            return replace(rules, put_off=_less(rules.put_off, name))
        case "pin" if decision.at_mjd is not None:
            return replace(rules, pinned=_less(rules.pinned, name))
        case "forbid":
            return replace(rules, forbidden_filters=rules.forbidden_filters - {decision.filter})
        case "pin" | "hold" | "chose":
            return replace(rules, first=None, hold=False)
        case _:
            return rules


def _less(moments: dict[str, float], name: str) -> dict[str, float]:
    return {each: mjd for each, mjd in moments.items() if each != name}


def decided(rules: Rules) -> dict[str, str]:
    """Return the code of the reason that the observer made, by target: put off, or dropped."""
    return dict.fromkeys(rules.put_off, "put_off") | dict.fromkeys(rules.dropped, "dropped")


def is_pinned(state: NightState, name: str) -> bool:
    """Say whether a target is pinned, next or at a time, and the pin has not served yet."""
    standing = _standing(state)
    is_next = standing.next is not None and standing.next.target == name
    return is_next or name in standing.pinned


def _standing(state: NightState) -> _Standing:
    begun = {
        event.target: event.n
        for event in state.events
        if isinstance(event, RunStart) and event.n not in state.withdrawn
    }
    standing = _Standing()
    for each in state.overrides:
        if each.action == "pin" and begun.get(each.target, 0) > each.n:
            # It has served; what it took the place of does not come back.
            standing.release(each.target)
        else:
            standing.take(each)
    return standing


def _first(state: NightState, standing: _Standing) -> tuple[str | None, bool]:
    """Return the target that comes first, and whether all of its plan does.

    The one held; else the one under way; else the one pinned to be next; else the one the
    telescope was sent to, until its run there is over: an order that proposed to leave it again
    would be of no use.
    """
    held, pointing = standing.held, state.pointing
    if held is not None and pointing is not None and pointing.target == held.target:
        return held.target, True
    if state.run is not None:
        return state.run.target, False
    if standing.next is not None:
        return standing.next.target, False
    if pointing is None:
        return None, False
    left = any(isinstance(each, RunStop) and each.n > pointing.n for each in state.events)
    return (None if left else pointing.target), False
