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

from plumbwell.desk.jobs import Answer, Lane, Progress, Stopped
from plumbwell.files.folder import read_survey
from plumbwell.files.keeper import Keeper
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
        A folder could not be read: its path, and why.
    changed
        An act was taken, taken back or taken again.
    reduced
        There is a new result.
    not_reduced(Exception)
        The present case cannot be reduced; the result before stands.
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
        self._live.answered.connect(self._take_result)
        self._long.answered.connect(self._take_long)
        self._long.progressed.connect(lambda _, share, what: self.progressed.emit(share, what))
        self._opening: dict[int, Path] = {}
        self._ticket = 0
        self._kept = Kept()
        self._keeper: Keeper | None = None
        self.folder: Path | None = None
        self.survey: Survey | None = None
        self.case: Case | None = None
        self.results: Results | None = None
        self.reduced_case: Case | None = None
        self.saved: float | None = None
        self.busy = False

    # -- opening ---------------------------------------------------------------------------------------------

    def open(self, path: Path) -> None:
        """Read a survey folder (or the folder of a survey.toml) beside the window."""
        folder = path.parent if path.name == "survey.toml" else path
        self.busy = True
        ticket = self._long.request(lambda progress: _read(folder, progress))
        self._opening[ticket] = folder

    def _take_survey(self, folder: Path, survey: Survey) -> None:
        try:
            # The one before is let go first, for it may be of this very folder.
            if self._keeper is not None:
                self._keeper.close()
            self._keeper = keeper = Keeper.open(folder, survey, home=self._home)
        except PlumbwellError as error:
            # A dossier that cannot be read stays as it is; the survey can be seen all the same.
            self._keeper = keeper = None
            self.told.emit(str(error))
        self.folder, self.survey, self.results, self.saved = folder.resolve(), survey, None, None
        self._kept = Kept()
        self.case = Case(survey=survey) if keeper is None else keeper.history.case(survey)
        self.opened.emit()
        for sentence in () if keeper is None else keeper.notices:
            self.told.emit(sentence)
        self._reduce()

    def close(self) -> None:
        """End the work and let go of the dossier; nothing is asked, for every act is already kept."""
        self._live.end()
        self._long.end()
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
        return self._turn(lambda keeper: keeper.act(act))

    def undo(self) -> str | None:
        """Take the last act back."""
        return self._turn(lambda keeper: keeper.undo())

    def redo(self) -> str | None:
        """Take the act again that was taken back last."""
        return self._turn(lambda keeper: keeper.redo())

    def go_to(self, number: int) -> str | None:
        """Go to any point of the history."""
        return self._turn(lambda keeper: keeper.go_to(number))

    def _turn(self, keep: Callable[[Keeper], History]) -> str | None:
        if self.survey is None:
            return "No survey is open."
        if self._keeper is None:
            return "Nothing can be changed: the dossier of this survey cannot be read."
        before = self._keeper.history
        try:
            history = keep(self._keeper)
            case = history.case(self.survey)
        except PlumbwellError as error:
            return str(error)
        if history is before:
            return None
        self.saved = time()
        former, self.case = self.case, case
        self.changed.emit()
        if case is not former:
            self._reduce()
        return None

    # -- reducing --------------------------------------------------------------------------------------------

    def _reduce(self) -> None:
        case, kept = self.case, self._kept
        assert case is not None
        self.busy = True
        self._ticket = self._live.request(lambda progress: (case, reduce(case, kept=kept)))
        self.working.emit(True)

    def _take_result(self, answer: Answer) -> None:
        if answer.ticket != self._ticket:
            return
        self.busy = False
        if answer.error is None:
            self.reduced_case, self.results = answer.value
            self.working.emit(False)
            self.reduced.emit()
            return
        self.working.emit(False)
        if not isinstance(answer.error, PlumbwellError):
            raise answer.error
        self.not_reduced.emit(answer.error)

    # -- long work -------------------------------------------------------------------------------------------

    def long_work(self, work: Callable[[Progress], Any]) -> None:
        """Have something done on the long lane; `done` or `not_done` tells how it ended."""
        self._long.request(work)

    def stop(self) -> None:
        """Stop the long work at its next step."""
        self._long.stop()

    def _take_long(self, answer: Answer) -> None:
        folder = self._opening.pop(answer.ticket, None)
        if folder is None:
            if answer.error is None:
                self.done.emit(answer.value)
            elif isinstance(answer.error, PlumbwellError | OSError | Stopped):
                self.not_done.emit(answer.error)
            else:
                self.not_done.emit(answer.error)
                raise answer.error
            return
        if self._opening:
            return  # another folder was asked for since
        if answer.error is None:
            self._take_survey(folder, answer.value)
        elif isinstance(answer.error, PlumbwellError | OSError):
            self.busy = False
            self.not_opened.emit(str(folder), answer.error)
        else:
            self.busy = False
            raise answer.error


def _read(folder: Path, progress: Progress) -> Survey:
    progress(0.0, "reading the files")
    return read_survey(folder)
