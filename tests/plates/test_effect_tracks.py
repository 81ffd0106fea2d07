"""Tracks made from plain values: effects, what is left over, sd by origin, a second recipe beside."""

from dataclasses import replace
from math import sqrt

import pytest

from plumbwell.plates.survey_tracks import effect_tracks, origin_track, survey_tracks
from plumbwell.plates.track_readout import readings_at, told

DEPTHS = [30.0, 10.0, 20.0]


def made(**changes):
    values = {
        "large": [("free air", [9.0, 3.0, 6.0]), ("shells", [-6.0, None, -4.0]), ("never", [None] * 3)],
        "small": [("terrain", [0.3, 0.1, 0.2], [0.01, None, 0.01])],
        "left_over": [0.03, 0.01, 0.02],
        "left_over_sd": [0.006, 0.006, 0.006],
        "origins": [("reading", [3.0, 3.0, 3.0]), ("depth", [4.0, 4.0, 4.0]), ("tie", [0.0, None, 0.0])],
    }
    return effect_tracks(DEPTHS, **{**values, **changes})


def test_the_reduction_stage_has_effects_left_over_and_origins():
    large, terrain, left, sd = made()
    assert [track.title for track in (large, terrain, left, sd)] == ["large terms", "terrain", "left over", "sd"]
    assert [curve.name for curve in large.lines] == ["free air", "shells"], "what has no value has no curve"
    assert [bool(curve.dashes) for curve in large.lines] == [False, True]
    assert [point.depth for point in large.lines[0].points] == [10.0, 20.0, 30.0]
    assert [point.depth for point in large.lines[1].points] == [20.0, 30.0]
    assert (left.unit, sd.unit) == ("mGal", "\u00b5Gal, by origin")
    assert left.points[0].sd == 0.006 and terrain.points[0].sd is None
    assert left.weight == max(track.weight for track in (large, terrain, left, sd)), "names of layers stand there"
    assert large.low < -6.0 and large.high > 9.0 and large.signed


def test_shares_are_of_the_variance_and_the_greatest_comes_first():
    sd = made()[-1]
    assert sd.origins == ("depth", "reading")
    assert [bar.sd for bar in sd.bars] == [5.0] * 3
    assert sd.bars[0].shares == (pytest.approx(16 / 25), pytest.approx(9 / 25))
    assert [bar.depth for bar in sd.bars] == [10.0, 20.0, 30.0]
    assert sd.low == 0.0 and sd.high > 5.0


def test_more_origins_than_fills_become_one():
    origins = [(name, [float(size)] * 3) for name, size in zip("abcdef", (1, 6, 2, 5, 3, 4), strict=True)]
    track = origin_track(DEPTHS, origins)
    assert track.origins == ("b", "d", "f", "others")
    variance = sum(size**2 for size in range(1, 7))
    assert track.bars[0].sd == pytest.approx(sqrt(variance))
    assert track.bars[0].shares[-1] == pytest.approx((1 + 4 + 9) / variance)
    assert sum(track.bars[0].shares) == pytest.approx(1.0)


def test_what_is_not_there_has_no_track():
    assert effect_tracks([]) == []
    assert made(large=[], small=[], origins=[("tie", [0.0] * 3)])[0].title == "left over"
    assert len(made(large=[], small=[], origins=[], left_over=[None] * 3)) == 0


def test_stations_that_nothing_joins_are_not_joined():
    large, terrain, left, _ = made(parts=[0, 1, 0])
    assert left.point_columns.at(15.0) is None and left.point_columns.at(25.0) is not None
    assert large.lines[0].columns.at(15.0) is None


def test_the_crosshair_reads_what_was_given():
    large, terrain, left, sd = made()
    assert [reading.forms[0] for reading in readings_at(large, 25.0)] == ["+7.500", "\u22125.000"]
    assert [reading.name for reading in readings_at(large, 25.0)] == ["free air", "shells"]
    assert readings_at(left, 20.0)[0].forms == ("+0.020\u00a0\u00b1\u00a00.006", "+0.020")
    assert readings_at(left, 15.0)[0].forms == ("+0.015",)
    assert readings_at(sd, 20.4, reach=0.5)[0].forms == ("5.0",)
    assert readings_at(sd, 20.6, reach=0.5) == readings_at(left, 31.0) == []
    assert told(large, 15.0) == "large terms free air +4.500 mGal"
    assert told(left, 40.0) == ""


def test_a_second_recipe_stands_beside_and_stretches_the_scales(invented_plate):
    plate = invented_plate(12)
    rows = tuple(
        replace(row, density=row.density + 0.6, difference=row.difference + 0.6) for row in plate.intervals
    )
    beside = replace(plate, intervals=rows)
    alone = {track.title: track for track in survey_tracks(plate, wide=True)}
    both = {track.title: track for track in survey_tracks(plate, wide=True, beside=beside, beside_name="slab form")}
    for title in ("density", "difference"):
        assert len(both[title].beside) == 12 and not alone[title].beside
        assert both[title].high > alone[title].high + 0.3
        assert both[title].steps == alone[title].steps
    assert both["density"].beside_name == "slab form"
    middle = (rows[4].top + rows[4].base) / 2
    names = [reading.name for reading in readings_at(both["density"], middle)]
    assert names == ["", "slab form", "log"]


def test_scales_hold_bars_of_one_or_two_sd(invented_plate):
    plate = invented_plate(12, log=False)
    rows = tuple(replace(row, sd=0.05) for row in plate.intervals)
    one, two = (
        next(track for track in survey_tracks(replace(plate, intervals=rows), wide=True, bars=bars) if track.steps)
        for bars in (1, 2)
    )
    highest = max(step.value for step in two.steps)
    assert two.high > highest + 0.1 and one.high > highest + 0.05
    assert two.high - one.high == pytest.approx(0.05, rel=0.2)
