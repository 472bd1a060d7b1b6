"""The few calls by which the log touches the disk: in one place, so that tests can fail them."""

from __future__ import annotations

import errno
import fcntl
import os
import sys
from pathlib import Path


class Disk:
    """The disk as it is. Each call raises OSError when it fails."""

    def write(self, fd: int, data: bytes) -> int:
        """Write bytes at the end of a file; return how many went in."""
        return os.write(fd, data)

    def sync(self, fd: int) -> None:
        """Return once what was written is on the medium."""
        if sys.platform == "darwin":
            # There fsync stops at the drive's own memory, says its manual page (fsync(2)).
            fcntl.fcntl(fd, fcntl.F_FULLFSYNC)
        else:
            os.fdatasync(fd)

    def truncate(self, fd: int, size: int) -> None:
        """Cut a file to a size."""
        os.ftruncate(fd, size)

    def link(self, source: Path, path: Path) -> None:
        """Give a file a second name; FileExistsError when there is a file of that name."""
        os.link(source, path)

    def replace(self, source: Path, path: Path) -> None:
        """Let a file take a name, in one step, from the file that has it."""
        os.replace(source, path)

    def sync_folder(self, folder: Path) -> None:
        """Return once a folder's entries are on the medium."""
        fd = os.open(folder, os.O_RDONLY)
        try:
            os.fsync(fd)
        except OSError as error:
            # Some network and FUSE disks sync no folders: nothing more can be done there.
            if error.errno not in (errno.EINVAL, errno.ENOTSUP):
                raise
        finally:
            os.close(fd)

    def write_all(self, fd: int, data: bytes) -> None:
        """Write all of some bytes at the end of a file.

        A full disk takes what fits and says nothing: the next write then says why.
        """
        done = self.write(fd, data)
        while done < len(data):
            more = self.write(fd, data[done:])
            if more <= 0:
                raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))
            done += more


def is_file_at(fd: int, path: Path) -> bool:
    """Say whether an open file is the one that has a name; OSError when that can't be told."""
    here = os.fstat(fd)
    try:
        there = os.stat(path)
    except (FileNotFoundError, NotADirectoryError):
        return False
    return (here.st_dev, here.st_ino) == (there.st_dev, there.st_ino)


def remedy(error: OSError) -> str:
    """Return what the observer can do about a disk that fails, in one line."""
    said = error.strerror or str(error)
    return f"{said}: {_REMEDIES.get(error.errno or 0, _OTHER)}"


_OTHER = "the console keeps trying; leave it open and look at the disk"
_ROOM = "make room on the disk; the console keeps trying, leave it open"
_FAILS = "the disk fails; leave the console open and call who looks after it"
_REMEDIES = {
    errno.ENOSPC: _ROOM,
    errno.EDQUOT: _ROOM,
    errno.EFBIG: _ROOM,
    errno.EROFS: "the disk is read-only now; leave the console open and call who looks after it",
    errno.EACCES: "the folder's permissions were changed; restore them, the console keeps trying",
    errno.EPERM: "the folder's permissions were changed; restore them, the console keeps trying",
    errno.ENOENT: "the log's folder is gone; put it back, and the whole log is written there anew",
    errno.ENOTDIR: "the log's folder is gone; put it back, and the whole log is written there anew",
    errno.ESTALE: "another file stands in the log's place; move it away, the console keeps trying",
    errno.EIO: _FAILS,
    errno.ENXIO: _FAILS,
    errno.ENODEV: _FAILS,
}
