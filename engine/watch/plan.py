"""A plan: what is advised from one moment on."""

from __future__ import annotations

from dataclasses import dataclass

from engine.night import Night, Outlook
from engine.order import Order, Visit
from engine.seeing import SeeingForecast


@dataclass(frozen=True, slots=True)
class Plan:
    """Forecast, outlook and order made at one moment (UTC MJD), why, and what has moved since.

    ``night`` holds the tables they were made from: their targets and filters are the outlook's.
    """

    made_mjd: float
    because: str
    night: Night
    forecast: SeeingForecast
    outlook: Outlook
    order: Order
    news: tuple[str, ...] = ()

    def ahead(self, now_mjd: float) -> tuple[Visit, ...]:
        """Return the visits of the order that are not over at a moment (UTC MJD), in turn."""
        return tuple(visit for visit in self.order.visits if visit.end_mjd > now_mjd)
