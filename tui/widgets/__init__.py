"""The pieces the console is built of: they take painted lines and plain data, nothing else."""

from tui.widgets.entry import Entry, Question
from tui.widgets.live_list import Column, LiveList, Row
from tui.widgets.sheet import Sheet

__all__ = ["Column", "Entry", "LiveList", "Question", "Row", "Sheet"]
