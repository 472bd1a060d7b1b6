"""Reading what was typed: a number in its range, or what was expected."""

from __future__ import annotations

import math
from collections.abc import Callable


def number_between(least: float, greatest: float, unit: str) -> Callable[[str], float]:
    """Return a reader of a number in a range; a comma may stand for the point."""
    expected = f"expected {least:g} to {greatest:g} {unit}"

    def read(text: str) -> float:
        try:
            value = float(text.strip().replace(",", "."))
        except ValueError:
            raise ValueError(expected) from None
        if not math.isfinite(value) or not least <= value <= greatest:
            raise ValueError(expected)
        return value

    return read
