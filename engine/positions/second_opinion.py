"""The almanac by somebody else: astroplan's times beside ours.

A console that an observer trusts blindly should be easy to doubt. astroplan searches astropy's own
positions; agreement to a second or two says that table, time zone and site are what they should be.
"""

from __future__ import annotations

import math
import warnings
from typing import TYPE_CHECKING

import numpy as np

from engine.positions.almanac import RISE_SET_ALTITUDE_DEG, Almanac
from engine.positions.earth import prepare_astropy

if TYPE_CHECKING:
    from engine.logbook import Site

# Our event, astroplan's search for it, and the altitude (deg) it is a crossing of.
SEARCHES = (
    ("sunset", "sun_set_time", RISE_SET_ALTITUDE_DEG),
    ("civil_dusk", "sun_set_time", -6.0),
    ("nautical_dusk", "sun_set_time", -12.0),
    ("astronomical_dusk", "sun_set_time", -18.0),
    ("astronomical_dawn", "sun_rise_time", -18.0),
    ("nautical_dawn", "sun_rise_time", -12.0),
    ("civil_dawn", "sun_rise_time", -6.0),
    ("sunrise", "sun_rise_time", RISE_SET_ALTITUDE_DEG),
    ("moonrise", "moon_rise_time", RISE_SET_ALTITUDE_DEG),
    ("moonset", "moon_set_time", RISE_SET_ALTITUDE_DEG),
)
# It draws straight lines between grid points; with so many they cost it under a second.
_GRID_POINTS = 400


def astroplans_almanac(site: Site, ours: Almanac) -> dict[str, float | None]:
    """Return astroplan's time (UTC MJD) of each event of a night; None for what it has none of.

    Takes a second or two, most of it importing.
    """
    prepare_astropy()
    import astropy.units as u
    from astroplan import Observer
    from astroplan.exceptions import TargetAlwaysUpWarning, TargetNeverUpWarning
    from astropy.coordinates import EarthLocation
    from astropy.time import Time

    place = EarthLocation.from_geodetic(
        site.longitude_deg * u.deg, site.latitude_deg * u.deg, site.elevation_m * u.m
    )
    # No air: its altitudes are geometric then, like ours.
    observer = Observer(location=place, timezone="UTC", pressure=0.0 * u.bar)
    begin = Time(ours.begin_mjd, format="mjd", scale="utc")
    found: dict[str, float | None] = {}
    with warnings.catch_warnings():
        # It warns of a day without the event; here that is an answer like any other.
        warnings.simplefilter("ignore", TargetAlwaysUpWarning)
        warnings.simplefilter("ignore", TargetNeverUpWarning)
        for event, method, limit_deg in SEARCHES:
            moment = getattr(observer, method)(
                begin, which="next", horizon=limit_deg * u.deg, n_grid_points=_GRID_POINTS
            )
            mjd = float(np.ma.filled(moment.mjd, math.nan))
            found[event] = mjd if mjd <= ours.end_mjd else None
    return found
