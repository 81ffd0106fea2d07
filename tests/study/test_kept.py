"""What is kept between reductions: found again by its inputs, and never anything but what a fresh one gives."""

from dataclasses import fields, is_dataclass, replace
from pathlib import Path

import numpy as np
import pytest

from plumbwell.files.folder import read_survey
from plumbwell.study.case import Case
from plumbwell.study.kept import HELD, Kept, same
from plumbwell.study.reduce import reduce
from plumbwell.survey.column import Column
from plumbwell.survey.recipe import KEYS, UNAVAILABLE, Recipe
from plumbwell.survey.site import Site

CHECKOUT = Path(__file__).resolve().parents[2]
OTHER = {
    "normal_gravity": ["GRS80", "GRS67", "1930"],
    "height_form": ["series"],
    "free_air": [(0.3090e-5, 0.0002e-5), (0.3090e-5, 0.0003e-5)],
    "gradient_sd": [0.001e-5],
    "reference_density": [2500.0, "markers", "log"],
    "tide": ["longman", "none"],
    "tide_factor": [1.0],
    "pressure_admittance": [-0.4e-8 / 100.0],
    "drift_order": [0, 1, 2, 3],
    "drift_walk": ["off", "on", 2e-8 / 3600.0**1.5],
    "tares": ["proposed"],
    "outliers": ["downweight", "exclude"],
    "scale_factor": ["estimate"],
    "noise": ["as_given"],
    "depth_sd": [0.1],
    "depth_scale_sd": [1e-4],
    "datum_station": ["TB-20"],
    "datum_sd": [1e-4],
    "same_place": [0.05],
    "min_thickness": [30.0],
    "visit_gap": [60.0],
    "layers": ["none"],
    "layer_boundaries": ["stations", "markers", 25.0],
    "terrain_tolerance": [1e-9],
}


@pytest.fixture(scope="module")
def well():
    """The sample well."""
    return Case(survey=read_survey(CHECKOUT / "sample_surveys" / "tolly_bank_well"))


def numbers(results):
    """All arrays that results hold, by their path; timing and what steps keep for themselves are left out."""
    found: dict[str, np.ndarray] = {}

    def walk(value, path):
        if isinstance(value, Column):
            found[path] = value.values
        elif isinstance(value, np.ndarray):
            found[path] = value
        elif isinstance(value, (bool, int, float, str)):
            found[path] = np.array(value)
        elif isinstance(value, dict):
            for key, one in value.items():
                walk(one, f"{path}[{key}]")
        elif isinstance(value, tuple):
            for number, one in enumerate(value):
                walk(one, f"{path}[{number}]")
        elif is_dataclass(value):
            for field in fields(value):
                if field.name not in ("timing", "survey", "made"):
                    walk(getattr(value, field.name), f"{path}.{field.name}")

    walk(results, "results")
    return found


def equal(one, other):
    """True when two results hold the same bits."""
    a, b = numbers(one), numbers(other)
    assert a.keys() == b.keys()
    return [path for path in a if not np.array_equal(a[path], b[path], equal_nan=a[path].dtype.kind == "f")]


def test_every_key_of_the_recipe_is_changed_here():
    fixed = {key for key in KEYS if key in UNAVAILABLE and key not in OTHER}
    assert set(OTHER) | fixed | {"out_of_table"} >= {field.name for field in fields(Recipe)}


def test_kept_equals_fresh_bit_for_bit(well):
    kept = Kept()
    reduce(well, kept=kept)
    for key, values in OTHER.items():
        for value in values:
            recipe = replace(well.chosen, **{key: value})
            with_kept = reduce(well, recipe=recipe, kept=kept)
            assert not equal(with_kept, reduce(well, recipe=recipe)), (key, value)
    assert not equal(reduce(well, kept=kept), reduce(well))


def test_a_key_changes_what_it_should_and_nothing_before(well):
    kept = Kept()
    first = reduce(well, kept=kept)
    later = reduce(well, recipe=replace(well.chosen, depth_sd=0.1), kept=kept)
    assert later.network is not first.network
    assert later.network.adjustment is first.network.adjustment
    assert later.stations.gravity is first.stations.gravity
    assert later.intervals.density is first.intervals.density
    assert later.intervals.density_sd is not first.intervals.density_sd
    tidal = reduce(well, recipe=replace(well.chosen, tide_factor=1.0), kept=kept)
    assert tidal.readings.calibrated is first.readings.calibrated
    assert tidal.stations.located is first.stations.located
    assert tidal.network.adjustment is not first.network.adjustment


def test_the_last_four_results_of_a_step_are_held():
    kept, calls = Kept(), []

    def step(value):
        calls.append(value)
        return [value]

    results = [kept(step, n) for n in range(HELD)]
    assert [kept(step, n) is result for n, result in enumerate(results)] == [True] * HELD
    kept(step, 99)
    assert kept(step, 3) is results[3]
    assert kept(step, 0) is not results[0]
    assert calls == [0, 1, 2, 3, 99, 0]


def test_what_counts_as_the_same_input():
    array = np.zeros(3)
    site = {"latitude": 0.1, "longitude": 0.2, "ground_elevation": 1.0, "collar_elevation": 1.0}
    assert same(array, array) and not same(array, np.zeros(3))
    assert same((1, array), (1, array)) and not same((1, array), (1, np.zeros(3)))
    one, other = Site(name="a", **site), Site(name="b", **site)
    assert same(one, Site(name="a", **site)) and not same(one, other)
    assert not same(1, 1.0) and not same(1, True) and not same("1", 1)
    assert not same((1, 2), (1, 2, 3)) and same(None, None)


def test_a_step_of_another_name_is_another_step():
    kept = Kept()
    assert kept(str.upper, "a") == "A" and kept(str.lower, "a") == "a"
    assert kept(dict, a=1) == {"a": 1} and kept(dict, b=1) == {"b": 1}
