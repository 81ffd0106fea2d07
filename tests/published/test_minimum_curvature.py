"""Minimum curvature against a printed example, closed cases, and an integration of the great-circle tangent.

Printed: the example that goes with the minimum curvature formula in drilling-formula handbooks, MD 3500 to
3600 ft, inclination 15 to 25 deg, azimuth 20 to 45 deg: dogleg 0.22605 rad = 12.95 deg, north 27.22 ft,
east 19.45 ft, vertical 94.01 ft; half a unit of the last printed digit. The other cases follow in closed
form from the geometry of a circle. The second route turns the tangent along the great circle and integrates
it by Gauss-Legendre quadrature, without any formula of minimum curvature.
"""

import numpy as np
import pytest

from plumbwell.reduction.positions import WellPath, dogleg, well_path
from plumbwell.survey.column import constant_column
from plumbwell.survey.places import Path


def hole(*points: tuple[float, float, float]) -> WellPath:
    depth, inclination, azimuth = np.array(points).T
    path = Path(
        depth=constant_column("depth", "m", depth),
        inclination=constant_column("inclination", "rad", np.radians(inclination)),
        azimuth=constant_column("azimuth", "rad", np.radians(azimuth)),
    )
    return well_path(path, north_correction=0.0)


def step(first: tuple[float, float, float], second: tuple[float, float, float]) -> np.ndarray:
    """Vertical, east and north steps between two survey points."""
    path = hole(first, second)
    return np.array(path.at(second[0])[:3]) - np.array(path.at(first[0])[:3])


def integrated(
    first: tuple[float, float, float], second: tuple[float, float, float], share: float
) -> np.ndarray:
    """The same, up to a share of the arc, by integrating the tangent along the great circle."""

    def tangent(inclination: float, azimuth: float) -> np.ndarray:
        i, a = np.radians([inclination, azimuth])
        return np.array([np.cos(i), np.sin(i) * np.sin(a), np.sin(i) * np.cos(a)])

    start, end = tangent(*first[1:]), tangent(*second[1:])
    axis = np.cross(start, end)
    angle = np.arctan2(np.linalg.norm(axis), start @ end)
    across = np.cross(axis / np.linalg.norm(axis), start) if angle > 0.0 else np.zeros(3)
    node, weight = np.polynomial.legendre.leggauss(20)
    at = share * (node + 1.0) / 2.0
    along = np.outer(np.cos(at * angle), start) + np.outer(np.sin(at * angle), across)
    return (second[0] - first[0]) * share / 2.0 * weight @ along


def test_printed_example_in_feet():
    turn = dogleg(
        inclination_1=np.radians(15.0),
        azimuth_1=np.radians(20.0),
        inclination_2=np.radians(25.0),
        azimuth_2=np.radians(45.0),
    )
    assert float(turn) == pytest.approx(0.22605, abs=5e-6)
    assert np.degrees(turn) == pytest.approx(12.95, abs=5e-3)
    assert step((3500.0, 15.0, 20.0), (3600.0, 25.0, 45.0)) == pytest.approx([94.01, 19.45, 27.22], abs=5e-3)


@pytest.mark.parametrize(
    ("first", "second", "expected"),
    [
        ((0, 0, 0), (100, 0, 0), (100.0, 0.0, 0.0)),
        ((1000, 30, 45), (1100, 30, 45), (100 * np.cos(np.pi / 6), 25 * np.sqrt(2), 25 * np.sqrt(2))),
        ((0, 0, 0), (900, 90, 0), (1800 / np.pi, 0.0, 1800 / np.pi)),
        ((500, 0, 0), (530, 0, 180), (30.0, 0.0, 0.0)),
        ((3000, 90, 120), (3100, 90, 120), (0.0, 50 * np.sqrt(3), -50.0)),
        ((3000, 90, 0), (3100, 90, 90), (0.0, 200 / np.pi, 200 / np.pi)),
        ((0, 180, 0), (80, 180, 77), (-80.0, 0.0, 0.0)),
    ],
    ids=["vertical", "straight", "quarter circle", "azimuth flip", "horizontal", "horizontal turn", "upward"],
)
def test_closed_cases(first, second, expected):
    assert step(first, second) == pytest.approx(expected, abs=1e-9)


@pytest.mark.parametrize("share", [0.0, 0.2, 1.0 / 3.0, 0.85, 1.0])
@pytest.mark.parametrize(
    ("first", "second"),
    [
        ((3500, 15, 20), (3600, 25, 45)),
        ((1000, 10, 0), (1100, 20, 0)),
        ((2000, 30, 350), (2090, 40, 10)),
        ((1500, 45, 200), (1600, 35, 200)),
        ((2500, 88, 60), (2600, 95, 75)),
        ((300, 0, 123), (330, 3, 45)),
        ((1000, 30, 45), (1010, 30.00001, 45.00001)),
        ((0, 20, 10), (50, 100, 170)),
    ],
)
def test_whole_and_part_of_an_arc_against_the_integrated_tangent(first, second, share):
    path = hole(first, second)
    start = np.array(path.at(first[0])[:3])
    found = np.array(path.at(first[0] + share * (second[0] - first[0]))[:3]) - start
    assert found == pytest.approx(integrated(first, second, share), abs=1e-9)


def test_direction_within_an_arc_turns_evenly():
    path = hole((0.0, 0.0, 0.0), (900.0, 90.0, 0.0))
    depth = np.array([0.0, 300.0, 450.0, 900.0])
    assert path.at(depth)[3] == pytest.approx(np.cos(np.pi * depth / 1800.0), abs=1e-15)
