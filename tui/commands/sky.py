"""``warmroom sky``: every target at one moment: where, how soft, may it be observed."""

from __future__ import annotations

import argparse
import math
from collections.abc import Sequence
from dataclasses import fields
from typing import Any

from engine.image import Terms
from engine.logbook import load_logbook
from engine.night import FilterNow, Night, TargetNow
from engine.positions import earth_table_note, sidereal_time_h
from engine.times import iso_from_mjd
from engine.watch import Snapshot, snapshot
from tui.commands.output import number, print_columns, print_json


def run(arguments: argparse.Namespace) -> int:
    """Print the sky at a moment; status 1 when nothing may be observed."""
    seen = snapshot(load_logbook(arguments.logbook), arguments.at, arguments.seeing)
    if arguments.json:
        print_json(_as_json(seen))
    else:
        _print_text(seen)
    return 0 if any(target.observable for target in seen.targets) else 1


def _as_json(seen: Snapshot) -> dict[str, Any]:
    night = seen.night
    site = night.observatory.site
    return {
        "at": iso_from_mjd(seen.mjd),
        "mjd": seen.mjd,
        "lst_h": float(sidereal_time_h(seen.mjd, site.longitude_deg)),
        "seeing_arcsec": seen.seeing_arcsec,
        "sun": {
            "altitude_deg": float(night.sun.altitude_deg[0]),
            "azimuth_deg": float(night.sun.azimuth_deg[0]),
        },
        "moon": {
            "altitude_deg": float(night.moon.altitude_deg[0]),
            "azimuth_deg": float(night.moon.azimuth_deg[0]),
            "illumination": float(night.moon.illumination[0]),
        },
        "targets": [_target_as_json(seen, each) for each in seen.targets],
    }


def _target_as_json(seen: Snapshot, now: TargetNow) -> dict[str, Any]:
    return {
        "name": now.target.name,
        "ra_deg": now.target.ra_deg,
        "dec_deg": now.target.dec_deg,
        "altitude_deg": now.altitude_deg,
        "apparent_altitude_deg": now.apparent_altitude_deg,
        "azimuth_deg": now.azimuth_deg,
        "hour_angle_h": now.hour_angle_h,
        "parallactic_angle_deg": now.parallactic_angle_deg,
        "airmass": now.airmass,
        "moon_separation_deg": now.moon_separation_deg,
        "observable": now.observable,
        "reason": now.reasons[0].code if now.reasons else None,
        "filters": [_filter_as_json(seen, now, each) for each in now.filters],
    }


def _filter_as_json(seen: Snapshot, now: TargetNow, one: FilterNow) -> dict[str, Any]:
    # Below the horizon there is no image; its keys stay, with null.
    up = math.isfinite(now.airmass)
    image = seen.model.breakdown(one.filter_index, seen.seeing_arcsec, now.airmass) if up else None
    return {
        "filter": one.progress.filter,
        "image_size_arcsec": image.size_arcsec if image else None,
        "image_size_px": image.size_px if image else None,
        "elongation": image.elongation if image else None,
        "terms_arcsec": {
            each.name: getattr(image.terms, each.name) if image else None for each in fields(Terms)
        },
        "sky_mag_arcsec2": one.sky_mag_arcsec2,
        "planned": one.progress.planned,
        "done": one.progress.done,
        "credit": one.progress.credit,
    }


def _print_text(seen: Snapshot) -> None:
    night = seen.night
    print(
        f"{night.observatory.site.name} at {iso_from_mjd(seen.mjd)[:16].replace('T', ' ')} UTC, "
        f"seeing {seen.seeing_arcsec:.2f} arcsec ({seen.seeing_source}), "
        f"Sun {night.sun.altitude_deg[0]:+.0f}°, Moon {night.moon.altitude_deg[0]:+.0f}° "
        f"{night.moon.illumination[0]:.0%} lit"
    )
    ordered = sorted(seen.targets, key=lambda t: (not t.observable, -t.apparent_altitude_deg))
    print_columns(
        ("target", "alt", "az", "HA", "airmass", "Moon", "FWHM per filter", ""),
        [_row(night, each) for each in ordered],
        left=1,
    )
    note = earth_table_note(seen.mjd)
    if note:
        print(note)


def _row(night: Night, now: TargetNow) -> Sequence[str]:
    sizes = " ".join(
        f"{each.progress.filter} {number(each.image_size_arcsec)}{'!' if each.soft else ''}"
        for each in now.filters
    )
    moon_is_up = night.moon.altitude_deg[0] > 0
    return (
        now.target.name,
        f"{now.apparent_altitude_deg:.1f}°",
        f"{now.azimuth_deg:.0f}°",
        f"{now.hour_angle_h:+.1f}h",
        number(now.airmass),
        f"{now.moon_separation_deg:.0f}°" if moon_is_up else "",
        sizes,
        "; ".join(reason.sentence for reason in now.reasons) or "may be observed",
    )
