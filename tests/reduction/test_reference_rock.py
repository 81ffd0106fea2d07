"""Reference density by log and by markers: layers, ends, gaps, the ground, the datum, and climbing holes."""

import numpy as np
import pytest

from plumbwell.reduction.positions import well_path
from plumbwell.reduction.reference_rock import (
    covered_steps,
    log_depth,
    reference_layers_from_log,
    reference_layers_from_markers,
)
from plumbwell.survey.column import constant_column
from plumbwell.survey.errors import SurveyError
from plumbwell.survey.log import DensityLog
from plumbwell.survey.places import Markers, Path
from plumbwell.survey.site import Site

VERTICAL = well_path(None, north_correction=0.0)
SITE = Site(
    name="Made up",
    latitude=0.9,
    longitude=0.1,
    ground_elevation=1000.0,
    collar_elevation=1000.0,
    depth_datum_height=5.0,
)


def logged(depth, density, *, datum_height=5.0, depth_shift=0.0):
    return DensityLog(
        file="hole.las",
        curve="RHOB",
        depth=constant_column("depth", "m", depth),
        density=constant_column("density", "kg/m3", density),
        datum_height=datum_height,
        depth_shift=depth_shift,
    )


def inclined(angle):
    return well_path(
        Path(
            depth=constant_column("depth", "m", [0.0, 1000.0]),
            inclination=constant_column("inclination", "rad", np.radians([angle, angle])),
            azimuth=constant_column("azimuth", "rad", [0.0, 0.0]),
        ),
        north_correction=0.0,
    )


def test_a_logs_depth_is_brought_to_the_surveys_datum():
    # The log counts from 2 m above the collar, the survey from 5 m: 3 m deeper, and 1 m of shift.
    assert log_depth(logged([100.0], [2500.0], datum_height=2.0, depth_shift=1.0), SITE).tolist() == [104.0]


def test_layers_stand_between_samples_and_the_ends_take_their_fifty_metres():
    depth = np.arange(105.0, 306.0, 10.0)  # elevations 900 down to 700
    density = np.where(depth < 200.0, 2400.0, 2600.0)
    found = reference_layers_from_log(logged(depth, density), VERTICAL, SITE)
    assert found.tops.tolist() == [1000.0, *np.arange(900.0, 699.0, -10.0)]
    assert found.density[:11].tolist() == [2400.0] * 10 + [2500.0]
    assert found.density[11:].tolist() == [2600.0] * 11
    facts = found.facts
    assert (facts.top, facts.base, facts.above, facts.below) == (900.0, 700.0, 2400.0, 2600.0)
    assert facts.gaps == () and facts.dropped == 0


def test_the_end_mean_reaches_fifty_metres_and_no_farther():
    # 20 m samples: the top 50 m hold layers of 20, 20 and half of the third.
    found = reference_layers_from_log(
        logged([5, 25, 45, 65, 85], [2000, 2200, 2400, 2600, 9000]), VERTICAL, SITE
    )
    assert found.facts.above == pytest.approx((20 * 2100 + 20 * 2300 + 10 * 2500) / 50)
    # The log begins at the ground, which then is the first top.
    assert found.tops[:2].tolist() == [1000.0, 980.0] and found.density[0] == 2100.0


def test_gaps_are_bridged_straight_and_told():
    density = [2400.0, 2400.0, np.nan, np.nan, 2700.0, 2700.0, 2700.0]
    found = reference_layers_from_log(logged([5, 15, 25, 35, 45, 55, 65], density), VERTICAL, SITE)
    assert found.facts.gaps == ((990.0, 960.0),)
    assert found.tops.tolist() == [1000, 990, 980, 970, 960, 950, 940]
    assert found.density == pytest.approx([2400, 2450, 2550, 2650, 2700, 2700, 2700])


def test_a_step_of_more_than_three_median_steps_is_a_gap():
    log = logged([5, 6, 7, 8, 11, 14.1], [2000.0] * 4 + [2300.0, 2500.0])
    assert covered_steps(log).tolist() == [True, True, True, True, False]
    found = reference_layers_from_log(log, VERTICAL, SITE)
    assert found.facts.gaps == ((pytest.approx(994.0), pytest.approx(990.9)),)
    # 3.1 m in four straight pieces.
    assert found.density[4:8] == pytest.approx([2325, 2375, 2425, 2475])
    # The end mean holds covered rock only: 1 m of 2000, 2000, 2000 and 3 m of 2150.
    assert found.facts.below == pytest.approx((3 * 2000 + 3 * 2150) / 6)


def test_there_is_no_reference_rock_above_the_ground():
    log = logged([-15, -5, 5, 15], [1.0, 1.0, 2500.0, 2700.0])
    found = reference_layers_from_log(log, VERTICAL, SITE)
    assert found.tops.tolist() == [1000.0, 990.0] and found.density[0] == 2600.0
    deep_ground = Site(
        name="Drift",
        latitude=0.9,
        longitude=0.1,
        ground_elevation=1400.0,
        collar_elevation=1000.0,
        depth_datum_height=5.0,
    )
    found = reference_layers_from_log(logged([5, 15], [2500.0, 2700.0]), VERTICAL, deep_ground)
    assert found.tops.tolist() == [1400.0, 1000.0, 990.0] and found.density[0] == 2600.0


def test_layers_lie_at_the_paths_true_depth_and_turn_over_in_a_climbing_hole():
    density = [2000.0, 2200.0, 2400.0]
    slanted = reference_layers_from_log(logged([100, 200, 300], density), inclined(60.0), SITE)
    assert slanted.tops[1:] == pytest.approx([955.0, 905.0, 855.0])
    assert slanted.density[1:3].tolist() == [2100.0, 2300.0]
    underground = Site(
        name="Drift", latitude=0.9, longitude=0.1, ground_elevation=1400.0, collar_elevation=1000.0
    )
    climbing = reference_layers_from_log(
        logged([100, 200, 300], density, datum_height=0.0), inclined(180.0), underground
    )
    assert climbing.tops.tolist() == [1400.0, 1300.0, 1200.0, 1100.0]
    assert climbing.density[1:3].tolist() == [2300.0, 2100.0]
    assert climbing.facts.dropped == 0


def test_gaps_of_a_climbing_hole_lie_where_they_are():
    underground = Site(
        name="Drift", latitude=0.9, longitude=0.1, ground_elevation=1400.0, collar_elevation=1000.0
    )
    log = logged(
        [100, 110, 120, 130, 140, 150], [2000.0, 2000.0, np.nan, 2400.0, 2400.0, 2400.0], datum_height=0.0
    )
    found = reference_layers_from_log(log, inclined(180.0), underground)
    assert found.facts.gaps == ((1130.0, 1110.0),)
    # Both ends reach over the whole log, whose covered rock is 20 m of 2400 and 10 m of 2000.
    end = (2 * 2400 + 2000) / 3
    assert found.density == pytest.approx([end, 2400.0, 2400.0, 2300.0, 2100.0, 2000.0, end])


def test_samples_of_a_stretch_that_climbs_back_are_dropped_and_counted():
    path = well_path(
        Path(
            depth=constant_column("depth", "m", [0.0, 100.0, 100.001, 140.0]),
            inclination=constant_column("inclination", "rad", np.radians([0.0, 0.0, 100.0, 100.0])),
            azimuth=constant_column("azimuth", "rad", [0.0, 0.0, 0.0, 0.0]),
        ),
        north_correction=0.0,
    )
    found = reference_layers_from_log(
        logged([50, 75, 100, 125, 138], [2000.0, 2100, 2200, 7000, 7000]), path, SITE
    )
    assert found.facts.dropped == 2 and found.density.max() < 2200.0


def test_one_sample_stands_for_all_and_none_is_refused():
    found = reference_layers_from_log(logged([100, 110, 120], [np.nan, 2345.0, np.nan]), VERTICAL, SITE)
    assert np.all(found.density == 2345.0)
    with pytest.raises(SurveyError, match="the log hole.las holds no density"):
        reference_layers_from_log(logged([100, 110], [np.nan, np.nan]), VERTICAL, SITE)


def marked(depth, density):
    return Markers(
        marker=tuple(f"M{number}" for number in range(len(depth))),
        depth=constant_column("depth", "m", depth),
        density=constant_column("density", "kg/m3", density),
    )


def test_markers_reach_down_to_the_next_that_has_a_density():
    found = reference_layers_from_markers(marked([105, 205, 305], [2300.0, np.nan, 2700.0]), VERTICAL, SITE)
    assert found.tops.tolist() == [1000.0, 900.0, 700.0]
    assert found.density.tolist() == [2300.0, 2300.0, 2700.0]
    assert found.facts is None


def test_of_markers_at_one_level_the_last_stands_and_those_above_the_ground_are_cut():
    found = reference_layers_from_markers(
        marked([0, 5, 55, 55], [1900.0, 2300.0, 2400.0, 2500.0]), VERTICAL, SITE
    )
    assert found.tops.tolist() == [1000.0, 950.0]
    assert found.density.tolist() == [2300.0, 2500.0]


def test_markers_without_any_density_are_refused():
    with pytest.raises(SurveyError, match='"markers" needs a density beside at least one marker'):
        reference_layers_from_markers(marked([5, 55], [np.nan, np.nan]), VERTICAL, SITE)
