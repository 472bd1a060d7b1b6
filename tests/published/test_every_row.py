"""No published row is forgotten: each is checked by one module here, or said not to be, and why.

A module checks a row when one of its tests is parametrised with it; it leaves rows out by a
module-level ``NOT_USED``, from prefixes of ids to reasons.
"""

from __future__ import annotations

import importlib
from dataclasses import dataclass
from pathlib import Path
from types import ModuleType

import pytest

from tests.published.rows import all_rows

IDS = [str(row["id"]) for row in all_rows()]


@dataclass(frozen=True, slots=True)
class Claims:
    """What one module says of the rows: ids it checks, prefixes it leaves out with reasons."""

    module: str
    checked: frozenset[str]
    not_used: dict[str, str]

    def leaves_out(self, row_id: str) -> bool:
        """Return whether a row is left out here, with a reason."""
        return row_id.startswith(tuple(self.not_used))


def claims_of(module: ModuleType) -> Claims:
    """Return what a module says: from the parameters of its tests, and its ``NOT_USED``."""
    marks = [
        mark
        for name, test in vars(module).items()
        if name.startswith("test_")
        for mark in getattr(test, "pytestmark", [])
        if mark.name == "parametrize" and mark.args[0] == "row"
    ]
    checked = {parameter.values[0]["id"] for mark in marks for parameter in mark.args[1]}
    return Claims(module.__name__, frozenset(checked), getattr(module, "NOT_USED", {}))


CLAIMS = [
    claims_of(importlib.import_module(f"tests.published.{path.stem}"))
    for path in sorted(Path(__file__).parent.glob("test_*.py"))
    if path != Path(__file__)
]


def test_ids_are_unique() -> None:
    assert len(set(IDS)) == len(IDS)


def test_every_row_is_checked_or_left_out_for_a_reason() -> None:
    forgotten = [
        row_id
        for row_id in IDS
        if not any(row_id in each.checked or each.leaves_out(row_id) for each in CLAIMS)
    ]
    assert forgotten == []


def test_no_row_is_claimed_twice() -> None:
    claimed = {
        row_id: [each.module for each in CLAIMS if row_id in each.checked]
        + [f"{each.module} NOT_USED" for each in CLAIMS if each.leaves_out(row_id)]
        for row_id in IDS
    }
    assert {row_id: by for row_id, by in claimed.items() if len(by) > 1} == {}


@pytest.mark.parametrize("claims", CLAIMS, ids=lambda each: each.module)
def test_what_is_left_out_exists_and_says_why(claims: Claims) -> None:
    for prefix, reason in claims.not_used.items():
        assert any(row_id.startswith(prefix) for row_id in IDS), prefix
        assert reason.strip()
