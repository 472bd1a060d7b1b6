"""A writer that dies without warning: what it acknowledged is there, and the next goes on."""

from __future__ import annotations

from pathlib import Path

from engine.log import read_log
from tests.engine.log_nights import NAME, read_plainly
from tests.faults.log_deaths import kill_often

KILLS = 200


def test_two_hundred_kills_lose_nothing(tmp_path: Path) -> None:
    """Kill -9 at any moment, in the middle of an entry too, and take the night up again."""
    tally = kill_often(KILLS, tmp_path, seed=20270314)
    assert tally.tried == KILLS
    assert tally.acknowledged > 1000
    assert (tally.lost, tally.invented) == (0, 0)
    torn = list(tmp_path.glob(f"*/{NAME}.torn-*"))
    assert torn, "no kill fell into an entry: the trial is too gentle"
    # All but the last victim of a night were followed by one that put the file in order.
    for path in tmp_path.glob(f"*/{NAME}"):
        reading = read_log(path)
        whole = path.read_bytes()[: reading.sound_end]
        assert len(read_plainly(whole)) == len(reading.events)
        assert all("torn" in finding.what for finding in reading.findings)
