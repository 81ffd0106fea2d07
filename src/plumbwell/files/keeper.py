"""The keeper: every act is on the disk before it is shown.

The acts on a survey folder live in an unnamed dossier in the user's data folder, found again by the path of the
folder and the bytes of its readings. One window at a time writes to it; a second one may look.
"""

from __future__ import annotations

import hashlib
import os
import sqlite3
import time
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from pathlib import Path

from plumbwell import __version__
from plumbwell.files.dossier_file import connected, insert_points, open_dossier, write_new
from plumbwell.files.user_folders import data_folder, user_name
from plumbwell.files.window_lock import LockHeld, WindowLock
from plumbwell.study.act_wording import day
from plumbwell.study.acts import Act
from plumbwell.study.docket.wording import counted
from plumbwell.study.history import History
from plumbwell.survey.errors import DossierError, shown
from plumbwell.survey.survey import Survey

FOLDER = "dossiers"
ENDING = ".plumb"
FORMAT = "plumbwell-dossier/1"
EPOCH = 946_684_800.0
"""2000-01-01T00:00:00Z in the system's seconds."""
DIGITS = 16
"""Of a hash in a file name."""


def readings_sha256(survey: Survey) -> str:
    """The SHA-256 of the file of a survey's readings, as it was when it was read.

    Raises
    ------
    DossierError
        When the survey was not read from a folder.
    """
    for file in survey.files:
        if shown(file.name) == survey.readings.raw.file:
            return file.sha256
    raise DossierError("Acts are kept for surveys that were read from a folder; this one was not.")


def now() -> float:
    """The present, UTC, s since 2000-01-01, to the millisecond."""
    return round(time.time() - EPOCH, 3)


class Keeper:
    """The history of one survey folder, and the file in which it is kept.

    Made by `Keeper.open`. `history` is what the file holds; `survey` what its acts are applied to.

    Attributes
    ----------
    path : Path
        The dossier; it is written with the first act.
    survey : Survey
    history : History
    read_only : str or None
        Why acts cannot be made here, in a sentence; None when they can.
    earlier : str or None
        A sentence about acts on earlier readings of the folder, which are not applied.
    notices : tuple of str
        All that a person should be told on opening, in sentences; `read_only` and `earlier` are among them.
    """

    def __init__(self, path: Path, survey: Survey, *, folder: Path, who: str) -> None:
        self.path, self.survey, self.who = path, survey, who
        self.read_only: str | None = None
        self.earlier: str | None = None
        self.notices: tuple[str, ...] = ()
        self._folder = folder
        self._lock: WindowLock | None = None
        self._connection: sqlite3.Connection | None = None
        self._identity: tuple[int, int] | None = None
        self._revision = 0
        self.history = History.begun(readings_sha256(survey), who=who, when=now())

    @classmethod
    def open(
        cls, folder: str | os.PathLike[str], survey: Survey, *, home: Path | None = None, who: str | None = None
    ) -> Keeper:
        """The keeper of a survey folder, with the history that was kept for it.

        Parameters
        ----------
        folder : path-like
            The survey folder, or its survey.toml.
        survey : Survey
            As `read_survey` gave it.
        home : Path or None
            None: the user's data folder.
        who : str or None
            Who makes the acts; None: the user's name.

        Raises
        ------
        DossierError
            When the file that was kept is damaged or foreign; it is left as it is.
        """
        resolved = _survey_folder(Path(folder))
        place = (data_folder() if home is None else home) / FOLDER
        path = place / _file_name(resolved, readings_sha256(survey))
        keeper = cls(path, survey, folder=resolved, who=user_name() if who is None else who)
        try:
            keeper._take_lock()
            keeper._read()
        except BaseException:
            keeper.close()
            raise
        keeper.history, left = keeper.history.standing(survey)
        keeper.earlier = _earlier(path)
        keeper.notices = tuple(one for one in (keeper.read_only, left, keeper.earlier) if one is not None)
        return keeper

    def __enter__(self) -> Keeper:
        return self

    def __exit__(self, *_: object) -> None:
        self.close()

    def close(self) -> None:
        """Let go of the file and its lock. Everything is kept already."""
        connection, self._connection = self._connection, None
        lock, self._lock = self._lock, None
        if connection is not None:
            connection.close()
        if lock is not None:
            lock.release()
        self.read_only = self.read_only or "This survey is closed: no more acts can be made."

    def act(self, act: Act) -> History:
        """The history with an act, kept.

        Raises
        ------
        ActRefused
            When the case cannot take it.
        DossierError
            When it cannot be kept. In both cases everything is as it was.
        """
        return self.keep(self.history.with_act(act, survey=self.survey, who=self.who, when=now()))

    def undo(self) -> History:
        """The history one act back, kept; raises as `act`."""
        return self._moved(self.history.undo())

    def redo(self) -> History:
        """The history one act on, kept; raises as `act`."""
        return self._moved(self.history.redo())

    def go_to(self, number: int) -> History:
        """The history at any of its points, kept; raises as `act`."""
        return self._moved(self.history.go_to(number))

    def _moved(self, history: History) -> History:
        if history == self.history:
            return self.history
        history.case(self.survey)
        return self.keep(history)

    def keep(self, history: History) -> History:
        """Store what a history has more than the file, points and cursor, in one transaction.

        Raises
        ------
        DossierError
            When it cannot be stored, saying why; `self.history` and the file are then as they were.
        """
        if self.read_only is not None:
            raise DossierError(self.read_only)
        kept = len(self.history.points)
        if history.points[:kept] != self.history.points:
            raise DossierError("This history does not go on from the one that is kept.")
        try:
            if self._connection is None:
                self._begin(history)
            else:
                self._add(self._connection, history)
        except (sqlite3.Error, OSError, DossierError) as error:
            raise DossierError(f"The act cannot be kept, so it was not made: {_reason(error)}") from error
        self.history = history
        return history

    def _add(self, connection: sqlite3.Connection, history: History) -> None:
        """Write what a history has more than the file."""
        with self._transaction(connection):
            insert_points(connection, history.points[len(self.history.points) :])
            changed = connection.execute(
                "UPDATE state SET cursor = ?, tip = ?, revision = revision + 1 WHERE revision = ?",
                (history.cursor, history.tip, self._revision),
            )
            if changed.rowcount != 1:
                raise DossierError("the dossier was changed by another program meanwhile.")
        self._revision += 1

    @contextmanager
    def _transaction(self, connection: sqlite3.Connection) -> Iterator[None]:
        """Everything in the block or nothing of it."""
        if _identity(self.path) != self._identity:
            raise DossierError(f'the dossier "{shown(self.path, 300)}" was moved or replaced.')
        try:
            connection.execute("BEGIN IMMEDIATE")
            yield
            connection.execute("COMMIT")
        except BaseException:
            if connection.in_transaction:
                with suppress(sqlite3.Error):
                    connection.execute("ROLLBACK")
            raise

    def _begin(self, history: History) -> None:
        """Write the file with a history that has no file yet: aside, then to its place."""
        aside = self.path.with_name(f"{self.path.name}.part")
        for left in (aside, aside.with_name(f"{aside.name}-journal")):
            left.unlink(missing_ok=True)
        meta = {
            "format": FORMAT,
            "made_by": __version__,
            "folder": str(self._folder).encode("utf-8", "backslashreplace").decode(),
            "readings": history.of,
        }
        try:
            write_new(aside, history, meta)
            os.replace(aside, self.path)
        except BaseException:
            with suppress(OSError):
                aside.unlink(missing_ok=True)
            raise
        _sync_folder(self.path.parent)
        self._connection = connected(self.path)
        self._identity, self._revision = _identity(self.path), 0

    def _take_lock(self) -> None:
        try:
            self.path.parent.mkdir(parents=True, exist_ok=True, mode=0o700)
            self._lock = WindowLock(self.path.with_name(f"{self.path.name}.lock"))
        except LockHeld as held:
            self.read_only = (
                f"This survey is open in another window ({held}). It can be looked at here; acts are made there."
            )
        except OSError as error:
            self.read_only = (
                f'Acts cannot be kept, so none can be made: "{shown(self.path.parent, 300)}" cannot be written to '
                f"({error.strerror})."
            )

    def _read(self) -> None:
        """Read the file, where there is one."""
        try:
            if not self.path.exists():
                return
        except OSError:
            return
        self._connection, stored = open_dossier(self.path, read_only=self.read_only is not None)
        if stored.history.of != self.history.of:
            raise DossierError(f'The dossier "{shown(self.path, 300)}" belongs to other readings.')
        self.history, self._revision = stored.history, stored.revision
        self._identity = _identity(self.path)


def _survey_folder(given: Path) -> Path:
    resolved = given.resolve()
    return resolved.parent if resolved.is_file() else resolved


def _file_name(folder: Path, readings: str) -> str:
    """The name of the dossier of a survey folder: for a person to know it, and by the hashes of path and readings."""
    name = "".join(c if c.isascii() and c.isalnum() else "_" for c in folder.name)[:40] or "survey"
    path = hashlib.sha256(os.fsencode(os.path.normcase(folder))).hexdigest()
    return f"{name}-{path[:DIGITS]}-{readings[:DIGITS]}{ENDING}"


def _earlier(path: Path) -> str | None:
    """A sentence about the acts in other dossiers of the same folder, those of earlier readings."""
    stem = path.name[: -len(ENDING) - DIGITS]
    acts, last = 0, 0.0
    with suppress(OSError):
        for other in sorted(path.parent.iterdir()):
            if other.name.startswith(stem) and other.name.endswith(ENDING) and other != path:
                with suppress(DossierError):
                    connection, stored = open_dossier(other, read_only=True)
                    connection.close()
                    points = stored.history.points
                    acts += len(points) - 1
                    last = max(last, points[-1].when)
    if not acts:
        return None
    were = "was" if acts == 1 else "were"
    return (
        f"{counted(acts, 'act')} {were} made on earlier readings of this folder, the last on {day(last)}. "
        f"{'It is' if acts == 1 else 'They are'} kept and not applied, since the readings are others now."
    )


def _identity(path: Path) -> tuple[int, int] | None:
    try:
        status = path.stat()
    except OSError:
        return None
    return (status.st_dev, status.st_ino)


def _sync_folder(folder: Path) -> None:
    """Make sure that a name in a folder is on the disk, where folders can be asked that."""
    with suppress(OSError):
        handle = os.open(folder, os.O_RDONLY)
        try:
            os.fsync(handle)
        finally:
            os.close(handle)


def _reason(error: Exception) -> str:
    """Why something could not be written, for the person at the desk."""
    if isinstance(error, DossierError):
        return str(error)
    if isinstance(error, OSError):
        return f"{error.strerror or error}."
    code = getattr(error, "sqlite_errorcode", 0) or 0
    words = {
        sqlite3.SQLITE_FULL: "the disk is full.",
        sqlite3.SQLITE_READONLY: "the dossier cannot be written to.",
        sqlite3.SQLITE_BUSY: "another program holds the dossier.",
        sqlite3.SQLITE_IOERR: "the disk refused (it may be full or gone).",
        sqlite3.SQLITE_CANTOPEN: "the dossier cannot be opened.",
        sqlite3.SQLITE_TOOBIG: "it is too large.",
    }
    return words.get(code & 0xFF, f"{error}.")
