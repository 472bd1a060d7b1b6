"""``warmroom exposure``: what an exposure of one target reaches, in each filter of its plan."""

from __future__ import annotations

import argparse
from typing import Any

from engine.errors import NoAnswer, WarmroomError
from engine.logbook import load_logbook
from engine.logbook.faults import nearest
from engine.night import FilterNow, TargetNow
from engine.times import iso_from_mjd
from engine.watch import Reach, Scene, Snapshot, reach, snapshot
from tui.commands.output import number, print_columns, print_json


def run(arguments: argparse.Namespace) -> int:
    """Print what exposures reach; status 1 when the target is below the horizon."""
    seen = snapshot(load_logbook(arguments.logbook), arguments.at, arguments.seeing)
    now = _chosen(seen, arguments.target)
    filters = [f for f in now.filters if arguments.filter in (None, f.progress.filter)]
    if not filters:
        known = ", ".join(each.progress.filter for each in now.filters)
        raise WarmroomError(f"--filter: '{arguments.filter}', expected one of its plan: {known}")
    magnitude = arguments.magnitude if arguments.magnitude is not None else now.target.magnitude
    reached = [(one, _reach(seen, now, one, arguments.seconds, magnitude)) for one in filters]
    if arguments.json:
        print_json(_as_json(seen, now, reached))
    else:
        _print_text(seen, now, reached)
    return 0


def _chosen(seen: Snapshot, name: str) -> TargetNow:
    for each in seen.targets:
        if each.target.name == name:
            return each
    names = [each.target.name for each in seen.targets]
    raise NoAnswer(f"no target is called '{name}'{nearest(name, names)}")


def _reach(
    seen: Snapshot, now: TargetNow, one: FilterNow, seconds: float | None, magnitude: float | None
) -> Reach:
    scene = Scene(one.filter_index, seen.seeing_arcsec, now.airmass, one.sky_mag_arcsec2)
    observatory = seen.night.observatory
    length_s = one.progress.seconds if seconds is None else seconds
    return reach(observatory, seen.model, scene, length_s, magnitude)


def _as_json(
    seen: Snapshot, now: TargetNow, reached: list[tuple[FilterNow, Reach]]
) -> dict[str, Any]:
    return {
        "at": iso_from_mjd(seen.mjd),
        "target": now.target.name,
        "seeing_arcsec": seen.seeing_arcsec,
        "airmass": now.airmass,
        "filters": [
            {
                "filter": one.progress.filter,
                "seconds": each.seconds,
                "magnitude": each.magnitude,
                "image_size_arcsec": each.image_size_arcsec,
                "aperture_radius_arcsec": each.aperture_radius_arcsec,
                "sky_mag_arcsec2": one.sky_mag_arcsec2,
                "signal_to_noise": each.signal_to_noise,
                "seconds_for_signal_to_noise_100": each.seconds_for_100,
                "limiting_magnitude": each.limiting_magnitude,
                "saturation_s": each.saturation_s,
                "sky_limited_s": each.sky_limited_s,
                "parts": {
                    "count": each.parts.count,
                    "seconds": each.parts.seconds,
                    "read_noise_share": each.parts.read_noise_share,
                },
            }
            for one, each in reached
        ],
    }


def _print_text(seen: Snapshot, now: TargetNow, reached: list[tuple[FilterNow, Reach]]) -> None:
    star = reached[0][1].magnitude
    print(
        f"{now.target.name} at {iso_from_mjd(seen.mjd)[:16].replace('T', ' ')} UTC, airmass "
        f"{number(now.airmass)}, seeing {seen.seeing_arcsec:.2f} arcsec ({seen.seeing_source}), "
        f"star of magnitude {number(star, '.1f')}"
    )
    print_columns(
        ("filter", "seconds", "FWHM", "sky", "S/N", "s for 100", "limit", "saturates", "in parts"),
        [
            (
                one.progress.filter,
                f"{each.seconds:g}",
                number(each.image_size_arcsec),
                number(one.sky_mag_arcsec2, ".1f"),
                number(each.signal_to_noise, ".0f"),
                number(each.seconds_for_100, ".1f"),
                number(each.limiting_magnitude, ".1f"),
                f"{number(each.saturation_s, '.0f')} s{' !' if each.saturates else ''}",
                f"{each.parts.count} x {each.parts.seconds:.0f} s, "
                f"read noise +{each.parts.read_noise_share:.0%}",
            )
            for one, each in reached
        ],
    )
    print(
        "S/N in an aperture of 0.7 FWHM, with sky, dark, read noise and scintillation; limit at "
        "S/N 5; the sky is good to 8 to 23 % by moonlight"
    )
