"""Each screen is what its snapshot says, cell by cell: text and styles.

See `tests/tui/snapshots.py` for how they are written anew.
"""

from __future__ import annotations

from tests.tui.snapshots import FOLDER, screens


def test_every_screen_is_as_its_snapshot() -> None:
    """The files are those of the views there are, and each holds what is drawn."""
    drawn = screens()
    kept = {path.name: path.read_text(encoding="utf-8") for path in FOLDER.glob("*.txt")}
    assert sorted(drawn) == sorted(kept)
    for name, text in drawn.items():
        assert text.splitlines() == kept[name].splitlines(), name
