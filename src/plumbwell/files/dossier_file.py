"""The file of a dossier: an SQLite database with the points of one history, and how it is opened and checked.

The one place that connects. A file that is damaged, foreign or of another version is refused with a sentence and
never written to. What the points mean is left to `study.history`.
"""

from __future__ import annotations

import json
import sqlite3
from contextlib import closing
from dataclasses import dataclass
from pathlib import Path

from plumbwell.study.acts import act_from_data
from plumbwell.study.history import History, Point, act_text
from plumbwell.survey.errors import DossierError, shown

APPLICATION_ID = 0x504C4D42
VERSION = 1
MAGIC = b"SQLite format 3\0"
HEADER = 100
FIRST_SQLITE = (3, 37, 0)
"""From here on tables can be strict."""
LARGEST_CHECKED = 100 * 1024 * 1024
LONGEST_PATH = 300
LONGEST_VALUE = 64 * 1024 * 1024
PRAGMAS = (
    "trusted_schema=OFF", "cell_size_check=ON", "mmap_size=0", "foreign_keys=ON", "recursive_triggers=ON",
    "busy_timeout=2000", "temp_store=MEMORY", "synchronous=EXTRA",
)  # fmt: skip
SAFE = "Nothing was written to it. To begin anew, move the file elsewhere."

SCHEMA = (
    "CREATE TABLE meta(key TEXT PRIMARY KEY, value TEXT NOT NULL) STRICT, WITHOUT ROWID",
    """CREATE TABLE point(
      number INTEGER PRIMARY KEY CHECK(number >= 0),
      parent INTEGER REFERENCES point(number) CHECK(parent < number),
      act TEXT NOT NULL CHECK(length(act) BETWEEN 2 AND 60000000),
      who TEXT NOT NULL CHECK(length(who) <= 1000),
      at REAL NOT NULL,
      hash TEXT NOT NULL UNIQUE CHECK(length(hash) = 64),
      CHECK((number = 0) = (parent IS NULL))) STRICT""",
    """CREATE TABLE state(
      one INTEGER PRIMARY KEY CHECK(one = 1),
      cursor INTEGER NOT NULL REFERENCES point(number),
      tip INTEGER NOT NULL REFERENCES point(number),
      revision INTEGER NOT NULL CHECK(revision >= 0)) STRICT""",
    *(
        f"CREATE TRIGGER {table}_{name} BEFORE {event} ON {table} "
        f"BEGIN SELECT raise(ABORT, 'what was kept is never {done}'); END"
        for table in ("meta", "point")
        for name, event, done in (("kept", "DELETE", "deleted"), ("fixed", "UPDATE", "changed"))
    ),
    "CREATE TRIGGER state_kept BEFORE DELETE ON state BEGIN SELECT raise(ABORT, 'the state is never deleted'); END",
)


def connected(path: Path | None, *, read_only: bool = False) -> sqlite3.Connection:
    """A connection with all that keeps a dossier safe; None for one in memory.

    Raises
    ------
    sqlite3.Error
    DossierError
        When the SQLite library is too old.
    """
    if sqlite3.sqlite_version_info < FIRST_SQLITE:
        raise DossierError(
            f"The SQLite library of this Python is {sqlite3.sqlite_version}; acts are kept from 3.37 on."
        )
    if path is None:
        connection = sqlite3.connect(":memory:", isolation_level=None)
    elif read_only:
        connection = sqlite3.connect(f"{path.as_uri()}?mode=ro", uri=True, isolation_level=None)
    else:
        connection = sqlite3.connect(path, isolation_level=None)
    try:
        for limit, most in (
            (sqlite3.SQLITE_LIMIT_LENGTH, LONGEST_VALUE),
            (sqlite3.SQLITE_LIMIT_SQL_LENGTH, 1_000_000),
            (sqlite3.SQLITE_LIMIT_COLUMN, 100),
            (sqlite3.SQLITE_LIMIT_EXPR_DEPTH, 100),
            (sqlite3.SQLITE_LIMIT_ATTACHED, 0),
            (sqlite3.SQLITE_LIMIT_TRIGGER_DEPTH, 5),
        ):
            connection.setlimit(limit, most)
        if hasattr(connection, "setconfig"):
            connection.setconfig(sqlite3.SQLITE_DBCONFIG_DEFENSIVE, True)  # type: ignore[attr-defined,unused-ignore]
        for pragma in (*PRAGMAS, *(() if read_only else ("journal_mode=DELETE",))):
            connection.execute(f"PRAGMA {pragma}").fetchall()
    except BaseException:
        connection.close()
        raise
    return connection


def write_new(path: Path, history: History, meta: dict[str, str]) -> None:
    """Write a dossier file that is not there yet, with a history and what it belongs to."""
    with closing(connected(path)) as connection:
        connection.execute("PRAGMA page_size=4096")
        connection.execute("BEGIN IMMEDIATE")
        connection.execute(f"PRAGMA application_id={APPLICATION_ID}")
        connection.execute(f"PRAGMA user_version={VERSION}")
        for statement in SCHEMA:
            connection.execute(statement)
        connection.executemany("INSERT INTO meta VALUES(?, ?)", sorted(meta.items()))
        insert_points(connection, history.points)
        connection.execute("INSERT INTO state VALUES(1, ?, ?, 0)", (history.cursor, history.tip))
        connection.execute("COMMIT")


def insert_points(connection: sqlite3.Connection, points: tuple[Point, ...]) -> None:
    """Add points to the table."""
    connection.executemany(
        "INSERT INTO point VALUES(?, ?, ?, ?, ?, ?)",
        [(one.number, one.parent, act_text(one.act), one.who, one.when, one.hash) for one in points],
    )


@dataclass(frozen=True, slots=True, kw_only=True)
class Stored:
    """What a dossier file holds: its history, what it belongs to, how often it was written to."""

    history: History
    meta: dict[str, str]
    revision: int


def open_dossier(path: Path, *, read_only: bool = False) -> tuple[sqlite3.Connection, Stored]:
    """A connection to a dossier file and all that it holds, when it is whole.

    Raises
    ------
    DossierError
        When anything in it is not as it was written; the file is left as it is.
    """
    _check_header(path)
    try:
        connection = connected(path, read_only=read_only)
    except sqlite3.Error as error:
        raise _unreadable(path, error) from None
    try:
        return connection, _read(connection, path)
    except BaseException:
        connection.close()
        raise


def _check_header(path: Path) -> None:
    """Refuse a file that is no dossier of this version by its first bytes, before anything else looks at it."""
    try:
        if not path.is_file():
            raise _refused(path, "is no plain file")
        with open(path, "rb") as file:
            header = file.read(HEADER)
    except OSError as error:
        raise _refused(path, f"cannot be read ({error.strerror})") from None
    if len(header) < HEADER or not header.startswith(MAGIC):
        raise _refused(path, "is damaged, or no dossier at all")
    if int.from_bytes(header[68:72], "big") != APPLICATION_ID:
        raise _refused(path, "is a database of another program")
    version = int.from_bytes(header[60:64], "big")
    if version > VERSION:
        raise _refused(path, f"was written by a newer version of the program (its format is {version})")
    if version != VERSION or header[18:20] != b"\1\1":
        raise _refused(path, "was changed by another program")


def _read(connection: sqlite3.Connection, path: Path) -> Stored:
    try:
        if path.stat().st_size <= LARGEST_CHECKED:
            told = connection.execute("PRAGMA quick_check(1)").fetchone()
            if told != ("ok",):
                raise _refused(path, f"is damaged ({shown(told[0] if told else 'unreadable')})")
        if _shape(connection) != _shape_of_schema():
            raise _refused(path, "holds tables that the program did not make")
        meta = dict(connection.execute("SELECT key, value FROM meta"))
        points = _points(connection, path)
        state = connection.execute("SELECT cursor, tip, revision FROM state").fetchall()
    except (sqlite3.Error, OSError) as error:
        raise _unreadable(path, error) from None
    if not points or len(state) != 1 or not all(0 <= one < len(points) for one in state[0][:2]):
        raise _refused(path, "is damaged: the place in its history is lost")
    cursor, tip, revision = state[0]
    history = History(of=meta.get("readings", ""), points=points, cursor=cursor, tip=tip)
    try:
        history.verify()
    except DossierError as error:
        raise _refused(path, f"is damaged. {str(error).removesuffix('.')}") from None
    if history.children(tip) or cursor not in (one.number for one in history.line()):
        raise _refused(path, "is damaged: the place in its history is lost")
    return Stored(history=history, meta=meta, revision=revision)


def _points(connection: sqlite3.Connection, path: Path) -> tuple[Point, ...]:
    try:
        return tuple(_point(row) for row in connection.execute("SELECT * FROM point ORDER BY number"))
    except DossierError as error:
        raise _refused(path, f"cannot be read whole. {str(error).removesuffix('.')}") from None


def _point(row: tuple[int, int | None, str, str, float, str]) -> Point:
    number, parent, text, who, when, hash_ = row
    try:
        data = json.loads(text, parse_constant=_no_number)
        act = None if data is None else act_from_data(data)
        whole = act_text(act) == text
    except (ValueError, RecursionError):
        whole = False
    if not whole:
        raise DossierError(f"The history is damaged at its point {number}: its act cannot be read.")
    return Point(number=number, parent=parent, act=act, who=who, when=when, hash=hash_)


def _no_number(word: str) -> float:
    raise ValueError(word)


def _shape(connection: sqlite3.Connection) -> set[tuple[str, str, str, str]]:
    """Everything that a database is made of, its wording without regard to blanks."""
    rows = connection.execute("SELECT type, name, tbl_name, sql FROM sqlite_schema").fetchall()
    return {(kind, name, table, " ".join((sql or "").split())) for kind, name, table, sql in rows}


def _shape_of_schema() -> set[tuple[str, str, str, str]]:
    with closing(connected(None)) as connection:
        for statement in SCHEMA:
            connection.execute(statement)
        return _shape(connection)


def _told(path: Path) -> str:
    return f'The dossier "{shown(path, LONGEST_PATH)}"'


def _unreadable(path: Path, error: Exception) -> DossierError:
    """What to say when SQLite or the disk refuses to read a dossier."""
    if getattr(error, "sqlite_errorcode", None) in (sqlite3.SQLITE_BUSY, sqlite3.SQLITE_LOCKED):
        return DossierError(f"{_told(path)} is held by another program; try again.")
    damaged = isinstance(error, sqlite3.DatabaseError) and not isinstance(error, sqlite3.OperationalError)
    return _refused(path, f"{'is damaged' if damaged else 'cannot be read'} ({error})")


def _refused(path: Path, why: str) -> DossierError:
    return DossierError(f"{_told(path)} {why}. {SAFE}")
