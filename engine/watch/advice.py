"""Cautions about weather: advice on the screen only; the observatory's own rules decide."""

from __future__ import annotations

from dataclasses import dataclass

from engine.log import NightState
from engine.logbook import Caution


@dataclass(frozen=True, slots=True)
class CautionNow:
    """One caution: what is beyond its threshold, in a sentence."""

    code: str
    sentence: str


def cautions(state: NightState, caution: Caution) -> tuple[CautionNow, ...]:
    """Return every caution that the last typed conditions call for."""
    found = []
    humidity = state.latest("humidity_percent")
    wind = state.latest("wind_m_per_s")
    temperature, dew_point = state.latest("temperature_c"), state.latest("dew_point_c")
    if humidity and humidity.value > caution.humidity_percent:
        found.append(
            CautionNow(
                "humidity",
                f"humidity {humidity.value:g} %, caution above {caution.humidity_percent:g} %",
            )
        )
    if wind and wind.value > caution.wind_m_per_s:
        found.append(
            CautionNow(
                "wind", f"wind {wind.value:g} m/s, caution above {caution.wind_m_per_s:g} m/s"
            )
        )
    if temperature and dew_point:
        margin_c = temperature.value - dew_point.value
        if margin_c < caution.dew_margin_c:
            found.append(
                CautionNow(
                    "dew",
                    f"{margin_c:.1f} °C above the dew point, caution below "
                    f"{caution.dew_margin_c:g} °C",
                )
            )
    return tuple(
        CautionNow(each.code, f"{each.sentence}; the observatory's own rules decide")
        for each in found
    )
