"""What a logbook holds, in a few lines for a person."""

from __future__ import annotations

from engine.logbook.load import Logbook
from engine.logbook.targets import Target


def planned_hours(targets: tuple[Target, ...]) -> float:
    """Return the open-shutter time (h) that the plans of targets ask for."""
    return sum(e.seconds * e.count for target in targets for e in target.exposures) / 3600.0


def describe(logbook: Logbook) -> list[str]:
    """Return what the logbook holds, a line each."""
    observatory = logbook.observatory
    site, telescope, camera = observatory.site, observatory.telescope, observatory.camera
    field_arcmin = observatory.pixel_arcsec * camera.columns / 60.0
    lines = [
        f"{site.name}: latitude {site.latitude_deg:+.4f}°, longitude {site.longitude_deg:+.4f}°, "
        f"{site.elevation_m:g} m, {site.timezone}",
        f"{telescope.name}: {telescope.aperture_m:g} m aperture, {telescope.focal_length_m:g} m "
        f"focal length, {telescope.mount} mount",
        f"camera: {observatory.pixel_arcsec:.3f} arcsec a pixel, {field_arcmin:.1f} arcmin across",
        "filters: " + ", ".join(f"{f.name} {f.wavelength_nm:g} nm" for f in observatory.filters),
        f"targets: {len(logbook.targets)}, asking for {planned_hours(logbook.targets):.1f} h",
    ]
    names = [programme.name for programme in logbook.programmes]
    for name in [*names, ""]:
        own = tuple(target for target in logbook.targets if target.programme == name)
        if own:
            label = name or "no programme"
            lines.append(f"  {label}: {len(own)} targets, {planned_hours(own):.1f} h")
    return lines
