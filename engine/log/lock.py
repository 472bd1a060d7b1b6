"""One writer a night: the lock on the log, and the note that says who holds it.

The lock is the kernel's (flock on the log itself): it ends with the process, however that ends. The
note is a file of its own beside the log, ``.NAME.held``; it only tells a person whom to ask, it
decides nothing, and nothing about it can damage the log. A forked child would keep the lock after
its parent has let go: children are to be started afresh (spawn), never forked.
"""

from __future__ import annotations

import contextlib
import fcntl
import getpass
import os
import socket
from pathlib import Path

from engine.errors import LogError
from engine.times import iso_from_mjd

# File systems on which flock is known not to reach other computers, or not reliably.
_NETWORK = frozenset({"nfs", "nfs4", "cifs", "smb3", "smbfs", "9p", "fuse.sshfs", "afs", "ceph"})


def take_lock(path: Path, fd: int) -> None:
    """Take the lock on an open log; LogError, which says who has it, when it can't be had."""
    try:
        fcntl.flock(fd, fcntl.LOCK_EX | fcntl.LOCK_NB)
    except BlockingIOError:
        raise LogError(
            f"{path}: this night is open already, by {_holder(path)}; close it there, "
            "or look on with 'warmroom follow'"
        ) from None
    except OSError as error:
        raise LogError(
            f"{path}: no lock can be had here ({error.strerror}); keep the log on a local disk"
        ) from None


def sign(path: Path, now_mjd: float) -> None:
    """Write down who holds the lock and since when. The lock must be held."""
    try:
        user = getpass.getuser()
    except (KeyError, OSError):
        user = f"user {os.getuid()}"
    text = (
        f"{user} on {socket.gethostname()}, process {os.getpid()}, "
        f"since {iso_from_mjd(now_mjd)[:19]}Z\n"
    )
    with contextlib.suppress(OSError):
        _note(path).write_text(text, encoding="utf-8")


def unsign(path: Path) -> None:
    """Take the note away. The lock must still be held."""
    with contextlib.suppress(OSError):
        _note(path).unlink(missing_ok=True)


def network_disk(folder: Path) -> str | None:
    """Return the type of the network file system a folder is on; None for a local one or unknown.

    Reads the system's own table of mounts, which only Linux has.
    """
    try:
        mounts = Path("/proc/self/mounts").read_text(encoding="utf-8").splitlines()
        there = folder.resolve()
    except (OSError, UnicodeDecodeError):
        return None
    best, kind = -1, ""
    for line in mounts:
        _, mounted, fs_type, *_ = line.split(" ")
        point = Path(mounted.replace("\\040", " "))
        if there.is_relative_to(point) and len(point.parts) >= best:
            best, kind = len(point.parts), fs_type
    return kind if kind in _NETWORK else None


def _holder(path: Path) -> str:
    try:
        return _note(path).read_text(encoding="utf-8").strip() or "another console"
    except (OSError, UnicodeDecodeError):
        return "another console"


def _note(path: Path) -> Path:
    return path.with_name(f".{path.name}.held")
