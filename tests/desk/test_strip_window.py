"""The depth window as the grip changes it: it keeps to the hole, its least length and the depth under the pointer."""

import pytest

from plumbwell.desk.hole.strip_window import window_limits

HOLE = window_limits((0.0, 1000.0), "m")
AIR = 12.0


def test_a_line_of_the_grip_goes_to_the_end_of_the_hole_and_never_past_the_other_line():
    assert HOLE.resized((200.0, 600.0), "top", 350.0) == (350.0, 600.0)
    assert HOLE.resized((200.0, 600.0), "base", 650.0) == (200.0, 650.0)
    assert HOLE.resized((200.0, 600.0), "top", -500.0) == (-AIR, 600.0)
    assert HOLE.resized((200.0, 600.0), "base", 5000.0) == (200.0, 1000.0 + AIR)
    assert HOLE.resized((200.0, 600.0), "top", 700.0) == (598.0, 600.0)
    assert HOLE.resized((200.0, 600.0), "base", 100.0) == (200.0, 202.0)


def test_the_least_window_is_two_metres_or_a_five_hundredth_of_the_hole():
    assert window_limits((0.0, 500.0), "m").least == 2.0
    assert window_limits((0.0, 5000.0), "m").least == 10.0
    assert window_limits((0.0, 1000.0), "ft").least == pytest.approx(2.0 / 0.3048)
    assert window_limits((0.0, 1.5), "m").least == 1.5, "a hole shorter than that is shown whole"


def test_a_moved_window_keeps_its_length_and_stops_at_the_ends():
    assert HOLE.moved((200.0, 600.0), 50.0) == (250.0, 650.0)
    assert HOLE.moved((200.0, 600.0), -900.0) == (-AIR, 400.0 - AIR)
    assert HOLE.moved((200.0, 600.0), 900.0) == (600.0 + AIR, 1000.0 + AIR)
    assert HOLE.moved((-300.0, 1900.0), 10.0) == HOLE.whole, "one that reached beyond the hole is brought back"


@pytest.mark.parametrize("factor", [0.5, 0.8, 1.25])
def test_zooming_keeps_the_depth_under_the_pointer_in_its_place(factor):
    top, base = HOLE.zoomed((200.0, 600.0), 300.0, factor)
    assert base - top == pytest.approx(400.0 * factor)
    assert (300.0 - top) / (base - top) == pytest.approx(0.25)


def test_zooming_ends_at_the_least_window_and_at_the_whole_hole():
    top, base = HOLE.zoomed((200.0, 203.0), 201.0, 0.01)
    assert base - top == pytest.approx(2.0)
    assert HOLE.zoomed((200.0, 600.0), 300.0, 100.0) == pytest.approx(HOLE.whole)


def test_a_window_about_a_depth_stays_in_the_hole():
    assert HOLE.about((0.0, 100.0), 500.0) == (450.0, 550.0)
    assert HOLE.about((0.0, 100.0), 10.0) == (-AIR, 100.0 - AIR)
