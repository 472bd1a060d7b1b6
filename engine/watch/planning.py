"""From what is known to what is advised: forecast, outlook, order, and what moved.

Planning is the night's heavy work, so it is a plain function of frozen things: the console runs it
on a worker thread and adopts the result on its own.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from datetime import date

import numpy as np
from numpy.typing import NDArray

from engine.image import ImageModel
from engine.log import NightState, TargetAdded
from engine.logbook import Logbook
from engine.night import Night, Outlook, Outlooks, Plans, Taken, open_night, plans
from engine.order import Order, Problem, Rules, build_problem, propose, refine, retime, travel_of
from engine.past import done_before
from engine.positions import Air
from engine.seeing import SeeingForecast, SeeingMeasurement, nowcast
from engine.times import HOURS_PER_DAY
from engine.watch.listing import listed
from engine.watch.news import cost_of, news
from engine.watch.plan import Plan
from engine.watch.rules import rules_from, without
from engine.watch.triggers import Wish, Work

# How long a typed value of the air is taken to hold, and from which change on the tables are made
# anew: common practice, no source. Each step is worth under 2 % of the dispersion.
AIR_HOLDS_H = 4.0
AIR_STEP_HPA, AIR_STEP_C, AIR_STEP_PERCENT = 8.0, 4.0, 40.0


# A forecast within this share of the one before leaves sizes and sky as they were.
SAME_SEEING = 0.005


@dataclass(frozen=True, slots=True)
class Planned:
    """A plan, and the planner that made it: another one when list or air have changed."""

    planner: Planner
    plan: Plan


class Planner:
    """The tables of one night and the image model over them; makes one plan after another.

    Nothing in it changes once it is made, so a worker thread may use it freely.
    """

    def __init__(
        self,
        logbook: Logbook,
        night: date,
        done: tuple[Taken, ...] = (),
        *,
        added: tuple[TargetAdded, ...] = (),
        air: Air | None = None,
    ) -> None:
        self.logbook = listed(logbook, added)
        self.night: Night = open_night(self.logbook, night, air)
        self.model = ImageModel(logbook.observatory, self.night.air)
        self._outlooks = Outlooks(self.night, self.model)
        self._travel = travel_of(self.night)
        self._done_before = done
        self._as_read, self._added = logbook, added

    def fit(self, state: NightState, now_mjd: float, logbook: Logbook | None = None) -> Planner:
        """Return this planner, or another one where the list or the air has become another.

        ``logbook`` is the one that was read anew, if it was. Refraction and dispersion hardly mind
        a degree or a hectopascal: small changes of the air keep the tables.
        """
        as_read = logbook or self._as_read
        air = measured_air(state, now_mjd, self.logbook.observatory.site.elevation_m)
        same_air = not _differs(air, self.night.air)
        if same_air and as_read is self._as_read and state.added == self._added:
            return self
        night = self.night.almanac.night
        names = {target.name for target in listed(as_read, state.added).targets}
        is_known = names == {target.name for target in self.logbook.targets}
        return Planner(
            as_read,
            night,
            self._done_before if is_known else done_before(as_read.folder, night, names),
            added=state.added,
            air=self.night.air if same_air else air,
        )

    def plans(self, state: NightState) -> Plans:
        """Return every target's plan with past nights and this one counted in."""
        return plans(self.night.targets, state.kept, self._done_before)

    def forecast(self, state: NightState, now_mjd: float) -> SeeingForecast:
        """Return the seeing now and its forecast, from everything measured this night."""
        return forecast_of(state, now_mjd, self.logbook.observatory.seeing.typical_arcsec)

    def outlook(
        self, seeing_arcsec: NDArray[np.float64], high_arcsec: NDArray[np.float64] | None = None
    ) -> Outlook:
        """Return the outlook for a zenith seeing (T,), minute by minute (arcsec).

        ``high_arcsec`` (T,) is the upper end of its 68 % band.
        """
        return self._outlooks.given(seeing_arcsec, high_arcsec)

    def plan(self, state: NightState, now_mjd: float, wish: Wish, before: Plan | None) -> Plan:
        """Return a new plan for the rest of the night from a moment (UTC MJD) on."""
        forecast = self.forecast(state, now_mjd)
        outlook = self._outlook_for(forecast, now_mjd, before)
        rules = rules_from(state, now_mjd)
        problem = self.problem(state, outlook, now_mjd, rules)
        if before is None:
            order = propose(problem)
            return Plan(now_mjd, wish.because, self.night, forecast, outlook, order)
        order = ordered(problem, before.order, wish.work)
        plan = Plan(now_mjd, wish.because, self.night, forecast, outlook, order)
        said = news(before, plan, problem.plans, _under_way(state))
        if wish.decision is not None:
            free = self.problem(state, outlook, now_mjd, without(rules, wish.decision))
            said = (*cost_of(order, ordered(free, before.order, wish.work)), *said)
        return replace(plan, news=said)

    def refined(self, state: NightState, now_mjd: float, plan: Plan, seed: int) -> Plan | None:
        """Return a plan with a clearly better order than the one in force; None when none is."""
        problem = self.problem(state, plan.outlook, now_mjd, rules_from(state, now_mjd))
        order = refine(problem, plan.order, seed=seed)
        if order is plan.order:
            return None
        better = replace(
            plan, made_mjd=now_mjd, because="a better order was found", order=order, news=()
        )
        return replace(better, news=news(plan, better, problem.plans, _under_way(state)))

    def _outlook_for(
        self, forecast: SeeingForecast, now_mjd: float, before: Plan | None
    ) -> Outlook:
        """Return the outlook for a forecast, or the one before when it differs by next to nothing.

        It is most of what a plan costs, and between measurements the forecast only relaxes.
        """
        seeing, _, high = forecast.at(self.night.mjd)
        if before is not None and before.night is self.night:
            ahead = self.night.index_at(now_mjd)
            known = before.outlook
            pairs = ((seeing, known.seeing_arcsec), (high, known.high_arcsec))
            if all(np.abs(a[ahead:] / b[ahead:] - 1.0).max() < SAME_SEEING for a, b in pairs):
                return known
        return self.outlook(seeing, high)

    def problem(
        self, state: NightState, outlook: Outlook, from_mjd: float, rules: Rules
    ) -> Problem:
        """Return the rest of the night from a moment (UTC MJD) as the search takes it."""
        known = {target.name for target in self.night.targets}
        sent_to = state.pointing.target if state.pointing else None
        return build_problem(
            self.night,
            outlook,
            self.plans(state),
            rules,
            from_mjd=from_mjd,
            # A target that has left the list since is nowhere in particular.
            pointing=sent_to if sent_to in known else None,
            travel=self._travel,
            tonight=state.kept,
        )


def _under_way(state: NightState) -> str | None:
    """Return the target of the run that goes on; None when none does."""
    return state.run.target if state.run else None


def ordered(problem: Problem, in_force: Order, work: Work) -> Order:
    """Return an order that goes on from the one in force, with as much work as is asked for."""
    kept = retime(problem, in_force) if work <= Work.RETIME else None
    return kept or propose(problem, in_force, afresh=work is Work.AFRESH)


def measured_air(state: NightState, now_mjd: float, elevation_m: float) -> Air:
    """Return the air (pressure, temperature, humidity) from what was entered in the last hours.

    The standard air of the site's height for what was not, or was withdrawn.
    """
    otherwise = Air.standard(elevation_m)

    def latest(quantity: str, known: float) -> float:
        entered = state.latest(quantity)
        fresh = entered is not None and (now_mjd - entered.mjd) * HOURS_PER_DAY < AIR_HOLDS_H
        return entered.value if entered is not None and fresh else known

    return Air(
        pressure_hpa=latest("pressure_hpa", otherwise.pressure_hpa),
        temperature_c=latest("temperature_c", otherwise.temperature_c),
        humidity_percent=latest("humidity_percent", otherwise.humidity_percent),
    )


def _differs(one: Air, other: Air) -> bool:
    return (
        abs(one.pressure_hpa - other.pressure_hpa) > AIR_STEP_HPA
        or abs(one.temperature_c - other.temperature_c) > AIR_STEP_C
        or abs(one.humidity_percent - other.humidity_percent) > AIR_STEP_PERCENT
    )


def forecast_of(state: NightState, now_mjd: float, typical_arcsec: float) -> SeeingForecast:
    """Return the seeing at a moment (UTC MJD) from what a night's state holds by then."""
    measured = [SeeingMeasurement(each.mjd, each.zenith_arcsec) for each in state.seeing]
    return nowcast(measured, now_mjd, typical_arcsec)
