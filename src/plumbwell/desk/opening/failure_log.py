"""The log of failures: what broke, where in the program, and nothing of what was measured.

The rule that keeps readings out: of an error its type and the places in the program are written, never its message
and never a value of a variable, because both may hold cells of a table. Messages are kept only of Qt, which sees no
readings, and of the operating system, by its own name for the trouble and without the file.
"""

from __future__ import annotations

import errno
import faulthandler
import platform
import sys
import threading
import traceback
from collections import Counter
from datetime import UTC, datetime
from pathlib import Path
from typing import TextIO

from PySide6.QtCore import qVersion

from plumbwell import __version__

LOG_NAME = "plumbwell.log"
LARGEST = 512 * 1024
"""Bytes from which a log is put aside at the next start, and at which one run stops writing."""

KEPT = 3
"""Logs put aside that are kept."""

SAME_SAID = 3
"""How often the same text is written in one run."""

LONGEST_MESSAGE = 300
MOST_FRAMES = 60
MOST_CAUSES = 8


def versions() -> str:
    """Return the versions that a report of a failure needs, in a line."""
    return (
        f"Plumbwell {__version__}, Python {platform.python_version()}, Qt {qVersion()}, "
        f"{platform.system()} {platform.release()} {platform.machine()}"
    )


def _place(file: str) -> str:
    """A source file without the folders of this machine: from the package on, else its last two parts."""
    parts = Path(file).parts
    if "plumbwell" in parts:
        last = len(parts) - 1 - parts[::-1].index("plumbwell")
        return "/".join(parts[last:])
    return "/".join(parts[-2:])


def _kind(error: BaseException) -> str:
    kind = type(error)
    name = kind.__qualname__ if kind.__module__ == "builtins" else f"{kind.__module__}.{kind.__qualname__}"
    if isinstance(error, OSError) and error.errno is not None:
        name += f" ({errno.errorcode.get(error.errno, error.errno)})"
    return name


def traced(error: BaseException) -> str:
    """Return type and places of an error and of what caused it, without messages and values.

    Parameters
    ----------
    error : BaseException

    Returns
    -------
    str
        Lines, the innermost place last: ``plumbwell/study/reduce.py:120 reduce``.
    """
    blocks: list[str] = []
    seen: set[int] = set()
    one: BaseException | None = error
    while one is not None and id(one) not in seen and len(blocks) < MOST_CAUSES:
        seen.add(id(one))
        frames = [
            f"  {_place(frame.f_code.co_filename)}:{line} {frame.f_code.co_name}"
            for frame, line in traceback.walk_tb(one.__traceback__)
        ]
        if len(frames) > MOST_FRAMES:
            half = MOST_FRAMES // 2
            frames = [*frames[:half], f"  ... {len(frames) - 2 * half} more", *frames[-half:]]
        blocks.append("\n".join([_kind(one), *frames]))
        one = one.__cause__ or (None if one.__suppress_context__ else one.__context__)
    return "\ncaused by ".join(blocks)


class FailureLog:
    """One log file, written line by line and flushed at once.

    Parameters
    ----------
    folder : Path
        The user's data folder; made when it is missing.
    """

    def __init__(self, folder: Path) -> None:
        self.path = folder / LOG_NAME
        # Entered again when collecting garbage while writing makes Qt say something.
        self._lock = threading.RLock()
        self._said: Counter[str] = Counter()
        self._written = 0
        self._file: TextIO | None = None
        try:
            folder.mkdir(parents=True, exist_ok=True)
            _put_aside(self.path)
            self._file = self.path.open("a", encoding="utf-8", errors="backslashreplace")
        except OSError:
            # A full or locked disk must not keep the window from opening; failures are then only shown.
            self._file = None
            return
        self.write(f"started: {versions()}")

    def write(self, text: str) -> None:
        """Write a text with its time; the same text at most three times, and no more than half a megabyte a run."""
        with self._lock:
            self._said[text] += 1
            if self._file is None or self._said[text] > SAME_SAID or self._written > LARGEST:
                return
            entry = f"{datetime.now(UTC):%Y-%m-%dT%H:%M:%SZ} {text}\n"
            self._written += len(entry)
            if self._said[text] == SAME_SAID:
                entry += "  (said no more in this run)\n"
            try:
                self._file.write(entry)
                self._file.flush()
            except (OSError, ValueError):
                self._file = None

    def catch_crashes(self) -> None:
        """Let a crash of the process write its places into the log too."""
        if self._file is not None:
            faulthandler.enable(file=self._file)

    def close(self) -> None:
        """End the log, and the catching of crashes if it was begun."""
        with self._lock:
            if self._file is not None:
                if faulthandler.is_enabled():
                    faulthandler.disable()
                    if sys.__stderr__ is not None:
                        faulthandler.enable(file=sys.__stderr__)
                self._file.close()
                self._file = None


def _put_aside(path: Path) -> None:
    """Rename a log that has grown large, and those before it; the oldest goes."""
    try:
        if path.stat().st_size < LARGEST:
            return
        for number in range(KEPT, 0, -1):
            older = path.with_name(f"{path.name}.{number}")
            newer = path if number == 1 else path.with_name(f"{path.name}.{number - 1}")
            if newer.exists():
                newer.replace(older)
    except FileNotFoundError:
        return
    except OSError:
        # Another window holds the file open: it is written on.
        return


def start_log(folder: Path) -> FailureLog:
    """Return a log in the user's data folder, begun with the versions; crashes write into it."""
    log = FailureLog(folder)
    log.catch_crashes()
    return log
