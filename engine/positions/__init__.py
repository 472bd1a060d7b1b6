"""Where everything is: Earth rotation, stars, Sun, Moon, twilight, refraction, airmass.

Times are UTC MJD floats, angles in the units their names say, arrays (N targets, T moments).
"""

from engine.positions.air import Air, standard_pressure_hpa
from engine.positions.airmass import AIRMASS_MODELS, airmass, effective_airmass
from engine.positions.almanac import Almanac, almanac, dark_spans
from engine.positions.bodies import Body, Moon, moon, sun
from engine.positions.earth import earth_table_note, prepare_astropy, sidereal_time_h
from engine.positions.finder import Crossing, crossings, spans_above
from engine.positions.refraction import apparent_altitude_deg, refraction_deg, true_altitude_deg
from engine.positions.skyline import skyline_altitude_deg
from engine.positions.stars import (
    Horizontal,
    Places,
    apparent_places,
    horizontal,
    separation_deg,
)

__all__ = [
    "AIRMASS_MODELS",
    "Air",
    "Almanac",
    "Body",
    "Crossing",
    "Horizontal",
    "Moon",
    "Places",
    "airmass",
    "almanac",
    "apparent_altitude_deg",
    "apparent_places",
    "crossings",
    "dark_spans",
    "earth_table_note",
    "effective_airmass",
    "horizontal",
    "moon",
    "prepare_astropy",
    "refraction_deg",
    "separation_deg",
    "sidereal_time_h",
    "skyline_altitude_deg",
    "spans_above",
    "standard_pressure_hpa",
    "sun",
    "true_altitude_deg",
]
