"""The targets as lines: a heading a programme with what is done of it, a row a target, one in full.

Plain data in. What is done is told as a count and as depth, each by a bar and by figures.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from datetime import datetime

from pydantic.fields import FieldInfo

from engine.logbook import PlannedExposures, Programme, Target
from engine.logbook.faults import field_key
from engine.night import Progress
from tui.paint.figures import bar
from tui.paint.spans import BLANK, Line, Span, cut, fitted, line, wrapped

NO_PROGRAMME = "no programme"
NAME_WIDTH, PLACE_WIDTH, WIDE_PLACE_WIDTH = 14, 14, 24
BAR_WIDTH, KEY_WIDTH = 8, 27
# From this width on a row has seconds of arc, and a heading longer bars.
WIDE = 90
ROUNDING = 1e-6


@dataclass(frozen=True, slots=True)
class Group:
    """One programme: its name, who it is for, its targets."""

    name: str
    investigator: str
    targets: tuple[Target, ...]


@dataclass(frozen=True, slots=True)
class Done:
    """What is done of a plan or of many: exposures planned, done, and their depth in exposures."""

    planned: int
    done: int
    credit: float

    @staticmethod
    def of(lines: Iterable[Progress]) -> Done:
        """Return the sum over lines of plans; what is beyond a line's plan does not fill others."""
        each = tuple(lines)
        return Done(
            sum(one.planned for one in each),
            sum(min(one.done, one.planned) for one in each),
            sum(min(one.credit, one.planned) for one in each),
        )


Plans = dict[str, tuple[Progress, ...]]


def groups(targets: Sequence[Target], programmes: Sequence[Programme], text: str) -> list[Group]:
    """Return the targets by programme in the logbook's order; ``text`` keeps those that hold it."""
    wanted = text.casefold()
    kept = [e for e in targets if wanted in e.name.casefold() or wanted in e.programme.casefold()]
    investigators = {each.name: each.investigator for each in programmes}
    names = dict.fromkeys([*investigators, *(each.programme for each in kept)])
    found = [
        Group(
            name or NO_PROGRAMME,
            investigators.get(name, ""),
            tuple(each for each in kept if each.programme == name),
        )
        for name in names
    ]
    return [each for each in found if each.targets]


def group_row(group: Group, plans: Plans, width: int) -> Line:
    """Return a programme's heading: its name, and what is done of it as count and as depth."""
    done = Done.of(line for each in group.targets for line in plans.get(each.name, ()))
    length = BAR_WIDTH * (2 if width >= WIDE else 1)
    figures = [
        Span(f" {done.done}/{done.planned} ".rjust(10), "text"),
        Span(bar(_share(done.done, done.planned), length), "good"),
        Span(f"  depth {done.credit:.1f} ".rjust(14), "text"),
        Span(bar(_share(done.credit, done.planned), length), "text"),
    ]
    room = max(width - sum(len(each.text) for each in figures) - 2, 8)
    who = f"  {group.investigator}" if group.investigator else ""
    name = Span(fitted(f" {group.name}", min(room, len(group.name) + 1)), "title")
    rest = Span(fitted(who, room - len(name.text)), "dim")
    return cut((name, rest, *figures), width)


def target_row(target: Target, plan: Sequence[Progress], is_chosen: bool, width: int) -> Line:
    """Return a target as one row: where it is, how urgent, and what is done of each line."""
    wide = width >= WIDE
    place = fitted(place_text(target, wide), WIDE_PLACE_WIDTH if wide else PLACE_WIDTH)
    done = Done.of(plan)
    state = "✓" if plan and done.done >= done.planned else "·" if not done.done else "◐"
    lines = " ".join(f"{each.filter}{each.done}/{each.planned}" for each in plan)
    magnitude = f"{target.magnitude:5.1f}" if target.magnitude is not None else "    -"
    parts = (
        Span(f" {state} ", "good" if state == "✓" else "dim"),
        Span(fitted(target.name, NAME_WIDTH + (6 if wide else 0)) + " ", "strong"),
        Span(place + " ", "text"),
        Span(f"p{target.priority} ", "dim"),
        Span(magnitude + " ", "dim"),
        Span(bar(_share(done.done, done.planned), BAR_WIDTH) + " ", "good"),
        Span(lines, "text"),
    )
    if is_chosen:
        return (Span(fitted("".join(part.text for part in parts), width), "cursor"),)
    return cut(parts, width)


def detail_page(
    target: Target, plan: Sequence[Progress], stands: str, letters: dict[str, str], width: int
) -> list[Line]:
    """Return everything that is known of a target, with the letter that edits each key."""
    lines = [
        line(Span(f" {target.name}", "title"), Span(f"  {stands}", "dim")),
        BLANK,
    ]
    for each in plan:
        length = max(min((width - 38) // 2, 20), 4)
        lines.append(
            line(
                Span(f" {fitted(each.filter, 4)} {each.seconds:6g} s ", "strong"),
                Span(f"{each.done:>3}/{each.planned:<3} ", "text"),
                Span(bar(_share(each.done, each.planned), length), "good"),
                Span(f"  depth {each.credit:4.1f} ", "text"),
                Span(bar(_share(each.credit, each.planned), length), "text"),
            )
        )
    lines.append(BLANK)
    # What is given stands before what is left at its default.
    fields = sorted(Target.model_fields.items(), key=lambda each: _is_default(target, *each))
    for name, known in fields:
        key = field_key(name, known)
        value = getattr(target, name)
        is_default = _is_default(target, name, known)
        said = "-" if value in (None, "", ()) else value_as_typed(key, value, target)
        label = Span(f" {letters.get(key, ' ')} ", "accent")
        more = wrapped(said, max(width - KEY_WIDTH - 5, 8), "dim" if is_default else "text", 3)
        lines.append((label, Span(fitted(key, KEY_WIDTH) + " ", "dim"), *more[0]))
        lines += [(Span(" " * (KEY_WIDTH + 4)), *each) for each in more[1:]]
    return [cut(each, width) for each in lines]


def _is_default(target: Target, name: str, known: FieldInfo) -> bool:
    return not known.is_required() and getattr(target, name) == known.default


def value_as_typed(key: str, value: object, target: Target) -> str:
    """Return a key's value as it would be typed."""
    if key == "ra":
        return right_ascension_text(target.ra_deg)
    if key == "dec":
        return declination_text(target.dec_deg)
    match value:
        case None:
            return ""
        case bool():
            return "true" if value else "false"
        case float():
            return f"{value:.10g}"
        case tuple():
            return " ".join(_part_text(each) for each in value)
        case _:
            return str(value)


def _part_text(part: object) -> str:
    match part:
        case PlannedExposures():
            return f"{part.filter}:{part.seconds:.10g}x{part.count}"
        case (datetime() as begin, datetime() as end):
            return f"{begin.isoformat()}/{end.isoformat()}".replace("+00:00", "Z")
        case _:
            return str(part)


def place_text(target: Target, wide: bool = True) -> str:
    """Return where a target is, in hours and degrees; without seconds where there is no room."""
    ra, dec = right_ascension_text(target.ra_deg), declination_text(target.dec_deg)
    return f"{ra} {dec}" if wide else f"{ra[:5]} {dec[:6]}"


def right_ascension_text(ra_deg: float) -> str:
    """Return a right ascension as hh:mm:ss.ss."""
    hundredths = round(ra_deg / 15.0 * 360_000.0) % (24 * 360_000)
    minutes, rest = divmod(hundredths, 6000)
    return f"{minutes // 60:02d}:{minutes % 60:02d}:{rest / 100.0:05.2f}"


def declination_text(dec_deg: float) -> str:
    """Return a declination as +dd:mm:ss.s."""
    tenths = round(abs(dec_deg) * 36_000.0)
    minutes, rest = divmod(tenths, 600)
    sign = "-" if dec_deg < 0 else "+"
    return f"{sign}{minutes // 60:02d}:{minutes % 60:02d}:{rest / 10.0:04.1f}"


def _share(part: float, whole: float) -> float:
    return part / whole if whole > ROUNDING else 0.0
