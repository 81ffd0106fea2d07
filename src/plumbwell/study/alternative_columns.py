"""The columns of alternatives.csv, described once: heading, unit, meaning, and where each comes from.

Values are taken from `study.alternatives` in SI and stand in the unit of the heading; NaN, and a text without
characters, means not known.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from operator import attrgetter

import numpy as np

from plumbwell.study.alternatives import Alternative
from plumbwell.study.tables import FACTORS, NUMBER, TEXT, TIME, Values
from plumbwell.survey.recipe import KEYS

FILE = "alternatives.csv"
_WALK = KEYS["drift_walk"]
_FACTORS = {**FACTORS, _WALK.unit: _WALK.factor or 1.0}


@dataclass(frozen=True, slots=True, kw_only=True)
class AlternativeColumn:
    """One column: name, unit label or None, meaning in one line, kind of its cells, and the SI value of a row."""

    name: str
    unit: str | None = None
    what: str
    kind: str = NUMBER
    get: Callable[[Alternative], float | str]

    @property
    def heading(self) -> str:
        """The heading as written: `rms_change [g/cm3]`."""
        return self.name if self.unit is None else f"{self.name} [{self.unit}]"

    def values(self, rows: Sequence[Alternative]) -> Values:
        """The column in the unit of its heading, (rows,) each; texts as they are, times in s."""
        values = [self.get(one) for one in rows]
        if self.kind == TEXT:
            return tuple(str(one) for one in values)
        return np.array(values, dtype=np.float64) / (1.0 if self.unit is None else _FACTORS[self.unit])


def _text(name: str, what: str, get: Callable[[Alternative], str]) -> AlternativeColumn:
    return AlternativeColumn(name=name, what=what, kind=TEXT, get=get)


def _number(name: str, unit: str | None, what: str, of: str) -> AlternativeColumn:
    return AlternativeColumn(name=name, unit=unit, what=what, get=attrgetter(of))


def _count(name: str, what: str, of: str) -> AlternativeColumn:
    """A count that is not known where the row could not be worked out."""
    find = attrgetter(of)
    return AlternativeColumn(name=name, what=what, get=lambda one: float("nan") if one.problem else float(find(one)))


def _of_test(name: str, what: str, of: str) -> AlternativeColumn:
    """Degrees of freedom of a test, of which there is none without."""
    find = attrgetter(of)
    return AlternativeColumn(name=name, what=what, get=lambda one: float(find(one)) or float("nan"))


def _orders(one: Alternative) -> str:
    return "; ".join(f"{run}: {order}" for run, order in one.orders)


COLUMNS = (
    _text("key", "what the change is, the same in every reduction; in_force for none", lambda one: one.key),
    _text("change", "the change in words", lambda one: one.sentence),
    _text("run", "run of the change; empty where it is of no single run", lambda one: one.run),
    AlternativeColumn(name="time", what="time of the tare", kind=TIME, get=lambda one: one.time),
    _text("edits", "what stands in survey.toml for it", lambda one: "; ".join(one.edits)),
    _text("orders", "drift order of each run that comes of it", _orders),
    _count("tares", "jumps that are taken out", "tares"),
    _count("dof", "degrees of freedom: used visits less the rank of their design", "freedom"),
    _number("chi_square", None, "weighted sum of squares of what is left", "squares"),
    _number("p", None, "chance of as much", "squares_chance"),
    _number("reseating_sd", "mGal", "root of the mean re-seating variance", "reseating_sd"),
    _number("reading_sd", "mGal", "median sd of a single reading", "reading_sd"),
    _number("walk", _WALK.unit, "strength of the drift's random walk; 0 for none", "walk"),
    _number(
        "log_likelihood", None, "of the restricted likelihood; to be compared where orders and tares are the same",
        "likelihood",
    ),
    _number(
        "gain", None,
        "of the log likelihood of visits freed of stations and biases alone, over the one in force: compares all rows",
        "gain",
    ),
    _number("bic", None, "information criterion of that likelihood, lower is better: compares all rows", "bic"),
    _number("f", None, "F of the change where one holds the other", "f"),
    _of_test("f_steps", "degrees of freedom of the change", "f_steps"),
    _of_test("f_dof", "degrees of freedom of the larger of both", "f_freedom"),
    _number("f_p", None, "chance of a larger F where the smaller of both is true", "f_chance"),
    _number(
        "largest_change", "g/cm3", "largest change of any interval density from the one in force", "largest_change"
    ),
    _text("largest_change_at", "that interval", lambda one: one.largest_change_at),
    _number("largest_change_sds", None, "the same over the interval's density_sd in force", "largest_change_sds"),
    _number("most_sds", None, "largest change of any interval over its density_sd, without sign", "most_sds"),
    _number("rms_change", "g/cm3", "root of the mean square of the changes of all intervals", "rms_change"),
    _text("problem", "why it cannot be worked out", lambda one: one.problem),
)
