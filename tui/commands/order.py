"""``warmroom order``: the proposed order for the rest of the night."""

from __future__ import annotations

import argparse
from typing import Any
from zoneinfo import ZoneInfo

from engine.logbook import load_logbook
from engine.order import Order, Visit
from engine.times import iso_from_mjd
from engine.watch import order_of_night
from tui.commands.output import clock_time, iso_or_none, number, print_columns, print_json


def run(arguments: argparse.Namespace) -> int:
    """Print the order; status 1 when nothing can be observed in what remains of the night."""
    logbook = load_logbook(arguments.logbook)
    order = order_of_night(
        logbook,
        night=arguments.night,
        at_mjd=arguments.at,
        seeing_arcsec=arguments.seeing,
        with_bound=arguments.bound,
    )
    if arguments.json:
        print_json(_as_json(order))
    else:
        _print_text(order, logbook.observatory.site.timezone)
    return 0 if order.visits else 1


def _as_json(order: Order) -> dict[str, Any]:
    return {
        "from": iso_or_none(order.from_mjd),
        "until": iso_or_none(order.until_mjd),
        "value": order.value,
        "bound": order.bound,
        "visits": [_visit_as_json(visit) for visit in order.visits],
        "left_out": [{"target": each.target, "reason": each.reason} for each in order.left_out],
        "compute_ms": order.compute_ms,
    }


def _visit_as_json(visit: Visit) -> dict[str, Any]:
    return {
        "target": visit.target,
        "start": iso_from_mjd(visit.start_mjd),
        "end": iso_from_mjd(visit.end_mjd),
        "exposures": [
            {
                "filter": each.filter,
                "seconds": each.seconds,
                "count": each.count,
                "start": iso_from_mjd(each.start_mjd),
            }
            for each in visit.exposures
        ],
        "airmass_start": visit.airmass_start,
        "airmass_end": visit.airmass_end,
        "image_size_arcsec": visit.image_size_arcsec,
        "reason": visit.reason,
    }


def _print_text(order: Order, timezone: str) -> None:
    zone = ZoneInfo(timezone)
    print(
        f"order from {clock_time(order.from_mjd, zone)} to {clock_time(order.until_mjd, zone)} "
        f"({timezone}), worth {order.value:.0f}"
        + (
            ""
            if order.bound is None
            else f", {order.value / order.bound:.1%} of the most any order can be worth"
        )
    )
    print_columns(
        ("target", "begin", "end", "airmass", "FWHM", "exposures", "why now"),
        [
            (
                visit.target,
                clock_time(visit.start_mjd, zone),
                clock_time(visit.end_mjd, zone),
                f"{number(visit.airmass_start)}-{number(visit.airmass_end)}",
                number(visit.image_size_arcsec),
                " ".join(f"{e.filter}:{e.seconds:g}x{e.count}" for e in visit.exposures),
                visit.reason,
            )
            for visit in order.visits
        ],
    )
    for each in order.left_out:
        print(f"left out: {each.target}: {each.reason}")
