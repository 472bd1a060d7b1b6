"""What positions cost and how far they are from astropy's, in one run.

``python -m tests.bench.positions``: 500 targets by 600 minutes, as a long night of a large logbook.
The figure to keep is the ratio; seconds are this machine's.
"""

from __future__ import annotations

import subprocess
import sys
from time import perf_counter

import astropy.units as u
import numpy as np
from astropy.coordinates import AltAz, EarthLocation, SkyCoord
from astropy.time import Time
from numpy.typing import NDArray

from engine.logbook import Site
from engine.positions import apparent_places, horizontal, prepare_astropy, separation_deg

Floats = NDArray[np.float64]

TARGETS, MINUTES = 500, 600
REPEATS = 5
# The middle of a night in 2026, UTC.
EVENING_MJD = 61180.95
SITE = Site(
    name="Invented",
    latitude_deg=-33.2,
    longitude_deg=-70.6,
    elevation_m=2300.0,
    timezone="America/Santiago",
)

FIRST_USE = """
from time import perf_counter
from engine.positions.earth import {reader}
began = perf_counter()
{reader}()
print(perf_counter() - began)
"""


def ours(ra_deg: Floats, dec_deg: Floats, mjd: Floats) -> tuple[Floats, Floats]:
    """Return azimuths and altitudes (deg, N x T) by `horizontal`."""
    places = apparent_places(ra_deg, dec_deg, float(np.mean(mjd)))
    where = horizontal(places, mjd, SITE)
    return where.azimuth_deg, where.altitude_deg


def astropys(ra_deg: Floats, dec_deg: Floats, mjd: Floats) -> tuple[Floats, Floats]:
    """Return azimuths and altitudes (deg, N x T) by astropy's AltAz without refraction."""
    place = EarthLocation.from_geodetic(
        SITE.longitude_deg * u.deg, SITE.latitude_deg * u.deg, SITE.elevation_m * u.m
    )
    frame = AltAz(obstime=Time(mjd, format="mjd", scale="utc"), location=place)
    stars = SkyCoord(ra_deg[:, None] * u.deg, dec_deg[:, None] * u.deg)
    where = stars.transform_to(frame)
    return np.asarray(where.az.deg), np.asarray(where.alt.deg)


def first_use_s(reader: str) -> float:
    """Return the seconds a reader of the Earth table takes in a fresh interpreter."""
    done = subprocess.run(
        [sys.executable, "-c", FIRST_USE.format(reader=reader)],
        capture_output=True, text=True, check=True,
    )  # fmt: skip
    return float(done.stdout)


def main() -> None:
    """Print both times, their ratio, and the largest difference."""
    prepare_astropy()
    random = np.random.default_rng(1)
    ra_deg = random.uniform(0.0, 360.0, TARGETS)
    dec_deg = np.rad2deg(np.arcsin(random.uniform(-1.0, 1.0, TARGETS)))
    mjd = EVENING_MJD + np.arange(MINUTES) / 1440.0
    ours(ra_deg[:1], dec_deg[:1], mjd[:1])
    astropys(ra_deg[:1], dec_deg[:1], mjd[:1])

    times_s = []
    for _ in range(REPEATS):
        began = perf_counter()
        azimuth_deg, altitude_deg = ours(ra_deg, dec_deg, mjd)
        times_s.append(perf_counter() - began)
    began = perf_counter()
    their_azimuth_deg, their_altitude_deg = astropys(ra_deg, dec_deg, mjd)
    theirs_s = perf_counter() - began

    apart_arcsec = 3600.0 * separation_deg(
        azimuth_deg, altitude_deg, their_azimuth_deg, their_altitude_deg
    )
    print(f"{TARGETS} targets x {MINUTES} minutes")
    print(f"  ours      {1e3 * min(times_s):8.1f} ms (best of {REPEATS})")
    print(f"  astropy   {1e3 * theirs_s:8.1f} ms (one run)")
    print(f"  ratio     {theirs_s / min(times_s):8.1f}")
    print(f"  apart     {float(apart_arcsec.max()):8.3f} arcsec at most")
    print(f"            {float(np.median(apart_arcsec)):8.3f} arcsec in the median")
    quick_s, slow_s = first_use_s("earth_table"), first_use_s("_table_by_astropy")
    print("Earth table, first use in a fresh interpreter")
    print(f"  ours      {1e3 * quick_s:8.1f} ms")
    print(f"  astropy   {1e3 * slow_s:8.1f} ms")
    print(f"  ratio     {slow_s / quick_s:8.1f}")


if __name__ == "__main__":
    main()
