"""What a logbook holds, in a few lines for a person."""

from __future__ import annotations

from engine.logbook.load import Logbook
from engine.logbook.targets import Target


def planned_hours(targets: tuple[Target, ...]) -> float:
    """Return the open-shutter time (h) that the plans of targets ask for."""
    return (
        sum(e.seconds * e.count * target.visits for target in targets for e in target.exposures)
        / 3600.0
    )


def describe(logbook: Logbook) -> list[str]:
    """Return what the logbook holds, a line each."""
    observatory, targets = logbook.observatory, logbook.targets
    site, telescope, camera = observatory.site, observatory.telescope, observatory.camera
    across, down = (
        observatory.pixel_arcsec * pixels / 60.0 for pixels in (camera.columns, camera.rows)
    )
    filters = (f"{each.name} {each.wavelength_nm:g} nm" for each in observatory.filters)
    lines = [
        f"{site.name}: latitude {site.latitude_deg:+.4f}°, longitude {site.longitude_deg:+.4f}°, "
        f"{site.elevation_m:g} m, {site.timezone}",
        f"{telescope.name}: {telescope.aperture_m:g} m aperture, {telescope.focal_length_m:g} m "
        f"focal length, {telescope.mount} mount",
        f"camera: {observatory.pixel_arcsec:.3f} arcsec a pixel, {across:.1f} x {down:.1f} arcmin",
        f"filters: {', '.join(filters)}",
        f"seeing: {observatory.seeing.typical_arcsec:g} arcsec until something is measured",
        f"targets: {len(targets)}, asking for {planned_hours(targets):.1f} h",
    ]
    investigators = {each.name: each.investigator for each in logbook.programmes}
    names = dict.fromkeys([*investigators, *(each.programme for each in targets)])
    return lines + [_programme(name, investigators.get(name, ""), targets) for name in names]


def _programme(name: str, investigator: str, targets: tuple[Target, ...]) -> str:
    own = tuple(target for target in targets if target.programme == name)
    standards = sum(target.role == "standard" for target in own)
    label = name or "no programme"
    if investigator:
        label += f" ({investigator})"
    counted = f"{len(own)} target{'' if len(own) == 1 else 's'}"
    if standards:
        counted += f", {standards} of them standard{'' if standards == 1 else 's'}"
    return f"  {label}: {counted}, {planned_hours(own):.1f} h"
