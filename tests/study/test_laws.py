"""Every number is a law applied to named inputs: each cell of each column is worked out anew and compared.

A law gives its cell to 1e-12 relative. A weighing gives it to 1e-9 relative, or to 1e-13 m/s2 (1e-8 mGal) where the
cell is a small difference of numbers near 10 m/s2, which carry rounding of 2e-15 in each of many terms.
"""

from dataclasses import fields, is_dataclass, replace
from functools import cache
from pathlib import Path

import numpy as np
import pytest

from plumbwell.files.folder import read_survey
from plumbwell.study.case import Case
from plumbwell.study.reduce import reduce
from plumbwell.survey.column import Column, Input, Law, Setting, Weighing

CHECKOUT = Path(__file__).resolve().parents[2]
SURVEYS = {
    "well": CHECKOUT / "sample_surveys" / "tolly_bank_well",
    "shaft": CHECKOUT / "sample_surveys" / "quernlow_shaft",
    "real": CHECKOUT / "tests" / "data" / "reiche_zeche_shaft",
    "well, weighed": CHECKOUT / "sample_surveys" / "tolly_bank_well",
    "shaft, excluded": CHECKOUT / "sample_surveys" / "quernlow_shaft",
}
CHANGED = {
    "well, weighed": {"drift_walk": "on", "outliers": "downweight", "tares": "proposed", "scale_factor": "estimate"},
    "shaft, excluded": {"drift_walk": 2e-8 / 3600.0**1.5, "outliers": "exclude", "drift_order": 2},
}


@cache
def columns_of(name):
    """All columns that the results of a survey hold, with the path by which each was found."""
    case = Case(survey=read_survey(SURVEYS[name]))
    results = reduce(case, recipe=replace(case.chosen, **CHANGED.get(name, {})))
    found: dict[int, tuple[str, Column]] = {}
    seen: dict[int, object] = {}

    def walk(value, path):
        if isinstance(value, (str, int, float, bool, type(None), np.ndarray)) or id(value) in seen:
            return
        seen[id(value)] = value
        if isinstance(value, Column):
            found[id(value)] = (path, value)
            for one in value.inputs:
                walk(one.of, f"{path} <- {one.name}")
        elif isinstance(value, Setting):
            walk(value.value, path)
        elif isinstance(value, dict):
            for key, one in value.items():
                walk(one, f"{path}[{key}]")
        elif isinstance(value, (tuple, list)):
            for number, one in enumerate(value):
                walk(one, f"{path}[{number}]")
        elif is_dataclass(value):
            for field in fields(value):
                walk(getattr(value, field.name), f"{path}.{field.name}")

    walk(results, name)
    return list(found.values())


@pytest.mark.parametrize("name", SURVEYS)
def test_every_law_gives_its_cells(name):
    wrong, laws = [], 0
    for path, column in columns_of(name):
        if not isinstance(column.law, Law):
            continue
        laws += 1
        again = np.array([column.worked(row) for row in range(len(column))])
        near = np.abs(again - column.values) <= 1e-12 * np.abs(column.values)
        wrong += [f"{path} row {row}" for row in np.flatnonzero(~(near | np.isnan(again) & np.isnan(column.values)))]
    assert laws > 30
    assert not wrong, "\n".join(wrong[:20])


@pytest.mark.parametrize("name", SURVEYS)
def test_every_weighing_gives_its_cells_by_its_weights(name):
    wrong, weighings = [], 0
    for path, column in columns_of(name):
        if not isinstance(column.law, Weighing):
            continue
        weighings += 1
        room = 1e-13 if column.unit == "m/s2" else 1e-12
        for row in range(len(column)):
            value = column.values[row]
            if np.isnan(value):
                continue
            weights = column.law.weights(row)
            by_weights = sum(
                float(weight @ one.of.values) for one, weight in zip(column.inputs, weights, strict=True)
            )
            for again in (column.worked(row), by_weights):
                if not abs(again - value) <= 1e-9 * abs(value) + room:
                    wrong.append(f"{path} row {row}: {value} {again}")
    assert weighings >= 4
    assert not wrong, "\n".join(wrong[:20])


@pytest.mark.parametrize("name", SURVEYS)
def test_inputs_fit_their_columns(name):
    for path, column in columns_of(name):
        assert not column.values.flags.writeable and column.values.dtype == np.float64, path
        for one in column.inputs:
            assert isinstance(one, Input) and isinstance(one.of, Column | Setting), path
            if isinstance(one.of, Column) and isinstance(column.law, Law):
                rows = len(one.of) if one.rows is None else len(one.rows)
                assert rows == len(column), f"{path} <- {one.name}"
        if isinstance(column.law, Law | Weighing):
            assert column.law.name and column.law.formula and column.law.source, path


@pytest.mark.parametrize("name", SURVEYS)
def test_the_walk_from_a_density_ends_at_raw_cells(name):
    (density,) = (column for path, column in columns_of(name) if path.endswith("intervals.densities.density"))
    ends = []

    def walk(one):
        if one.origin is not None:
            ends.append(one.key)
        for part in one.inputs:
            if isinstance(part.of, Column):
                walk(part.of)

    walk(density)
    assert {"reading", "time"} <= set(ends)
