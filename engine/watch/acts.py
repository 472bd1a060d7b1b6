"""What the observer can do, as plain functions on a `Watch`: each becomes one event or a few.

An act that makes no sense at this stage raises `NotNow` and does nothing.
"""

from __future__ import annotations

from dataclasses import replace

from engine.errors import NotNow
from engine.log import (
    Amendment,
    Conditions,
    Event,
    Exposure,
    LostTime,
    Note,
    Override,
    Pointing,
    RunStart,
    RunStop,
    last_undoable,
    title,
)
from engine.logbook import Target
from engine.night import Progress, series_of
from engine.times import MINUTES_PER_DAY, SECONDS_PER_DAY
from engine.watch.listing import added_event
from engine.watch.record import Ending, credit_measured
from engine.watch.rules import is_pinned, rules_from
from engine.watch.stage import Stage
from engine.watch.watch import Watch

# The common round


def point_at(watch: Watch, name: str) -> Event:
    """Send the telescope to a target; another than the proposed one is logged as an override."""
    _not_while_exposing(watch)
    night = watch.planner.night
    try:
        target = night.targets[night.target_index(name)]
    except KeyError:
        raise NotNow(f"no target is called {name!r}") from None
    state = watch.state
    if state.lost_since is not None:
        raise NotNow("time is being lost; end that first")
    if state.run is not None:
        watch.submit(RunStop(of=state.run.n, why="left for another target"))
    proposed = watch.plan.ahead(watch.clock.now_mjd())[:1] if watch.plan else ()
    if proposed and proposed[0].target != name:
        watch.submit(Override(action="chose", target=name, instead_of=proposed[0].target))
    pointing = Pointing(target=name, ra_deg=target.ra_deg, dec_deg=target.dec_deg)
    return watch.submit(pointing, because=f"the telescope goes to {name}")


def arrive(watch: Watch) -> Event:
    """Say that the telescope stands on the target it was sent to."""
    if watch.stage is not Stage.MOVING or watch.state.pointing is None:
        raise NotNow("the telescope was not sent anywhere")
    there = watch.state.pointing
    return watch.submit(
        Pointing(target=there.target, ra_deg=there.ra_deg, dec_deg=there.dec_deg, on_target=True)
    )


def lines_now(watch: Watch) -> tuple[Progress, ...]:
    """Return the lines of the plan of the target the telescope is on that a run would take now.

    Those that the order has for it now; where the order has none, all that remain and may be
    exposed now; where limits forbid them all, all that remain: then it is the observer's choice.
    """
    pointing = watch.state.pointing
    if pointing is None or watch.plan is None:
        return ()
    left = tuple(line for line in this_visit(watch, pointing.target) if line.remaining)
    if not left:
        return ()
    now_mjd = watch.clock.now_mjd()
    visit = next(iter(watch.plan.ahead(now_mjd)), None)
    if visit is not None and visit.target == pointing.target:
        wanted = {placed.filter for placed in visit.exposures}
        return tuple(line for line in left if line.filter in wanted) or left
    night, outlook = watch.planner.night, watch.plan.outlook
    at, index = night.index_at(now_mjd), night.target_index(pointing.target)
    open_now = tuple(
        line
        for line in left
        for place in (night.observatory.filter_index(line.filter),)
        if night.dark[place, at] and not outlook.soft[place, index, at]
    )
    return open_now or left


def this_visit(watch: Watch, name: str) -> tuple[Progress, ...]:
    """Return a target's plan for one visit: of one visited several times, only the next."""
    plan = watch.plans().get(name, ())
    target = next((each for each in watch.planner.night.targets if each.name == name), None)
    series = series_of(target, plan, watch.state.kept) if target is not None else None
    if series is None or not series.visits:
        return plan
    return tuple(
        replace(line, planned=line.done + count)
        for line, count in zip(plan, series.visits[0], strict=True)
    )


def start_run(watch: Watch, lines: tuple[Progress, ...]) -> Event:
    """Begin a run on the target: all that remains of these lines of its plan, filter by filter."""
    if watch.stage is not Stage.READY or watch.state.pointing is None:
        raise NotNow("the telescope is not on a target")
    lines = tuple(line for line in lines if line.remaining)
    if not lines:
        raise NotNow(f"nothing remains of the plan of {watch.state.pointing.target}")
    event = watch.submit(
        RunStart(
            target=watch.state.pointing.target,
            filters=tuple(line.filter for line in lines),
            seconds=tuple(line.seconds for line in lines),
            counts=tuple(line.remaining for line in lines),
        )
    )
    watch.tick()
    return event


# The observer's rules


def drop(watch: Watch, name: str) -> Event:
    """Drop a target for tonight, or take it back when it was dropped or put off."""
    rules = rules_from(watch.state, watch.clock.now_mjd())
    back = name in rules.dropped or name in rules.put_off
    action = "release" if back else "drop"
    said = "taken back" if back else "dropped"
    return watch.submit(Override(action=action, target=name), because=f"{name} was {said}")


def put_off(watch: Watch, name: str, minutes: float) -> Event:
    """Leave a target out of the order for so many minutes."""
    until_mjd = watch.clock.now_mjd() + minutes / MINUTES_PER_DAY
    override = Override(action="put_off", target=name, until_mjd=until_mjd)
    return watch.submit(override, because=f"{name} was put off")


def take_next(watch: Watch, name: str) -> Event:
    """Let a target be next whatever the order says, or no longer when it was to be."""
    back = is_pinned(watch.state, name)
    action = "release" if back else "pin"
    said = "no longer pinned" if back else "to be next"
    return watch.submit(Override(action=action, target=name), because=f"{name} is {said}")


def take_at(watch: Watch, name: str, at_mjd: float) -> Event:
    """Let a target's exposures begin at a moment (UTC MJD) whatever the order says."""
    if at_mjd < watch.clock.now_mjd():
        raise NotNow("that moment is past")
    if at_mjd > watch.planner.night.mjd[-1]:
        raise NotNow("that moment is after the end of the night")
    override = Override(action="pin", target=name, at_mjd=at_mjd)
    return watch.submit(override, because=f"{name} is pinned to a time")


def hold(watch: Watch) -> Event:
    """Stay on the present target until all of its plan is done, or no longer."""
    pointing = watch.state.pointing
    if pointing is None:
        raise NotNow("the telescope is on no target")
    rules = rules_from(watch.state, watch.clock.now_mjd())
    action = "release" if rules.hold else "hold"
    said = "no longer held" if rules.hold else "held"
    override = Override(action=action, target=pointing.target)
    return watch.submit(override, because=f"{pointing.target} is {said}")


def insert(watch: Watch, target: Target) -> Event:
    """Take a target into the night that is in no file; the order is made anew with it."""
    taken = {each.name for each in watch.planner.night.targets}
    taken |= {each.name for each in watch.state.added}
    if target.name in taken:
        raise NotNow(f"a target is called {target.name} already; give it another name")
    return watch.submit(added_event(target), because=f"{target.name} came in")


def put_filter_aside(watch: Watch, name: str) -> Event:
    """Use a filter no more tonight, or again when it was put aside."""
    back = name in rules_from(watch.state, watch.clock.now_mjd()).forbidden_filters
    action = "release" if back else "forbid"
    said = "used again" if back else "put aside"
    return watch.submit(Override(action=action, filter=name), because=f"{name} is {said}")


# Exposures


def stop(watch: Watch) -> Event:
    """End the exposure under way, and its run, now."""
    if watch.stage not in (Stage.EXPOSING, Stage.BETWEEN):
        raise NotNow("nothing is being exposed")
    run = watch.state.run
    event: Event | None = None
    if watch.state.exposing is not None:
        now_mjd = max(watch.clock.now_mjd(), watch.state.exposing.start_mjd)
        event = watch.end_exposure(Ending(now_mjd, "stopped", "stopped by the observer"))
    if run is not None:
        event = watch.submit(
            RunStop(of=run.n, why="stopped by the observer"), because="the run was stopped"
        )
    if event is None:
        raise NotNow("nothing is being exposed")
    return event


def reject(watch: Watch, why: str = "") -> Event:
    """Reject the last exposure that counts: it comes back on the plan."""
    last = next((each for each in reversed(watch.state.exposures) if each.outcome == "good"), None)
    if last is None:
        raise NotNow("no exposure of this night counts")
    amendment = Amendment(of=last.n, why=why, extra={"outcome": "rejected"})
    return watch.submit(amendment, because=f"{last.filter} on {last.target} was rejected")


def repeat(watch: Watch) -> Event:
    """Take the last exposure once more, as a run of one."""
    if not watch.state.exposures:
        raise NotNow("nothing was exposed yet")
    last = watch.state.exposures[-1]
    pointing = watch.state.pointing
    if watch.stage is not Stage.READY or pointing is None or pointing.target != last.target:
        raise NotNow(f"the telescope is not on {last.target}, or a run is under way")
    return start_run(watch, (Progress(last.filter, last.seconds, 1),))


def keep_cut_off(watch: Watch) -> Event | None:
    """Say that the exposure that was open when the console ended was not harmed.

    If its time is over it is logged as good; if not, the count-down goes on. Of the rest of its run
    nothing is counted that was not watched either.
    """
    exposing = watch.state.exposing
    if watch.stage is not Stage.CUT_OFF or exposing is None:
        raise NotNow("no exposure was cut off")
    end_mjd = exposing.start_mjd + exposing.seconds / SECONDS_PER_DAY
    if watch.clock.now_mjd() < end_mjd:
        watch.vouch()
        return None
    event = watch.end_exposure(
        Ending(end_mjd, "good", "the console was away at its end; kept by the observer")
    )
    watch.tick()
    return event


def lose_cut_off(watch: Watch) -> Event:
    """Log the exposure that was open when the console ended as lost, and end its run."""
    exposing, run = watch.state.exposing, watch.state.run
    if watch.stage is not Stage.CUT_OFF or exposing is None:
        raise NotNow("no exposure was cut off")
    end_mjd = exposing.start_mjd + exposing.seconds / SECONDS_PER_DAY
    ended_mjd = max(min(watch.clock.now_mjd(), end_mjd), exposing.start_mjd)
    event = watch.end_exposure(Ending(ended_mjd, "cut_off", "the console ended during it"))
    if run is not None:
        watch.submit(RunStop(of=run.n, why="cut off"), because="an exposure was lost")
    return event


# Conditions


def zenith_seeing(watch: Watch, arcsec: float) -> Event:
    """Enter the seeing (arcsec, zenith, 500 nm) as somebody measured or judged it."""
    return watch.submit(Conditions(seeing_arcsec=arcsec), because=f'seeing {arcsec:.2f}" entered')


def measured_fwhm(watch: Watch, arcsec: float) -> Event:
    """Enter the FWHM (arcsec) measured on the last exposure; the zenith seeing follows from it.

    The exposure gets the value, and its credit is worked out again with it. NoAnswer when the
    telescope and camera alone can't give an image so sharp.
    """
    last = watch.state.exposures[-1] if watch.state.exposures else None
    if last is None or last.airmass_mid is None:
        raise NotNow("no exposure yet to have measured it on; type the zenith seeing instead")
    try:
        place = watch.planner.logbook.observatory.filter_index(last.filter)
    except KeyError:
        raise NotNow(f"{last.filter} is no longer in the wheel; type the zenith seeing") from None
    zenith = watch.planner.model.zenith_seeing_arcsec(place, arcsec, last.airmass_mid)
    event = watch.submit(
        Conditions(
            seeing_arcsec=round(zenith, 3),
            measured_fwhm_arcsec=arcsec,
            target=last.target,
            filter=last.filter,
            airmass=last.airmass_mid,
            of=last.n,
        ),
        because=f'a FWHM of {arcsec:.2f}" in {last.filter}',
    )
    worth = credit_measured(watch.planner, last, arcsec)
    watch.submit(
        Amendment(
            of=last.n,
            with_n=event.n,
            extra={"measured_fwhm_arcsec": float(arcsec), "credit": worth},
        )
    )
    return event


def conditions(watch: Watch, entered: Conditions) -> Event:
    """Enter cloud, wind, humidity, temperature, dew point or pressure."""
    return watch.submit(entered)


# The night


def begin_lost(watch: Watch, cause: str) -> Event:
    """Time begins to be lost: the run stops, and an exposure under way with it."""
    if watch.state.lost_since is not None:
        raise NotNow("time is being lost already")
    if watch.stage in (Stage.EXPOSING, Stage.BETWEEN):
        stop(watch)
    return watch.submit(LostTime(phase="begin", cause=cause), because=f"time is lost: {cause}")


def end_lost(watch: Watch) -> Event:
    """Time is no longer lost; the night goes on with a fresh order."""
    if watch.state.lost_since is None:
        raise NotNow("no time is being lost")
    return watch.submit(LostTime(phase="end"), because="lost time ended")


def note(watch: Watch, text: str) -> Event:
    """Write a note, tied to the target the telescope is on."""
    target = watch.state.pointing.target if watch.state.pointing else ""
    return watch.submit(Note(text=text, target=target))


def undo(watch: Watch) -> tuple[Event, str]:
    """Withdraw the last entry that can be; return the amendment and what was withdrawn."""
    last = last_undoable(watch.state)
    if last is None:
        raise NotNow("nothing is left to undo")
    if isinstance(last, RunStart | Pointing):
        _not_while_exposing(watch)
    what = title(last)
    event = watch.submit(
        Amendment(of=last.n, withdrawn=True, why="undone by the observer"),
        because=f"undone: {what}",
    )
    return event, what


def last_exposure(watch: Watch) -> Exposure | None:
    """Return the last exposure that was recorded; None when there is none."""
    return watch.state.exposures[-1] if watch.state.exposures else None


def _not_while_exposing(watch: Watch) -> None:
    if watch.stage is Stage.CUT_OFF:
        raise NotNow("an exposure was cut off; keep it or log it as lost first")
    if watch.state.exposing is not None:
        raise NotNow("an exposure is under way; stop it first")
