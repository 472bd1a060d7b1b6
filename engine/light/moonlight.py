"""Moonlight scattered by the air: Krisciunas & Schaefer 1991, PASP 103, 1033, and other bands.

Eqs. 3, 8, 9, 15 and 21 of that paper, made for V and good to 8 to 23 %. Two things are ours. Away
from V the light is shared out between gas and haze as each grows with frequency, and the Moon has
its colour: less sure than V. And with the Moon lower than any they measured, its light is dimmed
along the true airmass, so that the sky brightens gradually at moonrise.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Self

import numpy as np
from numpy.typing import ArrayLike, NDArray

from engine.light.extinction import rayleigh_mag
from engine.positions.airmass import airmass

Floats = NDArray[np.floating]

V_WAVELENGTH_NM = 550.0
# The power of frequency with which haze extinguishes: common practice, no source. The gas has its
# own formula.
HAZE_POWER = 1.3
# Colour of moonlight against V by wavelength (nm): U-B 0.46 and B-V 0.92 (Lane & Irvine 1973, AJ
# 78, 267), V-R 0.54 and V-I 1.00 for the Sun's colours reddened alike. From memory, not seen.
_COLOUR_NM = (365.0, 438.0, 550.0, 641.0, 798.0, 1000.0)
_COLOUR_MAG = (1.38, 0.92, 0.0, -0.54, -1.00, -1.25)
# Below this altitude of the Moon its light is dimmed along the true airmass.
LOW_MOON_DEG = 20.0
# Closer than 10 deg the haze term is another; inside the disc it has no meaning and is held.
_NEAR_DEG, _DISC_DEG = 10.0, 0.25


@dataclass(frozen=True, slots=True)
class MoonLight:
    """The Moon as a lamp; arrays that broadcast. ``phase_angle_deg`` is 0 at full, 180 at new."""

    altitude_deg: ArrayLike
    separation_deg: ArrayLike
    phase_angle_deg: ArrayLike


def scattering_path(zenith_deg: ArrayLike) -> Floats:
    """Return the path of light through the air that scatters it, 1 at the zenith, 5 level.

    X = (1 - 0.96 sin^2 Z)^-1/2 (K&S eq. 3). Never an airmass for the extinction of a star: level,
    that is nearly 40.
    """
    sine = np.sin(np.deg2rad(np.asarray(zenith_deg)))
    return np.asarray((1.0 - 0.96 * sine**2) ** -0.5)


def moon_magnitude(phase_angle_deg: ArrayLike) -> Floats:
    """Return the Moon's V magnitude at a phase angle (deg): -12.73 + 0.026 a + 4e-9 a^4 (eq. 9)."""
    angle = np.abs(np.asarray(phase_angle_deg, dtype=float))
    return np.asarray(-12.73 + 0.026 * angle + 4e-9 * angle**4)


def gas_scattering(separation_deg: ArrayLike) -> Floats:
    """Return what air itself scatters at an angle (deg): 10^5.36 (1.06 + cos^2 rho) (eq. 21)."""
    return np.asarray(10.0**5.36 * (1.06 + np.cos(np.deg2rad(np.asarray(separation_deg))) ** 2))


def haze_scattering(separation_deg: ArrayLike) -> Floats:
    """Return what haze scatters at an angle (deg): 10^(6.15 - rho/40), 6.2e7/rho^2 below 10 deg.

    Eq. 21; the small-angle branch from memory. As published the two do not quite meet.
    """
    rho = np.asarray(separation_deg)
    near = 6.2e7 / np.maximum(rho, _DISC_DEG) ** 2
    far = np.exp(math.log(10.0) * (6.15 - rho / 40.0))
    return np.asarray(np.where(rho < _NEAR_DEG, near, far))


@dataclass(frozen=True, slots=True)
class ScatteringShares:
    """How much of the V scattering of gas and of haze counts in a band, per unit of extinction."""

    gas: float
    haze: float

    @classmethod
    def at(cls, wavelength_nm: float, extinction_mag: float, pressure_hpa: float) -> Self:
        """Return the shares in a band with its extinction (mag per airmass); 1 and 1 in V.

        The formula's light grows with the band's extinction, of which the gas takes its Rayleigh
        part and haze the rest: the growth already in the extinction must not count twice.
        """
        gas_mag = float(rayleigh_mag(wavelength_nm, pressure_hpa))
        gas_v_mag = float(rayleigh_mag(V_WAVELENGTH_NM, pressure_hpa))
        haze_growth = (V_WAVELENGTH_NM / wavelength_nm) ** HAZE_POWER
        v_mag = gas_v_mag + max(extinction_mag - gas_mag, 0.0) / haze_growth
        share = v_mag / max(extinction_mag, gas_mag)
        return cls(gas=gas_mag / gas_v_mag * share, haze=haze_growth * share)


def lamp(moon: MoonLight, wavelength_nm: float, extinction_mag: float) -> Floats:
    """Return the Moon's light that reaches the air above the telescope (K&S's units); 0 if down.

    10^(-0.4 (V + colour + 16.57)), eq. 8, dimmed by the extinction along the Moon's own path.
    """
    altitude_deg = np.asarray(moon.altitude_deg, dtype=float)
    colour = np.interp(wavelength_nm, _COLOUR_NM, _COLOUR_MAG)
    magnitude = moon_magnitude(moon.phase_angle_deg) + colour + 16.57
    bounded = np.maximum(altitude_deg, 0.0)
    lower = airmass(np.minimum(bounded, LOW_MOON_DEG)) - airmass(LOW_MOON_DEG)
    path = scattering_path(90.0 - np.maximum(bounded, LOW_MOON_DEG)) + lower
    light = 10.0 ** (-0.4 * (magnitude + extinction_mag * path))
    return np.asarray(np.where(altitude_deg <= 0.0, 0.0, light))
