"""A report as plain data, for JSON: moments as ISO UTC, lengths of time in seconds."""

from __future__ import annotations

import json
import math
from dataclasses import fields, is_dataclass
from typing import Any

from engine.report.night import NightReport
from engine.times import iso_from_mjd

MJD = "_mjd"
# What of an exposure is not worth repeating.
LEFT_OUT = ("extra", "t_mjd", "of", "run")


def as_data(report: NightReport) -> dict[str, Any]:
    """Return a report as dictionaries, lists, text and numbers."""
    account = report.account
    return {
        "night": report.night.isoformat(),
        "site": report.site.name if report.site else None,
        "observers": list(report.header.observers),
        "software": report.header.software,
        "closed": not report.is_open,
        "exposed_s": report.exposed_s,
        "dark_s": account.dark_s,
        "spent_s": account.spent_s,
        "lost_s": account.lost_s,
        "totals": [_record(each) for each in report.totals],
        "exposures": [_record(each) for each in report.exposures],
        "seeing": _record(report.seeing) if report.seeing else None,
        "seeing_measured": [_record(each) for each in report.state.seeing],
        "conditions": [_record(each) for each in report.conditions],
        "lost": [_record(each) for each in report.lost],
        "notes": [
            {"at": iso_from_mjd(each.t_mjd), "target": each.target, "text": each.text}
            for each in report.notes
        ],
        "orders": report.orders,
        "chosen_otherwise": report.chosen_otherwise,
        "findings": list(report.findings),
    }


def as_json_text(report: NightReport) -> str:
    """Return a report as JSON."""
    return json.dumps(as_data(report), ensure_ascii=False, indent=1, allow_nan=False) + "\n"


def _record(value: Any) -> dict[str, Any]:
    found: dict[str, Any] = {}
    for each in fields(value):
        if each.name in LEFT_OUT:
            continue
        held = getattr(value, each.name)
        name = "at" if each.name == "mjd" else each.name
        if name == "at" or name.endswith(MJD):
            found[name.removesuffix(MJD)] = iso_from_mjd(held) if _is_known(held) else None
        else:
            found[name] = _record(held) if is_dataclass(held) else _number(held)
    return found


def _is_known(value: object) -> bool:
    return isinstance(value, float) and math.isfinite(value)


def _number(value: object) -> object:
    return None if isinstance(value, float) and not math.isfinite(value) else value
