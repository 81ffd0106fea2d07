"""Errors of interval densities against finite differences of the whole reduction."""

from dataclasses import replace

import numpy as np
import pytest

from made_surveys import loop, made_case
from plumbwell.study.reduce import reduce
from plumbwell.survey.column import constant_column
from plumbwell.survey.instrument import Instrument
from plumbwell.survey.places import Path as WellTrace

UGAL, MGAL, HOUR = 1e-8, 1e-5, 3600.0
FOUR_PI_G = 4.0 * np.pi * 6.67430e-11
METER = Instrument(name="A", reading_floor=2 * UGAL, reseating_sd=4 * UGAL, scale_sd=2e-4)
DEPTH = {name: 60.0 * number + 7.0 * (number % 3) for number, name in enumerate("ABCDEF")}
GRAVITY = {name: 0.088 * MGAL * depth for name, depth in DEPTH.items()}
TIES = {"A": (9.81, 5 * UGAL), "E": (9.81 + GRAVITY["E"], 8 * UGAL)}


def trace(degrees):
    """A hole that turns away from the vertical below 100 m, to the north-north-east: latitude changes along it."""
    return WellTrace(
        depth=constant_column("depth", "m", [0.0, 100.0, 400.0]),
        inclination=constant_column("inclination", "rad", np.deg2rad([0.0, 0.0, degrees])),
        azimuth=constant_column("azimuth", "rad", np.deg2rad([20.0, 20.0, 20.0])),
    )


def case_of(rows, *, instruments=(METER,), degrees=0.0, **more):
    """A case whose noise and drift order are held."""
    held = {"noise": "as_given", "drift_order": 1, "gradient_sd": 0.0005 * MGAL} | more
    case = made_case(rows, instruments=instruments, **held)
    return replace(case, survey=replace(case.survey, path=trace(degrees))) if degrees else case


@pytest.fixture(scope="module")
def rows():
    """Two runs over six stations."""
    chance = np.random.default_rng(2)
    first = loop(chance, "ABCDEFEDCBA", depth=DEPTH, gravity=GRAVITY, counts=(2, 3))
    return first + loop(chance, "ACEFCA", depth=DEPTH, gravity=GRAVITY, counts=(2,), run="2", start=86400.0)


def density(rows, **more):
    """Interval densities of a changed survey."""
    return reduce(case_of(rows, **more)).intervals.density.values


@pytest.mark.parametrize("ties", [{}, TIES], ids=["relative", "tied"])
@pytest.mark.parametrize("degrees", [0.0, 60.0])
def test_covariance_by_finite_difference_of_the_whole_formula(rows, ties, degrees):
    results = reduce(case_of(rows, ties=ties, degrees=degrees))
    errors, gravity = results.intervals.errors, results.network.gravity
    names = results.stations.label
    step, by_gravity = 10 * UGAL, []
    for name in names:
        moved = [replace(row, reading=row.reading + step * (row.station == name)) for row in rows]
        shifted = {at: (value + step * (at == name), sd) for at, (value, sd) in ties.items()}
        by_gravity.append((density(moved, ties=shifted, degrees=degrees) - results.intervals.density.values) / step)
    jacobian = np.array(by_gravity).T
    for part in ("reading", "drift", "tare"):
        wanted = jacobian @ getattr(gravity, part).matrix() @ jacobian.T
        np.testing.assert_allclose(errors.parts[part].matrix(), wanted, rtol=0, atol=2e-6 * max(wanted.max(), 1e-9))
    by_depth, shift = [], 0.05
    for name in names:
        up, down = (
            density([replace(row, depth=row.depth + sign * shift * (row.station == name)) for row in rows],
                    ties=ties, degrees=degrees)
            for sign in (1, -1)
        )  # fmt: skip
        by_depth.append((up - down) / (2 * shift))
    jacobian = np.array(by_depth).T * 0.03
    wanted = jacobian @ jacobian.T
    np.testing.assert_allclose(errors.parts["depth"].matrix(), wanted, rtol=0, atol=1e-4 * wanted.max())
    whole = sum(part.matrix() for part in errors.parts.values())
    np.testing.assert_allclose(errors.independent.matrix(), whole, rtol=1e-12)
    np.testing.assert_allclose(results.intervals.density_sd.values, np.sqrt(np.diag(whole)), rtol=1e-12)
    np.testing.assert_allclose(np.diag(whole[1:, :-1]), errors.independent.with_follower()[:-1], rtol=1e-9, atol=1e-12)


def test_depth_counts_with_the_gradient_in_rock_and_not_with_free_air(rows):
    results = reduce(case_of(rows))
    slope = results.intervals.densities.gradient.values
    thickness = results.intervals.densities.thickness.values
    wanted = slope / (FOUR_PI_G * thickness) * 0.03 * np.sqrt(2.0)
    np.testing.assert_allclose(results.intervals.errors.part_sd["depth"].values, wanted, rtol=3e-3)


def test_moving_a_station_down_raises_the_density_above_and_lowers_that_below(rows):
    plain = density(rows)
    lowered = density([replace(row, depth=row.depth + 0.1 * (row.station == "C")) for row in rows])
    change = lowered - plain
    assert change[1] > 0.0 > change[2]
    np.testing.assert_allclose(change[[0, 3, 4]], 0.0, atol=1e-5)


def test_neighbours_of_equal_thickness_correlate_by_minus_a_half():
    depth = {name: 50.0 * number for number, name in enumerate("ABCDE")}
    gravity = {name: 0.09 * MGAL * one for name, one in depth.items()}
    rows = loop(np.random.default_rng(3), "ABCDE" * 4, depth=depth, gravity=gravity, counts=(2,), drift=())
    parts = reduce(case_of(rows, drift_order=0)).intervals.errors.parts
    for name in ("reading", "depth"):
        whole = parts[name].matrix()
        sd = np.sqrt(np.diag(whole))
        correlation = whole / sd[:, None] / sd
        np.testing.assert_allclose(np.diag(correlation, 1), -0.5, atol=2e-4)
        np.testing.assert_allclose(np.diag(correlation, 2), 0.0, atol=1e-4)


@pytest.mark.parametrize("ties", [{}, TIES], ids=["relative", "tied"])
def test_gradient_factor_by_finite_difference(rows, ties):
    plain = reduce(case_of(rows, ties=ties))
    more = (plain.choice.normal + 0.0005 * MGAL, 0.0)
    wanted = density(rows, ties=ties, free_air=more) - plain.intervals.density.values
    np.testing.assert_allclose(plain.intervals.errors.factors["gradient"], wanted, rtol=1e-6)
    np.testing.assert_allclose(wanted, 0.0005 * MGAL / FOUR_PI_G, rtol=1e-3)


@pytest.mark.parametrize("ties", [{}, TIES], ids=["relative", "tied"])
def test_scale_factor_of_each_instrument_by_finite_difference(rows, ties):
    other = replace(METER, name="B", scale=1.002, scale_sd=5e-4)
    rows = [replace(row, instrument="B" if row.run == "2" else "A") for row in rows]
    plain = reduce(case_of(rows, ties=ties, instruments=(METER, other)))
    for name in "AB":
        changed = tuple(
            replace(one, scale=one.scale + one.scale_sd) if one.name == name else one for one in (METER, other)
        )
        wanted = density(rows, ties=ties, instruments=changed) - plain.intervals.density.values
        np.testing.assert_allclose(plain.intervals.errors.factors[f"scale {name}"], wanted, rtol=2e-5, atol=1e-6)


@pytest.mark.parametrize("degrees", [0.0, 60.0])
@pytest.mark.parametrize("ties", [{}, TIES], ids=["relative", "tied"])
def test_depth_scale_factor_by_finite_difference(rows, degrees, ties):
    scale_sd = 1e-4
    plain = reduce(case_of(rows, degrees=degrees, ties=ties, depth_scale_sd=scale_sd))
    longer, shorter = (
        density([replace(row, depth=row.depth * (1.0 + sign * scale_sd)) for row in rows], degrees=degrees, ties=ties)
        for sign in (1, -1)
    )
    wanted = 0.5 * (longer - shorter)
    np.testing.assert_allclose(plain.intervals.errors.factors["depth scale"], wanted, rtol=2e-4)
    if not degrees:
        # 1.1 g/cm3 for a whole scale error: the gradient in rock over 4 pi G.
        np.testing.assert_allclose(wanted, scale_sd * 0.088 * MGAL / FOUR_PI_G, rtol=2e-2)


def test_datum_factor_by_finite_difference(rows):
    plain = reduce(case_of(rows))
    assert "datum" in plain.intervals.errors.factors
    # 50 mGal more at the datum station, as if a tie had said so.
    level = plain.network.gravity.gravity[0]
    stations, parts = plain.stations, plain.stations.parts
    shell = parts.shell.values[0]
    tie = parts.normal_gravity.values[0] + parts.free_air.values[0] + shell
    low, high = (density(rows, ties={"A": (tie + more, 1 * UGAL)}) for more in (0.0, 50 * MGAL))
    np.testing.assert_allclose(low, plain.intervals.density.values, rtol=0, atol=1e-4)
    np.testing.assert_allclose(plain.intervals.errors.factors["datum"], high - low, rtol=1e-4)
    assert level == 0.0 and stations.label[0] == "A"
    # 0.0004 g/cm3 for 100 mGal.
    np.testing.assert_allclose(np.abs(high - low) * 2.0, 0.4, atol=0.05)


def test_tie_factors_by_finite_difference(rows):
    plain = reduce(case_of(rows, ties=TIES))
    for number, name in enumerate(TIES, start=1):
        value, sd = TIES[name]
        up = density(rows, ties=TIES | {name: (value + sd, sd)})
        wanted = up - plain.intervals.density.values
        factor = plain.intervals.errors.factors[f"tie {number}"]
        np.testing.assert_allclose(factor, wanted, rtol=1e-5, atol=2e-6)
    assert "datum" not in plain.intervals.errors.factors


def test_common_covariance_is_the_sum_of_outer_products(rows):
    results = reduce(case_of(rows, depth_scale_sd=1e-4))
    errors = results.intervals.errors
    assert set(errors.factors) == {"gradient", "scale A", "depth scale", "datum"}
    wanted = sum(np.outer(one, one) for one in errors.factors.values())
    np.testing.assert_allclose(errors.common_covariance(), wanted, rtol=1e-12)
    np.testing.assert_allclose(results.intervals.density_common_sd.values, np.sqrt(np.diag(wanted)), rtol=1e-12)


def test_a_stated_sd_of_elevation_stands_in_for_that_of_depth():
    depth = {"A": 0.0, "B": 60.0, "C": 120.0}
    gravity = {name: 0.09 * MGAL * one for name, one in depth.items()}
    rows = loop(np.random.default_rng(4), "ABCBA", depth=depth, gravity=gravity, counts=(2,))
    places = {"B": {"depth": 60.0, "elevation_sd": 0.3}}
    sd = [reduce(case_of(rows, places=one)).intervals.errors.part_sd["depth"].values for one in ({}, places)]
    shares = np.sqrt((0.03**2 + 0.3**2) / (0.03**2 + 0.03**2))
    np.testing.assert_allclose(sd[1] / sd[0], shares, rtol=1e-3)
