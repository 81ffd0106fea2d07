"""The document: one survey in front, its acts, and what was reduced from it; the only place where a case changes.

An act is kept on the disk before it is shown. Reducing goes on beside the window: the newest case replaces the one
that waits, and an answer to an older case is dropped.
"""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from time import time
from typing import Any

from PySide6.QtCore import QObject, Signal

from plumbwell.desk.jobs import Answer, Lane, Progress, Stopped, end_all
from plumbwell.files.folder import read_survey
from plumbwell.files.keeper import Keeper, now
from plumbwell.study.acts import Act
from plumbwell.study.case import Case
from plumbwell.study.history import History
from plumbwell.study.kept import Kept
from plumbwell.study.reduce import reduce
from plumbwell.study.results import Results
from plumbwell.survey.errors import PlumbwellError
from plumbwell.survey.survey import Survey


class Document(QObject):
    """The survey in front.

    Signals
    -------
    opened
        A survey was read; nothing of it is reduced yet.
    not_opened(str, Exception)
        A folder could not be read, or its reading was stopped: its path, and why.
    changed
        An act was taken, taken back or taken again.
    reduced
        There is a new result.
    not_reduced(Exception)
        The present case cannot be reduced; the result before stands, and is that of another case.
    working(bool)
        A result is on its way, or has come.
    told(str)
        A sentence for the person.
    done(object)
        The value that a long work gave.
    not_done(Exception)
        A long work failed or was stopped.
    progressed(float, str)
        How far the long work is.
    """

    opened = Signal()
    not_opened = Signal(str, object)
    changed = Signal()
    reduced = Signal()
    not_reduced = Signal(object)
    working = Signal(bool)
    told = Signal(str)
    done = Signal(object)
    not_done = Signal(object)
    progressed = Signal(float, str)

    def __init__(self, home: Path, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self._home = home
        self._live = Lane("live lane", replaces=True, parent=self)
        self._long = Lane("long lane", replaces=False, parent=self)
        self._reader = Lane("reading lane", replaces=True, parent=self)
        self._live.answered.connect(self._take_result)
        self._long.answered.connect(self._take_long)
        self._reader.answered.connect(self._take_read)
        self._long.progressed.connect(lambda _, share, what: self.progressed.emit(share, what))
        self._opening: tuple[int, Path] | None = None
        self._ticket: int | None = None
        self._asked = 0
        self._kept = Kept()
        self._keeper: Keeper | None = None
        self.folder: Path | None = None
        self.survey: Survey | None = None
        self.case: Case | None = None
        self.results: Results | None = None
        self.reduced_case: Case | None = None
        self.saved: float | None = None

    @property
    def busy(self) -> bool:
        """Whether a folder is being read, or a result is on its way."""
        return self._opening is not None or self._ticket is not None

    @property
    def current(self) -> bool:
        """Whether the result is that of the present case."""
        return self._ticket is None and self.results is not None and self.reduced_case is self.case

    @property
    def at_work(self) -> bool:
        """Whether a long work is being done or waits."""
        return self._asked > 0

    # -- opening ---------------------------------------------------------------------------------------------

    def open(self, path: Path) -> None:
        """Read a survey folder (or the folder of a survey.toml) beside the window."""
        folder = path.parent if path.name == "survey.toml" else path
        self._opening = self._reader.request(lambda _: read_survey(folder)), folder

    def _take_read(self, answer: Answer) -> None:
        if self._opening is None or answer.ticket != self._opening[0]:
            return  # another folder was asked for since, or it was stopped
        folder, self._opening = self._opening[1], None
        if answer.error is None:
            self._take_survey(folder, answer.value)
            return
        self.not_opened.emit(str(folder), answer.error)
        if not isinstance(answer.error, PlumbwellError | OSError):
            raise answer.error

    def _take_survey(self, folder: Path, survey: Survey) -> None:
        unread = ""
        try:
            # The one before is let go first, for it may be of this very folder.
            if self._keeper is not None:
                self._keeper.close()
            self._keeper = keeper = Keeper.open(folder, survey, home=self._home)
        except PlumbwellError as error:
            # A dossier that cannot be read stays as it is; the survey can be seen all the same.
            self._keeper = keeper = None
            unread = str(error)
        self.folder, self.survey, self.results, self.saved = folder.resolve(), survey, None, None
        self.reduced_case, self._ticket, self._kept = None, None, Kept()
        self.case = Case(survey=survey) if keeper is None else keeper.history.case(survey)
        self.opened.emit()
        notices = (unread,) if keeper is None else keeper.notices
        if notices:
            self.told.emit(" ".join(notices))
        self._reduce()

    def close(self) -> None:
        """End the work and let go of the dossier; nothing is asked, for every act is already kept."""
        end_all(self._live, self._long, self._reader)
        if self._keeper is not None:
            self._keeper.close()
            self._keeper = None

    # -- acts ------------------------------------------------------------------------------------------------

    @property
    def history(self) -> History | None:
        """The acts of this survey; None where nothing is open, or its dossier cannot be read."""
        return None if self._keeper is None else self._keeper.history

    def act(self, act: Act) -> str | None:
        """Take an act: keep it, then show it. Returns None, or the sentence that says why it cannot be."""
        return self._turn(
            lambda keeper: keeper.history.with_act(act, survey=keeper.survey, who=keeper.who, when=now())
        )

    def undo(self) -> str | None:
        """Take the last act back."""
        return self._turn(lambda keeper: keeper.history.undo())

    def redo(self) -> str | None:
        """Take the act again that was taken back last."""
        return self._turn(lambda keeper: keeper.history.redo())

    def go_to(self, number: int) -> str | None:
        """Go to any point of the history."""
        return self._turn(lambda keeper: keeper.history.go_to(number))

    def _turn(self, turned: Callable[[Keeper], History]) -> str | None:
        keeper = self._keeper
        if self.survey is None:
            return "No survey is open."
        if keeper is None:
            return (
                "Nothing can be changed, because the dossier of this survey cannot be read. Move that file elsewhere "
                "and read the folder again; acts are then kept in a new one."
            )
        try:
            history = turned(keeper)
            if history == keeper.history:
                return None
            case = history.case(keeper.survey)
            # While the disk makes sure of the act, its result is worked out already; it is shown only when it is kept.
            ahead = None if case is self.case else self._request(case)
            try:
                keeper.keep(history)
            except BaseException:
                if ahead is not None and self._ticket is not None:
                    # It took the place of one that waited for the case that stands.
                    self._reduce()
                raise
        except PlumbwellError as error:
            return str(error)
        self.saved = time()
        former, self.case = self.case, case
        self.changed.emit()
        if case is not former and ahead is not None:
            self._await(ahead)
        return None

    # -- reducing --------------------------------------------------------------------------------------------

    def _reduce(self) -> None:
        assert self.case is not None
        self._await(self._request(self.case))

    def _request(self, case: Case) -> int:
        """Ask for a case to be reduced; its answer counts once it is awaited."""
        kept = self._kept
        return self._live.request(lambda progress: (case, reduce(case, kept=kept)))

    def _await(self, ticket: int) -> None:
        self._ticket = ticket
        self.working.emit(True)

    def _take_result(self, answer: Answer) -> None:
        if answer.ticket != self._ticket:
            return
        self._ticket = None
        if answer.error is None:
            self.reduced_case, self.results = answer.value
            self.working.emit(False)
            self.reduced.emit()
            return
        self.working.emit(False)
        self.not_reduced.emit(answer.error)
        if not isinstance(answer.error, PlumbwellError):
            raise answer.error

    # -- long work -------------------------------------------------------------------------------------------

    def long_work(self, work: Callable[[Progress], Any]) -> None:
        """Have something done on the long lane; `done` or `not_done` tells how it ended."""
        self._asked += 1
        self._long.request(work)

    def stop(self) -> None:
        """Stop the long work at its next step, and do without the folder that is being read."""
        self._long.stop()
        if self._opening is not None:
            folder, self._opening = self._opening[1], None
            self.not_opened.emit(str(folder), Stopped())

    def _take_long(self, answer: Answer) -> None:
        self._asked -= 1
        if answer.error is None:
            self.done.emit(answer.value)
            return
        self.not_done.emit(answer.error)
        if not isinstance(answer.error, PlumbwellError | OSError | Stopped):
            raise answer.error
