"""The seeing: what it is now, what it will be, and how sure that is."""

from engine.seeing.nowcast import SeeingForecast, SeeingMeasurement, nowcast
from engine.seeing.summary import SeeingSummary, summary

__all__ = ["SeeingForecast", "SeeingMeasurement", "SeeingSummary", "nowcast", "summary"]
