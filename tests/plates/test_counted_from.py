"""Scales of long numbers: their ticks count from a round number, which is told in the head or in the track."""

import pytest
from PySide6.QtGui import QImage

from plumbwell.plates.axis import Frame, value_ticks
from plumbwell.plates.lettering import text_placed
from plumbwell.plates.naming import draw_base_name
from plumbwell.plates.painting import painting
from plumbwell.plates.survey_tracks import point_track, round_below
from plumbwell.plates.track import Point
from plumbwell.plates.track_row import base_in_head, draw_track_head, track_widths

POINTS = tuple(Point(depth=float(row), value=981_440.0 + 1.6 * row, sd=0.005) for row in range(0, 100, 5))


def placed_by(theme, *draws):
    image = QImage(500, 500, QImage.Format.Format_RGB32)
    with text_placed() as placed, painting(image) as painter:
        for draw in draws:
            draw(painter)
    return placed


def frame(width):
    return Frame(left=100.0, top=60.0, right=100.0 + width, base=460.0, depth_top=0.0, depth_base=100.0)


def gravity():
    track = point_track(POINTS, title="gravity", unit="mGal", weight=0.75)
    assert track is not None
    return track


def written(theme, track, width):
    placed = placed_by(
        theme,
        lambda painter: draw_track_head(painter, track, frame(width), theme),
        lambda painter: draw_base_name(painter, track, frame(width), theme),
    )
    return [one.drawn for one in placed]


@pytest.mark.parametrize(
    ("low", "high", "base"),
    [(-5.0, 40.0, 0.0), (4_200.0, 4_260.0, 0.0), (981_440.0, 981_600.0, 981_000.0), (981_450.0, 981_465.0, 981_400.0)],
)
def test_numbers_count_from_a_round_one_only_where_they_are_long(low, high, base):
    assert round_below(low, high) == base


def test_ticks_that_count_from_a_number_give_the_value_when_it_is_added(light):
    ticks = value_ticks(light, 981_440.0, 981_600.0, left=0.0, width=300.0, counted_from=981_000.0)
    assert len(ticks) >= 3
    for value, words, _ in ticks:
        assert 981_000.0 + float(words) == value


@pytest.mark.parametrize("width", [84, 300])
def test_what_the_numbers_count_from_is_told_once(qapp, light, width):
    track = gravity()
    found = written(light, track, width)
    assert sum("+\u00a0981\u00a0000" in words for words in found) == 1
    assert ("mGal +\u00a0981\u00a0000" in found) == base_in_head(light, track, frame(width)) == (width == 300)
    assert len([words for words in found if words.isdigit()]) >= 2, "also where there is little room"


def test_a_track_is_wide_enough_to_tell_it(qapp, light):
    track = gravity()
    (width, _) = track_widths(light, [track, point_track(POINTS, title="other", unit="", weight=20.0)], 500.0)
    assert any("981" in words for words in written(light, track, width))


def test_it_stands_clear_of_the_curve(qapp, light):
    track, own = gravity(), frame(84)
    (box,) = [one.needed for one in placed_by(light, lambda painter: draw_base_name(painter, track, own, light))]
    inside = [point for point in POINTS if box.top() <= own.y(point.depth) <= box.bottom()]
    assert all(track.x(point.value, own) < box.left() for point in inside)

