"""What the image model costs: tables against direct convolutions, and updates of the night.

``python -m tests.bench.image`` prints times of this machine and, from the same run, ratios.
"""

from __future__ import annotations

import time
from collections.abc import Callable

import numpy as np

from engine.image import ImageModel
from engine.image.contour import size_arcsec
from tests.engine.image_cases import DEMO_FILTERS, an_observatory

TARGETS, MINUTES = 500, 600
FILTERS = (*DEMO_FILTERS, ("Ha", 656.3, 7.0))
SAMPLE = 400


def best_s(work: Callable[[], object], repeats: int = 7) -> float:
    """Return the shortest of several times (s): the others waited for something else."""
    times = []
    for _ in range(repeats):
        begin = time.perf_counter()
        work()
        times.append(time.perf_counter() - begin)
    return min(times)


def line(what: str, milliseconds: float, note: str = "") -> None:
    """Print one measured time."""
    print(f"{what:46}{milliseconds:12.2f} ms   {note}")


def main() -> None:
    """Measure and print."""
    rng = np.random.default_rng(11)
    airmass = rng.uniform(1.0, 3.0, (TARGETS, MINUTES))
    seeing = rng.uniform(0.7, 2.0, MINUTES)
    observatory = an_observatory(filters=FILTERS)
    values = len(FILTERS) * TARGETS * MINUTES

    def build(outer_scale_m: float | None = None) -> None:
        made = an_observatory(filters=FILTERS, outer_scale_m=outer_scale_m)
        ImageModel(made).sizes_arcsec(1.0, 1.0)

    begin = time.perf_counter()
    build()
    first_s = time.perf_counter() - begin
    model = ImageModel(observatory)
    tables = [model.table(index) for index in range(len(FILTERS))]
    memory_kb = sum(each.size_arcsec.nbytes + each.peak_per_arcsec2.nbytes for each in tables) / 1e3
    prepared = model.prepare(airmass)
    sample = [
        model.blur(int(f), float(s), float(x))
        for f, s, x in zip(
            rng.integers(0, len(FILTERS), SAMPLE),
            rng.choice(seeing, SAMPLE),
            rng.choice(airmass.ravel(), SAMPLE),
            strict=True,
        )
    ]
    each_s = best_s(lambda: [size_arcsec(blur) for blur in sample], 3) / SAMPLE
    lookup_s = best_s(lambda: model.sizes_arcsec(seeing, airmass))
    update_s = best_s(lambda: prepared.sizes_arcsec(seeing))

    print(f"{len(FILTERS)} filters x {TARGETS} targets x {MINUTES} minutes = {values:,} sizes\n")
    line("tables of all filters, first time", 1e3 * first_s)
    line("tables of all filters", 1e3 * best_s(build, 3))
    line("tables with an outer scale", 1e3 * best_s(lambda: build(25.0), 3))
    line("placing the airmasses, once a night", 1e3 * best_s(lambda: model.prepare(airmass)))
    line(
        "all sizes by table, from nothing", 1e3 * lookup_s, f"{1e9 * lookup_s / values:.1f} ns each"
    )
    line("all sizes when the seeing changes, per minute", 1e3 * update_s)
    line("all sizes for one seeing", 1e3 * best_s(lambda: prepared.sizes_arcsec(1.1)))
    line("one image taken apart", 1e3 * best_s(lambda: model.breakdown(0, 1.1, 1.4)))
    line("seeing from one measured image", 1e3 * best_s(lambda: invert(model)))
    line("one direct convolution", 1e3 * each_s, f"mean of {SAMPLE}")
    scaled_s = each_s * values
    line("all sizes by direct convolution", 1e3 * scaled_s, f"scaled from the {SAMPLE}")
    print(f"\ntable : direct       1 : {scaled_s / lookup_s:,.0f}")
    print(f"update : direct      1 : {scaled_s / update_s:,.0f}")
    print(f"memory of the tables {memory_kb:,.0f} kB")


def invert(model: ImageModel) -> float:
    """Return the seeing behind one image."""
    return model.zenith_seeing_arcsec(0, 1.8, 1.4)


if __name__ == "__main__":
    main()
