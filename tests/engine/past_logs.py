"""What the past's tests share: small archives, and the truth told by the fold alone."""

from __future__ import annotations

import os
from collections import defaultdict
from pathlib import Path
from typing import Any

from engine.errors import LogError
from engine.log import Exposure, NightState, fold, night_logs, read_log
from engine.past import PastIndex
from tests.bench.archive import Archive, night_bytes

LONG_AGO_S = 1_600_000_000


def small_archive(folder: Path, nights: int = 8, exposures: int = 9) -> list[Path]:
    """Write a few short nights; return their logs."""
    folder.mkdir(parents=True, exist_ok=True)
    paths = []
    for place in range(nights):
        name, data = night_bytes(Archive(nights, exposures), place)
        paths.append(folder / name)
        paths[-1].write_bytes(data)
        os.utime(paths[-1], (LONG_AGO_S + place, LONG_AGO_S + place))
    return paths


def folded(folder: Path) -> dict[str, NightState]:
    """Return the state of every night that can be read, by the log's name."""
    states = {}
    for path in night_logs(folder):
        try:
            states[path.name] = fold(read_log(path).events)
        except LogError:
            continue
    return states


def rows_by_fold(folder: Path) -> list[tuple[Any, ...]]:
    """Return every exposure as the index should have it, from the fold."""
    return [
        (name, each.n, each.target, each.filter, each.seconds, each.exposed_s, each.start_mjd,
         each.airmass_mid, each.measured_fwhm_arcsec, each.outcome, each.credit, each.why)
        for name, state in folded(folder).items()
        for each in state.exposures
    ]  # fmt: skip


def rows_by_index(index: PastIndex) -> list[tuple[Any, ...]]:
    """Return every exposure that the index has."""
    return index.ask(
        "SELECT night.name, n, target, filter, seconds, exposed_s, start_mjd, airmass_mid, "
        "measured_fwhm_arcsec, outcome, credit, why FROM exposure "
        "JOIN night ON night.id = exposure.night ORDER BY night.name, place"
    )


def totals_by_fold(folder: Path) -> dict[tuple[str, str, str, float, str], tuple[int, int]]:
    """Return how many exposures there are, and in how many nights, by all that totals part."""
    found: dict[Any, list[tuple[str, Exposure]]] = defaultdict(list)
    for name, state in folded(folder).items():
        for each in state.exposures:
            key = (each.target, each.programme, each.filter, each.seconds, each.outcome)
            found[key].append((name, each))
    return {key: (len(some), len({name for name, _ in some})) for key, some in found.items()}
