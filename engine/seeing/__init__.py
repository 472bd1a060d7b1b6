"""The seeing: what it is now, what it will be, and how sure that is."""

from engine.seeing.nowcast import (
    SeeingForecast,
    SeeingMeasurement,
    SeeingSummary,
    nowcast,
    summary,
)

__all__ = ["SeeingForecast", "SeeingMeasurement", "SeeingSummary", "nowcast", "summary"]
