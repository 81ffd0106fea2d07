"""Axes: round steps, numbers with room, graduations, value scales."""

import pytest

from plumbwell.plates.axis import (
    Frame,
    multiples,
    round_step,
    spaced_rows,
    strip_graduation,
    track_graduation,
    value_ticks,
)
from plumbwell.plates.lettering import text_width
from plumbwell.plates.track import value_range


@pytest.mark.parametrize(
    ("least", "step"),
    [(0.9, 1.0), (1.0, 1.0), (1.1, 2.0), (2.1, 5.0), (5.1, 10.0), (0.003, 0.005), (73.0, 100.0)],
)
def test_steps_are_one_two_or_five(least, step):
    assert round_step(least)[0] == step


def test_multiples_are_clean_numbers_and_zero_has_no_sign():
    ticks = multiples(0.1, -0.3, 0.3)
    assert ticks == [-0.3, -0.2, -0.1, 0.0, 0.1, 0.2, 0.3]
    assert str(ticks[3]) == "0.0"


@pytest.mark.parametrize("span", [3.0, 30.0, 180.0, 420.0, 999.0, 1440.0, 5200.0, 12345.0])
def test_the_strip_has_twenty_to_forty_fields(span):
    graduation = strip_graduation(span, 700.0)
    assert 16 <= span / graduation.step <= 40
    assert graduation.numbered / span * 700.0 >= 20


@pytest.mark.parametrize("span", [3.0, 30.0, 180.0, 420.0, 999.0, 1440.0, 5200.0])
def test_fields_of_the_tracks_are_12_to_30_px(span):
    assert 12 <= track_graduation(span, 700.0).step / span * 700.0 <= 30.0001


@pytest.mark.parametrize(
    ("low", "high"),
    [(-0.06, 0.05), (1.9, 3.0), (981342.05, 981342.19), (-1200.0, 3400.0), (0.0, 1.0), (-4.2, 9.7)],
)
@pytest.mark.parametrize("width", [93.0, 124.0, 260.0, 700.0])
def test_tick_numbers_have_room(qapp, light, low, high, width):
    ticks = value_ticks(light, low, high, left=50.0, width=width)
    assert 1 <= len(ticks) <= 13
    if width >= 260:
        assert len(ticks) >= 3
    edge = 50.0
    for tick, words, middle in ticks:
        assert low <= tick <= high
        half = text_width(light, "small", words) / 2
        assert middle - half >= edge - 1e-6
        edge = middle + half + 3.9
    assert edge - 3.9 <= 50.0 + width + 1e-6


def test_a_scale_holds_values_and_bands():
    low, high = value_range([2.2, 2.4, 2.9], [0.01, 0.02, 0.01], least_span=0.2, plausible=(1.0, 3.6))
    assert low < 2.18
    assert high > 2.92
    assert high - low < 1.2


def test_a_wild_value_or_band_does_not_flatten_the_others():
    values = [2.3, 2.4, 2.35, 2.45, 2.4, 27.0]
    assert value_range(values, [0.01] * 6, least_span=0.2, plausible=(1.0, 3.6))[1] < 3
    assert value_range(values[:5], [0.01] * 4 + [5.0], least_span=0.2, plausible=(1.0, 3.6))[1] < 3


def test_a_real_layer_stays_in_the_scale():
    low, _ = value_range([2.65] * 40 + [2.0], [0.01] * 41, least_span=0.2, plausible=(1.0, 3.6))
    assert low < 2.0


def test_equal_values_have_a_scale():
    low, high = value_range([2.4], [None], least_span=0.2, plausible=(1.0, 3.6))
    assert low < 2.4 < high


def test_station_ticks_are_thinned_where_they_would_run_together():
    frame = Frame(left=0, top=0, right=10, base=300, depth_top=0.0, depth_base=1000.0)
    rows = spaced_rows(frame, [float(depth) for depth in range(1001)], 3)
    assert min(b - a for a, b in zip(rows, rows[1:], strict=False)) >= 3
    assert len(rows) > 90
    assert spaced_rows(frame, [-5.0, 0.0, 500.0, 1000.0, 1001.0], 3) == [0, 150, 300]


def test_a_scale_is_stretched_to_a_third_tick_only_where_that_is_near():
    assert value_range([-0.05, 0.04], [None, None], least_span=0.1, plausible=(-1.0, 1.0))[1] == 0.05
    low, high = value_range([1.94, 2.68], [None, None], least_span=0.2, plausible=(1.0, 3.6))
    assert (low, high) == (pytest.approx(1.8956), pytest.approx(2.7244))
