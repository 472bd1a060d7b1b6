"""A report in a file: the ending says in which form. A file that is there is never replaced."""

from __future__ import annotations

import io
from collections.abc import Callable
from pathlib import Path

from engine.errors import WarmroomError
from engine.report.markdown import as_markdown
from engine.report.night import NightReport
from engine.report.page import as_html
from engine.report.plain import as_json_text
from engine.report.tables import exposure_table


def _csv(report: NightReport) -> str:
    text = io.StringIO()
    exposure_table(report).write(text, format="ascii.csv")
    return text.getvalue()


def _ecsv(report: NightReport) -> str:
    text = io.StringIO()
    exposure_table(report).write(text, format="ascii.ecsv")
    return text.getvalue()


def _votable(report: NightReport) -> str:
    data = io.BytesIO()
    exposure_table(report).write(data, format="votable")
    return data.getvalue().decode()


# What each ending stands for: the whole report, or the table of exposures.
FORMS: dict[str, Callable[[NightReport], str]] = {
    ".md": as_markdown,
    ".html": as_html,
    ".json": as_json_text,
    ".csv": _csv,
    ".ecsv": _ecsv,
    ".vot": _votable,
}


def save(report: NightReport, path: Path) -> None:
    """Write a report into a new file.

    WarmroomError when the ending is none of ``FORMS``, the file is there, or it can't be written.
    """
    form = FORMS.get(path.suffix.lower())
    if form is None:
        raise WarmroomError(f"{path}: expected a name that ends in {', '.join(FORMS)}")
    text = form(report)
    try:
        with path.open("x", encoding="utf-8", newline="") as file:
            file.write(text)
    except FileExistsError:
        raise WarmroomError(f"{path} is there already; nothing was written") from None
    except OSError as error:
        raise WarmroomError(f"{path}: {error.strerror}") from None
