"""The errors that Plumbwell raises, and the problem in five parts that an input error carries.

Readers collect problems and go on, so that a person sees all of them at once. Nothing here
computes; nothing is repaired in silence.
"""

from __future__ import annotations

from dataclasses import dataclass

MAXIMUM_SHOWN = 80


def shown(text: object) -> str:
    """Text of a cell as it may stand in a message: control characters escaped, at most 80 characters."""
    escaped = "".join(c if c.isprintable() else c.encode("unicode_escape").decode() for c in str(text))
    return escaped if len(escaped) <= MAXIMUM_SHOWN else escaped[: MAXIMUM_SHOWN - 1] + "…"


@dataclass(frozen=True, slots=True, kw_only=True)
class Problem:
    """One thing that is wrong with an input.

    Parameters
    ----------
    file : str
        Name of the file, relative to the survey folder.
    row : int or None
        Physical line, as a text editor counts them; None when the whole file is meant.
    column : str or None
        Heading of the column, or the key in survey.toml.
    found : str
        What stands there.
    expected : str
        What should stand there.
    mend : str
        What the person can do about it.
    """

    file: str
    row: int | None
    column: str | None
    found: str
    expected: str
    mend: str

    def __str__(self) -> str:
        place = self.file
        if self.row is not None:
            place += f", row {self.row}"
        if self.column is not None:
            place += f", {self.column}"
        return f"{place}: found {self.found}; expected {self.expected}; to mend: {self.mend}"


class PlumbwellError(Exception):
    """Any error that Plumbwell raises on purpose; its text is written for the person at the desk."""


class InputError(PlumbwellError):
    """The input is wrong; `problems` says all that is wrong with it.

    Parameters
    ----------
    problems : iterable of Problem
    """

    def __init__(self, problems: tuple[Problem, ...] | list[Problem]) -> None:
        self.problems = tuple(problems)
        super().__init__("\n".join(str(problem) for problem in self.problems))


class SurveyError(PlumbwellError):
    """The survey can be read but not reduced."""


class NumericalError(PlumbwellError):
    """A computation lost its footing (rank, convergence) where no finding can stand for it."""


class DossierError(PlumbwellError):
    """A project file cannot be read or written."""
