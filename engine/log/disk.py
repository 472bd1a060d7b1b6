"""The few calls by which the log touches the disk: in one place, so that tests can fail them."""

from __future__ import annotations

import os
from pathlib import Path


class Disk:
    """The disk as it is."""

    def write(self, fd: int, data: bytes) -> int:
        """Write bytes at the end of a file; return how many went in."""
        return os.write(fd, data)

    def sync(self, fd: int) -> None:
        """Return once what was written is on the medium."""
        # macOS has no fdatasync; fsync does more, never less.
        getattr(os, "fdatasync", os.fsync)(fd)

    def truncate(self, fd: int, size: int) -> None:
        """Cut a file to a size."""
        os.ftruncate(fd, size)

    def sync_folder(self, folder: Path) -> None:
        """Return once a folder's entries are on the medium."""
        fd = os.open(folder, os.O_RDONLY)
        try:
            os.fsync(fd)
        finally:
            os.close(fd)
