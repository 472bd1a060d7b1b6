"""A report as one HTML file: no script, nothing from elsewhere, readable on screen and on paper."""

from __future__ import annotations

from engine.report.charts import charts
from engine.report.content import Rows, Section, sections, title
from engine.report.night import NightReport
from engine.report.style import STYLE
from engine.report.svg import Chart, escaped
from engine.report.words import clock, number

# The section each chart stands in, behind its sentences and before its table.
PLACE_OF = {
    "timeline": "time",
    "altitude": "done",
    "seeing": "seeing",
    "images": "seeing",
    "sky": "conditions",
}


def as_html(report: NightReport) -> str:
    """Return a report as an HTML page with its charts."""
    drawn = charts(report)
    told = sections(report)
    names = {section.name for section in told}
    # A chart whose section has nothing to say gets a place of its own.
    body = "".join(
        _section(section, [c for c in drawn if PLACE_OF[c.name] == section.name])
        for section in told
    )
    body += "".join(
        _section(Section(c.name, c.title), [c]) for c in drawn if PLACE_OF[c.name] not in names
    )
    return (
        "<!DOCTYPE html>\n"
        '<html lang="en"><head><meta charset="utf-8">'
        '<meta name="viewport" content="width=device-width, initial-scale=1">'
        f"<title>{escaped(title(report))}</title><style>{STYLE}</style></head>\n"
        f"<body><main><h1>{escaped(title(report))}</h1>\n{body}{_every_exposure(report)}"
        "</main></body></html>\n"
    )


def _section(section: Section, drawn: list[Chart]) -> str:
    said = "".join(f"<p>{escaped(sentence)}</p>" for sentence in section.sentences)
    figures = "".join(_figure(chart) for chart in drawn)
    table = _table(section.table) if section.table is not None else ""
    return (
        f'<section class="{section.name}"><h2>{escaped(section.heading)}</h2>'
        f"{said}{figures}{table}</section>\n"
    )


def _figure(chart: Chart) -> str:
    return (
        f"<figure>{chart.text()}<figcaption><b>{escaped(chart.title)}.</b> "
        f"{escaped(chart.about)}</figcaption></figure>"
    )


def _table(table: Rows) -> str:
    def row(cells: tuple[str, ...], tag: str) -> str:
        sides = [' class="n"' if name in table.numbers else "" for name in table.columns]
        made = [
            f"<{tag}{side}>{escaped(cell)}</{tag}>" for cell, side in zip(cells, sides, strict=True)
        ]
        return f"<tr>{''.join(made)}</tr>"

    rows = "".join(row(each, "td") for each in table.rows)
    head = f"<thead>{row(table.columns, 'th')}</thead>" if any(table.columns) else ""
    return f"<table>{head}<tbody>{rows}</tbody></table>"


def _every_exposure(report: NightReport) -> str:
    """Return the table behind the charts: every exposure, folded away on the screen."""
    if not report.exposures:
        return ""
    rows = tuple(
        (
            clock(report, each.start_mjd),
            each.target,
            each.filter,
            f"{each.exposed_s:g}",
            number(each.altitude_deg, ".1f"),
            number(each.airmass_mid),
            number(each.image_size_arcsec),
            number(each.measured_fwhm_arcsec),
            number(each.sky_mag_arcsec2, ".1f"),
            number(each.credit),
            each.outcome,
        )
        for each in report.exposures
    )
    columns = (
        "local", "target", "filter", "s", "altitude", "airmass", "predicted", "measured", "sky",
        "worth", "outcome",
    )  # fmt: skip
    table = _table(Rows(columns, rows, frozenset(columns[3:-1])))
    return (
        '<section class="every"><h2>Every exposure</h2>'
        f"<details><summary>{len(rows)} exposures, the figures behind the charts</summary>"
        f"{table}</details></section>\n"
    )
