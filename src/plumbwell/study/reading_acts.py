"""Acts on readings: leave them out, take them in, note something beside them."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import ClassVar

import numpy as np

from plumbwell.study.act import Act, ActRefused, check_text
from plumbwell.study.act_wording import readings_words
from plumbwell.study.admissible import LONGEST_NOTE, unusable
from plumbwell.study.case import Case
from plumbwell.study.docket.wording import counted
from plumbwell.study.overlay import RowNote, RowUse, with_uses
from plumbwell.survey.column import Index
from plumbwell.survey.errors import shown
from plumbwell.survey.survey import Survey


@dataclass(frozen=True, slots=True, kw_only=True)
class _OfRows(Act):
    """An act on rows of the readings, counted from 0; kept rising, each once."""

    rows: tuple[int, ...]

    def __post_init__(self) -> None:
        object.__setattr__(self, "rows", tuple(sorted({int(row) for row in self.rows})))

    def _known(self, survey: Survey) -> Index:
        """The rows as an array.

        Raises
        ------
        ActRefused
            When there are none, or one that the readings do not have.
        """
        if not self.rows:
            raise ActRefused("No reading was chosen.")
        if self.rows[0] < 0 or self.rows[-1] >= len(survey.readings):
            raise ActRefused(
                f"There is no such reading: {survey.readings.raw.file} has {counted(len(survey.readings), 'reading')}."
            )
        return np.array(self.rows, dtype=np.intp)

    def _told(self, survey: Survey, of: Index | None = None) -> str:
        """Those of the rows that the readings have, in words."""
        rows = [row for row in (self.rows if of is None else of.tolist()) if 0 <= row < len(survey.readings)]
        return readings_words(survey.readings, rows)


@dataclass(frozen=True, slots=True, kw_only=True)
class _OfUse(_OfRows):
    """An act that puts rows in or out of use, those of its rows that are not so already."""

    reason: str = ""
    use: ClassVar[bool] = False

    def __post_init__(self) -> None:
        _OfRows.__post_init__(self)
        object.__setattr__(self, "reason", self.reason.strip())

    def _changed(self, case: Case) -> Index:
        """The rows that the act puts in or out of use."""
        rows = self._known(case.survey)
        use = with_uses(case.survey, case.overlay).readings.use
        return rows[use[rows] != self.use]

    def _with_changed(self, case: Case) -> Case:
        stated = case.survey.readings.use
        changed: dict[int, RowUse | None] = {}
        for row in self._changed(case).tolist():
            # A row that a person takes in again as the folder has it is as if nothing had been done to it.
            plain = self.use and stated[row]
            changed[row] = None if plain else RowUse(row, self.use, self.reason)
        if not changed:
            raise ActRefused(f"{'This reading is' if len(self.rows) == 1 else 'These readings are'} {self._already}.")
        return replace(case, overlay=case.overlay.with_rows(changed))

    @property
    def _already(self) -> str:
        return "in use already" if self.use else "left out already"

    def sentence(self, case: Case) -> str:
        """How many readings of which stations, and why."""
        try:
            rows: Index | None = self._changed(case)
        except ActRefused:
            rows = None
        told = self._told(case.survey, rows)
        done = f"Took {told} into use" if self.use else f"Left out {told}"
        return f"{done}: {shown(self.reason, LONGEST_NOTE)}" if self.reason else done


@dataclass(frozen=True, slots=True, kw_only=True)
class Exclude(_OfUse):
    """Leave readings out, for a reason. Those of the rows that are out already stay as they are."""

    kind: ClassVar[str] = "exclude"
    use: ClassVar[bool] = False

    def apply(self, case: Case) -> Case:
        """The case without these readings."""
        if not self.reason:
            raise ActRefused("Say why the readings are left out: the reason stands beside them ever after.")
        check_text(self.reason, "A reason")
        after = self._with_changed(case)
        if not with_uses(after.survey, after.overlay).readings.use.any():
            raise ActRefused("No reading would be left in use: nothing could be reduced.")
        return after


@dataclass(frozen=True, slots=True, kw_only=True)
class Include(_OfUse):
    """Take readings into use that were left out, by a person or by the folder."""

    kind: ClassVar[str] = "include"
    use: ClassVar[bool] = True

    def apply(self, case: Case) -> Case:
        """The case with these readings."""
        check_text(self.reason, "A reason")
        after = self._with_changed(case)
        survey = with_uses(case.survey, case.overlay)
        if (why := unusable(survey, case.chosen, self._changed(case))) is not None:
            raise ActRefused(why)
        return after


@dataclass(frozen=True, slots=True, kw_only=True)
class Note(_OfRows):
    """Write a note beside readings, in place of what stood there; an empty text takes it away."""

    text: str
    kind: ClassVar[str] = "note"

    def __post_init__(self) -> None:
        _OfRows.__post_init__(self)
        object.__setattr__(self, "text", self.text.strip())

    def apply(self, case: Case) -> Case:
        """The case with the note."""
        check_text(self.text, "A note")
        rows = self._known(case.survey)
        stated = case.survey.readings.note
        changed = {
            row: None if stated[row] == self.text else RowNote(row, self.text) for row in rows.tolist()
        }
        overlay = case.overlay.with_notes(changed)
        if overlay == case.overlay:
            raise ActRefused("The note stands there already." if self.text else "There is no note to take away.")
        return replace(case, overlay=overlay)

    def sentence(self, case: Case) -> str:
        """The note, and beside which readings."""
        told = self._told(case.survey)
        if not self.text:
            return f"Took the note away from {told}"
        return f"Noted beside {told}: {shown(self.text, LONGEST_NOTE)}"
