"""Putting the log right: other values, rejected and restored exposures, withdrawn entries.

Each is an amendment, so the log keeps both, and each can itself be withdrawn. The entry that was
amended is never touched.
"""

from __future__ import annotations

from dataclasses import replace

from engine.errors import NotNow
from engine.log import (
    Amendment,
    Conditions,
    Event,
    Exposure,
    ExposureStart,
    NightState,
    effective,
    title,
)
from engine.log.keys import to_values
from engine.log.state import CONDITION_KEYS, UNDOABLE
from engine.log.values import Value
from engine.watch.record import Ending, credit_measured, exposure_record
from engine.watch.watch import Watch

# The keys of each kind that an observer enters or says, and so may put right.
AMENDABLE: dict[str, tuple[str, ...]] = {
    "exposure": ("outcome", "measured_fwhm_arcsec", "filter", "target", "frame", "why"),
    "note": ("text", "target"),
    "conditions": CONDITION_KEYS,
    "focus": ("position", "fwhm_arcsec", "temperature_c", "filter"),
    "calibration": ("what", "filter", "seconds", "count", "level_adu"),
    "lost_time": ("cause",),
    "override": ("why",),
    "pointing": ("target",),
}
WITHDRAWABLE = tuple(each for each in UNDOABLE if each.kind not in ("pointing", "run_start"))


def as_it_stands(state: NightState, n: int) -> Event | None:
    """Return an entry with its amendments carried out; None when it is withdrawn or not there."""
    return next((each for each in effective(state.events) if each.n == n), None)


def amendments_of(state: NightState, n: int) -> tuple[Amendment, ...]:
    """Return the amendments of an entry, withdrawn ones too, in their order."""
    return tuple(each for each in state.events if isinstance(each, Amendment) and each.of == n)


def amendable(event: Event) -> tuple[str, ...]:
    """Return the keys of an entry that can be given another value."""
    keys = AMENDABLE.get(event.kind, ())
    if isinstance(event, Conditions):
        # One that follows from a FWHM is put right on the exposure it was measured on.
        return () if event.of else tuple(key for key in keys if getattr(event, key) is not None)
    return keys


def amend(watch: Watch, n: int, key: str, value: Value) -> Event:
    """Give an entry another value of a key; what follows from it is worked out again.

    An exposure on another target or in another filter has other airmasses, sizes and credit; a
    FWHM measured on it gives another seeing.
    """
    event = _standing(watch, n)
    if key not in amendable(event):
        raise NotNow(f"{key} of this entry is not for the observer to change")
    changes: dict[str, Value] = {key: value}
    if isinstance(event, Exposure):
        changes |= _what_follows(watch, event, key, value)
    amendment = watch.submit(
        Amendment(of=n, why="put right by the observer", extra=changes),
        because=f"{title(event)} was amended",
    )
    if isinstance(event, Exposure) and key == "measured_fwhm_arcsec":
        _amend_its_seeing(watch, event, float(str(value)), amendment.n)
    return amendment


def reject_or_restore(watch: Watch, n: int, why: str = "") -> Event:
    """Reject an exposure that counts, or let a rejected one count again."""
    event = _standing(watch, n)
    if not isinstance(event, Exposure):
        raise NotNow("only an exposure can be rejected")
    if event.outcome not in ("good", "rejected"):
        raise NotNow(f"it was {event.outcome.replace('_', ' ')}: it does not count anyway")
    outcome = "rejected" if event.outcome == "good" else "good"
    said = "rejected" if outcome == "rejected" else "restored"
    return watch.submit(
        Amendment(of=n, why=why, extra={"outcome": outcome}),
        because=f"{event.filter} on {event.target} was {said}",
    )


def withdraw_or_restore(watch: Watch, n: int) -> Event:
    """Withdraw an entry, or take a withdrawal of it back."""
    state = watch.state
    written = state.event(n)
    if written is None:
        raise NotNow(f"no entry has the number {n}")
    if n in state.withdrawn:
        return _restore(watch, written)
    if not isinstance(written, WITHDRAWABLE):
        raise NotNow(f"{title(written)}: that happened, and stands; a note can say more")
    return watch.submit(
        Amendment(of=n, withdrawn=True, why="withdrawn by the observer"),
        because=f"withdrawn: {title(written)}",
    )


def _restore(watch: Watch, written: Event) -> Event:
    state = watch.state
    by = [
        each
        for each in amendments_of(state, written.n)
        if each.withdrawn and each.n not in state.withdrawn
    ]
    if not by:
        raise NotNow("it went with another entry: restore that one")
    for each in by:
        last = watch.submit(
            Amendment(of=each.n, withdrawn=True, why="restored by the observer"),
            because=f"restored: {title(written)}",
        )
    return last


def _standing(watch: Watch, n: int) -> Event:
    event = as_it_stands(watch.state, n)
    if event is None:
        raise NotNow("this entry is withdrawn: restore it first")
    return event


def _what_follows(watch: Watch, event: Exposure, key: str, value: Value) -> dict[str, Value]:
    """Return the other keys of an exposure's record that change with one of them."""
    if key == "measured_fwhm_arcsec":
        return {"credit": credit_measured(watch.planner, event, float(str(value)))}
    if key not in ("target", "filter"):
        return {}
    began = watch.state.event(event.of)
    if not isinstance(began, ExposureStart) or event.seeing_arcsec is None:
        return {}
    programmes = {each.name: each.programme for each in watch.planner.night.targets}
    target = str(value) if key == "target" else event.target
    started = replace(
        began,
        target=target,
        programme=programmes.get(target, ""),
        filter=str(value) if key == "filter" else event.filter,
    )
    ending = Ending(event.end_mjd, event.outcome, event.why)
    planner = watch.planner
    record = exposure_record(planner.night, planner.model, started, ending, event.seeing_arcsec)
    if event.measured_fwhm_arcsec is not None:
        worth = credit_measured(planner, record, event.measured_fwhm_arcsec)
        record = replace(record, credit=worth)
    stamped = replace(record, n=event.n, t_mjd=event.t_mjd, frame=event.frame)
    (_, new), (_, old) = to_values(stamped), to_values(event)
    kept = ("measured_fwhm_arcsec",)
    return {each: new[each] for each in new if each not in kept and new[each] != old.get(each)}


def _amend_its_seeing(watch: Watch, event: Exposure, fwhm_arcsec: float, with_n: int) -> None:
    """Amend the seeing that followed from a FWHM, if one did: it goes and comes with that."""
    entered = [
        each
        for each in effective(watch.state.events)
        if isinstance(each, Conditions) and each.of == event.n and each.seeing_arcsec is not None
    ]
    if not entered or event.airmass_mid is None:
        return
    place = watch.planner.logbook.observatory.filter_index(event.filter)
    zenith = watch.planner.model.zenith_seeing_arcsec(place, fwhm_arcsec, event.airmass_mid)
    changes: dict[str, Value] = {
        "measured_fwhm_arcsec": fwhm_arcsec,
        "seeing_arcsec": round(zenith, 3),
    }
    watch.submit(Amendment(of=entered[-1].n, with_n=with_n, extra=changes))
