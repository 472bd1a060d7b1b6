"""One look at a logbook without opening its night for writing: for the commands that print."""

from __future__ import annotations

from dataclasses import dataclass, replace
from datetime import date

import numpy as np

from engine.clock import SystemClock
from engine.errors import NoAnswer
from engine.image import ImageModel
from engine.log import NightState, fold, night_logs, read_log
from engine.logbook import Logbook
from engine.night import Night, Outlooks, TargetNow, plans, tables, targets_at
from engine.order import Order, propose, upper_limit
from engine.positions import almanac
from engine.times import iso_from_mjd, night_of
from engine.watch.listing import listed
from engine.watch.opening import done_for
from engine.watch.planning import Planner, forecast_of, measured_air
from engine.watch.rules import decided, rules_from


@dataclass(frozen=True, slots=True)
class Snapshot:
    """Every target at one moment (UTC MJD), and the seeing (arcsec) it was worked out with."""

    mjd: float
    night: Night
    model: ImageModel
    seeing_arcsec: float
    seeing_source: str
    targets: tuple[TargetNow, ...]


def snapshot(logbook: Logbook, mjd: float | None, seeing_arcsec: float | None) -> Snapshot:
    """Return every target at a moment (now when None), with what its night's log says by then.

    The seeing is the given one, else the night's nowcast, else the site's usual value.
    """
    mjd = SystemClock().now_mjd() if mjd is None else mjd
    observatory = logbook.observatory
    date_ = night_of(mjd, observatory.site.timezone)
    state = state_of_night(logbook, date_, mjd)
    logbook = listed(logbook, state.added)
    times = almanac(observatory.site, date_)
    air = measured_air(state, mjd, observatory.site.elevation_m)
    night = tables(observatory, logbook.targets, times, np.array([mjd]), air)
    model = ImageModel(observatory, night.air)
    source = "given"
    if seeing_arcsec is None:
        seeing_arcsec, source = observatory.seeing.typical_arcsec, "the site's usual value"
        if state.seeing:
            seeing_arcsec = forecast_of(state, mjd, seeing_arcsec).now_arcsec
            source = "from the night's log"
    outlook = Outlooks(night, model).given(np.array([seeing_arcsec]))
    progress = plans(logbook.targets, state.kept, done_for(logbook, date_, ()))
    seen = targets_at(night, outlook, mjd, progress, decided(rules_from(state, mjd)))
    return Snapshot(mjd, night, model, seeing_arcsec, source, seen)


def state_of_night(logbook: Logbook, night: date, until_mjd: float) -> NightState:
    """Return what a night's log says up to a moment (UTC MJD); an empty state without a log.

    LogError when there is one and it can't be read.
    """
    path = logbook.folder / f"{night.isoformat()}.toml"
    if path not in night_logs(logbook.folder):
        return NightState()
    return fold(event for event in read_log(path).events if not event.t_mjd > until_mjd)


def order_of_night(
    logbook: Logbook,
    night: date | None,
    at_mjd: float | None,
    seeing_arcsec: float | None,
    *,
    with_bound: bool = False,
) -> Order:
    """Return the order for what remains of a night.

    From ``at_mjd`` (UTC MJD) if given, else from now if now is in the night, else from its
    beginning; of the night's log only what is older counts. ``with_bound`` proves an upper limit
    too, which takes seconds and needs the extra ``bound``. NoAnswer when the night has no dark time
    left, or the moment is none of it.
    """
    now_mjd = SystemClock().now_mjd()
    moment = now_mjd if at_mjd is None else at_mjd
    site = logbook.observatory.site
    night = night or night_of(moment, site.timezone)
    if at_mjd is not None and night_of(at_mjd, site.timezone) != night:
        raise NoAnswer(f"{iso_from_mjd(at_mjd)} is not in the night of {night.isoformat()}")
    planner = Planner(logbook, night, done_for(logbook, night, ()))
    grid = planner.night.mjd
    inside = at_mjd is not None or grid[0] < now_mjd < grid[-1]
    start_mjd = moment if inside else float(grid[0])
    state = state_of_night(logbook, night, start_mjd)
    planner = planner.fit(state, start_mjd)
    if not planner.night.dark[:, planner.night.index_at(start_mjd) :].any():
        raise NoAnswer(f"no darkness is left in the night of {night.isoformat()}")
    if seeing_arcsec is None:
        seeing, _, high = planner.forecast(state, start_mjd).at(grid)
        outlook = planner.outlook(seeing, high)
    else:
        outlook = planner.outlook(np.full(len(grid), seeing_arcsec))
    problem = planner.problem(state, outlook, start_mjd, rules_from(state, start_mjd))
    order = propose(problem)
    return replace(order, bound=upper_limit(problem)) if with_bound else order
