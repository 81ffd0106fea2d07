"""Logs of up to a million samples: put in order, cut to a window, gathered to px rows without losing a spike."""

import numpy as np
import pytest
from PySide6.QtGui import QImage

from plumbwell.plates.axis import Frame
from plumbwell.plates.log_curve import LogCurve
from plumbwell.plates.painting import painting
from plumbwell.plates.polyline import log_pieces
from plumbwell.plates.track import Track
from plumbwell.plates.track_curves import draw_curves

LOW, HIGH = 1.0, 4.0


def frame(top, base, height=460.0):
    return Frame(left=20, top=52, right=320, base=52 + height, depth_top=top, depth_base=base)


def column(value, of):
    return of.left + (value - LOW) / (HIGH - LOW) * (of.right - of.left)


def test_samples_in_any_order_are_put_in_order_and_what_has_no_depth_leaves_a_gap():
    nan = float("nan")
    curve = LogCurve.of([30.0, 10.0, 20.0], [2.3, None, 2.2])
    assert curve.depth.tolist() == [10.0, 20.0, 30.0]
    assert np.isnan(curve.value[0]) and curve.value[1:].tolist() == [2.2, 2.3]
    assert (curve.low, curve.high) == (2.2, 2.3)
    holed = LogCurve.of([nan, 10.0, 20.0, nan, 30.0, 40.0], [2.0, 2.1, 2.2, 2.3, 2.4, float("inf")])
    assert holed.runs.tolist() == [[0, 2], [3, 4]], "no line joins 20 m and 30 m"
    assert holed.at(25.0) is None and holed.at(15.0) == pytest.approx(2.15)


def test_a_log_is_never_changed_and_never_unequal():
    values = np.array([2.0, 2.1])
    curve = LogCurve(depth=np.array([1.0, 2.0]), value=values)
    values[0] = 9.0
    assert curve.value[0] == 2.0
    with pytest.raises(ValueError):
        curve.value[0] = 3.0
    with pytest.raises(ValueError, match="2 depths|\\(2,\\)"):
        LogCurve(depth=np.array([1.0, 2.0]), value=np.array([1.0]))
    with pytest.raises(ValueError, match="ascending"):
        LogCurve(depth=np.array([2.0, 1.0]), value=values)


def test_the_value_between_samples_is_linear_and_there_is_none_in_gaps_and_outside():
    curve = LogCurve.of([10.0, 20.0, 30.0, 40.0], [2.0, 2.4, None, 2.6])
    assert curve.at(12.5) == pytest.approx(2.1)
    assert [curve.at(depth) for depth in (10.0, 20.0, 40.0)] == [2.0, 2.4, 2.6]
    assert [curve.at(depth) for depth in (9.9, 25.0, 30.0, 35.0, 40.1)] == [None] * 5


def gathered_by_hand(curve, of):
    """Least and greatest column of each px row, sample by sample."""
    rows = {}
    for depth, value in zip(curve.depth.tolist(), curve.value.tolist(), strict=True):
        if of.depth_top <= depth <= of.depth_base and not np.isnan(value):
            x, row = column(value, of), int(np.floor(of.y(depth)))
            least, most = rows.get(row, (x, x))
            rows[row] = (min(least, x), max(most, x))
    return rows


@pytest.mark.parametrize("gaps", ["none", "one", "many"])
@pytest.mark.parametrize("window", [(0.0, 100.0), (12.34, 47.1), (90.0, 140.0)])
def test_rows_hold_what_a_walk_over_all_samples_finds(gaps, window):
    chance = np.random.default_rng(3)
    depth = np.sort(np.concatenate([np.arange(9000) / 90.0, chance.choice(np.arange(9000) / 90.0, 3000)]))
    value = chance.uniform(1.5, 3.5, len(depth))
    if gaps == "one":
        value[(depth > 30) & (depth < 34)] = np.nan
    if gaps == "many":
        value[chance.random(len(depth)) < 0.3] = np.nan
    curve = LogCurve(depth=depth, value=value)
    of = frame(*window, height=200.0)
    wanted = gathered_by_hand(curve, of)
    found = {}
    for piece in log_pieces(curve, LOW, HIGH, of):
        for y, least, most in zip(piece.y.tolist(), piece.least.tolist(), piece.most.tolist(), strict=True):
            row = int(np.floor(y))
            before = found.get(row, (least, most))
            found[row] = (min(least, before[0]), max(most, before[1]))
    assert found.keys() <= wanted.keys()
    # A stretch of one sample between two gaps has no length, so it is not drawn.
    assert gaps == "many" or found.keys() == wanted.keys()
    if gaps != "many":
        for row, (least, most) in wanted.items():
            assert found[row] == (pytest.approx(least), pytest.approx(most))


def million():
    """A million samples with spikes of one sample each, and the depths and values of the spikes."""
    chance = np.random.default_rng(11)
    depth = np.linspace(0.0, 2000.0, 1_000_000)
    value = 2.4 + 0.01 * chance.standard_normal(len(depth))
    value[400_000:402_000] = np.nan
    at = np.sort(chance.choice(np.arange(410_000, 1_000_000), 200, replace=False))
    value[at] = np.where(chance.random(200) < 0.5, 1.3, 3.6)
    return LogCurve(depth=depth, value=value), at


def test_a_million_samples_keep_every_spike_in_every_window():
    curve, at = million()
    for window in ((0.0, 2000.0), (700.0, 1366.7), (1500.0, 1501.0), (1999.0, 2400.0)):
        of = frame(*window)
        reach = {}
        for piece in log_pieces(curve, LOW, HIGH, of):
            least, most = piece.extent
            for y, low, high in zip(piece.y.tolist(), least.tolist(), most.tolist(), strict=True):
                reach.setdefault(int(np.floor(y)), []).append((low, high))
        inside = [n for n in at.tolist() if window[0] <= curve.depth[n] <= window[1]]
        for number in inside:
            x, row = column(curve.value[number], of), int(np.floor(of.y(curve.depth[number])))
            assert any(low - 1e-6 <= x <= high + 1e-6 for low, high in reach[row]), number


def test_a_spike_among_a_million_samples_is_seen_to_its_tip(qapp, light):
    curve, at = million()
    track = Track(title="density", unit="", low=LOW, high=HIGH, line=curve)
    image = QImage(340, 520, QImage.Format.Format_RGB32)
    image.fill(light.colour("ground"))
    of = frame(0.0, 2000.0)
    with painting(image) as painter:
        draw_curves(painter, track, of, light)
    for number in at.tolist():
        value = float(curve.value[number])
        x, y = int(column(value, of)) + (1 if value < 2 else -2), int(of.y(curve.depth[number]))
        seen = [image.pixelColor(x, y + near).lightness() for near in (-1, 0, 1)]
        assert min(seen) < light.colour("ground").lightness() - 15, value
