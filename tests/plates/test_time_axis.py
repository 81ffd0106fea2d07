"""The time axis of runs: widths by duration, round ticks, and a view that zooms and pans without losing its place."""

import pytest

from made_time_plots import at
from plumbwell.plates.lettering import text_width
from plumbwell.plates.theme import theme_named
from plumbwell.plates.time_axis import (
    RunSpan,
    TimeView,
    clock,
    day,
    days,
    panel_widths,
    time_axis,
    time_ticks,
)


def spans(*hours):
    """Runs that begin at 08:00 on following days and last so many hours."""
    return [
        RunSpan(run_index=index, name=f"run {index + 1}", first=at(14 + index, 8), last=at(14 + index, 8) + 3600 * long)
        for index, long in enumerate(hours)
    ]


@pytest.fixture
def light():
    """The light theme."""
    return theme_named("light")


def axis_of(light, *hours, view=None, left=50.0, right=650.0):
    """The axis of runs of so many hours."""
    return time_axis(spans(*hours), light, left=left, right=right, view=view or TimeView())


def test_panels_are_as_wide_as_their_runs_are_long_and_nights_are_gaps(light):
    first, second = axis_of(light, 4, 8).panels()
    assert (second.right - second.left) / (first.right - first.left) == pytest.approx(2.0, rel=0.01)
    assert first.left == 50.0
    assert second.right == pytest.approx(650.0)
    assert second.left - first.right == pytest.approx(14.0)


def test_a_short_run_still_has_the_least_width(light):
    _, short = axis_of(light, 9, 0.1).panels()
    assert short.right - short.left == pytest.approx(44.0)


def test_widths_of_many_runs_fill_the_room_and_none_is_lost():
    widths = panel_widths([1.0, *[100.0] * 3], 400.0, 50.0)
    assert sum(widths) == pytest.approx(400.0)
    assert widths[0] == 50.0


def test_hundred_runs_all_have_a_panel_in_order(light):
    panels = axis_of(light, *[6] * 17).panels()
    assert all(one.right > one.left for one in panels)
    assert all(one.right <= other.left for one, other in zip(panels, panels[1:], strict=False))
    assert panels[-1].right == pytest.approx(650.0)


def test_a_place_is_the_time_it_stands_for(light):
    panel = axis_of(light, 4, 8).panels()[1]
    assert panel.time(panel.x(at(15, 11, 42))) == pytest.approx(at(15, 11, 42), abs=0.01)


@pytest.mark.parametrize("x", [120.0, 300.0, 640.0])
@pytest.mark.parametrize("factor", [1.25, 6.0])
def test_zooming_keeps_the_time_under_the_pointer(light, x, factor):
    axis = axis_of(light, 4, 8, 3)
    panel = axis.panel_at(x)
    time = panel.time(x)
    closer = time_axis(spans(4, 8, 3), light, left=50.0, right=650.0, view=axis.zoomed(x, factor))
    again = next(one for one in closer.panels() if one.span.run_index == panel.span.run_index)
    assert again.x(time) == pytest.approx(x, abs=0.5)
    assert again.scale == pytest.approx(factor * panel.scale)


def test_zooming_out_and_panning_never_leave_the_runs(light):
    axis = axis_of(light, 4, 8)
    assert axis.zoomed(300.0, 0.1) == TimeView()
    closer = axis_of(light, 4, 8, view=axis.zoomed(300.0, 4.0))
    begin = axis_of(light, 4, 8, view=closer.panned(1e6))
    end = axis_of(light, 4, 8, view=closer.panned(-1e6))
    assert begin.panels()[0].left == pytest.approx(50.0)
    assert end.panels()[-1].right == pytest.approx(650.0)


def test_zooming_in_stops_at_a_minute(light):
    axis = axis_of(light, 4, 8)
    for _ in range(60):
        axis = axis_of(light, 4, 8, view=axis.zoomed(300.0, 1.6))
    (panel,) = axis.shown()
    assert 55.0 < panel.last - panel.first < 70.0


def test_a_time_out_of_view_is_brought_into_it_and_one_in_view_moves_nothing(light):
    axis = axis_of(light, 4, 8)
    closer = axis_of(light, 4, 8, view=axis.zoomed(100.0, 8.0))
    assert closer.revealed(0, closer.panels()[0].time(200.0)) == closer.view
    moved = axis_of(light, 4, 8, view=closer.revealed(1, at(15, 12)))
    assert moved.left <= moved.panels()[1].x(at(15, 12)) <= moved.right


def ticks_of(light, panel, spill=6.0):
    """Ticks of a panel that may spill a little."""
    return time_ticks(light, panel, room=(panel.left - spill, panel.right + spill))


def test_ticks_stand_at_round_hours_and_their_words_do_not_touch(light):
    for panel in axis_of(light, 4, 8).shown():
        told = [(words, middle) for _, words, middle in ticks_of(light, panel) if words]
        assert told
        assert all(words.endswith(":00") for words, _ in told)
        for (words, middle), (other, following) in zip(told, told[1:], strict=False):
            reach = (text_width(light, "small", words) + text_width(light, "small", other)) / 2
            assert following - middle >= reach + 6


def test_every_panel_with_room_tells_at_least_one_time(light):
    for panel in axis_of(light, 9, 0.3, 0.2).shown():
        assert any(words for _, words, _ in ticks_of(light, panel))


def test_close_by_ticks_are_minutes_and_then_seconds(light):
    axis = axis_of(light, 8)
    minutes = axis_of(light, 8, view=axis.zoomed(300.0, 40.0)).shown()[0]
    assert {time % 60 for time, _, _ in ticks_of(light, minutes)} == {0.0}
    seconds = axis_of(light, 8, view=axis.zoomed(300.0, 450.0)).shown()[0]
    assert any(words.count(":") == 2 for _, words, _ in ticks_of(light, seconds))


def test_midnight_is_told_as_the_day(light):
    (panel,) = axis_of(light, 30).shown()
    assert "15\u00a0Oct" in [words for _, words, _ in ticks_of(light, panel)]


@pytest.mark.parametrize(
    ("first", "last", "words"),
    [
        ((14, 8), (14, 17), "14\u00a0Oct"),
        ((14, 8), (16, 1), "14 to 16\u00a0Oct"),
        ((31, 8), (32, 8), "31\u00a0Oct to 1\u00a0Nov"),
    ],
)
def test_days_of_a_run(first, last, words):
    begin = at(14, *first[1:]) + 86400 * (first[0] - 14)
    assert days(begin, at(14, *last[1:]) + 86400 * (last[0] - 14)) == words


def test_times_are_written_in_24_hours():
    assert clock(at(15, 23, 7)) == "23:07"
    assert clock(at(15, 8, 7) + 5, seconds=True) == "08:07:05"
    assert day(at(15, 0), year=True) == "15\u00a0Oct\u00a02025"
