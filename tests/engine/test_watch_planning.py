"""One plan after another, while the list changes under them."""

from __future__ import annotations

from pathlib import Path

from engine.logbook import typed_target
from engine.watch import Watch, acts
from tests.engine.watch_nights import a_console, evening_clock, plan, small_logbook


def ahead(watch: Watch) -> set[str]:
    """Return the targets of the order in force."""
    assert watch.plan is not None
    return {visit.target for visit in watch.plan.order.visits}


def test_a_target_that_may_be_observed_at_once_comes_into_the_plan_and_leaves_it(
    tmp_path: Path,
) -> None:
    """Its news is told against a plan whose tables have no such target."""
    folder = small_logbook(tmp_path)
    clock = evening_clock(folder)
    with a_console(folder, clock) as watch:
        acts.insert(watch, typed_target("06:40:00 -31:00:00 V:60x5 New One", ["V"]))
        plan(watch)
        assert "New One" in ahead(watch)
        assert watch.plan is not None
        assert "taken in: New One" in watch.plan.news
        acts.undo(watch)
        plan(watch)
        assert ahead(watch) == {"Near", "Far"}
