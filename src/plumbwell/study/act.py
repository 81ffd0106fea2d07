"""What an act is: plain data, a pure function from case to case, and a sentence for the history."""

from __future__ import annotations

from dataclasses import dataclass, fields
from typing import Any, ClassVar

from plumbwell.study.admissible import LONGEST_NOTE, unfit_text
from plumbwell.study.case import Case
from plumbwell.survey.errors import PlumbwellError


class ActRefused(PlumbwellError):
    """An act that a case cannot take; its text says why, and the case stays as it was."""


def check_text(text: str, what: str, *, longest: int = LONGEST_NOTE) -> None:
    """Refuse a text that may not stand as a reason, a note or a name; `what` begins the sentence."""
    if (why := unfit_text(text, what, longest)) is not None:
        raise ActRefused(why)


@dataclass(frozen=True, slots=True, kw_only=True)
class Act:
    """What all acts have: a name and a version for storing, what they do, and a sentence for the history."""

    kind: ClassVar[str] = ""
    version: ClassVar[int] = 1

    def apply(self, case: Case) -> Case:
        """The case after the act.

        Raises
        ------
        ActRefused
            When the case cannot take it.
        """
        raise TypeError(f"{type(self).__name__} is no act by itself")

    def sentence(self, case: Case) -> str:
        """What the act does to a case, as the history tells it; `case` is the one before the act."""
        raise TypeError(f"{type(self).__name__} is no act by itself")

    def to_data(self) -> dict[str, Any]:
        """The act as plain data for JSON; rows as ranges of first and last."""
        values = {one.name: getattr(self, one.name) for one in fields(self)}
        if "rows" in values:
            values["rows"] = _ranges(values["rows"])
        return {"act": self.kind, "version": self.version, **values}


def _ranges(rows: tuple[int, ...]) -> list[list[int]]:
    """Rising rows as ranges of first and last."""
    ranges: list[list[int]] = []
    for row in rows:
        if ranges and row == ranges[-1][1] + 1:
            ranges[-1][1] = row
        else:
            ranges.append([row, row])
    return ranges
