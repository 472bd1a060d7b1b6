"""The fit of the images finds the telescope that made them, or says what it lacks."""

from __future__ import annotations

from datetime import timedelta
from functools import cache
from pathlib import Path

import numpy as np
import pytest

from engine.image import ImageModel
from engine.log import Conditions, Event, Exposure, Header
from engine.log.header import header_bytes
from engine.logbook import Observatory, load_logbook, sample_logbook
from engine.logbook.load import Logbook
from engine.past import PastIndex
from engine.past.fit import ImageFit, fit_images
from engine.times import MINUTES_PER_DAY
from tests.engine.log_nights import DUSK_MJD, NIGHT, blocks_of

OBSERVATORY = load_logbook(sample_logbook()).observatory
FILE_MODEL = ImageModel(OBSERVATORY)
# What the invented images are made with: optics 0.70 and tracking 0.25 arcsec; the file says 0.35.
TRUE_OPTICS, TRUE_TRACKING = 0.70, 0.25


@cache
def true_model() -> ImageModel:
    """Return the model of the telescope as it really is."""
    telescope = OBSERVATORY.telescope.model_copy(
        update={"optics_fwhm_arcsec": TRUE_OPTICS, "tracking_fwhm_arcsec": TRUE_TRACKING}
    )
    return ImageModel(OBSERVATORY.model_copy(update={"telescope": telescope}))


def events_of(
    chance: np.random.Generator, day: int, exponent: float, most_airmass: float, monitored: bool
) -> list[Event]:
    """Return a night of measured images; 4 % of them are spoilt to twice the size."""
    model = true_model()
    events: list[Event] = []
    for place in range(24):
        mjd = DUSK_MJD + day + 15.0 * place / MINUTES_PER_DAY
        seeing = float(np.exp(chance.normal(np.log(1.1), 0.25)))
        airmass = float(chance.uniform(1.0, most_airmass))
        at = int(chance.integers(0, 4))
        size = model.size_arcsec(at, seeing * airmass ** (exponent - 0.6), airmass)
        measured = float(size) * float(np.exp(chance.normal(0.0, 0.04)))
        if chance.random() < 0.04:
            measured *= 2.0
        predicted = FILE_MODEL.size_arcsec(at, seeing, airmass)
        if monitored:
            told = round(seeing * float(np.exp(chance.normal(0.0, 0.03))), 2)
            events.append(Conditions(n=len(events) + 1, t_mjd=mjd, seeing_arcsec=told))
        events.append(
            Exposure(
                n=len(events) + 1, t_mjd=mjd, of=0, target="KR 12", seconds=60.0, exposed_s=60.0,
                filter=OBSERVATORY.filters[at].name, start_mjd=mjd, mid_mjd=mjd, end_mjd=mjd,
                outcome="good", airmass_mid=airmass, image_size_arcsec=float(predicted),
                measured_fwhm_arcsec=measured,
            )
        )  # fmt: skip
    return events


def fitted(
    folder: Path,
    *,
    nights: int = 12,
    exponent: float = 0.6,
    most_airmass: float = 2.4,
    monitored: bool = True,
    observatory: Observatory = OBSERVATORY,
    seed: int = 1,
) -> ImageFit:
    """Write such nights, and fit them."""
    chance = np.random.default_rng(seed)
    for day in range(nights):
        night = NIGHT + timedelta(days=day)
        head = header_bytes(Header.of(OBSERVATORY, night, ("R. Okonjo",), "warmroom 0.1.0"))
        log = head + blocks_of(events_of(chance, day, exponent, most_airmass, monitored))
        (folder / f"{night.isoformat()}.toml").write_bytes(log)
    with PastIndex(folder, cache=folder / "cache") as index:
        return fit_images(index, observatory)


@pytest.mark.parametrize(("exponent", "seed"), [(0.6, 1), (0.75, 3)])
def test_the_true_telescope_and_exponent_are_found(
    tmp_path: Path, exponent: float, seed: int
) -> None:
    """Within three standard errors, and with errors small enough to mean it."""
    fit = fitted(tmp_path, exponent=exponent, seed=seed)
    assert fit.missing == ()
    assert fit.blur_arcsec is not None
    assert fit.blur_error_arcsec is not None
    assert fit.exponent is not None
    assert fit.exponent_error is not None
    truth = float(np.hypot(TRUE_OPTICS, TRUE_TRACKING))
    assert fit.blur_error_arcsec < 0.06
    assert abs(fit.blur_arcsec - truth) < 3.0 * fit.blur_error_arcsec
    assert fit.exponent_error < 0.05
    assert abs(fit.exponent - exponent) < 3.0 * fit.exponent_error
    assert fit.scatter == pytest.approx(0.05, abs=0.02)


def test_what_is_offered_can_stand_in_the_file(tmp_path: Path) -> None:
    """The snippet, put into observatory.toml, loads, and asks for no further change."""
    fit = fitted(tmp_path)
    folder = tmp_path / "logbook"
    folder.mkdir()
    for name in ("observatory.toml", "targets.toml"):
        (folder / name).write_bytes((sample_logbook() / name).read_bytes())
    path = folder / "observatory.toml"
    lines = path.read_text(encoding="utf-8").splitlines()
    offered = dict(line.split(" = ", 1) for line in fit.toml.splitlines()[1:])
    changed = [
        f"{line.split(' = ')[0]} = {offered[line.split(' = ')[0]]}"
        if line.split(" = ")[0] in offered
        else line
        for line in lines
    ]
    assert changed != lines
    path.write_text("\n".join(changed), encoding="utf-8")
    logbook: Logbook = load_logbook(folder)
    assert logbook.observatory.telescope.optics_fwhm_arcsec == fit.optics_fwhm_arcsec
    with PastIndex(tmp_path, cache=tmp_path / "cache") as index:
        again = fit_images(index, logbook.observatory)
    assert again.blur_arcsec == pytest.approx(again.blur_now_arcsec, abs=0.005)


@pytest.mark.parametrize(
    ("how", "said"),
    [
        ({"monitored": False}, "enter what a seeing monitor says"),
        ({"nights": 3}, "of 3 nights"),
        ({"most_airmass": 1.2}, "measure images low in the sky too"),
    ],
)
def test_what_is_missing_is_said(tmp_path: Path, how: dict[str, object], said: str) -> None:
    """No values without data that carry them; how sizes compare is told all the same."""
    fit = fitted(tmp_path, **how)  # type: ignore[arg-type]
    assert any(said in text for text in fit.missing)
    assert fit.blur_arcsec is None
    assert fit.toml == ""
    assert fit.all is not None
    assert fit.all.count == fit.images > 0
