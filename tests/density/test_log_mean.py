"""Means of a density log over intervals: by hand and by quadrature, coverage, datum, path, several logs."""

import numpy as np
import pytest

from plumbwell.density.log_mean import combined_log_means, log_integrals, log_mean_columns, log_means
from plumbwell.reduction.positions import well_path
from plumbwell.survey.column import constant_column
from plumbwell.survey.log import DensityLog
from plumbwell.survey.places import Path
from plumbwell.survey.site import Site

VERTICAL = well_path(None, north_correction=0.0)
SITE = Site(
    name="Made up",
    latitude=0.9,
    longitude=0.1,
    ground_elevation=100.0,
    collar_elevation=100.0,
    depth_datum_height=5.0,
)


def logged(depth, density, *, datum_height=5.0, depth_shift=0.0, minimum_coverage=0.8):
    return DensityLog(
        file="hole.las",
        curve="RHOB",
        depth=constant_column("depth", "m", depth),
        density=constant_column("density", "kg/m3", density),
        datum_height=datum_height,
        depth_shift=depth_shift,
        minimum_coverage=minimum_coverage,
    )


def curved(*points):
    depth, inclination = np.array(points, dtype=float).T
    return well_path(
        Path(
            depth=constant_column("depth", "m", depth),
            inclination=constant_column("inclination", "rad", np.radians(inclination)),
            azimuth=constant_column("azimuth", "rad", np.zeros(len(depth))),
        ),
        north_correction=0.0,
    )


def means(log, top, base, path=VERTICAL):
    mean, coverage = log_means(log, top_depth=np.array(top), base_depth=np.array(base), path=path, site=SITE)
    return mean, coverage


def test_whole_and_partial_steps_by_hand():
    log = logged([10, 11, 12, 13], [2000.0, 2100.0, 2400.0, 2400.0])
    mean, coverage = means(log, [10.0, 10.5, 11.25], [12.0, 12.0, 11.75])
    # From 10.5: half a step from 2050 to 2100, then 2100 to 2400. Within one step: its value at 11.5.
    assert mean == pytest.approx([(2050 + 2250) / 2, (0.5 * 2075 + 2250) / 1.5, 2250.0], rel=1e-13)
    assert coverage == pytest.approx([1.0, 1.0, 1.0], abs=1e-12)


def test_depths_are_brought_to_one_datum():
    depth = np.arange(0.0, 101.0)
    log = logged(depth, 2000.0 + depth, datum_height=2.0, depth_shift=1.0)
    # Survey depth is the log's + 1 + 5 - 2.
    mean, _ = means(log, [30.0], [50.0])
    assert mean == pytest.approx([2000.0 + 40.0 - 4.0])


def test_what_the_log_does_not_cover_is_not_filled():
    depth = np.arange(0.0, 101.0)
    density = np.where(depth < 50, 2000.0, 2600.0)
    density[20] = np.nan
    log = logged(np.delete(depth, [71, 72, 73]), np.delete(density, [71, 72, 73]))
    mean, coverage = means(log, [10.0, 60.0, 95.0, 18.0, 150.0], [30.0, 80.0, 110.0, 22.0, 160.0])
    # A missing value takes both its steps; a step of 4 m among steps of 1 m is none; the log ends at 100.
    assert coverage == pytest.approx([18 / 20, 16 / 20, 5 / 15, 2 / 4, 0.0])
    assert mean[:2] == pytest.approx([2000.0, 2600.0]) and np.isnan(mean[2:]).all()


def test_the_least_coverage_is_the_logs_own():
    log = logged([0, 10], [2000.0, 2000.0], minimum_coverage=0.3)
    mean, coverage = means(log, [5.0, 8.0], [15.0, 18.0])
    assert coverage == pytest.approx([0.5, 0.2])
    assert mean[0] == 2000.0 and np.isnan(mean[1])


def test_the_mean_goes_by_vertical_thickness():
    # 60 deg below 100 m: each metre of hole counts half.
    path = curved((0, 0), (100, 0), (100.000001, 60), (300, 60))
    depth = np.arange(0.0, 300.0)
    log = logged(depth, np.where(depth <= 100.0, 2000.0, 2600.0))
    mean, coverage = means(log, [80.0], [140.0], path)
    assert mean[0] == pytest.approx((20 * 2000 + 0.5 * 2300 + 19.5 * 2600) / 40, rel=1e-6)
    assert coverage[0] == pytest.approx(1.0)


def test_on_an_arc_against_quadrature():
    path = curved((0, 10), (400, 80))
    depth = np.linspace(0.0, 400.0, 4001)
    log = logged(depth, 2400.0 + 200.0 * np.sin(depth / 37.0))
    mean, coverage = means(log, [33.33], [371.9], path)
    node, weight = np.polynomial.legendre.leggauss(120)
    at = 33.33 + (371.9 - 33.33) * (node + 1.0) / 2.0
    fall = np.cos(np.radians(10.0 + 70.0 * at / 400.0)) * weight
    expected = np.sum(fall * (2400.0 + 200.0 * np.sin(at / 37.0))) / np.sum(fall)
    assert mean[0] == pytest.approx(expected, abs=1e-3)
    assert coverage[0] == pytest.approx(1.0, abs=1e-9)


def test_a_hole_that_climbs_gives_the_same_whichever_end_comes_first():
    path = curved((0, 170), (500, 170))
    depth = np.arange(0.0, 200.0)
    log = logged(depth, 2000.0 + depth)
    mean, coverage = means(log, [120.0, 40.0], [40.0, 120.0], path)
    assert mean == pytest.approx([2080.0, 2080.0]) and coverage == pytest.approx([1.0, 1.0])


def test_places_off_the_path_and_level_intervals_have_neither_mean_nor_coverage():
    mean, coverage = means(logged([0, 10], [2000.0, 2000.0]), [np.nan, 1.0, 5.0], [5.0, np.nan, 5.0])
    assert np.isnan(mean).all() and np.isnan(coverage).all()


@pytest.mark.parametrize(
    ("depth", "density"), [([], []), ([50.0], [2500.0]), ([0.0, 90.0], [np.nan, np.nan])]
)
def test_a_log_that_says_nothing_covers_nothing(depth, density):
    mean, coverage = means(logged(depth, density), [10.0], [20.0])
    assert np.isnan(mean[0]) and coverage[0] == 0.0


def test_negative_readings_of_a_broken_log_stay_negative():
    mean, _ = means(logged([0, 10, 20], [-50.0, -50.0, -50.0]), [2.0], [12.0])
    assert mean[0] == pytest.approx(-50.0)


def test_of_several_logs_the_one_that_covers_most_serves_and_the_first_of_equals():
    short = logged(np.arange(0.0, 31.0), np.full(31, 2100.0))
    long = logged(np.arange(0.0, 101.0), np.full(101, 2500.0))
    mean, coverage, which = combined_log_means(
        (short, long),
        top_depth=np.array([5.0, 20.0, 60.0, 200.0]),
        base_depth=np.array([25.0, 40.0, 80.0, 210.0]),
        path=VERTICAL,
        site=SITE,
    )
    assert which.tolist() == [0, 1, 1, -1]
    assert mean[:3] == pytest.approx([2100.0, 2500.0, 2500.0]) and np.isnan(mean[3])
    assert coverage == pytest.approx([1.0, 1.0, 1.0, 0.0])


def test_no_log_at_all_covers_nothing():
    mean, coverage, which = combined_log_means(
        (), top_depth=np.array([5.0]), base_depth=np.array([25.0]), path=VERTICAL, site=SITE
    )
    assert np.isnan(mean[0]) and coverage[0] == 0.0 and which[0] == -1


def test_each_cell_is_worked_out_anew_from_the_stations_depths():
    chance = np.random.default_rng(3)
    depth = np.arange(0.0, 400.0, 0.5)
    density = 2500.0 + 100.0 * chance.standard_normal(len(depth))
    density[200:230] = np.nan
    path = curved((0, 3), (200, 25), (400, 50))
    sensor = constant_column("sensor_depth", "m", [10.3, 90.7, 111.0, 222.2, 390.9, np.nan])
    logs = (logged(depth, density), logged(depth[:300], density[:300] + 1.0))
    found = log_mean_columns(
        logs,
        log_integrals(logs, path, SITE),
        sensor_depth=sensor,
        upper=np.arange(5),
        lower=np.arange(1, 6),
        path=path,
    )
    for column in (found.density, found.coverage):
        worked = [column.worked(row) for row in range(5)]
        assert worked == pytest.approx(column.values.tolist(), rel=1e-12, nan_ok=True)
    assert np.isfinite(found.coverage.values[:4]).all() and np.isnan(found.coverage.values[4])
    assert found.which.tolist() == [0, 0, 0, 0, -1]
