"""How much of a plan is done."""

from __future__ import annotations

from dataclasses import dataclass

from engine.logbook import Target
from engine.night import Progress, is_finished, plans


@dataclass(frozen=True)
class Taken:
    """An exposure of the target that was taken and kept."""

    filter: str
    seconds: float
    credit: float | None = 1.0
    target: str = "A"


def progress(plan: str, *taken: Taken) -> tuple[Progress, ...]:
    """Return the progress of a plan such as ``V:60x2 B:90x1``."""
    words = [word.partition(":") for word in plan.split()]
    exposures = [
        {"filter": name, "seconds": float(what.split("x")[0]), "count": int(what.split("x")[1])}
        for name, _, what in words
    ]
    target = Target.model_validate({"name": "A", "ra": 1.0, "dec": 1.0, "exposures": exposures})
    return plans([target], taken)["A"]


def done(plan: tuple[Progress, ...]) -> list[int]:
    """Return how many of each line are done."""
    return [line.done for line in plan]


def test_an_exposure_counts_for_the_line_of_its_filter_and_length() -> None:
    plan = progress("V:60x2 V:10x2 B:60x2", Taken("V", 10.0, 0.5), Taken("B", 60.0))
    assert done(plan) == [0, 1, 1]
    assert [line.credit for line in plan] == [0.0, 0.5, 1.0]


def test_a_filter_that_stands_twice_in_a_plan_is_filled_twice() -> None:
    """V before and after B, as a variable star may want it."""
    plan = progress("V:60x2 B:60x1 V:60x2", *[Taken("V", 60.0)] * 3, Taken("B", 60.0))
    assert done(plan) == [2, 1, 1]
    assert is_finished(progress("V:60x2 B:60x1 V:60x2", *[Taken("V", 60.0)] * 4, Taken("B", 60.0)))


def test_more_than_was_planned_leaves_nothing_and_is_counted() -> None:
    plan = progress("V:60x2", *[Taken("V", 60.0)] * 3)
    assert done(plan) == [3]
    assert plan[0].remaining == 0


def test_another_length_counts_for_the_line_of_its_filter_that_lacks_most() -> None:
    assert done(progress("V:60x2 V:10x5", Taken("V", 30.0))) == [0, 1]


def test_what_is_in_no_plan_counts_for_nothing() -> None:
    plan = progress("V:60x2", Taken("R", 60.0), Taken("V", 60.0, target="B"))
    assert done(plan) == [0]


def test_an_exposure_of_unknown_worth_counts_as_a_planned_one() -> None:
    assert progress("V:60x2", Taken("V", 60.0, None))[0].credit == 1.0
