"""The pages of ``warmroom past`` as text: aligned columns, bars of blocks, plain sentences."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from engine.log import LOST_CAUSES, OUTCOMES
from engine.logbook.text import one_line
from engine.past.account import HEADINGS
from engine.past.digest import STATES
from engine.past.exposures import Asked, PastExposure, ProgrammeTotal, Refused, Total
from engine.past.fit import ImageFit, Ratio
from engine.past.nights import Efficiency, NightLine
from engine.past.search import FoundWords
from engine.past.seeing import Group, SiteSeeing
from engine.seeing import SeeingSummary
from engine.times import iso_from_mjd
from tui.commands.output import number, print_columns

LABEL = {word.value: word.label for word in (*OUTCOMES, *LOST_CAUSES, *HEADINGS, *STATES)}
NAME, TEXT = 28, 90
BAR_CELLS = 40
OTHERS_SHOWN = 20


def whole(told: dict[str, Any], newest: int | None) -> None:
    """Print nights, time, totals and seeing; of the nights only the newest, if so many."""
    nights(told["nights"], newest)
    time(told["time"])
    programmes(told["programmes"])
    done(told["asked"])
    others(told["totals"], {each.target for each in told["asked"]})
    if told["seeing"].all is not None:
        seeing(told["seeing"], briefly=True)


def nights(lines: Sequence[NightLine], newest: int | None = None) -> None:
    """Print a line a night, and how the logs were found."""
    states = [
        f"{sum(line.state == word.value for line in lines)} {word.label}"
        for word in reversed(STATES)
        if any(line.state == word.value for line in lines)
    ]
    print(f"{len(lines)} night logs: {', '.join(states)}")
    for line in lines:
        if line.state != "sound":
            said = one_line(line.findings[0], TEXT) if line.findings else ""
            print(f"  {line.name}: {LABEL[line.state]}: {said}")
    shown = lines if newest is None else lines[-newest:]
    if len(shown) < len(lines):
        print(f"the newest {len(shown)}; --since and --until show others")
    print_columns(
        ("night", "dark h", "open h", "lost h", "taken", "kept", "seeing", "observers"),
        [_night_row(line) for line in shown if line.is_used],
    )


def _night_row(line: NightLine) -> tuple[str, ...]:
    lost = ", ".join(
        f"{LABEL.get(cause, one_line(cause, 12))} {hours:.1f}"
        for cause, hours in sorted(line.lost_h.items())
    )
    return (
        line.night,
        number(line.dark_h, ".1f"),
        f"{line.open_h:.1f}",
        lost or "-",
        str(line.exposures),
        str(line.kept),
        _short(line.seeing),
        one_line(", ".join(line.observers), TEXT),
    )


def _short(summary: SeeingSummary | None) -> str:
    if summary is None:
        return "-"
    return (
        f"{summary.median_arcsec:.2f} "
        f"({summary.lower_quartile_arcsec:.2f}-{summary.upper_quartile_arcsec:.2f})"
    )


def time(spent: Efficiency) -> None:
    """Print where the dark time went."""
    if spent.open_share is None or spent.open_share_unlost is None:
        return
    print(
        f"\n{spent.dark_h:.1f} dark hours in {spent.nights} nights; shutter open "
        f"{spent.open_share:.0%} of them, {spent.open_share_unlost:.0%} of what was not lost"
    )
    rows = []
    for word in HEADINGS:
        hours = spent.spent_h.get(word.value, 0.0)
        rows.append((word.label, f"{hours:.1f} h", f"{hours / spent.dark_h:.1%}", word.sentence))
        if word.value == "lost":
            rows += [
                (f"  {LABEL.get(c, one_line(c, 12))}", f"{h:.1f} h", f"{h / spent.dark_h:.1%}", "")
                for c, h in sorted(spent.lost_h.items(), key=lambda item: -item[1])
            ]
    print_columns(("time", "", "", ""), rows)


def programmes(sums: Sequence[ProgrammeTotal]) -> None:
    """Print how far each programme has come."""
    if not sums:
        return
    print("\nprogrammes, over all nights (depth in planned exposures):")
    print_columns(
        ("targets", "finished", "done", "asked", "depth", "remain", "programme"),
        [
            (
                str(each.targets),
                str(each.finished),
                str(each.done),
                str(each.asked),
                f"{each.credit:.1f}",
                f"{each.remaining_h:.1f} h",
                one_line(each.programme, NAME) or "none",
            )
            for each in sums
        ],
        left=0,
    )


def done(asked: Sequence[Asked]) -> None:
    """Print what is done of what was asked, and what remains, by programme and target."""
    if not asked:
        return
    print("\nof what the list asks, over all nights (depth in planned exposures):")
    order = sorted(asked, key=lambda each: (each.programme, each.target))
    print_columns(
        ("target", "filter", "done", "asked", "depth", "remain", "programme"),
        [
            (
                one_line(each.target, NAME),
                f"{each.line.filter} {each.line.seconds:g} s",
                str(each.line.done),
                str(each.line.planned),
                f"{each.line.credit:.1f}",
                str(each.line.remaining) if each.line.remaining else "done",
                one_line(each.programme, NAME),
            )
            for each in order
        ],
    )


def others(totals: Sequence[Total], listed: set[str]) -> None:
    """Print what was taken of targets that are not on the list."""
    sums: dict[str, list[float]] = {}
    for each in totals:
        if each.target not in listed:
            row = sums.setdefault(each.target, [0, 0.0])
            row[0] += each.count
            row[1] += each.exposed_s / 3600.0
    if not sums:
        return
    count, hours = (sum(row[i] for row in sums.values()) for i in range(2))
    print(f"\nno longer on the list: {len(sums)} targets, {count:.0f} exposures, {hours:.1f} h")
    largest = sorted(sums.items(), key=lambda item: -item[1][1])[:OTHERS_SHOWN]
    for name, (taken, open_h) in largest:
        print(f"  {one_line(name, NAME)}: {taken:.0f} exposures, {open_h:.1f} h")


def target(sums: Sequence[Total], taken: Sequence[PastExposure]) -> None:
    """Print one target's totals and every exposure of it."""
    print(one_line(taken[0].target, NAME))
    print_columns(
        ("filter", "seconds", "outcome", "count", "hours", "depth", "nights"),
        [
            (
                each.filter,
                f"{each.seconds:g}",
                LABEL.get(each.outcome, each.outcome),
                str(each.count),
                f"{each.exposed_s / 3600.0:.2f}",
                f"{each.credit:.1f}",
                str(each.nights),
            )
            for each in sums
        ],
    )
    print()
    exposures(taken)


def exposures(taken: Sequence[PastExposure]) -> None:
    """Print exposures with their conditions, a line each."""
    print_columns(
        (
            "begin (UTC)", "target", "filter", "s", "airmass", "seeing", "image", "FWHM", "sky",
            "Moon", "worth", "outcome",
        ),
        [
            (
                iso_from_mjd(each.start_mjd)[:19].replace("T", " "),
                one_line(each.target, NAME),
                one_line(each.filter, 8),
                f"{each.exposed_s:g}",
                number(each.airmass_mid),
                number(each.seeing_arcsec),
                number(each.image_size_arcsec),
                number(each.measured_fwhm_arcsec),
                number(each.sky_mag_arcsec2, ".1f"),
                number(each.moon_separation_deg, ".0f"),
                number(each.credit),
                _verdict(each),
            )
            for each in taken
        ],
        left=3,
    )  # fmt: skip
    print(f"{len(taken)} exposures")


def _verdict(each: PastExposure) -> str:
    said = each.judged or each.why
    label = LABEL.get(each.outcome, each.outcome)
    if said.startswith(label):
        return one_line(said, TEXT)
    return one_line(f"{label}: {said}" if said else label, TEXT)


def refused(why: Sequence[Refused], newest: Sequence[PastExposure]) -> None:
    """Print why exposures do not count, and the newest of them."""
    print_columns(
        ("outcome", "count", "why"),
        [
            (LABEL.get(e.outcome, e.outcome), str(e.count), one_line(e.reason, TEXT) or "-")
            for e in why
        ],
    )
    print()
    exposures(newest)


def words(found: Sequence[FoundWords]) -> None:
    """Print what was written, the newest first."""
    for each in found:
        about = f" {one_line(each.target, NAME)}" if each.target else ""
        kind = LABEL.get(each.kind, each.kind)
        print(f"{each.night} {kind} {each.n}{about}: {one_line(each.text, 400)}")
    print(f"{len(found)} found")


def seeing(site: SiteSeeing, *, briefly: bool = False) -> None:
    """Print the site's seeing: quartiles by group, and its distribution as bars."""
    if site.all is None:
        print("no seeing was measured")
        return
    print(
        f"\nseeing (zenith, 500 nm): {site.all.count} values of {site.nights} nights, "
        f"{site.from_images} from images"
    )
    groups = [Group("all", site.all), *site.by_month]
    if not briefly:
        groups += [*site.by_hour, *site.by_filter, *site.by_airmass]
    print_columns(
        ("", "values", "best", "25 %", "median", "75 %", "worst", ""),
        [
            (
                one_line(group.label, NAME),
                str(group.summary.count),
                f"{group.summary.best_arcsec:.2f}",
                f"{group.summary.lower_quartile_arcsec:.2f}",
                f"{group.summary.median_arcsec:.2f}",
                f"{group.summary.upper_quartile_arcsec:.2f}",
                f"{group.summary.worst_arcsec:.2f}",
                "",
            )
            for group in groups
        ],
    )
    most = max(site.counts)
    filled = [place for place, count in enumerate(site.counts) if count]
    for place in range(filled[0], filled[-1] + 1):
        low, high = site.edges_arcsec[place : place + 2]
        count = site.counts[place]
        cells = round(BAR_CELLS * count / most)
        print(f'{low:5.2f}-{high:.2f}" {"█" * cells:{BAR_CELLS}} {count}')


def fit(found: ImageFit) -> None:
    """Print measured against predicted size, and the fit or what is missing for one."""
    if found.all is None:
        print("no image size was measured: enter the FWHM of a frame now and then")
        return
    print(f"measured over predicted image size, {found.images} images:")
    parts: list[Ratio] = [found.all, *found.by_filter, *found.by_airmass]
    print_columns(
        ("", "images", "25 %", "median", "75 %", ""),
        [
            (
                one_line(each.label, NAME),
                str(each.count),
                f"{each.lower_quartile:.3f}",
                f"{each.median:.3f}",
                f"{each.upper_quartile:.3f}",
                "",
            )
            for each in parts
        ],
    )
    for text in found.missing:
        print(f"no fit: {text}")
    if found.blur_arcsec is None or found.exponent is None:
        return
    print(
        f"\nfitted to {found.pairs} images of {found.nights} nights with seeing entered near them, "
        f"{found.scatter:.1%} scatter:\n"
        f"optics and tracking together {found.blur_arcsec:.3f} ± {found.blur_error_arcsec:.3f} "
        f"arcsec, {found.blur_now_arcsec:.3f} in observatory.toml\n"
        f"seeing grows with airmass to the power {found.exponent:.3f} ± {found.exponent_error:.3f} "
        "(0.6 in theory and in every prediction)\n"
        "only the sum of both blurs can be measured so; tracking is kept where the sum allows it:\n"
    )
    print(found.toml, end="")
