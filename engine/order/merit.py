"""The merit: what an exposure, a finished plan and so an order are worth. The one place for it.

    exposure:  priority x seconds x quality x chance at its middle
    finished:  a tenth of the plan's own worth at quality 1, once nothing of the plan remains

Quality is the credit of `engine.light`: how much of the depth asked for a second there buys, from
predicted image size, sky and extinction. Chance is how likely the images are to be within the
target's own limit, as far as the seeing is known: 1 without a limit.

Limits are limits: an exposure that breaks one at its start, middle or end is worth nothing, nor is
one of a repeat visit that doesn't keep its gaps. A standard that is wanted several times a night is
bright, and wanted over a spread of airmass: its quality is 1, and a visit at an airmass that was
sampled that night already counts half (`engine.order.repeats`).

That the bonus is a tenth is common practice, no source.
"""

from __future__ import annotations

FINISHED_BONUS = 0.1


def exposure_worth(priority: int, seconds: float, quality: float) -> float:
    """Return what one exposure is worth: priority (1 to 5) x seconds (s) x quality (0 to 2).

    ``quality`` has the chance in it.
    """
    return priority * seconds * quality


def finished_worth(priority: int, planned_s: float) -> float:
    """Return the bonus for a plan that asked for so many seconds (s) and is finished."""
    return FINISHED_BONUS * priority * planned_s
