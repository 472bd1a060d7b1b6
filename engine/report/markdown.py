"""A report as Markdown, aligned so that it reads as plain text too."""

from __future__ import annotations

from engine.report.content import Rows, sections, title
from engine.report.night import NightReport

# What Markdown could take for something else.
_SPECIAL = str.maketrans({character: f"\\{character}" for character in "\\`*_[]<>|#"})


def as_markdown(report: NightReport) -> str:
    """Return a report as Markdown."""
    parts = [f"# {escaped(title(report))}"]
    for section in sections(report):
        parts.append(f"## {section.heading}")
        parts += [escaped(sentence) for sentence in section.sentences]
        if section.table is not None:
            parts.append(_table(section.table))
    return "\n\n".join(parts) + "\n"


def escaped(text: str) -> str:
    """Return text in which nothing is Markdown's own."""
    return " ".join(text.split()).translate(_SPECIAL)


def _table(table: Rows) -> str:
    cells = [tuple(escaped(cell) for cell in row) for row in (table.columns, *table.rows)]
    widths = [max(3, *(len(row[i]) for row in cells)) for i in range(len(table.columns))]
    lines = []
    are_numbers = [name in table.numbers for name in table.columns]
    for row in cells:
        padded = [
            cell.rjust(width) if is_number else cell.ljust(width)
            for cell, width, is_number in zip(row, widths, are_numbers, strict=True)
        ]
        lines.append(f"| {' | '.join(padded)} |")
    rule = [
        "-" * (width - 1) + (":" if is_number else "-")
        for width, is_number in zip(widths, are_numbers, strict=True)
    ]
    return "\n".join([lines[0], f"| {' | '.join(rule)} |", *lines[1:]])
