"""The night as a strip of time, from the watch."""

from __future__ import annotations

import numpy as np

from engine.watch import Watch
from tui.console.panels.local import ahead, local
from tui.paint.night_strip import Block, NightStrip, paint_strip
from tui.paint.spans import Line

# The glyph of an exposure by its outcome.
OUTCOME_GLYPHS = {"good": ("━", "good"), "rejected": ("×", "bad"), "stopped": ("╸", "warn")}


def paint_night(watch: Watch, width: int, height: int) -> list[Line]:
    """Return the strip's rows: all five, or the two there is room for."""
    night, now_mjd = watch.planner.night, watch.clock.now_mjd()
    begin_mjd, end_mjd = float(night.mjd[0]), float(night.mjd[-1])
    begin = local(watch, begin_mjd)

    def hour(mjd: float) -> float:
        return (mjd - begin_mjd) * 24.0

    def sun_deg(at_h: float) -> float:
        return float(np.interp(begin_mjd + at_h / 24.0, night.mjd, night.sun.altitude_deg))

    def moon_deg(at_h: float) -> float:
        return float(np.interp(begin_mjd + at_h / 24.0, night.mjd, night.moon.altitude_deg))

    at = night.index_at(now_mjd)
    strip = NightStrip(
        hours=hour(end_mjd),
        begin_hour=begin.hour + begin.minute / 60.0,
        now_h=hour(now_mjd),
        sun_deg=sun_deg,
        moon_deg=moon_deg,
        planned=tuple(
            Block(
                hour(max(visit.start_mjd, now_mjd)), hour(visit.end_mjd), f"{number} {visit.target}"
            )
            for number, visit in enumerate(ahead(watch), start=1)
        ),
        done=tuple(
            Block(hour(each.start_mjd), hour(each.end_mjd), *_outcome(each.outcome))
            for each in watch.state.exposures
        ),
        lost=tuple(
            Block(hour(each.begin_mjd), hour(each.end_mjd or now_mjd), role="lost")
            for each in watch.state.lost
        ),
        moon_label=f"{night.moon.illumination[at]:.0%} lit",
    )
    return paint_strip(strip, width, height)


def _outcome(outcome: str) -> tuple[str, str]:
    return OUTCOME_GLYPHS.get(outcome, ("╸", "bad"))
