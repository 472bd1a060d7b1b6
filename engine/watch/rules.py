"""The observer's standing decisions, read off the night's overrides."""

from __future__ import annotations

from engine.log import NightState
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
    return Rules(frozenset(dropped), still, frozenset(forbidden))
