"""A small sound logbook, as text, for tests that break it or read it in other forms."""

from __future__ import annotations

import os
from collections.abc import Mapping
from pathlib import Path

OBSERVATORY = """\
[site]
name = "Testing Hill"
latitude_deg = -31.27
longitude_deg = 149.07
elevation_m = 1165.0
timezone = "Australia/Sydney"
horizon = [[0, 18], [90, 25], [180, 12]]

[telescope]
name = "80 cm"
aperture_m = 0.80
obstruction = 0.35
focal_length_m = 5.6
mount = "german"
minimum_altitude_deg = 20.0
maximum_altitude_deg = 88.0
hour_angle_limits_h = [-6.0, 6.0]
slew_deg_per_s = 2.0
settle_s = 15.0
optics_fwhm_arcsec = 0.35
tracking_fwhm_arcsec = 0.25

[camera]
pixel_um = 9.0
columns = 2048
rows = 2048
readout_s = 8.0
read_noise_e = 9.0
gain_e_per_adu = 1.5
saturation_adu = 60000

[[filter]]
name = "B"
wavelength_nm = 438.0
width_nm = 90.0
extinction_mag = 0.28
zero_point_mag = 22.9
dark_sky_mag = 22.3

[[filter]]
name = "V"
wavelength_nm = 545.0
width_nm = 85.0
extinction_mag = 0.16
zero_point_mag = 23.1
dark_sky_mag = 21.6

[seeing]
typical_arcsec = 1.6
"""

TARGETS = """\
[[programme]]
name = "Clusters"
investigator = "R. Okonjo"

[[target]]
name = "M 67"
programme = "Clusters"
ra = "08:51:18"
dec = "+11:48:00"
magnitude = 11.0
priority = 5
exposures = [
    { filter = "B", seconds = 90, count = 5 },
    { filter = "V", seconds = 60, count = 5 },
]
windows = [[2027-03-25T11:00:00Z, 2027-03-25T12:20:00Z]]

[[target]]
name = "SA 98"
ra = 103.02
dec = -0.33
exposures = [{ filter = "V", seconds = 10, count = 3 }]
role = "standard"
"""


def written(
    folder: Path, files: Mapping[str, str | bytes] | None = None, *, sound: bool = True
) -> Path:
    """Write files into a folder, over the sound two where those are wanted; return the folder."""
    both: dict[str, str | bytes] = {"observatory.toml": OBSERVATORY, "targets.toml": TARGETS}
    for name, content in {**(both if sound else {}), **(files or {})}.items():
        path = folder / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_bytes(content.encode() if isinstance(content, str) else content)
    return folder


def as_told(folder: Path, message: str) -> list[str]:
    """Return the lines of a message with the folder cut off their paths."""
    return message.replace(f"{folder}{os.sep}", "").split("\n")
