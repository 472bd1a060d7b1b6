"""What the observer can do: one frozen table that feeds keys, footer, palette and help.

An action's ``name`` is the stable id. Nothing else in the console mentions a key, so that a key is
changed in this one place, or by the observer (`tui.console.keys`).
"""

from __future__ import annotations

from dataclasses import dataclass

from tui.console.views import VIEWS


@dataclass(frozen=True, slots=True)
class Action:
    """One thing the observer can do: its id, its keys, a word for the footer, a sentence."""

    name: str
    keys: tuple[str, ...]
    label: str
    sentence: str
    group: str
    footer: int = 0  # its place in the footer, from 1; 0 for none


GROUPS = ("the common round", "exposures", "conditions", "the night", "the views", "the screen")

ACTIONS: tuple[Action, ...] = (
    Action(
        "go_on",
        ("space",),
        "go on",
        "Do the next thing: accept the proposal, say 'on target', start the run.",
        GROUPS[0],
        footer=1,
    ),
    Action(
        "choose",
        ("enter",),
        "choose",
        "Take the target under the cursor instead of the proposed one.",
        GROUPS[0],
        footer=4,
    ),
    Action(
        "measure",
        ("f",),
        "FWHM",
        "Type the FWHM measured on the last frame; the zenith seeing follows from it.",
        GROUPS[0],
        footer=5,
    ),
    Action("stop", ("s",), "stop", "End the exposure and the run now.", GROUPS[1], footer=6),
    Action(
        "reject",
        ("x",),
        "reject",
        "Reject the last exposure; it comes back on the plan.",
        GROUPS[1],
        footer=11,
    ),
    Action("repeat", ("r",), "repeat", "Take the last exposure once more.", GROUPS[1]),
    Action(
        "one_filter",
        ("o",),
        "one filter",
        "Start a run in one chosen filter of the plan.",
        GROUPS[1],
    ),
    Action(
        "keep_cut_off",
        ("K",),
        "keep it",
        "Keep the exposure that was cut off: it was completed.",
        GROUPS[1],
    ),
    Action(
        "lose_cut_off",
        ("L",),
        "it is lost",
        "Log the exposure that was cut off as lost.",
        GROUPS[1],
    ),
    Action("seeing", ("z",), "seeing", "Type the zenith seeing at 500 nm.", GROUPS[2]),
    Action(
        "conditions",
        ("c",),
        "conditions",
        "Type cloud, wind, humidity, temperature, dew point or pressure.",
        GROUPS[2],
        footer=7,
    ),
    Action(
        "lost",
        ("l",),
        "lost time",
        "Begin lost time with its cause, or end it.",
        GROUPS[3],
        footer=8,
    ),
    Action(
        "drop",
        ("d",),
        "drop",
        "Drop the target under the cursor for tonight, or take it back.",
        GROUPS[3],
    ),
    Action(
        "put_off",
        ("p",),
        "put off",
        "Leave the target under the cursor out of the order for some minutes.",
        GROUPS[3],
    ),
    Action(
        "take_next",
        ("b",),
        "be next",
        "Let the target under the cursor be next whatever the order says, or no longer.",
        GROUPS[3],
    ),
    Action(
        "take_at",
        ("t",),
        "at a time",
        "Let the target under the cursor begin at a time whatever the order says.",
        GROUPS[3],
    ),
    Action(
        "hold",
        ("h",),
        "hold",
        "Stay on the present target until all of its plan is done, or no longer.",
        GROUPS[3],
    ),
    Action(
        "insert",
        ("i",),
        "insert",
        "Take a new target into the night by its coordinates.",
        GROUPS[3],
    ),
    Action(
        "filter_aside",
        ("w",),
        "filter aside",
        "Put a filter of the wheel aside for tonight, or use it again.",
        GROUPS[3],
    ),
    Action(
        "acknowledge",
        ("a",),
        "seen",
        "Say that the alarm on the screen was seen; the next one that waits takes its place.",
        GROUPS[3],
    ),
    Action("note", ("n",), "note", "Write a note into the log.", GROUPS[3], footer=9),
    Action(
        "undo",
        ("u",),
        "undo",
        "Withdraw the last entry; the log keeps both.",
        GROUPS[3],
        footer=10,
    ),
    *(Action(each.action, (each.key,), each.title, each.sentence, GROUPS[4]) for each in VIEWS),
    Action(
        "next_panel",
        ("tab",),
        "panel",
        "Show the next panel: target, order, log.",
        GROUPS[5],
        footer=3,
    ),
    Action(
        "find",
        ("slash",),
        "find",
        "Show only targets whose name or programme holds a text.",
        GROUPS[5],
    ),
    Action("next_look", ("v",), "look", "Change the colours: night, red, day, mono.", GROUPS[5]),
    Action("help", ("question_mark", "f1"), "help", "Show every key.", GROUPS[5], footer=2),
    Action(
        "leave", ("q", "ctrl+q"), "leave", "Leave the console; the log keeps the night.", GROUPS[5]
    ),
)

# What a key does to the list's cursor: how far, and in what.
MOVES: dict[str, tuple[int, str]] = {
    "down": (1, "rows"),
    "j": (1, "rows"),
    "up": (-1, "rows"),
    "k": (-1, "rows"),
    "pagedown": (1, "screens"),
    "pageup": (-1, "screens"),
    "home": (-1, "ends"),
    "g": (-1, "ends"),
    "end": (1, "ends"),
    "G": (1, "ends"),
}

# Textual's names of keys, as a person reads them on the keyboard.
_CAPS = {"question_mark": "?", "slash": "/", "space": "space", "enter": "enter", "f1": "F1"}


def cap(key: str) -> str:
    """Return what is printed on a key."""
    return _CAPS.get(key, key)
