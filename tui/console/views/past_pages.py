"""The pages of past nights as lines: answers of the index in, lines with roles out."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace
from datetime import UTC
from itertools import zip_longest
from zoneinfo import ZoneInfo

import numpy as np

from engine.log import LOST_CAUSES, OUTCOMES, Exposure, NightState, title
from engine.logbook.text import one_line
from engine.past.digest import STATES
from engine.past.exposures import PastExposure
from engine.past.nights import NightLine, efficiency
from engine.past.replay import Replay
from engine.past.search import FoundWords
from engine.past.seeing import Group, SiteSeeing
from engine.seeing import SeeingSummary
from engine.times import HOURS_PER_DAY, datetime_from_mjd
from tui.console.panels.night import OUTCOME_GLYPHS
from tui.paint.night_strip import ALL_ROWS, Block, NightStrip, paint_strip
from tui.paint.past import (
    Quartiles,
    histogram,
    pictures_row,
    seeing_picture,
    seeing_scale,
    time_legend,
    time_picture,
)
from tui.paint.spans import BLANK, Line, Span, fitted, line, phrases, width_of

LABEL = {word.value: word.label for word in (*OUTCOMES, *LOST_CAUSES, *STATES)}
# Widths of the pictures on a narrow screen and on a wide one.
TIME_CELLS, SEEING_CELLS = (18, 36), (13, 25)
WIDE = 120
PLANS_SHOWN = 4
LABEL_CELLS = 19


def window(count: int, cursor: int, rows: int) -> range:
    """Return which of so many rows to show in so few, with the cursor in sight."""
    first = min(max(cursor - rows // 2, 0), max(count - rows, 0))
    return range(first, min(first + rows, count))


def quartiles(summary: SeeingSummary | None) -> Quartiles | None:
    """Return a summary as the pictures take it."""
    if summary is None:
        return None
    return Quartiles(
        summary.lower_quartile_arcsec, summary.median_arcsec, summary.upper_quartile_arcsec
    )


# Nights


def nights_head(lines: Sequence[NightLine]) -> tuple[Line, ...]:
    """Return what all nights together come to, in phrases, what matters most first."""
    spent = efficiency(lines)
    counts = [(word.label, sum(each.state == word.value for each in lines)) for word in STATES[:-1]]
    told = ", ".join(f"{count} {label}" for label, count in counts if count)
    share = f", shutter open {spent.open_share:.0%} of the dark" if spent.open_share else ""
    return (
        line(Span(f" {len(lines)} nights", "strong"), Span(share, "text")),
        line(Span(f"  {told} ", "warn")) if told else BLANK,
        line(Span(" "), *time_legend()),
    )


def nights_page(
    newest: Sequence[NightLine], head: Sequence[Line], cursor: int, width: int, rows: int
) -> list[Line]:
    """Return the nights, the newest first, each with a picture of its time and its seeing.

    ``head`` is what `nights_head` said of them.
    """
    place = int(width >= WIDE)
    time_cells, seeing_cells = TIME_CELLS[place], SEEING_CELLS[place]
    scale = seeing_scale(seeing_cells)
    columns = f"  {'night':<10}  dark {'time':<{time_cells}} {scale}  median  kept"
    shown: list[Line] = [phrases(width, *head), line(Span(columns, "dim"))]
    if not newest:
        return [*shown, line(Span("  no earlier night is in this logbook yet", "dim"))]
    return shown + [
        _night_row(newest[at], at == cursor, time_cells, seeing_cells, width)
        for at in window(len(newest), cursor, rows - len(shown))
    ]


def _night_row(
    each: NightLine, under: bool, time_cells: int, seeing_cells: int, width: int
) -> Line:
    mark = "▶ " if under else "  "
    role = "cursor" if under else "text"
    if not each.is_used:
        said = f"{mark}{each.night:<10}  {LABEL[each.state]}: {one_line(each.findings[0], 120)}"
        return line(Span(fitted(said, width), "cursor" if under else "warn"))
    dark = f"{each.dark_h:4.1f}" if each.dark_h is not None else "   -"
    median = f"{each.seeing.median_arcsec:.2f}" if each.seeing else "-"
    lost = ", ".join(f"{LABEL.get(c, c)} {h:.1f} h" for c, h in each.lost_h.items())
    notes = [
        f"lost: {lost}" if lost else "",
        LABEL[each.state] if each.state != "sound" else "",
        ", ".join(each.observers),
    ]
    after = f"  {median:>6}  {f'{each.kept}/{each.exposures}':>7}"
    room = width - len(mark) - 10 - 7 - time_cells - 1 - seeing_cells - len(after)
    after += "  " + one_line("; ".join(text for text in notes if text), 200)
    return pictures_row(
        f"{mark}{each.night:<10}  {dark} ",
        time_picture(each.spent_h, time_cells),
        seeing_picture(quartiles(each.seeing), seeing_cells),
        fitted(after, room + 16) if room > 0 else after[:16],
        role,
    )


# One night, again


def night_page(replay: Replay, place: int, state: NightState, width: int, rows: int) -> list[Line]:
    """Return a night as its log had it after one entry: the strip, its state, what led to it."""
    if not replay.events:
        return [line(Span(f" {replay.path.name}: no entry in it can be used", "warn"))]
    zone = ZoneInfo(replay.timezone) if replay.timezone else UTC
    event = replay.events[place]
    moment = datetime_from_mjd(event.t_mjd).astimezone(zone)
    head = phrases(
        width,
        line(Span(f" night of {replay.header.night.isoformat()}", "strong")),
        line(Span(f"  {moment:%H:%M:%S}", "now")),
        line(Span(f"  entry {place + 1} of {len(replay.events)}", "dim")),
        *(line(Span(f"  {each}", "text")) for each in _so_far(state)),
    )
    strip = paint_strip(_strip(replay, state, event.t_mjd), width, ALL_ROWS)
    shown = [head, *strip, BLANK]
    for at in window(len(replay.events), place, rows - len(shown)):
        each = replay.events[at]
        when = datetime_from_mjd(each.t_mjd).astimezone(zone)
        gone = " (withdrawn later)" if each.n in replay.withdrawn else ""
        text = f"{'▶' if at == place else ' '} {when:%H:%M:%S} {each.n:>4}  {title(each)}{gone}"
        role = "cursor" if at == place else "text" if at < place else "dim"
        shown.append(line(Span(fitted(text, width), role)))
    return shown


def _so_far(state: NightState) -> list[str]:
    """Return what a state comes to, in phrases, what matters most first."""
    open_s = sum(each.exposed_s for each in state.exposures)
    parts = [f"{len(state.kept)} kept of {len(state.exposures)}"]
    if state.lost_since is not None:
        parts.append(f"lost: {LABEL.get(state.lost_since.cause, state.lost_since.cause)}")
    elif state.exposing is not None:
        parts.append(f"exposing {state.exposing.filter} on {state.exposing.target}")
    elif state.pointing is not None:
        parts.append(f"on {state.pointing.target}")
    if state.seeing:
        parts.append(f'seeing {state.seeing[-1].zenith_arcsec:.2f}"')
    return [one_line(part, 60) for part in (*parts, f"open {open_s / 3600.0:.1f} h")]


def _strip(replay: Replay, state: NightState, now_mjd: float) -> NightStrip:
    begin_mjd, end_mjd = float(replay.mjd[0]), float(replay.mjd[-1])
    zone = ZoneInfo(replay.timezone) if replay.timezone else UTC
    begin = datetime_from_mjd(begin_mjd).astimezone(zone)

    def hour(mjd: float) -> float:
        return (mjd - begin_mjd) * HOURS_PER_DAY

    def height(heights: np.ndarray[tuple[int], np.dtype[np.float64]], at_h: float) -> float:
        value = float(np.interp(begin_mjd + at_h / HOURS_PER_DAY, replay.mjd, heights))
        return value if math.isfinite(value) else -90.0

    planned = state.order
    starts = planned.starts_mjd[:PLANS_SHOWN] if planned else ()
    ends = (*starts[1:], starts[-1] + 0.5 / HOURS_PER_DAY) if starts else ()
    names = planned.targets if planned else ()
    return NightStrip(
        hours=max(hour(end_mjd), 0.1),
        begin_hour=begin.hour + begin.minute / 60.0,
        now_h=hour(now_mjd),
        sun_deg=lambda at_h: height(replay.sun_deg, at_h),
        moon_deg=lambda at_h: height(replay.moon_deg, at_h),
        planned=tuple(
            Block(hour(max(start, now_mjd)), hour(end), one_line(name, 40))
            for name, start, end in zip(names, starts, ends, strict=False)
            if end > now_mjd
        ),
        done=tuple(
            _done(each, hour(each.start_mjd), hour(each.end_mjd)) for each in state.exposures
        ),
        lost=tuple(
            Block(hour(each.begin_mjd), hour(each.end_mjd or now_mjd), role="lost")
            for each in state.lost
        ),
    )


def _done(exposure: Exposure, begin_h: float, end_h: float) -> Block:
    return Block(begin_h, end_h, *OUTCOME_GLYPHS.get(exposure.outcome, ("╸", "bad")))


# A target, seeing, what was found


def target_page(
    name: str | None, taken: Sequence[PastExposure], cursor: int, width: int, rows: int
) -> list[Line]:
    """Return every past exposure of the target under the list's cursor, the newest first."""
    if name is None:
        return [line(Span(" no target is chosen", "dim"))]
    kept = [each for each in taken if each.outcome == "good"]
    nights = len({each.log for each in taken})
    head = phrases(
        width,
        line(Span(f" {name}", "strong")),
        line(
            Span(
                f"  {len(kept)} kept of {len(taken)} in {nights} night{'s'[: nights != 1]}", "text"
            )
        ),
        line(
            Span(f"  depth {sum(1.0 if e.credit is None else e.credit for e in kept):.1f}", "text")
        ),
    )
    columns = f"  {'night':<10} UTC   {'filter':<8}{'s':>6} airmass seeing  image   FWHM  worth"
    shown = [head, line(Span(fitted(columns, width), "dim"))]
    for at in window(len(taken), cursor, rows - len(shown)):
        each = taken[at]
        begin = datetime_from_mjd(each.start_mjd)
        text = (
            f"{'▶' if at == cursor else ' '} {each.night:<10} {begin:%H:%M} "
            f"{fitted(one_line(each.filter, 8), 8)}{each.exposed_s:6g} "
            f"{_number(each.airmass_mid):>7} "
            f"{_number(each.seeing_arcsec):>6} {_number(each.image_size_arcsec):>6} "
            f"{_number(each.measured_fwhm_arcsec):>6} {_number(each.credit):>6}  {_verdict(each)}"
        )
        role = "cursor" if at == cursor else "text" if each.outcome == "good" else "dim"
        shown.append(line(Span(fitted(text, width), role)))
    return shown


def _number(value: float | None) -> str:
    return "-" if value is None else f"{value:.2f}"


def _verdict(each: PastExposure) -> str:
    said = each.judged or each.why
    return one_line(f"{LABEL.get(each.outcome, each.outcome)} {said}".strip(), 120)


def seeing_groups(site: SiteSeeing) -> list[Group]:
    """Return the groups of a site's seeing, each named so that it stands alone."""
    return [
        *site.by_month,
        *site.by_hour,
        *(replace(group, label=f"filter {group.label}") for group in site.by_filter),
        *(replace(group, label=f"airmass {group.label}") for group in site.by_airmass),
    ]


def seeing_page(site: SiteSeeing, first: int, width: int, rows: int) -> list[Line]:
    """Return the site's seeing: quartiles of its groups from one of them on, its distribution."""
    if site.all is None:
        return [line(Span(" no seeing was measured on any night", "dim"))]
    cells = SEEING_CELLS[int(width >= WIDE)]
    head = line(
        Span(f" seeing of {site.nights} nights", "strong"),
        Span(f"  {site.all.count} values, {site.from_images} from images", "text"),
    )
    above = [
        line(Span(f" {'':<{LABEL_CELLS}} {seeing_scale(cells)}  median  values", "dim")),
        _group_row("all", site.all, cells),
    ]
    groups = [_group_row(each.label, each.summary, cells) for each in seeing_groups(site)]
    under = rows - 1 - len(above)
    first = min(first, max(len(groups) - under, 0))
    left = [*above, *groups[first : first + under]]
    beside = max(width_of(above[0]) + 2, width // 2 if width >= WIDE else 0)
    bars = histogram(site.edges_arcsec, site.counts, width - beside, rows - 1)
    return [head, *_beside(left, bars, beside)]


def _group_row(label: str, summary: SeeingSummary, cells: int) -> Line:
    picture = seeing_picture(quartiles(summary), cells)
    name = fitted(one_line(label, LABEL_CELLS), LABEL_CELLS)
    after = f"  {summary.median_arcsec:6.2f} {summary.count:>7}"
    return pictures_row(f" {name}", (), picture, after, "text")


def _beside(left: list[Line], right: list[Line], width: int) -> list[Line]:
    shown: list[Line] = []
    for one, other in zip_longest(left, right, fillvalue=BLANK):
        shown.append((*one, Span(" " * max(width - width_of(one), 0)), *other))
    return shown


def found_page(
    text: str, found: Sequence[FoundWords], cursor: int, width: int, rows: int
) -> list[Line]:
    """Return what was written with the words of a text in it, the newest first."""
    head = line(Span(f" {len(found)} found with ", "strong"), Span(one_line(text, 60), "accent"))
    shown = [head]
    for at in window(len(found), cursor, rows - 1):
        each = found[at]
        said = (
            f"{'▶' if at == cursor else ' '} {each.night} {LABEL.get(each.kind, each.kind):<9} "
            f"{fitted(one_line(each.target, 14), 14)} {one_line(each.text, 300)}"
        )
        shown.append(line(Span(fitted(said, width), "cursor" if at == cursor else "text")))
    return shown
