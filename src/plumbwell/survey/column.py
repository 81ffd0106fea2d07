"""Columns of numbers that know where they come from: a raw cell, a law, or a weighing.

Every number is a law applied to named inputs. `Law.of` is the one place where the arithmetic
stands: it fills the column and it explains a single cell, so that a shown working can never
differ from the result. Values are SI float64, contiguous and read-only.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
Index = NDArray[np.intp]


def frozen(values: Any) -> Array:
    """Values as a read-only contiguous float64 array, shape kept."""
    array = np.ascontiguousarray(values, dtype=np.float64)
    if array.flags.writeable:
        if array is values:
            array = array.copy()
        array.flags.writeable = False
    return array


def frozen_index(values: Any) -> Index:
    """Values as a read-only contiguous array of row numbers."""
    array = np.ascontiguousarray(values, dtype=np.intp)
    if array.flags.writeable:
        if array is values:
            array = array.copy()
        array.flags.writeable = False
    return array


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Origin:
    """Where the raw cells of a column stand: file, heading, physical line of each row, text of each cell."""

    file: str
    heading: str
    lines: Index
    cells: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class Law:
    """A formula with its name, its wording, its source and the one function that computes it.

    Parameters
    ----------
    name : str
        What comes out, in the trade's words.
    formula : str
        The formula as a reader would write it.
    source : str
        Published source, or the word "definition".
    of : callable
        Takes the inputs by name (arrays or scalars, row by row), returns the values.
    """

    name: str
    formula: str
    source: str
    of: Callable[..., Any]


@dataclass(frozen=True, slots=True)
class Weighing:
    """An estimate that many rows share: value = sum of weight times input.

    Parameters
    ----------
    name, formula, source : str
        As in `Law`.
    weights : callable
        `weights(row)` returns one (m,) array of weights for each input of the column, m the
        length of that input. The weights are those of the factorisation that gave the estimate.
    """

    name: str
    formula: str
    source: str
    weights: Callable[[int], tuple[Array, ...]]


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Setting:
    """A single value that enters a law: a constant, a key of survey.toml or of the recipe."""

    key: str
    value: Any
    unit: str = ""
    origin: str = ""


@dataclass(frozen=True, eq=False, slots=True)
class Input:
    """One named input of a law.

    Parameters
    ----------
    name : str
        Keyword of `Law.of`.
    of : Column or Setting
    rows : (n,) int array or None
        For each row of the column the row of `of` that it uses; None: the same row.
    """

    name: str
    of: Column | Setting
    rows: Index | None = None

    def values(self) -> Any:
        """All values, one a row of the column, or the setting's single value."""
        if isinstance(self.of, Setting):
            return self.of.value
        return self.of.values if self.rows is None else self.of.values[self.rows]

    def at(self, row: int) -> Any:
        """The value that enters one row."""
        if isinstance(self.of, Setting):
            return self.of.value
        return float(self.of.values[row if self.rows is None else self.rows[row]])


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Column:
    """A column of numbers with its unit and its descent.

    Parameters
    ----------
    key : str
        Name inside the program, e.g. "density".
    unit : str
        SI unit of `values`: "m/s2", "m", "kg/m3", "s", "rad", "Pa", "" ...
    values : (n,) float64 array, read-only
        NaN where the number is not known.
    law : Law, Weighing or None
        None for measured data, which carry an `origin` instead.
    inputs : tuple of Input
    origin : Origin or None
    """

    key: str
    unit: str
    values: Array
    law: Law | Weighing | None = None
    inputs: tuple[Input, ...] = ()
    origin: Origin | None = None

    def __len__(self) -> int:
        return len(self.values)

    def worked(self, row: int) -> float:
        """The value of one row, worked out anew from its inputs by the same law or weighing."""
        if isinstance(self.law, Law):
            return float(self.law.of(**{one.name: one.at(row) for one in self.inputs}))
        if isinstance(self.law, Weighing):
            total = 0.0
            for one, weight in zip(self.inputs, self.law.weights(row), strict=True):
                used = np.flatnonzero(weight)
                total += float(np.sum(weight[used] * np.asarray(one.values())[used]))
            return total
        return float(self.values[row])


def computed(key: str, unit: str, law: Law, *inputs: Input) -> Column:
    """A column whose values are made by its law, and by nothing else.

    Parameters
    ----------
    key, unit : str
        As in `Column`.
    law : Law
    *inputs : Input
        The law's inputs; at least one holds a column, which gives the number of rows.
    """
    values = law.of(**{one.name: one.values() for one in inputs})
    return Column(key=key, unit=unit, values=frozen(values), law=law, inputs=inputs)


def weighed(key: str, unit: str, values: Any, weighing: Weighing, *inputs: Input) -> Column:
    """A column of estimates with the weighing that explains each of them."""
    return Column(key=key, unit=unit, values=frozen(values), law=weighing, inputs=inputs)


def constant_column(key: str, unit: str, values: Any) -> Column:
    """A column of values that the program sets itself (zeros of an absent column), without descent."""
    return Column(key=key, unit=unit, values=frozen(values))


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Labels:
    """A column of labels: the different names, and for each row the number of its name (-1: none)."""

    names: tuple[str, ...]
    code: Index

    def __len__(self) -> int:
        return len(self.code)

    def __getitem__(self, row: int) -> str | None:
        code = self.code[row]
        return self.names[code] if code >= 0 else None

    def as_list(self) -> list[str | None]:
        """The label of each row, None where there is none."""
        names: list[str | None] = [*self.names, None]
        return [names[code] for code in self.code.tolist()]


def labels(of: list[str | None] | tuple[str | None, ...]) -> Labels:
    """Labels made from one text a row; empty texts and None mean no label. Names keep their first order."""
    numbers: dict[str, int] = {}
    code = [numbers.setdefault(text, len(numbers)) if text else -1 for text in of]
    return Labels(names=tuple(numbers), code=frozen_index(code))
