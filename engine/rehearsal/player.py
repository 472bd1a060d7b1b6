"""Somebody who observes: follows the advice, measures, notes, loses time to the cloud.

It acts on a watch through the same acts as an observer's keys do, so that a rehearsed night is a
night like any other, its log included.
"""

from __future__ import annotations

import numpy as np

from engine.errors import WarmroomError
from engine.log import Conditions, Exposure
from engine.rehearsal.weather import InventedNight
from engine.times import MINUTES_PER_DAY, SECONDS_PER_DAY
from engine.watch import Stage, Watch, acts

MOVING_S = 75.0
MEASURES_EVERY_MIN = 12.0
ENTERS_AIR_EVERY_MIN = 60.0
# Does not go to a target that can't be exposed within this.
PATIENCE_MIN = 3.0
REJECTS_SHARE = 0.02
MEASUREMENT_SCATTER_LN = 0.05


class Player:
    """An invented observer for one invented night; the same for the same seed."""

    def __init__(self, truth: InventedNight, seed: int) -> None:
        self._truth = truth
        self._chance = np.random.default_rng(seed)
        self._there_mjd = 0.0
        self._measured_mjd = 0.0
        self._air_mjd = 0.0
        self._judged_n = 0

    def tick(self, watch: Watch) -> tuple[str, ...]:
        """Do what is to be done now; return what to tell an onlooker."""
        now_mjd = watch.clock.now_mjd()
        said = [*self._cloud(watch, now_mjd), *self._air(watch, now_mjd)]
        last = acts.last_exposure(watch)
        if last is not None and last.n > self._judged_n:
            self._judged_n = last.n
            said += self._judge(watch, last, now_mjd)
        match watch.stage:
            case Stage.IDLE:
                said += self._accept(watch, now_mjd)
            case Stage.MOVING if now_mjd >= self._there_mjd:
                acts.arrive(watch)
            case Stage.READY:
                said += self._begin(watch, now_mjd)
            case Stage.CUT_OFF:
                acts.lose_cut_off(watch)
            case _:
                pass
        return tuple(said)

    def _cloud(self, watch: Watch, now_mjd: float) -> list[str]:
        lost = watch.state.lost_since
        if self._truth.is_cloudy(now_mjd) and lost is None:
            acts.conditions(watch, Conditions(cloud_percent=90.0))
            acts.begin_lost(watch, "cloud")
            return ["a cloud comes over: time is lost"]
        if lost is not None and lost.cause == "cloud" and not self._truth.is_cloudy(now_mjd):
            acts.conditions(watch, Conditions(cloud_percent=0.0))
            acts.end_lost(watch)
            return ["the cloud has passed"]
        return []

    def _air(self, watch: Watch, now_mjd: float) -> list[str]:
        if (now_mjd - self._air_mjd) * MINUTES_PER_DAY < ENTERS_AIR_EVERY_MIN:
            return []
        self._air_mjd = now_mjd
        temperature_c, humidity_percent, wind_m_per_s = self._truth.air_at(now_mjd)
        acts.conditions(
            watch,
            Conditions(
                temperature_c=round(temperature_c, 1),
                humidity_percent=float(round(humidity_percent)),
                wind_m_per_s=round(wind_m_per_s, 1),
            ),
        )
        return []

    def _judge(self, watch: Watch, last: Exposure, now_mjd: float) -> list[str]:
        """Look at the frame just taken: reject one now and then, measure one now and then."""
        if last.outcome == "good" and self._chance.random() < REJECTS_SHARE:
            acts.reject(watch, "trailed")
            return [f"{last.filter} on {last.target} rejected: trailed"]
        since_min = (now_mjd - self._measured_mjd) * MINUTES_PER_DAY
        if since_min < MEASURES_EVERY_MIN or last.airmass_mid is None:
            return []
        self._measured_mjd = now_mjd
        place = watch.planner.logbook.observatory.filter_index(last.filter)
        seeing = self._truth.seeing_at(last.mid_mjd)
        size = float(watch.planner.model.size_arcsec(place, seeing, last.airmass_mid))
        measured = round(size * float(np.exp(self._chance.normal(0.0, MEASUREMENT_SCATTER_LN))), 2)
        try:
            acts.measured_fwhm(watch, measured)
        except WarmroomError:
            # Sharper than the optics allow: the scatter of a measurement; an observer shrugs.
            return []
        return [f'measured {measured:.2f}" in {last.filter} on {last.target}']

    def _accept(self, watch: Watch, now_mjd: float) -> list[str]:
        visit = next(iter(watch.plan.ahead(now_mjd)), None) if watch.plan else None
        if visit is None:
            return []
        wait_min = (visit.exposures[0].start_mjd - now_mjd) * MINUTES_PER_DAY
        if wait_min > PATIENCE_MIN:
            return []
        acts.point_at(watch, visit.target)
        self._there_mjd = now_mjd + MOVING_S / SECONDS_PER_DAY
        return [f"next {visit.target}: {visit.reason}"]

    def _begin(self, watch: Watch, now_mjd: float) -> list[str]:
        """Start the run, or go on to the next target when this one has had its run."""
        here = watch.state.pointing
        plan = watch.plan
        if here is None or plan is None:
            return []
        wanted = next(iter(plan.ahead(now_mjd)), None)
        if wanted is None or wanted.target != here.target:
            return self._accept(watch, now_mjd)
        lines = acts.lines_now(watch)
        if lines:
            acts.start_run(watch, lines)
        return []
