"""An invented archive: years of nights in the log's own format, many in a minute.

The program's own writer checks each entry by reading it back; here the same bytes are made without
that, and `tests/engine/test_past_archive.py` holds them against the writer's.
"""

from __future__ import annotations

import os
from collections.abc import Iterator, Sequence
from concurrent.futures import ProcessPoolExecutor
from dataclasses import dataclass
from datetime import date, datetime, timedelta
from math import acos, cos, degrees, exp, log, pi, radians
from multiprocessing import get_context
from pathlib import Path
from random import Random

from engine.log import Header
from engine.log.blocks import crc_of
from engine.log.header import header_bytes
from engine.log.values import Value
from engine.logbook import load_logbook, sample_logbook
from engine.times import datetime_from_mjd, iso_from_datetime, night_span_mjd

FIRST_NIGHT = date(2018, 9, 1)
# So many nights a list of targets lives, and so many targets are on it.
SEASON_NIGHTS = 90
ON_THE_LIST = 60
PEOPLE = ("R. Okonjo", "I. Varga", "T. Lindqvist", "M. Achterberg", "S. Palacios")
FILTERS = ("B", "V", "R", "I")
LENGTHS_S = (60.0, 75.0, 80.0, 90.0)
WORDS = (
    "thin cirrus in the west, halo round the Moon", "guiding lost for a moment, found again",
    "dome slit was late; half of the frame is dark", "focus looks better after the flip",
    "satellite through the field", "wind from the south, stars jump", "dew on the corrector wiped",
    "comparison star saturated in R", "the new standard looks double", "fog in the valley",
)  # fmt: skip
CAUSES = ("cloud", "cloud", "cloud", "humidity", "wind", "telescope", "instrument")


def quick_block(kind: str, values: dict[str, Value]) -> bytes:
    """Return an entry as `engine.log.blocks.block_bytes` writes it, for plain values only."""
    lines = "".join(f"{key} = {_text(value)}\n" for key, value in values.items())
    body = f"[[{kind}]]\n{lines}".encode()
    return b"\n" + body + f'crc = "{crc_of(body)}"\n'.encode()


def _text(value: Value) -> str:
    if isinstance(value, str):
        return f'"{value}"'
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, datetime):
        return iso_from_datetime(value)
    if isinstance(value, list):
        return f"[{', '.join(_text(each) for each in value)}]"
    return repr(value)


@dataclass(frozen=True, slots=True)
class Archive:
    """What to invent: so many nights, of about so many exposures each, the same for a seed."""

    nights: int
    exposures: int = 333
    seed: int = 1


class _Night:
    """One invented night, entry by entry."""

    def __init__(self, archive: Archive, place: int) -> None:
        self.chance = Random(f"{archive.seed} {place}")
        self.night = FIRST_NIGHT + timedelta(days=place)
        self.place = place
        self.last_season = (archive.nights - 1) // SEASON_NIGHTS
        self.exposures = round(archive.exposures * self.chance.uniform(0.9, 1.1))
        self.n = 0
        self.blocks: list[bytes] = []
        self.moon = 0.5 - 0.5 * cos(2.0 * pi * place / 29.53)
        self.ln_seeing = self.chance.gauss(log(1.5), 0.15)
        self.seeing = exp(self.ln_seeing)

    def write(self, kind: str, mjd: float, values: dict[str, Value]) -> int:
        self.n += 1
        stamp: dict[str, Value] = {"n": self.n, "t": datetime_from_mjd(mjd)}
        self.blocks.append(quick_block(kind, stamp | values))
        return self.n

    def play(self, zone: str, targets: Sequence[tuple[str, str]]) -> None:
        """Observe from dusk to dawn: visits of some ten exposures, weather, words."""
        noon_mjd, _ = night_span_mjd(self.night, zone)
        hours = 10.3 - 1.7 * cos(2.0 * pi * (self.place - 110) / 365.25)
        mjd = noon_mjd + (12.5 - hours / 2.0) / 24.0
        done = 0
        while done < self.exposures:
            if self.chance.random() < 0.012:
                mjd = self.lose(mjd)
            visit = min(self.chance.randint(6, 14), self.exposures - done)
            mjd = self.visit(mjd, *self.chance.choice(targets), visit)
            done += visit
        self.write("close", mjd, {"why": "left by the observer"})

    def lose(self, mjd: float) -> float:
        self.write("lost_time", mjd, {"phase": "begin", "cause": self.chance.choice(CAUSES)})
        mjd += self.chance.uniform(10.0, 90.0) / 1440.0
        self.write("lost_time", mjd, {"phase": "end"})
        return mjd

    def visit(self, mjd: float, target: str, programme: str, count: int) -> float:
        pair = self.chance.sample(FILTERS, 2)
        self.write("pointing", mjd, {"target": target})
        mjd += 70.0 / 86400.0
        self.write("pointing", mjd, {"target": target, "on_target": True})
        seconds = LENGTHS_S[len(target) % 2 + 2 * (target[-1] in "02468")]
        half = count // 2
        steps: dict[str, Value] = {
            "target": target, "filters": list(pair), "seconds": [seconds, seconds],
            "counts": [half, count - half],
        }  # fmt: skip
        run = self.write("run_start", mjd, steps)
        altitude_deg = self.chance.uniform(28.0, 80.0)
        for place in range(count):
            name = pair[0] if place < half else pair[1]
            altitude_deg = min(max(altitude_deg + self.chance.uniform(-0.4, 0.4), 25.0), 85.0)
            mjd = self.expose(mjd, run, target, programme, name, seconds, altitude_deg)
        self.write("run_stop", mjd, {"of": run, "why": "finished"})
        if self.chance.random() < 0.06:
            self.write("note", mjd, {"text": self.chance.choice(WORDS), "target": target})
        return mjd

    def expose(
        self, mjd: float, run: int, target: str, programme: str, name: str, seconds: float,
        altitude_deg: float,
    ) -> float:  # fmt: skip
        end_mjd = mjd + seconds / 86400.0
        began = self.write(
            "exposure_start", mjd,
            {"run": run, "target": target, "programme": programme, "filter": name,
             "seconds": seconds, "start": datetime_from_mjd(mjd)},
        )  # fmt: skip
        self.ln_seeing += self.chance.gauss(0.0, 0.05) - 0.02 * (self.ln_seeing - log(1.5))
        self.seeing = exp(self.ln_seeing)
        airmass = 1.0 / cos(radians(90.0 - altitude_deg))
        size = round((self.seeing**2 * airmass**1.2 + 0.45**2) ** 0.5, 4)
        record = self.record(mjd, end_mjd, seconds, altitude_deg, airmass, size)
        head: dict[str, Value] = {
            "of": began, "run": run, "target": target, "programme": programme, "filter": name,
            "seconds": seconds,
        }  # fmt: skip
        n = self.write("exposure", end_mjd, head | record)
        if self.chance.random() < 0.02:
            self.write("amendment", end_mjd, {"of": n, "why": "trailed", "outcome": "rejected"})
        elif self.chance.random() < 0.12:
            self.measure(end_mjd, n, target, name, airmass, size)
        return end_mjd + 16.0 / 86400.0

    def measure(
        self, mjd: float, of: int, target: str, name: str, airmass: float, size: float
    ) -> None:
        measured = round(size * exp(self.chance.gauss(0.0, 0.05)), 2)
        said: dict[str, Value] = {
            "seeing_arcsec": round(self.seeing * measured / size, 3),
            "measured_fwhm_arcsec": measured, "target": target, "filter": name,
            "airmass": round(airmass, 4), "of": of,
        }  # fmt: skip
        n = self.write("conditions", mjd, said)
        change: dict[str, Value] = {"of": of, "with_n": n, "measured_fwhm_arcsec": measured}
        self.write("amendment", mjd, change)
        if self.chance.random() < 0.25:
            monitor = round(self.seeing * exp(self.chance.gauss(0.0, 0.05)), 2)
            self.write("conditions", mjd, {"seeing_arcsec": monitor})

    def record(
        self, mjd: float, end_mjd: float, seconds: float, altitude_deg: float, airmass: float,
        size: float,
    ) -> dict[str, Value]:  # fmt: skip
        chance = self.chance
        return {
            "exposed_s": seconds,
            "start": datetime_from_mjd(mjd),
            "mid": datetime_from_mjd(0.5 * (mjd + end_mjd)),
            "end": datetime_from_mjd(end_mjd),
            "airmass_start": round(airmass * 0.998, 4),
            "airmass_mid": round(airmass, 4),
            "airmass_end": round(airmass * 1.002, 4),
            "airmass_effective": round(airmass, 4),
            "altitude_deg": round(altitude_deg, 4),
            "azimuth_deg": round(chance.uniform(0.0, 360.0), 4),
            "hour_angle_h": round(degrees(acos(1.0 / airmass)) / 15.0 * chance.choice((-1, 1)), 4),
            "moon_separation_deg": round(chance.uniform(20.0, 150.0), 4),
            "moon_altitude_deg": round(chance.uniform(-60.0, 60.0), 4),
            "moon_illumination": round(self.moon, 4),
            "image_size_arcsec": size,
            "image_atmosphere_arcsec": round(self.seeing * airmass**0.6, 4),
            "image_diffraction_arcsec": 0.1634,
            "image_optics_arcsec": 0.35,
            "image_tracking_arcsec": 0.25,
            "image_dispersion_arcsec": round(0.1 * (airmass - 1.0), 4),
            "image_sampling_arcsec": 0.2567,
            "sky_mag_arcsec2": round(21.5 - 3.0 * self.moon, 4),
            "seeing_arcsec": round(self.seeing, 4),
            "outcome": "good",
            "credit": round(min((1.6 / size) ** 2, 2.0), 4),
        }


def targets_of(place: int, last_season: int) -> list[tuple[str, str]]:
    """Return the targets (name, programme) on the list at a night; the sample's own in the end."""
    season = place // SEASON_NIGHTS
    if season == last_season:
        logbook = load_logbook(sample_logbook())
        return [(each.name, each.programme) for each in logbook.targets[:ON_THE_LIST]]
    return [
        (f"AR {season:02d}{number:02d}", f"Programme {season:02d}-{number % 7}")
        for number in range(ON_THE_LIST)
    ]


def night_bytes(archive: Archive, place: int) -> tuple[str, bytes]:
    """Return the name and the bytes of one night's log."""
    observatory = load_logbook(sample_logbook()).observatory
    night = _Night(archive, place)
    night.play(observatory.site.timezone, targets_of(place, night.last_season))
    people = tuple(night.chance.sample(PEOPLE, 2))
    head = header_bytes(Header.of(observatory, night.night, people, "warmroom 0.1.0"))
    return f"{night.night.isoformat()}.toml", head + b"".join(night.blocks)


def _write_some(folder: Path, archive: Archive, places: Sequence[int]) -> int:
    for place in places:
        name, data = night_bytes(archive, place)
        path = folder / name
        path.write_bytes(data)
        long_ago = 1_400_000_000 + place * 86400
        os.utime(path, (long_ago, long_ago))
    return len(places)


def write_archive(folder: Path, archive: Archive) -> Iterator[int]:
    """Write an archive into a folder beside a copy of the sample's files; tell how many so far."""
    folder.mkdir(parents=True, exist_ok=True)
    for name in ("observatory.toml", "targets.toml"):
        (folder / name).write_bytes((sample_logbook() / name).read_bytes())
    shares = [range(begin, archive.nights, 40) for begin in range(min(40, archive.nights))]
    if archive.nights < 40:
        yield _write_some(folder, archive, range(archive.nights))
        return
    with ProcessPoolExecutor(mp_context=get_context("spawn")) as pool:
        done = 0
        for count in pool.map(_write_some, [folder] * 40, [archive] * 40, shares):
            done += count
            yield done
