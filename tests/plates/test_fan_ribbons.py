"""Ribbons of the fan: where their edges run, also for what the mouse is over, and that none is without end."""

import pytest
from PySide6.QtCore import QPointF
from PySide6.QtGui import QImage

from plumbwell.plates.axis import Frame
from plumbwell.plates.fan import (
    Ribbon,
    boundary_row,
    draw_fan,
    draw_station_threads,
    interval_ribbons,
    ribbon_shape,
)
from plumbwell.plates.painting import painting

FRAME = Frame(left=10, top=50, right=70, base=450, depth_top=100.0, depth_base=500.0)


@pytest.mark.parametrize("depth", [120.0, 180.0, 400.0, 1400.0])
def test_the_edge_under_the_pointer_is_the_edge_that_is_drawn(qapp, depth):
    ribbon = Ribbon(row_top=60, row_base=70, top=depth, base=depth + 60, density=2.4)
    shape = ribbon_shape(ribbon, FRAME)
    for x in range(11, 70, 4):
        upper = boundary_row(FRAME, 60, depth, x)
        lower = boundary_row(FRAME, 70, depth + 60, x)
        assert upper < lower
        assert shape.contains(QPointF(x, (upper + lower) / 2))
        assert not shape.contains(QPointF(x, upper - 0.6))
        assert not shape.contains(QPointF(x, lower + 0.6))


def test_an_edge_is_straight_at_both_ends():
    assert [boundary_row(FRAME, 60, 300.0, x) for x in (10, 13, 16)] == [60, 60, 60]
    assert [boundary_row(FRAME, 60, 300.0, x) for x in (64, 67, 70)] == [250, 250, 250]
    assert boundary_row(FRAME, 60, 300.0, 40) == pytest.approx(155, abs=0.01)


@pytest.mark.parametrize("depth", [-1e7, 1e7])
def test_far_ribbons_and_threads_stay_within_what_a_painter_can_hold(qapp, light, depth):
    rows = interval_ribbons([(depth, depth + 50, 2.4, False)], first_row=60, row_height=24)
    bounds = ribbon_shape(rows[0], FRAME).boundingRect()
    assert abs(bounds.top()) < 4000 and abs(bounds.bottom()) < 4000
    image = QImage(80, 500, QImage.Format.Format_RGB32)
    image.fill(light.colour("ground"))
    with painting(image) as painter:
        draw_fan(painter, rows, FRAME, light)
        draw_station_threads(painter, [(100, depth)], FRAME, light)
    assert image.pixelColor(12, 72) == light.tone(2.4)
    assert image.pixelColor(12, 100) == light.colour("accent")
