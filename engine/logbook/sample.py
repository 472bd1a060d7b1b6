"""The sample logbook that travels with warmroom: an invented observatory, and real stars."""

from __future__ import annotations

from pathlib import Path


def sample_logbook() -> Path:
    """Return the folder of the sample logbook.

    An installed warmroom carries it beside this module; a checkout has it at its top as nights/.
    """
    carried = Path(__file__).parent / "sample"
    return carried if carried.is_dir() else Path(__file__).parents[2] / "nights"
