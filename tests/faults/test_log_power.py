"""Power that fails: a file system stopped dead under the writer keeps all that was acknowledged."""

from __future__ import annotations

from pathlib import Path

import pytest

from engine.log import Disk
from tests.faults.log_deaths import UnsyncedDisk, cut_power

NO_MOUNT = "this user may not mount a file system in a file"


def test_thirty_power_cuts_lose_nothing(tmp_path: Path) -> None:
    """Acknowledged is synced, and synced is there when the power is back."""
    tally = cut_power(30, tmp_path, 20270314, Disk())
    if tally is None:
        pytest.skip(NO_MOUNT)
    assert tally.tried == 30
    assert tally.acknowledged > 500
    assert (tally.lost, tally.invented) == (0, 0)


def test_the_trial_is_hard_enough_to_lose_what_is_not_synced(tmp_path: Path) -> None:
    """The same without the sync loses entries: so it is the sync that keeps them."""
    tally = cut_power(30, tmp_path, 20270314, UnsyncedDisk())
    if tally is None:
        pytest.skip(NO_MOUNT)
    assert tally.lost > 0
