"""The observer's standing decisions, read off the night's overrides."""

from __future__ import annotations

from engine.log import NightState, RunStop
from engine.order import Rules


def rules_from(state: NightState, now_mjd: float) -> Rules:
    """Return the rules in force at a moment (UTC MJD): what was dropped, put off, put aside.

    A later "release" of a target or a filter undoes what was decided about it before.
    """
    dropped: set[str] = set()
    put_off: dict[str, float] = {}
    forbidden: set[str] = set()
    for each in state.overrides:
        match each.action:
            case "drop":
                dropped.add(each.target)
            case "put_off" if each.until_mjd is not None:
                put_off[each.target] = each.until_mjd
            case "forbid":
                forbidden.add(each.filter)
            case "release":
                dropped.discard(each.target)
                put_off.pop(each.target, None)
                forbidden.discard(each.filter)
    still = {target: until for target, until in put_off.items() if until > now_mjd}
    return Rules(frozenset(dropped), still, frozenset(forbidden), _held(state))


def _held(state: NightState) -> str | None:
    """Return the target the telescope was sent to, until its run there is over.

    The observer has decided: an order that proposed to leave it again would be of no use.
    """
    if state.pointing is None:
        return None
    sent_n = state.pointing.n
    left = any(isinstance(each, RunStop) and each.n > sent_n for each in state.events)
    return None if left and state.run is None else state.pointing.target
