"""The log's own words: outcomes of exposures, causes of lost time, what an override does.

One frozen registry each; the screen, the report and the reference page read them.
"""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Word:
    """One value as it stands in the log, a label for the screen, and a sentence."""

    value: str
    label: str
    sentence: str


OUTCOMES: tuple[Word, ...] = (
    Word("good", "good", "It was taken to its end and counts for its plan."),
    Word("rejected", "rejected", "The observer rejected it; it comes back on the plan."),
    Word("stopped", "stopped", "The observer ended it early; it does not count."),
    Word("cut_off", "cut off", "The console ended during it and the observer judged it lost."),
)

LOST_CAUSES: tuple[Word, ...] = (
    Word("cloud", "cloud", "Cloud over the target or the whole sky."),
    Word("humidity", "humidity", "Humidity or dew: the dome was closed."),
    Word("wind", "wind", "Wind: the dome was closed or pointing was limited."),
    Word("telescope", "telescope", "The telescope, mount or dome did not work."),
    Word("instrument", "instrument", "The camera, filter wheel or computer did not work."),
    Word("other", "other", "Anything else; say it in a note."),
)

OVERRIDES: tuple[Word, ...] = (
    Word("chose", "chose instead", "The observer took another target than the proposed one."),
    Word("drop", "dropped", "Not tonight."),
    Word("put_off", "put off", "Not before a time."),
    Word("pin", "pinned", "Next, or at a time."),
    Word("hold", "held", "Nothing else until all of it is done."),
    Word("forbid", "filter put aside", "This filter is not to be used tonight."),
    Word("release", "released", "An earlier drop, put off, pin, hold or forbid no longer holds."),
)
