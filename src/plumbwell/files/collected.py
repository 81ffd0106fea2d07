"""What is gathered while a survey folder is read: problems, notes, the files seen.

Readers put what they find here and go on, so that a person sees everything that is wrong at once.
"""

from __future__ import annotations

from collections import Counter

from plumbwell.survey.errors import InputError, Problem
from plumbwell.survey.survey import InputFile, ReadingNote

MAXIMUM_PROBLEMS = 1000  # of one file; a table in a wrong format must not fill the memory with messages


class Collected:
    """Problems, notes and files of one reading, in the order in which they were met."""

    def __init__(self) -> None:
        self.problems: list[Problem] = []
        self.notes: list[ReadingNote] = []
        self.files: dict[str, InputFile] = {}
        self._count: Counter[str] = Counter()

    def problem(
        self, file: str, row: int | None, column: str | None, *, found: str, expected: str, mend: str
    ) -> None:
        """Add one problem; of one file no more than `MAXIMUM_PROBLEMS` are kept, and the last says so."""
        self._count[file] += 1
        if self._count[file] == MAXIMUM_PROBLEMS:
            column, found = (
                None,
                f"more than {MAXIMUM_PROBLEMS - 1} problems in this file; the rest are not listed",
            )
            expected, mend = "a readable table", "mend the problems listed above, then read again"
        if self._count[file] <= MAXIMUM_PROBLEMS:
            self.problems.append(
                Problem(file=file, row=row, column=column, found=found, expected=expected, mend=mend)
            )

    def full(self, file: str) -> bool:
        """True when no more problems of a file are kept."""
        return self._count[file] >= MAXIMUM_PROBLEMS

    def note(self, code: str, severity: str, place: str, text: str, mend: str) -> None:
        """Add one thing worth telling that is not an error; severity "note" or "look"."""
        self.notes.append(ReadingNote(code=code, severity=severity, place=place, text=text, mend=mend))

    def raise_problems(self) -> None:
        """Raise one `InputError` with all problems, file by file in order of rows, when there are any."""
        if self.problems:
            order = {file: place for place, file in reversed(list(enumerate(p.file for p in self.problems)))}
            raise InputError(sorted(self.problems, key=lambda one: (order[one.file], one.row or 0)))


def first_rows(lines: list[int], most: int = 5) -> str:
    """Row numbers in words, the first few of many: "rows 4, 9, 12 and 31 more"."""
    if len(lines) == 1:
        return f"row {lines[0]}"
    text = "rows " + ", ".join(str(line) for line in lines[:most])
    return text if len(lines) <= most else f"{text} and {len(lines) - most} more"
