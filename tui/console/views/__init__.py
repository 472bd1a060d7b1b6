"""The console's views: each fills the place under the state of the night, one key away.

This table is light on purpose: the table of actions and the footer read it before the engine is
loaded. The views themselves are in the modules beside it, and `classes` names them.
"""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class ViewEntry:
    """One view: its stable name, its key, its title on the screen, and what it shows."""

    name: str
    key: str
    title: str
    sentence: str

    @property
    def action(self) -> str:
        """The name of the action that shows it."""
        return f"view_{self.name}"


# The list with its panels; the frame shows it itself. The others are modules of this package.
NIGHT = "night"

VIEWS: tuple[ViewEntry, ...] = (
    ViewEntry(NIGHT, "1", "night", "Show the night under way: the list, a target, the order."),
    ViewEntry("sky", "2", "sky", "Show the sky: altitudes through the night, order and limits."),
    ViewEntry(
        "conditions",
        "3",
        "conditions",
        "Show seeing, weather and sky: measured, foretold, how old.",
    ),
    ViewEntry("image", "4", "image", "Show image sizes: which blur, what will be soft, and when."),
    ViewEntry("log", "5", "log", "Show the log as it grows: search it, put entries right."),
    ViewEntry("targets", "6", "targets", "Show the targets by programme: add, edit, import."),
    ViewEntry(
        "past", "7", "past", "Show past nights: each again, a target's history, the site's seeing."
    ),
)

VIEW_OF_ACTION: dict[str, str] = {each.action: each.name for each in VIEWS}


def view_named(name: str) -> ViewEntry:
    """Return the entry of a view; KeyError for an unknown one."""
    return next(each for each in VIEWS if each.name == name)
