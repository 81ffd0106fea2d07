"""What a person wants done to the survey, asked for where it must be, and turned into acts."""

from __future__ import annotations

from PySide6.QtCore import QObject

from plumbwell.desk.document import Document
from plumbwell.desk.frame.notice import Notice
from plumbwell.desk.workspace import Workspace
from plumbwell.plates.numbers import counted
from plumbwell.study.acts import (
    Act,
    AddRecipe,
    AddTare,
    ChooseRecipe,
    DropTare,
    Exclude,
    Include,
    NamePoint,
    Note,
    SetRecipe,
)
from plumbwell.study.overlay import with_uses


class Asking(QObject):
    """From wishes to acts.

    Parameters
    ----------
    document : Document
    work : Workspace
    notice : Notice
        Where it is told why something cannot be.
    """

    def __init__(self, document: Document, work: Workspace, notice: Notice) -> None:
        super().__init__(document)
        self._document, self._work, self._notice = document, work, notice

    def take(self, act: Act) -> str | None:
        """Take an act; None, or why it cannot be, which is also told to the person."""
        return self.say(self._document.act(act))

    def say(self, wrong: str | None) -> str | None:
        """Tell why something cannot be; None clears what was told."""
        if wrong is None:
            self._notice.clear()
        else:
            self._notice.say(wrong, wrong=True)
        return wrong

    def use(self, rows: tuple[int, ...]) -> None:
        """Leave readings out, or take them in again where all of them are out; asks for the reason."""
        case, reasons = self._document.case, self._work.reasons
        if self._still_reducing() or case is None:
            return
        if not rows:
            self._notice.say("Choose the readings first that are to be left out or taken in.")
            return
        # As the case stands, not as it was when the shown result was worked out.
        use = with_uses(case.survey, case.overlay).readings.use
        used = tuple(row for row in rows if use[row])
        if used:
            reasons.ask(
                f"Leave out {counted(len(used), 'reading')}, because",
                "Leave out",
                lambda reason: self._document.act(Exclude(rows=used, reason=reason)),
            )
        else:
            reasons.ask(
                f"Take {counted(len(rows), 'reading')} in again, because",
                "Take in",
                lambda reason: self._document.act(Include(rows=rows, reason=reason)),
            )

    def _still_reducing(self) -> bool:
        """Whether nothing can be asked yet, for there is no result; says so."""
        if self._work.shown is not None:
            return False
        self._notice.say("The survey is not reduced yet: choose readings when its result is there.")
        return True

    def chosen_readings(self) -> tuple[int, ...]:
        """The readings that belong to what is chosen."""
        work = self._work
        if work.shown is None:
            return ()
        return work.shown.converted(work.selection.level, work.selection.rows, "reading")

    def note(self) -> None:
        """Ask for a note on the chosen readings."""
        if self._still_reducing():
            return
        rows, shown = self.chosen_readings(), self._work.shown
        if not rows or shown is None:
            self._notice.say("Choose the readings first that the note belongs to.")
            return
        self._work.reasons.ask(
            f"Note on {counted(len(rows), 'reading')}",
            "Write",
            lambda text: self._document.act(Note(rows=rows, text=text)),
            text=shown.results.survey.readings.note[rows[0]],
        )

    def tare(self, *, drop: bool) -> None:
        """Take a jump before the first chosen reading into account, or drop the nearest one of its run."""
        if self._still_reducing():
            return
        rows, shown = self.chosen_readings(), self._work.shown
        if not rows or shown is None:
            self._notice.say("Choose the reading first before which the instrument jumped.")
            return
        survey, utc = shown.results.survey, shown.results.readings.utc.values
        row = min(rows, key=lambda one: float(utc[one]))
        run, time = survey.readings.run[row] or "", float(utc[row])
        if not drop:
            self.take(AddTare(run=run, time=time))
            return
        own = [one for one in survey.tares if one.run == run]
        if not own:
            self._notice.say(f"No tare is listed in run {run}.")
            return
        self.take(DropTare(run=run, time=min(own, key=lambda one: abs(one.time - time)).time))

    def name(self) -> None:
        """Ask for a name of the present point of the history."""
        self._work.reasons.ask(
            "Name of this point", "Name it", lambda name: self._document.act(NamePoint(name=name))
        )

    def recipe_key(self, key: str, value: object) -> str | None:
        """Change a key of the recipe in force; returns None, or why it cannot be, which is told beside the field."""
        case = self._document.case
        if case is None:
            return None
        return self._document.act(SetRecipe(name=case.chosen_name, key=key, value=value))

    def add_recipe(self, name: str) -> None:
        """Make a recipe from the one in force, and choose it."""
        case = self._document.case
        if case is not None and self.take(AddRecipe(name=name, based_on=case.chosen_name)) is None:
            self.take(ChooseRecipe(name=name))
