"""Predicted against measured image size, and what the images say of telescope and air.

A fit needs the seeing from elsewhere: a value that was itself worked out from an image says nothing
about the telescope. So an image counts for the fit when somebody entered the seeing near its time.
Of the telescope's own blurs only the sum can be had from sizes: optics and tracking both widen an
image by a Gaussian, and two Gaussians are one.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from engine.image import ImageModel
from engine.logbook import Observatory
from engine.past.digest import IMAGE_COLUMNS
from engine.past.index import PastIndex
from engine.past.nights import ALWAYS, Period
from engine.past.seeing import AIRMASS_EDGES, Measurements, airmass_labels, measurements, tables_of
from engine.times import MINUTES_PER_DAY

Floats = NDArray[np.float64]
Places = NDArray[np.intp]

# How near in time the seeing must have been entered: two thirds of the e-folding time of seeing,
# 17 min (Racine 1996, PASP 108, 372).
NEAR_MIN = 11.0
# What a fit needs at least; common practice, no source.
LEAST_PAIRS, LEAST_NIGHTS, LEAST_AIRMASS_SPAN = 40, 5, 0.3
# More pairs than this change nothing but the time it takes; they are taken evenly from all.
MOST_PAIRS = 20_000
# Values of the common Gaussian for which tables are made; between them its square is interpolated.
NODES_ARCSEC = np.array([0.0, 0.25, 0.45, 0.7, 1.0, 1.5, 2.2, 3.2])
EXPONENT = 0.6
EXPONENT_STEP = 0.02
# Huber 1964 (Ann. Math. Stat. 35, 73): from here on, in standard deviations, weight falls; at this
# value 95 % of the efficiency for normal errors is kept (from memory).
HUBER = 1.345
MAD_TO_SIGMA = 1.4826
STEPS = 40


@dataclass(frozen=True, slots=True)
class Ratio:
    """Measured over predicted size of some images: how many, quartiles."""

    label: str
    count: int
    lower_quartile: float
    median: float
    upper_quartile: float


@dataclass(frozen=True, slots=True)
class ImageFit:
    """What predicted and measured image sizes say.

    ``missing`` says why no fit is offered; then the values behind it are None. Errors are one
    standard deviation and allow for nights that differ. ``blur_arcsec`` is the FWHM of optics and
    tracking together, ``exponent`` the power of airmass with which the seeing grows (0.6 by theory:
    Fried 1966), ``scatter`` what remains, as a share of the size.
    """

    images: int
    all: Ratio | None
    by_filter: tuple[Ratio, ...]
    by_airmass: tuple[Ratio, ...]
    pairs: int
    nights: int
    missing: tuple[str, ...]
    blur_arcsec: float | None = None
    blur_error_arcsec: float | None = None
    blur_now_arcsec: float | None = None
    exponent: float | None = None
    exponent_error: float | None = None
    scatter: float | None = None
    optics_fwhm_arcsec: float | None = None
    tracking_fwhm_arcsec: float | None = None
    toml: str = ""


@dataclass(frozen=True, slots=True)
class Images:
    """Images that were predicted and measured (N,), and where each stands."""

    mjd: Floats
    airmass: Floats
    predicted_arcsec: Floats
    measured_arcsec: Floats
    filter: Places
    night: Places
    filters: tuple[str, ...]
    nights: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class Pairs:
    """Images with the seeing that was entered near them (P,); filters as the observatory's."""

    seeing_arcsec: Floats
    airmass: Floats
    measured_arcsec: Floats
    filter: Places
    night: Places


def images(index: PastIndex, period: Period = ALWAYS) -> Images:
    """Return every good image of a period whose size was predicted and measured."""
    rows, night, nights, filters = tables_of(index, "images", IMAGE_COLUMNS, period)
    mjd, filter_, airmass, _, predicted, measured = rows.T
    fits = (predicted > 0.0) & (measured > 0.0) & (airmass >= 1.0)
    return Images(
        mjd[fits],
        airmass[fits],
        predicted[fits],
        measured[fits],
        filter_[fits].astype(np.intp),
        night[fits],
        filters,
        nights,
    )


def fit_images(index: PastIndex, observatory: Observatory, period: Period = ALWAYS) -> ImageFit:
    """Return how predicted and measured sizes compare, and a fit where the data can carry one."""
    taken = images(index, period)
    ratio = taken.measured_arcsec / taken.predicted_arcsec
    pairs = paired(taken, measurements(index, period), observatory)
    whole = ImageFit(
        images=ratio.size,
        all=_ratio("all", ratio),
        by_filter=_ratios(ratio, taken.filter, taken.filters),
        by_airmass=_ratios(
            ratio, np.digitize(taken.airmass, AIRMASS_EDGES[1:-1]), airmass_labels()
        ),
        pairs=pairs.seeing_arcsec.size,
        nights=np.unique(pairs.night).size,
        missing=(),
    )
    missing = _missing(pairs)
    return replace(whole, missing=missing) if missing else _fitted(whole, pairs, observatory)


def paired(taken: Images, measured: Measurements, observatory: Observatory) -> Pairs:
    """Return the images near whose time the seeing was entered from elsewhere."""
    own = ~measured.from_image
    times, values = measured.mjd[own], measured.zenith_arcsec[own]
    order = np.argsort(times)
    times, values = times[order], values[order]
    known = {each.name: place for place, each in enumerate(observatory.filters)}
    filters = np.array([known.get(name, -1) for name in taken.filters], dtype=np.intp)
    if times.size == 0 or taken.mjd.size == 0:
        none = np.zeros(0)
        return Pairs(none, none, none, np.zeros(0, np.intp), np.zeros(0, np.intp))
    after = np.clip(np.searchsorted(times, taken.mjd), 1, max(times.size - 1, 1))
    before = after - 1
    after = np.minimum(after, times.size - 1)
    is_nearer = np.abs(times[after] - taken.mjd) < np.abs(times[before] - taken.mjd)
    nearest = np.where(is_nearer, after, before)
    fits = np.abs(times[nearest] - taken.mjd) * MINUTES_PER_DAY < NEAR_MIN
    fits &= filters[taken.filter] >= 0
    places = np.flatnonzero(fits)
    if places.size > MOST_PAIRS:
        places = places[np.linspace(0, places.size - 1, MOST_PAIRS).astype(np.intp)]
    return Pairs(
        values[nearest[places]],
        taken.airmass[places],
        taken.measured_arcsec[places],
        filters[taken.filter[places]],
        taken.night[places],
    )


def _missing(pairs: Pairs) -> tuple[str, ...]:
    """Return what the data lack for a fit."""
    count = pairs.seeing_arcsec.size
    if count < LEAST_PAIRS:
        return (
            f"{count} measured images have a seeing that was entered within {NEAR_MIN:g} min, "
            f"{LEAST_PAIRS} are needed: enter what a seeing monitor says, as seeing",
        )
    missing = []
    nights = np.unique(pairs.night).size
    if nights < LEAST_NIGHTS:
        missing.append(f"they are of {nights} nights, {LEAST_NIGHTS} are needed")
    low, high = np.quantile(pairs.airmass, (0.1, 0.9))
    if high - low < LEAST_AIRMASS_SPAN:
        missing.append(
            f"their airmass is {low:.2f} to {high:.2f} for 80 % of them, a span of "
            f"{LEAST_AIRMASS_SPAN:g} is needed: measure images low in the sky too"
        )
    return tuple(missing)


class _Sizes:
    """Sizes of all pairs for any common Gaussian and exponent, from tables at the nodes."""

    def __init__(self, pairs: Pairs, observatory: Observatory) -> None:
        self._pairs = pairs
        self._models = [ImageModel(_blurred(observatory, float(node))) for node in NODES_ARCSEC]

    def at_nodes(self, exponent: float) -> Floats:
        """Return squared sizes (nodes, P) with the seeing growing as a power of airmass."""
        pairs = self._pairs
        seeing = pairs.seeing_arcsec * pairs.airmass ** (exponent - EXPONENT)
        squares = np.empty((NODES_ARCSEC.size, seeing.size))
        for place in np.unique(pairs.filter):
            of_it = pairs.filter == place
            for row, model in enumerate(self._models):
                size = model.size_arcsec(int(place), seeing[of_it], pairs.airmass[of_it])
                squares[row, of_it] = size**2
        return squares


def _blurred(observatory: Observatory, blur_arcsec: float) -> Observatory:
    """Return an observatory whose optics and tracking together are one Gaussian."""
    telescope = observatory.telescope.model_copy(
        update={"optics_fwhm_arcsec": blur_arcsec, "tracking_fwhm_arcsec": 0.0}
    )
    return observatory.model_copy(update={"telescope": telescope})


def _between(squares: Floats, blur2: float) -> tuple[Floats, Floats]:
    """Return ln(size) (P,) and its slope with the square of the Gaussian, between the nodes.

    Beyond the ends the last slope goes on, so that a fit may say that it wants less than nothing.
    """
    nodes2 = NODES_ARCSEC**2
    row = int(np.clip(np.searchsorted(nodes2, blur2) - 1, 0, nodes2.size - 2))
    slope = (squares[row + 1] - squares[row]) / (nodes2[row + 1] - nodes2[row])
    square = np.maximum(squares[row] + slope * (blur2 - nodes2[row]), 1e-6)
    return 0.5 * np.log(square), 0.5 * slope / square


def _fitted(whole: ImageFit, pairs: Pairs, observatory: Observatory) -> ImageFit:
    """Return the fit with the common Gaussian and the exponent that explain the images best.

    Least squares of ln(measured / predicted) with Huber's weights, by Gauss-Newton steps.
    """
    sizes = _Sizes(pairs, observatory)
    telescope = observatory.telescope
    now2 = telescope.optics_fwhm_arcsec**2 + telescope.tracking_fwhm_arcsec**2
    blur2, exponent = now2, EXPONENT
    measured = np.log(pairs.measured_arcsec)
    for _ in range(STEPS):
        predicted, by_blur = _between(sizes.at_nodes(exponent), blur2)
        shifted, _ = _between(sizes.at_nodes(exponent + EXPONENT_STEP), blur2)
        slopes = np.stack([by_blur, (shifted - predicted) / EXPONENT_STEP], axis=1)
        left = measured - predicted
        sigma = MAD_TO_SIGMA * float(np.median(np.abs(left - np.median(left))))
        weight = 1.0 / np.maximum(np.abs(left) / (HUBER * max(sigma, 1e-6)), 1.0)
        bend = slopes.T @ (slopes * weight[:, None])
        step = np.linalg.lstsq(bend, slopes.T @ (weight * left), rcond=None)[0]
        blur2 = float(np.clip(blur2 + step[0], -1.0, NODES_ARCSEC[-1] ** 2))
        exponent = float(np.clip(exponent + step[1], -1.0, 3.0))
        if abs(step[0]) < 1e-5 and abs(step[1]) < 1e-5:
            break
    errors = _errors(slopes, weight * left, bend, pairs.night)
    return _offered(whole, observatory, (blur2, exponent), errors, sigma)


def _errors(slopes: Floats, weighted: Floats, bend: Floats, night: Places) -> Floats:
    """Return the standard errors of both values, with each night's images taken to go together.

    The sandwich estimate with clusters (Liang & Zeger 1986, Biometrika 73, 13; from memory), with
    its usual factor for few clusters.
    """
    pulls = slopes * weighted[:, None]
    _, cluster = np.unique(night, return_inverse=True)
    count = int(cluster.max()) + 1
    sums = np.stack([np.bincount(cluster, pulls[:, i], count) for i in range(2)], axis=1)
    inner = sums.T @ sums * count / max(count - 1, 1)
    back = np.linalg.pinv(bend)
    return np.asarray(np.sqrt(np.diagonal(back @ inner @ back)))


def _offered(
    whole: ImageFit,
    observatory: Observatory,
    found: tuple[float, float],
    errors: Floats,
    sigma: float,
) -> ImageFit:
    """Return a fit as it is offered, or why it is not."""
    blur2, exponent = found
    telescope = observatory.telescope
    optics, tracking = telescope.optics_fwhm_arcsec, telescope.tracking_fwhm_arcsec
    if blur2 <= 0.0:
        sharp = (
            "the images are sharper than seeing, aperture and pixels alone would give: check focal "
            "length, pixel size, and how the seeing that was entered is defined"
        )
        return replace(whole, missing=(sharp,))
    blur = blur2**0.5
    error = float(errors[0]) / (2.0 * blur)
    if error > max(0.25 * blur, 0.05):
        vague = (
            f'optics and tracking together come out as {blur:.2f} ± {error:.2f}": more measured '
            "images are needed, best of nights with good seeing"
        )
        return replace(whole, missing=(vague,))
    now = float(np.hypot(optics, tracking))
    if blur > tracking:
        optics = float(np.sqrt(blur2 - tracking**2))
    else:
        optics, tracking = (each * blur / now for each in (optics, tracking))
    optics, tracking = round(optics, 3), round(tracking, 3)
    toml = (
        "[telescope]\n"
        f"optics_fwhm_arcsec = {optics}    # {telescope.optics_fwhm_arcsec:g} now\n"
        f"tracking_fwhm_arcsec = {tracking}    # {telescope.tracking_fwhm_arcsec:g} now\n"
    )
    return replace(
        whole,
        blur_arcsec=blur,
        blur_error_arcsec=error,
        blur_now_arcsec=now,
        exponent=exponent,
        exponent_error=float(errors[1]),
        scatter=sigma,
        optics_fwhm_arcsec=optics,
        tracking_fwhm_arcsec=tracking,
        toml=toml,
    )


def _ratios(ratio: Floats, place: Places, labels: Sequence[str]) -> tuple[Ratio, ...]:
    found = [_ratio(label, ratio[place == at]) for at, label in enumerate(labels)]
    return tuple(each for each in found if each is not None)


def _ratio(label: str, values: Floats) -> Ratio | None:
    if values.size == 0:
        return None
    low, middle, high = np.quantile(values, (0.25, 0.5, 0.75))
    return Ratio(label, values.size, float(low), float(middle), float(high))
