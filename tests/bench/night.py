"""A large night, whole: 500 targets x 600 minutes x 5 filters, against doing each thing in full.

``python -m tests.bench.night``: positions and image sizes from our tables, against astropy's AltAz
and one direct convolution a size, in one run; then what a change of seeing costs, and the memory.
The figures to keep are the ratios; seconds are this machine's.
"""

from __future__ import annotations

import resource
import time

import numpy as np

from engine.image import ImageModel
from engine.image.contour import size_arcsec
from engine.positions import airmass
from tests.bench.positions import EVENING_MJD, MINUTES, TARGETS, astropys, ours
from tests.engine.image_cases import an_observatory

FILTERS = 5
SAMPLE = 300
REPEATS = 5


def best_s(work: object, repeats: int = REPEATS) -> float:
    """Return the least of some timings of a call (s)."""
    assert callable(work)
    times = []
    for _ in range(repeats):
        began = time.perf_counter()
        work()
        times.append(time.perf_counter() - began)
    return min(times)


def main() -> None:
    """Measure and print."""
    rng = np.random.default_rng(3)
    ra_deg = rng.uniform(0.0, 360.0, TARGETS)
    dec_deg = np.rad2deg(np.arcsin(rng.uniform(-1.0, 1.0, TARGETS)))
    mjd = EVENING_MJD + np.arange(MINUTES) / 1440.0
    seeing = rng.uniform(0.7, 2.0, MINUTES)
    observatory = an_observatory(
        filters=tuple((str(k), 400.0 + 100.0 * k, 80.0) for k in range(FILTERS))
    )
    model = ImageModel(observatory)
    model.sizes_arcsec(1.0, 1.0)
    masses = airmass(ours(ra_deg, dec_deg, mjd)[1])
    prepared = model.prepare(masses)
    up = masses[np.isfinite(masses) & (masses < 10.0)]
    sample = [
        model.blur(int(f), float(s), float(x))
        for f, s, x in zip(
            rng.integers(0, FILTERS, SAMPLE), rng.choice(seeing, SAMPLE), rng.choice(up, SAMPLE),
            strict=True,
        )
    ]  # fmt: skip

    ours_s = best_s(
        lambda: model.prepare(airmass(ours(ra_deg, dec_deg, mjd)[1])).sizes_arcsec(seeing)
    )
    altaz_s = best_s(lambda: astropys(ra_deg, dec_deg, mjd), 2)
    each_s = best_s(lambda: [size_arcsec(blur) for blur in sample], 3) / SAMPLE
    direct_s = altaz_s + each_s * FILTERS * TARGETS * MINUTES
    update_s = best_s(lambda: prepared.sizes_arcsec(seeing))
    print(f"{TARGETS} targets x {MINUTES} minutes x {FILTERS} filters")
    print(f"positions, airmass and sizes, ours     {1e3 * ours_s:10.1f} ms")
    print(f"astropy AltAz                          {1e3 * altaz_s:10.1f} ms")
    print(f"a direct convolution each              {each_s * FILTERS * TARGETS * MINUTES:10.1f} s, "
          f"scaled from {SAMPLE}")  # fmt: skip
    print(f"ours : both in full                    1 : {direct_s / ours_s:,.0f}")
    print(f"all sizes when the seeing changes      {1e3 * update_s:10.1f} ms")
    print(f"most memory the process ever held      "
          f"{resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024:10.0f} MB")  # fmt: skip


if __name__ == "__main__":
    main()
