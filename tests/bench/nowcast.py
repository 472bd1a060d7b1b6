"""How well the seeing forecast does on simulated nights: ``python -m tests.bench.nowcast``.

Prints, for kinds of night that are as assumed and that are not, the share of truths inside the 68 %
band and the rms error in ln(seeing) of the forecast, of the last value and of the night's median.
"""

from __future__ import annotations

import time

import numpy as np

from engine.seeing import nowcast
from tests.engine.seeing_nights import (
    NIGHT_MIN,
    TYPICAL_ARCSEC,
    NightKind,
    draw_night,
    mjd_at,
    scores,
)

SEED = 20270314
KINDS = {
    "as assumed": NightKind(),
    "5 % of measurements bad": NightKind(bad_share=0.05),
    "spread 30 % less": NightKind(spread_ln=0.26),
    "spread 30 % more": NightKind(spread_ln=0.48),
    "e-folding 30 % shorter": NightKind(e_folding_min=12.0),
    "e-folding 30 % longer": NightKind(e_folding_min=22.0),
    "level drifts 0.15 per root hour": NightKind(drift_ln_per_sqrt_h=0.15),
    "measured every 25 min": NightKind(mean_gap_min=25.0),
    "measured every 3 min, 5 % bad": NightKind(mean_gap_min=3.0, bad_share=0.05),
    "calm: spread 0.15, 5 % bad": NightKind(spread_ln=0.15, bad_share=0.05),
}


def main(nights: int = 250, asked: int = 4) -> None:
    """Measure and print."""
    print(f"{nights} nights of each kind, {asked} moments a night, seed {SEED}")
    print(f"{'':34}ahead  held   forecast  last value  night median   (rms ln error)")
    for name, kind in KINDS.items():
        for horizon, score in scores(kind, nights=nights, asked=asked, seed=SEED).items():
            ours, last, median = score.rms()
            print(
                f"{name:32}{horizon:4} min {100 * score.coverage:4.0f} %"
                f"{ours:11.3f}{last:12.3f}{median:14.3f}"
            )
            name = ""
    night = draw_night(NightKind(mean_gap_min=5.0), np.random.default_rng(SEED))
    spent_s = []
    for _ in range(7):
        begin = time.perf_counter()
        nowcast(night.measurements, mjd_at(NIGHT_MIN), TYPICAL_ARCSEC)
        spent_s.append(time.perf_counter() - begin)
    count = len(night.measurements)
    print(f"one forecast from {count} measurements: {1e3 * min(spent_s):.1f} ms")


if __name__ == "__main__":
    main()
