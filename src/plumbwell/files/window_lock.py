"""One window at a time on a dossier: a lock file beside it that names who holds it.

The operating system holds the lock itself and lets go of it when the process ends, however it ends, so that the
file of a dead process is simply taken over.
"""

from __future__ import annotations

import json
import os
import socket
from contextlib import suppress
from pathlib import Path

from plumbwell.files.user_folders import user_name
from plumbwell.survey.errors import shown

LONGEST = 4096
FAR_BYTE = 1 << 30
"""On Windows the locked byte lies beyond the text, which others may then read."""


class LockHeld(Exception):
    """Another window holds the lock; the text says whose."""


class WindowLock:
    """A lock that is held until `release`.

    Parameters
    ----------
    path : Path
        The lock file; its folder is there.

    Raises
    ------
    LockHeld
        When another window holds it.
    OSError
        When the file cannot be made.
    """

    def __init__(self, path: Path) -> None:
        self.path = path
        while True:
            handle = os.open(path, os.O_RDWR | os.O_CREAT | getattr(os, "O_CLOEXEC", 0), 0o600)
            try:
                _lock(handle)
            except OSError:
                holder = _holder(handle)
                os.close(handle)
                raise LockHeld(holder) from None
            if _is_still(handle, path):
                break
            os.close(handle)  # the one before has removed it meanwhile
        self._handle: int | None = handle
        text = json.dumps({"user": user_name(), "host": socket.gethostname(), "process": os.getpid()})
        os.ftruncate(handle, 0)
        os.lseek(handle, 0, os.SEEK_SET)
        os.write(handle, text.encode())

    def release(self) -> None:
        """Let go of the lock and take its file away; a second time does nothing."""
        handle, self._handle = self._handle, None
        if handle is None:
            return
        if os.name == "posix":
            with suppress(OSError):
                self.path.unlink()
            os.close(handle)
        else:
            os.close(handle)
            with suppress(OSError):
                self.path.unlink()


def _lock(handle: int) -> None:
    """Take the system's lock on an open file, or raise OSError at once."""
    if os.name == "posix":
        import fcntl

        fcntl.flock(handle, fcntl.LOCK_EX | fcntl.LOCK_NB)
    else:
        import msvcrt

        os.lseek(handle, FAR_BYTE, os.SEEK_SET)
        msvcrt.locking(handle, msvcrt.LK_NBLCK, 1)  # type: ignore[attr-defined,unused-ignore]


def _is_still(handle: int, path: Path) -> bool:
    """Whether the open file is still the one of that name."""
    try:
        there, own = os.stat(path), os.fstat(handle)
    except OSError:
        return False
    return (there.st_dev, there.st_ino) == (own.st_dev, own.st_ino)


def _holder(handle: int) -> str:
    """Who holds a lock, as its file says: user, computer and process."""
    try:
        os.lseek(handle, 0, os.SEEK_SET)
        told = json.loads(os.read(handle, LONGEST))
        return f"{shown(told['user'])} on {shown(told['host'])}, process {int(told['process'])}"
    except (OSError, ValueError, TypeError, KeyError, RecursionError):
        return "another window"
