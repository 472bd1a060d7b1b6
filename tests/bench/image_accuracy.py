"""How right the predicted image sizes are, against two-dimensional convolution by GalSim.

``python -m tests.bench.image_accuracy [cases]`` draws random instruments, filters, seeing and
airmasses over the whole domain (aperture 0.1 to 4 m, obstruction 0 to 0.5, seeing 0.3 to 6 arcsec,
350 to 1000 nm, 5 to 150 nm wide, pixel 0.1 to 3 arcsec, airmass 1 to 4) and compares the table's
sizes with the area above half peak of GalSim's images. Errors in percent, by what rules the image.
"""

from __future__ import annotations

import math
import sys
from collections import defaultdict
from dataclasses import astuple

import numpy as np
from numpy.typing import NDArray

from tests.engine.image_cases import Case, galsim_size_arcsec, random_case

SEED = 20


def quadrature_arcsec(case: Case) -> float:
    """Return the quadrature sum of the terms, a pixel counted as 0.68 of its side: the usual way.

    0.68 is 2.355/√12, the width of a Gaussian with the same variance; the smear counts likewise.
    """
    blur = case.blur
    terms = case.model.breakdown(0, case.seeing_arcsec, case.airmass).terms
    box = 2.0 * math.sqrt(2.0 * math.log(2.0) / 12.0)
    round_part = math.hypot(terms.atmosphere, terms.diffraction, terms.optics, terms.tracking)
    across = math.hypot(round_part, box * blur.pixel_arcsec)
    return math.sqrt(across * math.hypot(across, box * blur.dispersion_arcsec))


def regime(case: Case) -> str:
    """Name the blur that is largest: what limits this image."""
    terms = case.model.breakdown(0, case.seeing_arcsec, case.airmass).terms
    names = ("seeing", "diffraction", "optics, tracking", "optics, tracking", "dispersion", "pixel")
    return max(zip(astuple(terms), names, strict=True))[1]


def _row(name: str, errors: NDArray[np.float64]) -> str:
    percent = 100.0 * np.abs(errors)
    return (
        f"{name:32}{len(errors):6}{np.median(percent):9.3f}"
        f"{np.quantile(percent, 0.95):9.3f}{percent.max():9.3f}"
    )


def main(count: int) -> None:
    """Print the table."""
    rng = np.random.default_rng(SEED)
    errors, turned, naive = [], [], []
    by_regime: dict[str, list[float]] = defaultdict(list)
    for _ in range(count):
        case = random_case(rng)
        predicted = case.predicted_arcsec
        truth = galsim_size_arcsec(case.blur, predicted)
        errors.append(predicted / truth - 1.0)
        by_regime[f"{regime(case)}-limited"].append(errors[-1])
        naive.append(quadrature_arcsec(case) / truth - 1.0)
        angle_deg = float(rng.uniform(0.0, 45.0))
        turned.append(predicted / galsim_size_arcsec(case.blur, predicted, angle_deg) - 1.0)
    print(f"{'error of the size, %':32}{'cases':>6}{'median':>9}{'95 %':>9}{'worst':>9}")
    for name, values in sorted(by_regime.items()):
        print(_row(name, np.array(values)))
    print(_row("all", np.array(errors)))
    print(_row("all, pixels at any angle", np.array(turned)))
    print(_row("quadrature sum, for comparison", np.array(naive)))


if __name__ == "__main__":
    main(int(sys.argv[1]) if len(sys.argv) > 1 else 400)
