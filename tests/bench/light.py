"""What the sky and the credit of a night cost: ``python -m tests.bench.light``.

Prints times of this machine for 500 targets, 600 minutes and 5 filters, and ratios from one run.
"""

from __future__ import annotations

import time
from collections.abc import Callable
from typing import Any

import numpy as np

from engine.light import (
    MoonLight,
    Reference,
    clear_share,
    credit,
    depth_share,
    sky_mags_arcsec2,
)
from tests.engine.light_cases import a_filter

TARGETS, MINUTES = 500, 600
BANDS = (("U", 365.0), ("B", 438.0), ("V", 550.0), ("R", 641.0), ("I", 798.0))


def best_ms(work: Callable[[], object], repeats: int = 7) -> float:
    """Return the shortest of several times (ms): the others waited for something else."""
    times = []
    for _ in range(repeats):
        begin = time.perf_counter()
        work()
        times.append(time.perf_counter() - begin)
    return 1e3 * min(times)


def main() -> None:
    """Measure and print."""
    chance = np.random.default_rng(3)
    shape = (TARGETS, MINUTES)
    filters = [a_filter(name=name, wavelength_nm=wavelength) for name, wavelength in BANDS]
    inputs: dict[str, Any] = {
        "altitude_deg": chance.uniform(-30.0, 90.0, shape),
        "sun_altitude_deg": np.linspace(-5.0, -40.0, MINUTES),
        "moon": MoonLight(
            np.linspace(-20.0, 60.0, MINUTES),
            chance.uniform(0.0, 180.0, shape),
            np.full(MINUTES, 40.0),
        ),
    }
    double_ms = best_ms(lambda: sky_mags_arcsec2(filters, **inputs))
    single_ms = best_ms(lambda: sky_mags_arcsec2(filters, **inputs, precision=np.float32))
    exact = sky_mags_arcsec2(filters, **inputs)
    single = sky_mags_arcsec2(filters, **inputs, precision=np.float32)
    worst_mag = float(np.nanmax(np.abs(exact - single)))
    print(f"sky of the night, double precision {double_ms:8.1f} ms")
    print(
        f"                  single           {single_ms:8.1f} ms   "
        f"{single_ms / double_ms:.2f} of that, off by {worst_mag:.0e} mag at most"
    )

    sizes = chance.uniform(1.0, 3.0, (len(filters), *shape)).astype(np.float32)
    airmass = chance.uniform(1.0, 3.0, shape).astype(np.float32)
    reference = Reference(1.4, 21.6, 1.2)
    clear = [
        clear_share(sky, airmass, each, reference)
        for sky, each in zip(single, filters, strict=True)
    ]

    def whole() -> None:
        for size, sky, each in zip(sizes, single, filters, strict=True):
            credit(size, sky, airmass, each, reference)

    def kept() -> None:
        for size, share in zip(sizes, clear, strict=True):
            depth_share(size, share, reference)

    whole_ms, kept_ms = best_ms(whole), best_ms(kept)
    print(f"credit of the night, all of it     {whole_ms:8.1f} ms")
    print(
        f"                  image size alone {kept_ms:8.1f} ms   "
        f"{kept_ms / whole_ms:.2f} of that, with `clear_share` kept"
    )


if __name__ == "__main__":
    main()
