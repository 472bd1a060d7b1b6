"""What a report says, section by section, before it is Markdown or HTML.

A section is a heading, sentences, and perhaps a table of text; every form shows the same.
"""

from __future__ import annotations

from dataclasses import dataclass

from engine.log import LOST_CAUSES, OUTCOMES
from engine.past.account import HEADINGS
from engine.report.night import NightReport
from engine.report.words import EVENTS, clock, hours, number, share, span

_LABELS = {word.value: word.label for word in (*OUTCOMES, *LOST_CAUSES)}
_SPENT = {word.value: word for word in HEADINGS}


@dataclass(frozen=True, slots=True)
class Rows:
    """A table of text: its columns, its rows, and which columns hold numbers."""

    columns: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]
    numbers: frozenset[str] = frozenset()


@dataclass(frozen=True, slots=True)
class Section:
    """One section: its name (for charts to be put in), its heading, sentences, a table."""

    name: str
    heading: str
    sentences: tuple[str, ...] = ()
    table: Rows | None = None


def title(report: NightReport) -> str:
    """Return the report's title."""
    site = f"{report.site.name}, " if report.site else ""
    return f"{site}night of {report.night.isoformat()}"


def sections(report: NightReport) -> tuple[Section, ...]:
    """Return the sections that have something to say."""
    made = (
        _short(report),
        _time(report),
        _done(report),
        _seeing(report),
        _conditions(report),
        _refused(report),
        _lost(report),
        _notes(report),
        _log(report),
    )
    return tuple(each for each in made if each.sentences or each.table)


def _short(report: NightReport) -> Section:
    telescope = report.observatory.telescope.name if report.observatory else ""
    people = ", ".join(report.header.observers) or "not named"
    good = sum(total.good for total in report.totals)
    said = [
        f"Observers: {people}." + (f" Telescope: {telescope}." if telescope else ""),
        f"{len(report.exposures)} exposures, {good} of them good; the shutter was open for "
        f"{hours(report.exposed_s)}.",
    ]
    account = report.account
    if account.dark_s > 0.0:
        said.append(
            f"{hours(account.dark_s)} were dark; of those the shutter was open for "
            f"{share(account.spent_s['open'], account.dark_s)}, and "
            f"{share(account.spent_s['lost'], account.dark_s)} were lost."
        )
    if report.is_open:
        said.append("The night was not closed: this is as far as its log goes.")
    table = None
    if report.times is not None:
        known = [
            (mjd, label)
            for name, label in EVENTS
            if (mjd := getattr(report.times, name)) is not None
        ]
        rows = tuple((label, clock(report, mjd)) for mjd, label in sorted(known))
        table = Rows(("event", "local time"), rows, frozenset({"local time"}))
    return Section("short", "In short", tuple(said), table)


def _time(report: NightReport) -> Section:
    account = report.account
    if account.dark_s <= 0.0:
        return Section("time", "Where the dark time went")
    rows: list[tuple[str, ...]] = []
    for word in HEADINGS:
        seconds = account.spent_s[word.value]
        rows.append(
            (word.label, f"{seconds:.0f}", hours(seconds), share(seconds, account.dark_s),
             word.sentence)
        )  # fmt: skip
        if word.value == "lost":
            rows += [
                (f"- to {_LABELS.get(cause, cause)}", f"{lost_s:.0f}", hours(lost_s),
                 share(lost_s, account.dark_s), "")
                for cause, lost_s in sorted(account.lost_s.items())
            ]  # fmt: skip
    rows.append(("all", f"{account.dark_s:.0f}", hours(account.dark_s), "100%", ""))
    columns = ("", "seconds", "time", "share", "what")
    numbers = frozenset(columns[1:4])
    return Section("time", "Where the dark time went", (), Rows(columns, tuple(rows), numbers))


def _done(report: NightReport) -> Section:
    rows = tuple(
        (
            each.programme or "no programme",
            each.target,
            each.filter,
            f"{each.seconds:g}",
            f"{each.good}/{each.taken}",
            f"{each.credit:.1f}",
            span(each.airmass_least, each.airmass_greatest),
            number(each.predicted_arcsec),
            number(each.measured_arcsec),
        )
        for each in report.totals
    )
    columns = (
        "programme", "target", "filter", "s", "good/taken", "depth", "airmass", "predicted",
        "measured",
    )  # fmt: skip
    said = (
        "Depth counts the good exposures in planned ones, by what each is worth. Sizes are medians "
        "of star images, FWHM in arcsec.",
    )
    table = Rows(columns, rows, frozenset(columns[3:])) if rows else None
    return Section("done", "What was done", said if rows else (), table)


def _seeing(report: NightReport) -> Section:
    known = report.seeing
    said: tuple[str, ...] = ()
    if known is not None:
        said = (
            f"Zenith, 500 nm, from {known.count} measurements: median {known.median_arcsec:.2f} "
            f"arcsec, half of them from {known.lower_quartile_arcsec:.2f} to "
            f"{known.upper_quartile_arcsec:.2f}, best {known.best_arcsec:.2f}, worst "
            f"{known.worst_arcsec:.2f}.",
        )
    elif report.exposures:
        said = ("Nothing was measured.",)
    return Section("seeing", "Seeing", said)


def _conditions(report: NightReport) -> Section:
    rows = tuple(
        (f"{each.name}, {each.unit}", str(each.count), f"{each.least:g}", f"{each.median:g}",
         f"{each.greatest:g}")
        for each in report.conditions
    )  # fmt: skip
    columns = ("quantity", "entered", "least", "median", "greatest")
    table = Rows(columns, rows, frozenset(columns[1:])) if rows else None
    return Section("conditions", "Conditions", (), table)


def _refused(report: NightReport) -> Section:
    rows = tuple(
        (clock(report, each.start_mjd), each.target, each.filter, f"{each.exposed_s:g}",
         _LABELS.get(each.outcome, each.outcome), each.why)
        for each in report.refused
    )  # fmt: skip
    columns = ("local", "target", "filter", "s", "outcome", "why")
    table = Rows(columns, rows, frozenset({"s"})) if rows else None
    return Section("refused", "Exposures that do not count", (), table)


def _lost(report: NightReport) -> Section:
    rows = tuple(
        (
            clock(report, each.begin_mjd),
            "not ended" if each.end_mjd is None else clock(report, each.end_mjd),
            _LABELS.get(each.cause, each.cause),
        )
        for each in report.lost
    )
    table = Rows(("from", "to", "lost to"), rows) if rows else None
    return Section("lost", "Lost time", (), table)


def _notes(report: NightReport) -> Section:
    rows = tuple((clock(report, each.t_mjd), each.target, each.text) for each in report.notes)
    table = Rows(("local", "on", "note"), rows) if rows else None
    return Section("notes", "Notes", (), table)


def _log(report: NightReport) -> Section:
    said = [
        f"Entries: {len(report.state.events)}. Orders proposed: {report.orders}; another target "
        f"was chosen instead: {report.chosen_otherwise}."
    ]
    said += [
        f"{each.name} came in during the night, at ra {each.ra_deg:.5f}° dec {each.dec_deg:+.5f}° "
        "(ICRS)."
        for each in report.added
    ]
    said += [
        f"The computer's clock jumped {each.seconds:+.1f} s at {clock(report, each.t_mjd)}."
        for each in report.clock_steps
    ]
    said += [f"Of the log: {each}." for each in report.findings]
    if report.header.software:
        said.append(f"Written by {report.header.software}.")
    return Section("log", "The log", tuple(said))
