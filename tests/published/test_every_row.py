"""Every published row is checked in one module, or said there not to be used, with a reason.

A module of published checks claims rows with ``@pytest.mark.parametrize("row", rows(...))`` and
lists the others of its field in ``NOT_USED``: the beginning of the ids, and why.
"""

from __future__ import annotations

import importlib
from collections import defaultdict
from pathlib import Path
from types import ModuleType

import pytest

from tests.published.rows import all_rows

MODULES = sorted(
    path.stem
    for path in Path(__file__).parent.glob("test_*.py")
    if path.stem != Path(__file__).stem
)
IDS = frozenset(row["id"] for row in all_rows())


def module_named(name: str) -> ModuleType:
    """Return one module of published checks."""
    return importlib.import_module(f"tests.published.{name}")


def claimed_by(module: ModuleType) -> set[str]:
    """Return the ids of the rows that the module's own tests are run with."""
    found = set()
    for name, test in vars(module).items():
        if not name.startswith("test_") or getattr(test, "__module__", "") != module.__name__:
            continue
        for mark in getattr(test, "pytestmark", []):
            if mark.name == "parametrize" and mark.args[0] == "row":
                found |= {str(parameter.values[0]["id"]) for parameter in mark.args[1]}
    return found


def left_out_by(module: ModuleType) -> dict[str, str]:
    """Return what the module says of rows it doesn't use: beginning of the id, and why."""
    return dict(getattr(module, "NOT_USED", {}))


def test_ids_are_unique() -> None:
    assert len(IDS) == len(all_rows()) > 300


@pytest.mark.parametrize("name", MODULES)
def test_what_a_module_leaves_out_exists_has_a_reason_and_is_not_claimed(name: str) -> None:
    module = module_named(name)
    claimed = claimed_by(module)
    assert claimed, f"{name} checks no published row"
    for prefix, reason in left_out_by(module).items():
        assert any(each.startswith(prefix) for each in IDS), f"no row begins with {prefix!r}"
        assert len(reason.split()) > 3, f"{prefix}: {reason!r} is no reason"
        assert not [each for each in claimed if each.startswith(prefix)], f"{prefix} is claimed"


def test_every_row_is_claimed_once_or_left_out_once() -> None:
    owners: dict[str, list[str]] = defaultdict(list)
    for name in MODULES:
        module = module_named(name)
        prefixes = tuple(left_out_by(module))
        left_out = {each for each in IDS if prefixes and each.startswith(prefixes)}
        for each in claimed_by(module) | left_out:
            owners[each].append(name)
    unknown = sorted(IDS - set(owners))
    assert not unknown, f"{len(unknown)} rows that no module speaks of: {unknown}"
    twice = {each: names for each, names in owners.items() if len(names) > 1}
    assert not twice, f"rows that several modules speak of: {twice}"
