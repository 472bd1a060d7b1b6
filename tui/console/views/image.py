"""Image size: which blur makes it, how it goes through the night, which targets will be soft."""

from __future__ import annotations

import math
from dataclasses import astuple, fields
from typing import TYPE_CHECKING

import numpy as np

from engine.image import ImageSize, Terms
from engine.night import FilterNow, TargetNow
from engine.watch import Watch
from tui.console.panels.local import arcsec, hhmm, whole_hours
from tui.console.panels.softness import paint_softness
from tui.console.views.base import View
from tui.paint.figures import bar
from tui.paint.spans import BLANK, Line, Span, fitted, line, phrases

if TYPE_CHECKING:
    from tui.console.app import Console

TERMS = tuple(field.name for field in fields(Terms))
FILTER_WIDTH, SIZE_WIDTH, PIXELS_WIDTH = 3, 5, 6
# From this width on sizes are told in pixels as well.
PIXELS_FROM = 100
MARKED_VALUE_WIDTH = 6
HOUR_WIDTH = 6
# Taking an image apart takes some milliseconds: what is kept of that, and about how much of it one
# paint may do for the bands; the next goes on where it ended.
MOST_KEPT, MOST_WORK = 200, 4


class Image(View):
    """The blurs of the chosen target, its sizes hour by hour, and every target's softness."""

    def __init__(self, console: Console, watch: Watch) -> None:
        super().__init__(console, watch)
        self._model = watch.planner.model
        self._kept: dict[tuple[int, float, float], ImageSize] = {}
        self._work_left = 0
        self._shows_all = False

    @property
    def hints(self) -> tuple[tuple[str, str], ...]:
        """The key that gives all the place to the targets, or takes it back."""
        key = self.console.keys.cap_of("next_panel")
        return ((key, "one target" if self._shows_all else "all targets"),)

    def take_action(self, name: str) -> bool:
        """Let the key for the next panel change between one target and all."""
        if name != "next_panel":
            return False
        self._shows_all = not self._shows_all
        return True

    def paint(self, width: int, height: int) -> list[Line]:
        """Return blurs and hours of the chosen target, then a band for every target planned."""
        if self.watch.plan is None:
            return [line(Span(" working out the night ...", "dim"))]
        self._work_left = MOST_WORK
        name = self.console.chosen
        chosen = next((e for e in self.watch.targets_now() if e.target.name == name), None)
        lines: list[Line] = []
        if chosen is not None and not self._shows_all:
            gap = [BLANK] if height > 2 * len(chosen.filters) + 16 else []
            lines = [*self._blurs(chosen, width), *gap, *_hours(self.watch, chosen, width), *gap]
        size = (width, height - len(lines))
        return [*lines, *paint_softness(self.watch, name, size, self._blame)][:height]

    def _blurs(self, now: TargetNow, width: int) -> list[Line]:
        """Return one row a filter: its size, each blur as a bar, and which is to blame."""
        at = self.watch.planner.night.index_at(self.watch.clock.now_mjd())
        assert self.watch.plan is not None
        seeing_arcsec = float(self.watch.plan.outlook.seeing_arcsec[at])
        mass = now.airmass if math.isfinite(now.airmass) else self._best_airmass(now)
        head = _head(now, seeing_arcsec, mass, width)
        if mass is None:
            return [head, line(Span(" never above the horizon tonight", "dim"))]
        images = [(each, self._taken_apart(each, seeing_arcsec, mass)) for each in now.filters]
        return [head, *_blur_rows(images, now.target.maximum_image_size_arcsec, width)]

    def _best_airmass(self, now: TargetNow) -> float | None:
        masses = self.watch.planner.night.airmass[now.index]
        return None if np.isnan(masses).all() else float(np.nanmin(masses))

    def _taken_apart(self, one: FilterNow, seeing_arcsec: float, mass: float) -> ImageSize:
        """Return an image's blurs; seeing and airmass to the hundredths that are shown."""
        model = self.watch.planner.model
        if model is not self._model or len(self._kept) >= MOST_KEPT:
            self._model, self._kept = model, {}
        key = (one.filter_index, round(seeing_arcsec, 2), round(mass, 2))
        if key not in self._kept:
            self._kept[key] = model.breakdown(*key)
            self._work_left -= 1
        return self._kept[key]

    def _blame(self, one: FilterNow, seeing_arcsec: float, mass: float) -> str:
        """Return which blur is to blame for an image; nothing when this paint has done enough."""
        if self._work_left <= 0:
            return ""
        return self._taken_apart(one, seeing_arcsec, mass).blame


def _head(now: TargetNow, seeing_arcsec: float, mass: float | None, width: int) -> Line:
    limit = now.target.maximum_image_size_arcsec
    where = f"airmass {now.airmass:.2f}"
    if not math.isfinite(now.airmass):
        where = "down" if mass is None else f"down; here at its best airmass, {mass:.2f}"
    return phrases(
        width,
        line(Span(f" {now.target.name}", "strong")),
        line(Span(f"  {where}", "text")),
        line(Span(f"  seeing {arcsec(seeing_arcsec)}", "text")),
        line(Span(f'  limit {limit:g}"' if limit else "  no limit of its own", "dim")),
        line(Span("   ▸", "accent"), Span(" to blame, arcsec", "dim")),
    )


def _blur_rows(
    images: list[tuple[FilterNow, ImageSize]], limit: float | None, width: int
) -> list[Line]:
    """Return titles and a row a filter, with the blurs as bars on one scale."""
    has_pixels = width >= PIXELS_FROM
    fixed = FILTER_WIDTH + SIZE_WIDTH + (PIXELS_WIDTH if has_pixels else 0)
    each_width = (width - fixed) // len(TERMS)
    most = max(max(astuple(image.terms)) for _, image in images)
    titles = "".join(fitted(f" {name}", each_width) for name in TERMS)
    pixels = "px".rjust(PIXELS_WIDTH) if has_pixels else ""
    rows = [line(Span("size".rjust(FILTER_WIDTH + SIZE_WIDTH) + pixels + titles, "dim"))]
    for one, image in images:
        is_soft = limit is not None and image.size_arcsec > limit
        spans = [
            Span(fitted(f" {one.progress.filter}", FILTER_WIDTH), "title"),
            Span(f"{'!' if is_soft else ' '}{image.size_arcsec:.2f}", _size_role(is_soft)),
        ]
        if has_pixels:
            spans.append(
                Span(
                    f"{image.size_px:.1f}".rjust(PIXELS_WIDTH),
                    "warn" if image.undersampled else "dim",
                )
            )
        for name, value in zip(TERMS, astuple(image.terms), strict=True):
            blamed = name == image.blame
            spans += [
                Span(("▸" if blamed else " ") + f"{value:.2f} ", "accent" if blamed else "text"),
                Span(
                    bar(value / most, each_width - MARKED_VALUE_WIDTH),
                    "accent" if blamed else "text",
                ),
            ]
        rows.append(tuple(spans))
    return rows


def _size_role(is_soft: bool) -> str:
    return "bad" if is_soft else "strong"


def _hours(watch: Watch, now: TargetNow, width: int) -> list[Line]:
    """Return the size in each filter at every hour to come; soft ones have a mark."""
    assert watch.plan is not None
    night, outlook = watch.planner.night, watch.plan.outlook
    moments = whole_hours(watch, (width - FILTER_WIDTH) // HOUR_WIDTH, least_min=30.0)
    at = [night.index_at(mjd) for mjd in moments]
    head = "".join(hhmm(watch, mjd).rjust(HOUR_WIDTH) for mjd in moments)
    rows = [line(Span(" at".ljust(FILTER_WIDTH), "dim"), Span(head, "dim"))]
    for one in now.filters:
        cells = [
            _hour_cell(
                float(outlook.image_size_arcsec[one.filter_index, now.index, place]),
                bool(outlook.soft[one.filter_index, now.index, place]),
                bool(night.limits[now.index, place] == 0),
            )
            for place in at
        ]
        rows.append((Span(fitted(f" {one.progress.filter}", FILTER_WIDTH), "title"), *cells))
    return rows


def _hour_cell(size_arcsec: float, soft: bool, allowed: bool) -> Span:
    """Return one size: in figures, marked where soft, dim where the target is out of limits."""
    if not math.isfinite(size_arcsec):
        return Span("-".rjust(HOUR_WIDTH - 1) + " ", "dim")
    text = f"{size_arcsec:.2f}" if size_arcsec < 10.0 else f"{size_arcsec:.1f}"
    role = "dim" if not allowed else "bad" if soft else "text"
    return Span(("!" if soft else "").rjust(HOUR_WIDTH - len(text)) + text, role)
