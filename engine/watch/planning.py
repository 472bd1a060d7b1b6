"""From what is known to what is advised: forecast, outlook, order, and what moved.

Planning is the night's heavy work, so it is a plain function of frozen things: the console runs it
on a worker thread and adopts the result on its own.
"""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date

import numpy as np

from engine.image import ImageModel
from engine.log import NightState
from engine.logbook import Logbook
from engine.night import Night, Outlook, Outlooks, Plans, open_night, plans
from engine.night.progress import Taken
from engine.order import Order, Rules, build_problem, propose
from engine.positions import Air
from engine.seeing import SeeingForecast, SeeingMeasurement, nowcast
from engine.watch.news import news

COLD_BUDGET_MS = 150.0
WARM_BUDGET_MS = 40.0


@dataclass(frozen=True, slots=True)
class Plan:
    """What is advised from one moment on, and what has changed since the advice before."""

    made_mjd: float
    because: str
    forecast: SeeingForecast
    outlook: Outlook
    order: Order
    news: tuple[str, ...] = ()


class Planner:
    """The tables of one night and the image model over them; makes one plan after another."""

    def __init__(
        self,
        logbook: Logbook,
        night: date,
        done_before: tuple[Taken, ...] = (),
        air: Air | None = None,
    ) -> None:
        self.logbook = logbook
        self.night: Night = open_night(logbook, night, air)
        self.model = ImageModel(logbook.observatory, self.night.air)
        self._outlooks = Outlooks(self.night, self.model)
        self._done_before = done_before

    def plans(self, state: NightState) -> Plans:
        """Return every target's plan with past nights and this one counted in."""
        return plans(self.night.targets, (*self._done_before, *state.kept))

    def forecast(self, state: NightState, now_mjd: float) -> SeeingForecast:
        """Return the seeing now and its forecast, from everything measured this night."""
        measured = [SeeingMeasurement(each.mjd, each.zenith_arcsec) for each in state.seeing]
        return nowcast(measured, now_mjd, self.logbook.observatory.seeing.typical_arcsec)

    def plan(
        self, state: NightState, rules: Rules, now_mjd: float, because: str, before: Plan | None
    ) -> Plan:
        """Return a new plan for the rest of the night from a moment (UTC MJD)."""
        forecast = self.forecast(state, now_mjd)
        outlook = self._outlooks.given(self._seeing_ahead(forecast, now_mjd))
        remaining = self.plans(state)
        problem = build_problem(
            self.night,
            outlook,
            remaining,
            rules,
            from_mjd=now_mjd,
            pointing=state.pointing.target if state.pointing else None,
        )
        order = propose(
            problem,
            budget_ms=COLD_BUDGET_MS if before is None else WARM_BUDGET_MS,
            in_force=before.order if before else None,
        )
        fresh = Plan(now_mjd, because, forecast, outlook, order)
        if before is None:
            return fresh
        told = news(self.night, before, fresh, remaining)
        return Plan(now_mjd, because, forecast, outlook, order, told)

    def _seeing_ahead(self, forecast: SeeingForecast, now_mjd: float) -> np.ndarray:
        """Return the seeing (T,) to plan with: the forecast, and the present value before now."""
        return forecast.at(np.maximum(self.night.mjd, now_mjd))[0]
