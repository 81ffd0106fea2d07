"""Acts: everything that a person does to a case. Here are all their kinds, and acts read back from data.

`act_from_data` takes nothing that `Act.to_data` has not written.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass, fields
from typing import Any, ClassVar

from plumbwell.study.act import Act, ActRefused, check_text
from plumbwell.study.admissible import LONGEST_LABEL
from plumbwell.study.case import Case
from plumbwell.study.reading_acts import Exclude, Include, Note
from plumbwell.study.recipe_acts import AddRecipe, ChooseRecipe, SetRecipe
from plumbwell.study.tare_acts import AddTare, DropTare
from plumbwell.survey.errors import DossierError, shown

__all__ = [
    "KINDS",
    "Act",
    "ActRefused",
    "AddRecipe",
    "AddTare",
    "ChooseRecipe",
    "DropTare",
    "Exclude",
    "Include",
    "NamePoint",
    "Note",
    "SetRecipe",
    "act_from_data",
]


@dataclass(frozen=True, slots=True, kw_only=True)
class NamePoint(Act):
    """Give the present point of the history a name; the case stays what it is."""

    name: str
    kind: ClassVar[str] = "name_point"

    def __post_init__(self) -> None:
        object.__setattr__(self, "name", self.name.strip())

    def apply(self, case: Case) -> Case:
        """The same case."""
        if not self.name:
            raise ActRefused("Give the point a name.")
        check_text(self.name, "The name of a point", longest=LONGEST_LABEL)
        return case

    def sentence(self, case: Case) -> str:
        """The name."""
        return f'Named this point "{shown(self.name, LONGEST_LABEL)}"'


MOST_ROWS = 20_000_000
LARGEST = 10**18
KINDS: dict[str, type[Act]] = {
    one.kind: one
    for one in (Exclude, Include, Note, SetRecipe, ChooseRecipe, AddRecipe, AddTare, DropTare, NamePoint)
}


def act_from_data(data: Any) -> Act:
    """The act that `Act.to_data` wrote as plain data.

    Raises
    ------
    DossierError
        When the data are those of no act that this version of the program knows, down to the last value.
    """
    if not isinstance(data, dict):
        raise DossierError("An act of the history is damaged: it is no table of values.")
    kind = KINDS.get(data["act"]) if isinstance(data.get("act"), str) else None
    if kind is None:
        raise DossierError(
            f'The history holds an act "{shown(data.get("act"))}" that this version of the program does not know.'
        )
    version = data.get("version")
    if isinstance(version, bool) or version != kind.version:
        raise DossierError(
            f'The history holds an act "{kind.kind}" of version {shown(version)}; this version of the program '
            f"knows version {kind.version}."
        )
    values = {key: value for key, value in data.items() if key not in ("act", "version")}
    names = {one.name for one in fields(kind)}
    if set(values) != names or not all(_VALUES[name](value) for name, value in values.items()):
        raise DossierError(f'An act "{kind.kind}" of the history is damaged: {shown(values)}.')
    if "rows" in values:
        values["rows"] = tuple(row for first, last in values["rows"] for row in range(first, last + 1))
    return kind(**values)


def _is_text(value: Any) -> bool:
    """A text that UTF-8 can hold, without blanks around it."""
    return isinstance(value, str) and value == value.strip() and not any("\ud800" <= c <= "\udfff" for c in value)


def _is_number(value: Any) -> bool:
    if isinstance(value, bool) or not isinstance(value, int | float):
        return False
    return abs(value) < LARGEST if isinstance(value, int) else math.isfinite(value)


def _is_number_or_none(value: Any) -> bool:
    return value is None or _is_number(value)


def _is_setting(value: Any) -> bool:
    """A value as survey.toml writes it, or None."""
    if isinstance(value, dict):
        return all(isinstance(name, str) and _is_number(one) for name, one in value.items())
    return value is None or isinstance(value, str) or _is_number(value)


def _are_rows(value: Any) -> bool:
    """Ranges of first and last row, rising and apart."""
    if not isinstance(value, list):
        return False
    before = -2
    for one in value:
        if not isinstance(one, list) or len(one) != 2 or not all(type(row) is int for row in one):
            return False
        if one[0] <= before + 1 or one[1] < one[0] or one[1] > MOST_ROWS:
            return False
        before = one[1]
    return bool(value)


_VALUES: dict[str, Callable[[Any], bool]] = {
    "rows": _are_rows,
    "reason": _is_text,
    "text": _is_text,
    "name": _is_text,
    "based_on": _is_text,
    "key": _is_text,
    "value": _is_setting,
    "run": _is_text,
    "time": _is_number,
    "size": _is_number_or_none,
    "size_sd": _is_number_or_none,
}
