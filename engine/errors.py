"""The one family of errors warmroom raises on purpose.

::

    WarmroomError
    ├── LogbookFaults     what is wrong in the logbook's files: all of it, a line each
    ├── NoAnswer          the question is fair, the answer is no (no such night, nothing observable)
    ├── NotNow            the act makes no sense at this stage of the night; nothing was done
    └── LogError          the night log can't be opened, locked or written

Each is shown in one place: the console in a panel, the printing commands on stderr with an exit
status. Anything else that is raised is a defect of ours.
"""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path


class WarmroomError(Exception):
    """What warmroom says in one clear line instead of a traceback."""

    exit_status = 2


@dataclass(frozen=True, slots=True, order=True)
class Fault:
    """One thing that is wrong in one file: ``path:line: key: what, expected what``."""

    path: Path
    line: int
    key: str
    what: str

    def __str__(self) -> str:
        """Return the one line that is shown."""
        key = f" {self.key}:" if self.key else ""
        return f"{self.path}:{self.line}:{key} {self.what}"


class LogbookFaults(WarmroomError):
    """Every fault found in a logbook, in the order of files and lines; nothing was half-read."""

    def __init__(self, faults: list[Fault]) -> None:
        self.faults = tuple(sorted(faults))
        super().__init__("\n".join(str(fault) for fault in self.faults))


class NoAnswer(WarmroomError):
    """The question was understood and the answer is no."""

    exit_status = 1


class NotNow(WarmroomError):
    """The act makes no sense at this stage of the night; says why, and nothing was done."""


class LogError(WarmroomError):
    """The night log can't be opened, locked or written; says what to do about it."""
