"""Random nights to order: sites, seasons, mounts, lists that ask for too little or too much."""

from __future__ import annotations

from dataclasses import dataclass, replace
from datetime import UTC, date, datetime, timedelta
from pathlib import Path

import numpy as np

from engine.image import ImageModel
from engine.logbook import Logbook, Observatory, Target
from engine.night import Night, Outlook, Outlooks, Plans, open_night, plans
from engine.order import Problem, Rules, build_problem
from engine.times import datetime_from_mjd

# Wavelength and width (nm), extinction (mag), zero point, dark sky (mag): invented, of usual size.
FILTERS = (
    ("B", 438.0, 90.0, 0.28, 22.9, 22.3),
    ("V", 545.0, 85.0, 0.16, 23.1, 21.6),
    ("R", 641.0, 150.0, 0.11, 23.3, 20.8),
    ("I", 798.0, 150.0, 0.07, 22.6, 19.6),
)
# A list needs one target for its night to be opened at all.
ANY = Target.model_validate(
    {
        "name": "any",
        "ra": 0.0,
        "dec": 0.0,
        "exposures": [{"filter": "V", "seconds": 60.0, "count": 1}],
    }
)
# First seeds: nights to tune the search on, and nights that were never used for that.
TUNING, KEPT_APART = 1_000, 50_000
LOADS = (0.5, 1.0, 2.0, 4.0)
MOUNTS = ("german", "fork", "altazimuth")


@dataclass(frozen=True)
class RandomNight:
    """One random night, its outlook and its plans; ``load`` is time asked for over dark time."""

    seed: int
    load: float
    night: Night
    outlooks: Outlooks
    plans: Plans

    def outlook(self, seeing_factor: float = 1.0) -> Outlook:
        """Return the outlook for a seeing that wanders slowly, times a factor."""
        random = np.random.default_rng([self.seed, 7])
        hours = np.arange(len(self.night.mjd)) / 60.0
        wander = 0.15 * np.sin(hours * random.uniform(0.3, 1.2) + random.uniform(0.0, 6.0))
        usual = self.night.observatory.seeing.typical_arcsec
        return self.outlooks.given(usual * np.exp(wander) * seeing_factor)

    def problem(
        self,
        seeing_factor: float = 1.0,
        from_mjd: float | None = None,
        rules: Rules | None = None,
    ) -> Problem:
        """Return the whole night as a problem, or what is left of it from a moment on."""
        start = self.night.mjd[0] if from_mjd is None else from_mjd
        return build_problem(
            self.night,
            self.outlook(seeing_factor),
            self.plans,
            rules or Rules(),
            from_mjd=float(start),
            pointing=None,
        )


def load_of(number: int) -> float:
    """Return the time that the list of one of a row of nights asks for, in dark times."""
    return LOADS[number % len(LOADS)]


def random_night(seed: int, targets: int, load: float) -> RandomNight:
    """Return a night made from a seed, with so many targets asking for ``load`` dark times."""
    random = np.random.default_rng([seed, targets])
    observatory = _observatory(random)
    day = date(2026, 1, 1) + timedelta(days=int(random.integers(365)))
    empty = _opened(observatory, (ANY,), day)
    dark = np.flatnonzero(empty.dark.all(axis=0))
    if len(dark) < 120:
        # A white night of the far north: take one half a year away.
        day += timedelta(days=182)
        empty = _opened(observatory, (ANY,), day)
        dark = np.flatnonzero(empty.dark.all(axis=0))
    wanted = tuple(
        _target(random, empty, dark, index, load * len(dark) / targets) for index in range(targets)
    )
    night = _opened(observatory, wanted, day)
    outlooks = Outlooks(night, ImageModel(observatory, night.air))
    return RandomNight(seed, load, night, outlooks, plans(wanted, ()))


def with_series(seed: int, size: int, load: float, share: float = 0.3) -> RandomNight:
    """Return a random night in which some targets want several visits."""
    random = np.random.default_rng([seed, 99])

    def change(target: Target) -> Target:
        if random.random() > share:
            return target
        visits = int(random.integers(2, 6))
        least = float(random.uniform(15, 60))
        greatest = float(least + random.uniform(5, 60)) if random.random() < 0.7 else None
        each = tuple(
            e.model_copy(update={"count": min(e.count, 2), "seconds": min(e.seconds, 90.0)})
            for e in target.exposures
        )
        update: dict[str, object] = {
            "visits": visits,
            "least_gap_min": least,
            "greatest_gap_min": greatest,
            "exposures": each,
            "contiguous_min": None,
        }
        if random.random() < 0.4:
            update["role"] = "standard"
        return target.model_copy(update=update)

    night = random_night(seed, size, load)
    targets = tuple(change(target) for target in night.night.targets)
    return replace(night, night=replace(night.night, targets=targets), plans=plans(targets, ()))


def _opened(observatory: Observatory, targets: tuple[Target, ...], day: date) -> Night:
    return open_night(Logbook(Path("/nowhere"), observatory, (), targets), day)


def _observatory(random: np.random.Generator) -> Observatory:
    horizon = tuple((float(a), float(random.uniform(8, 25))) for a in range(0, 360, 45))
    return Observatory.model_validate(
        {
            "site": {
                "name": "Anywhere",
                "latitude_deg": float(random.uniform(-58, 58)),
                "longitude_deg": float(random.uniform(-180, 180)),
                "elevation_m": float(random.uniform(0, 2500)),
                "timezone": "UTC",
                "horizon": horizon if random.random() < 0.5 else (),
            },
            "telescope": {
                "name": "T",
                "aperture_m": 0.8,
                "obstruction": 0.35,
                "focal_length_m": 5.6,
                "mount": MOUNTS[int(random.integers(3))],
                "minimum_altitude_deg": 20.0,
                "maximum_altitude_deg": 88.0,
                "slew_deg_per_s": float(random.uniform(1.0, 4.0)),
                "settle_s": float(random.uniform(5.0, 25.0)),
                "optics_fwhm_arcsec": 0.35,
                "tracking_fwhm_arcsec": 0.25,
            },
            "camera": {
                "pixel_um": 9.0,
                "columns": 2048,
                "rows": 2048,
                "readout_s": float(random.uniform(2.0, 15.0)),
                "read_noise_e": 9.0,
                "gain_e_per_adu": 1.5,
                "saturation_adu": 60000,
            },
            "filter": [
                {
                    "name": name,
                    "wavelength_nm": wavelength,
                    "width_nm": width,
                    "extinction_mag": extinction,
                    "zero_point_mag": zero,
                    "dark_sky_mag": sky,
                    "change_s": 6.0,
                }
                for name, wavelength, width, extinction, zero, sky in FILTERS
            ],
            "seeing": {"typical_arcsec": float(random.uniform(1.0, 2.2))},
        }
    )


def _target(
    random: np.random.Generator, night: Night, dark: np.ndarray, index: int, share_min: float
) -> Target:
    """Return a target that is up for some of the dark time, asking for about a share of it."""
    site = night.observatory.site
    middle = datetime_from_mjd(float(night.mjd[int(random.choice(dark))]))
    # On the meridian at a random dark moment, give or take three hours; sidereal to a minute.
    days = (middle - datetime(2000, 1, 1, 12, tzinfo=UTC)).total_seconds() / 86400.0
    sidereal_deg = 280.46 + 360.9856474 * days + site.longitude_deg
    dec_deg = float(np.clip(site.latitude_deg + random.uniform(-50, 50), -85, 85))
    ask_s = share_min * 60.0 * float(random.lognormal(-0.18, 0.6))
    filters = random.choice(len(FILTERS), size=int(random.integers(1, 4)), replace=False)
    exposures = []
    for place in sorted(filters):
        seconds = float(random.choice([20, 30, 60, 90, 120, 180, 300]))
        seconds = min(seconds, max(10.0, round(ask_s / len(filters), -1)))
        count = max(1, round(ask_s / len(filters) / (seconds + 8.0)))
        exposures.append({"filter": FILTERS[place][0], "seconds": seconds, "count": count})
    values: dict[str, object] = {
        "name": f"F{index:03d}",
        "ra": float((sidereal_deg + random.uniform(-45, 45)) % 360.0),
        "dec": dec_deg,
        "priority": int(random.integers(1, 6)),
        "exposures": exposures,
    }
    if random.random() < 0.3:
        values["maximum_airmass"] = float(random.uniform(1.4, 2.2))
    if random.random() < 0.15:
        values["minimum_moon_separation_deg"] = float(random.uniform(20, 60))
    if random.random() < 0.15:
        values["maximum_image_size_arcsec"] = float(
            night.observatory.seeing.typical_arcsec * random.uniform(1.2, 1.6)
        )
    if random.random() < 0.1:
        begin = middle - timedelta(minutes=float(random.uniform(30, 120)))
        values["windows"] = [(begin, begin + timedelta(minutes=float(random.uniform(60, 240))))]
    if random.random() < 0.15:
        values["contiguous_min"] = min(45.0, max(1.0, ask_s / 60.0))
    return Target.model_validate(values)
