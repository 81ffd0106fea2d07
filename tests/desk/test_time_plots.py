"""Plots against time under a hand: what is clicked, brushed, walked and dragged reaches the ledger, and back."""

from dataclasses import replace

import pytest
from PySide6.QtCore import QEvent, QPoint, QPointF, Qt
from PySide6.QtGui import QColor, QMouseEvent, QWheelEvent
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication

from made_time_plots import LEFT_OUT, TARE_KEY, TARE_TIME, at, drift_plots
from plumbwell.desk.times.time_plots import TimePlots
from plumbwell.plates.lettering import text_placed
from plumbwell.plates.time_plot import RunPanel, TimePlot, time_points

LEFT, MIDDLE = Qt.MouseButton.LeftButton, Qt.MouseButton.MiddleButton
CTRL = Qt.KeyboardModifier.ControlModifier


@pytest.fixture
def plots(look, qtbot):
    """The widget with the invented plots, 640 x 500."""
    widget = TimePlots(look)
    qtbot.addWidget(widget)
    widget.resize(640, 500)
    widget.set_plots(drift_plots(), (2.6, 1), named=lambda row: f"visit {row + 1}")
    widget.show()
    return widget


def heard(signal):
    """A list that fills with what a signal carries."""
    found = []
    signal.connect(lambda *values: found.append(values[0] if len(values) == 1 else values))
    return found


def place(widget, row, plot=0):
    """Where a row's point lies in one of the plots."""
    layout = widget.time_layout()
    for run in widget._plots[plot].panels:
        rows = run.points.rows.tolist()
        if row in rows:
            panel = next(one for one in layout.axis.panels() if one.span.run_index == run.run_index)
            at_place = rows.index(row)
            return QPoint(
                round(panel.x(float(run.points.times[at_place]))),
                round(layout.frames[plot].scale.y(float(run.points.values[at_place]))),
            )
    raise AssertionError(row)


def move(widget, place, button=Qt.MouseButton.NoButton):
    """Move to a place, whatever window of another test still lies above it."""
    at = QPointF(place)
    event = QMouseEvent(
        QEvent.Type.MouseMove,
        at,
        widget.mapToGlobal(at),
        Qt.MouseButton.NoButton,
        button,
        Qt.KeyboardModifier.NoModifier,
    )
    QApplication.sendEvent(widget, event)


def drag(widget, begin, end, button=LEFT, *, release=True):
    """Press at one place and move to another by way of the middle."""
    QTest.mousePress(widget, button, pos=begin)
    for step in (QPoint((begin.x() + end.x()) // 2, (begin.y() + end.y()) // 2), end):
        move(widget, step, button)
    if release:
        QTest.mouseRelease(widget, button, pos=end)


def wheel(widget, pos, turns=1, modifiers=Qt.KeyboardModifier.NoModifier):
    """Turn the wheel at a place."""
    event = QWheelEvent(
        QPointF(pos),
        widget.mapToGlobal(QPointF(pos)),
        QPoint(),
        QPoint(0, 120 * turns),
        Qt.MouseButton.NoButton,
        modifiers,
        Qt.ScrollPhase.NoScrollPhase,
        False,
    )
    QApplication.sendEvent(widget, event)


def shot(widget):
    """What the widget shows."""
    return widget.grab().toImage()


def is_accent(widget, image, x, y):
    """Whether a pixel is accent."""
    return QColor(image.pixel(x, y)).name() == widget._look.theme.roles["accent"].lower()


@pytest.mark.parametrize("row", [0, 22, 45])
def test_clicking_a_point_chooses_its_row(plots, row):
    chosen = heard(plots.rows_chosen)
    QTest.mouseClick(plots, LEFT, pos=place(plots, row))
    assert chosen == [(row,)]


def test_clicking_in_the_lower_plot_chooses_the_same_row(plots):
    chosen = heard(plots.rows_chosen)
    QTest.mouseClick(plots, LEFT, pos=place(plots, 25, plot=1))
    assert chosen == [(25,)]


def test_clicking_where_nothing_is_chooses_nothing(plots):
    chosen = heard(plots.rows_chosen)
    QTest.mouseClick(plots, LEFT, pos=QPoint(int(plots.time_layout().axis.left) + 5, 90))
    assert chosen == [()]


def test_ctrl_click_joins_and_leaves(plots):
    chosen = heard(plots.rows_chosen)
    plots.set_selection([3, 40])
    QTest.mouseClick(plots, LEFT, CTRL, pos=place(plots, 22))
    QTest.mouseClick(plots, LEFT, CTRL, pos=place(plots, 40))
    assert chosen == [(3, 22, 40), (3,)]


def test_brushing_gives_the_rows_in_between_over_several_runs(plots):
    chosen = heard(plots.rows_chosen)
    begin, end = place(plots, 16) - QPoint(3, 60), place(plots, 22) + QPoint(3, 40)
    drag(plots, begin, end)
    assert chosen == [(16, 17, 18, 19, 20, 21, 22)]


def test_brushing_backwards_gives_the_same(plots):
    chosen = heard(plots.rows_chosen)
    drag(plots, place(plots, 22) + QPoint(3, 40), place(plots, 16) - QPoint(3, 60))
    assert chosen == [(16, 17, 18, 19, 20, 21, 22)]


def test_escape_ends_a_brush_without_choosing(plots):
    chosen = heard(plots.rows_chosen)
    drag(plots, place(plots, 16) - QPoint(3, 60), place(plots, 22), release=False)
    QTest.keyClick(plots, Qt.Key.Key_Escape)
    QTest.mouseRelease(plots, LEFT, pos=place(plots, 22))
    assert chosen == []


def test_points_that_stand_for_no_row_are_never_chosen(look, qtbot):
    widget = TimePlots(look)
    qtbot.addWidget(widget)
    widget.resize(640, 300)
    points = time_points(
        [at(14, 8), at(14, 9), at(14, 10)], [0.0, 0.5, 1.0], rows=[4, -1, 5], excluded=[False, True, False]
    )
    widget.set_plots((TimePlot(title="a", unit="µGal", panels=(RunPanel(name="run 1", run_index=0, points=points),)),))
    chosen, walked = heard(widget.rows_chosen), heard(widget.walked)
    QTest.mouseClick(widget, LEFT, pos=place(widget, -1))
    axis = widget.time_layout().axis
    drag(widget, QPoint(int(axis.left), 200), QPoint(int(axis.right), 200))
    widget.set_selection([4])
    QTest.keyClick(widget, Qt.Key.Key_Right)
    assert chosen == [(), (4, 5)]
    assert walked == [5]


def test_hovering_tells_the_row_and_grows_its_point(plots):
    hovered = heard(plots.row_hovered)
    before = shot(plots)
    spot = place(plots, 41)
    move(plots, spot)
    QApplication.processEvents()
    assert hovered[-1] == 41
    after = shot(plots)
    edge = (spot.x() + 4, spot.y() + 4)
    assert before.pixel(*edge) != after.pixel(*edge)
    QApplication.sendEvent(plots, QEvent(QEvent.Type.Leave))
    assert hovered[-1] is None
    assert shot(plots).pixel(*edge) == before.pixel(*edge)


def test_a_row_hovered_elsewhere_is_shown_and_not_told_again(plots):
    hovered = heard(plots.row_hovered)
    before = shot(plots)
    plots.set_hovered(41)
    assert shot(plots) != before
    assert hovered == []


def test_a_single_chosen_row_is_a_line_through_all_plots(plots):
    x = place(plots, 45).x()
    frames = plots.time_layout().frames
    assert not any(is_accent(plots, shot(plots), x, int(frame.scale.base) - 3) for frame in frames)
    plots.set_selection([45])
    assert all(is_accent(plots, shot(plots), x, int(frame.scale.base) - 3) for frame in frames)
    plots.set_selection([45, 46])
    assert not any(is_accent(plots, shot(plots), x, int(frame.scale.base) - 3) for frame in frames)


def test_the_wheel_zooms_time_about_the_pointer(plots):
    spot = place(plots, 30)
    panel = plots.time_layout().axis.panels()[1]
    time, scale = panel.time(spot.x()), panel.scale
    wheel(plots, spot, 4)
    panel = plots.time_layout().axis.panels()[1]
    assert panel.time(spot.x()) == pytest.approx(time, abs=60)
    assert panel.scale > 2 * scale
    QTest.mouseDClick(plots, LEFT, pos=spot)
    assert plots.time_layout().axis.panels()[1].scale == pytest.approx(scale)


def test_shift_and_wheel_zoom_the_values_of_the_plot_under_the_pointer(plots):
    upper, lower = (frame.scale for frame in plots.time_layout().frames)
    y = int(upper.y(20.0))
    wheel(plots, QPoint(300, y), 3, Qt.KeyboardModifier.ShiftModifier)
    closer, other = (frame.scale for frame in plots.time_layout().frames)
    assert closer.high - closer.low < 0.6 * (upper.high - upper.low)
    assert closer.value(y) == pytest.approx(upper.value(y))
    assert (other.low, other.high) == (lower.low, lower.high)
    QTest.keyClick(plots, Qt.Key.Key_Home)
    assert plots.time_layout().frames[0].scale == upper


def test_middle_drag_pans(plots):
    wheel(plots, place(plots, 30), 6)
    spot = QPoint(300, 200)
    panel = plots.time_layout().axis.panel_at(300)
    time = panel.time(300)
    drag(plots, spot, QPoint(360, 200), MIDDLE)
    again = next(one for one in plots.time_layout().axis.panels() if one.span == panel.span)
    assert again.x(time) == pytest.approx(360, abs=1)


def test_keys_walk_the_points_in_time_over_runs(plots):
    walked = heard(plots.walked)
    plots.walked.connect(lambda row: plots.set_selection([row]))
    plots.set_selection([18])
    for _ in range(3):
        QTest.keyClick(plots, Qt.Key.Key_Right)
    QTest.keyClick(plots, Qt.Key.Key_Left)
    assert walked == [19, 20, 21, 20]
    plots.set_selection([59])
    QTest.keyClick(plots, Qt.Key.Key_Right)
    assert walked[4:] == []


def test_walking_goes_by_time_whatever_the_rows_are_called(look, qtbot):
    widget = TimePlots(look)
    qtbot.addWidget(widget)
    widget.resize(640, 300)
    late = time_points([at(15, 9), at(15, 8)], [0.0, 1.0], rows=[0, 7])
    early = time_points([at(14, 9), at(14, 8)], [0.0, 1.0], rows=[3, 5])
    panels = tuple(
        RunPanel(name=f"run {index}", run_index=index, points=points) for index, points in enumerate((late, early))
    )
    widget.set_plots((TimePlot(title="a", unit="µGal", panels=panels),))
    walked = heard(widget.walked)
    widget.walked.connect(lambda row: widget.set_selection([row]))
    for _ in range(4):
        QTest.keyClick(widget, Qt.Key.Key_Right)
    assert walked == [5, 3, 7, 0]


def test_walking_begins_with_the_first_point_in_view(plots):
    walked = heard(plots.walked)
    wheel(plots, place(plots, 45), 8)
    QTest.keyClick(plots, Qt.Key.Key_Right)
    panel = plots.time_layout().axis.shown()[0]
    assert walked and walked[0] > 20
    assert panel.left <= place(plots, walked[0]).x() <= panel.right


def test_keys_zoom_about_the_chosen_point_and_fit(plots):
    plots.set_selection([45])
    x, scale = place(plots, 45).x(), plots.time_layout().axis.panels()[2].scale
    QTest.keyClick(plots, Qt.Key.Key_Plus)
    assert plots.time_layout().axis.panels()[2].scale == pytest.approx(1.5 * scale)
    assert place(plots, 45).x() == pytest.approx(x, abs=1)
    QTest.keyClick(plots, Qt.Key.Key_Minus)
    assert plots.time_layout().axis.panels()[2].scale == pytest.approx(scale)


def test_a_row_chosen_elsewhere_is_brought_into_view_and_then_left_alone(plots):
    wheel(plots, place(plots, 3), 8)
    plots.set_selection([50])
    axis = plots.time_layout().axis
    assert axis.left <= place(plots, 50).x() <= axis.right
    drag(plots, QPoint(300, 200), QPoint(600, 200), MIDDLE)
    moved = plots.time_layout().axis.view
    plots.set_selection([50])
    assert plots.time_layout().axis.view == moved


def test_new_values_of_the_same_runs_keep_what_is_in_view(plots):
    wheel(plots, place(plots, 30), 5)
    view = plots.time_layout().axis.view
    plots.set_plots(drift_plots(sd=5.0), (2.6, 1))
    assert plots.time_layout().axis.view == view
    one = TimePlot(title="x", unit="y", panels=drift_plots()[0].panels[:1])
    plots.set_plots((one,))
    assert plots.time_layout().axis.view.zoom == 1.0


def test_what_is_shown_is_told_in_a_sentence(plots):
    plots.set_selection([32])
    assert plots.accessibleDescription() == (
        "3 runs, 60 visits, 1 left out, run 2 has a tare at 11:42, visit 33 chosen"
    )
    plots.set_selection([1, 2, 3])
    assert plots.accessibleDescription().endswith("3 visits chosen")
    plots.set_stale(True)
    assert plots.accessibleDescription().endswith("computing")


def test_stale_curves_pale_and_the_words_stay(plots):
    before = shot(plots)
    spot = place(plots, 21)
    plots.set_stale(True)
    after = shot(plots)
    lightness = [QColor(image.pixel(spot)).lightness() for image in (before, after)]
    assert lightness[1] > lightness[0] + 30
    assert before.copy(0, 0, 640, 50) == after.copy(0, 0, 640, 50)


def test_without_plots_it_says_what_to_do_next(plots):
    with text_placed() as placed:
        plots.set_empty("Open a survey to see its readings against time.")
        plots.grab()
    assert " ".join(one.drawn for one in placed) == "Open a survey to see its readings against time."
    assert plots.accessibleDescription() == "Open a survey to see its readings against time."
    QTest.mouseClick(plots, LEFT, pos=QPoint(100, 100))
    QTest.keyClick(plots, Qt.Key.Key_Right)


def tag(widget):
    """Middle of the tag of the invented tare."""
    layout = widget.time_layout()
    return QPoint(round(layout.axis.panels()[1].x(TARE_TIME)), int(layout.top) + 6)


def test_a_tare_is_dragged_by_its_tag_and_let_go_once(plots):
    plots.set_tares_movable(True)
    moving, moved, chosen = heard(plots.tare_moving), heard(plots.tare_moved), heard(plots.rows_chosen)
    begin = tag(plots)
    wanted = plots.time_layout().axis.panels()[1].time(begin.x() + 20)
    drag(plots, begin, begin + QPoint(20, 30))
    assert len(moving) == 2 and len(moved) == 1
    key, time = moved[0]
    assert key == TARE_KEY
    assert time == pytest.approx(wanted, abs=91)
    assert time % 60 == 0, "to whole minutes"
    assert chosen == []


def test_new_plots_during_a_drag_do_not_swallow_its_end(plots):
    plots.set_tares_movable(True)
    moved = heard(plots.tare_moved)
    begin = tag(plots)
    drag(plots, begin, begin + QPoint(20, 0), release=False)
    time = plots._drag.time
    main, left = drift_plots()
    panels = list(main.panels)
    tare = replace(panels[1].tares[0], time=time)
    panels[1] = replace(panels[1], tares=(tare,))
    plots.set_plots((replace(main, panels=tuple(panels)), left), (2.6, 1))
    QTest.mouseRelease(plots, LEFT, pos=begin + QPoint(20, 0))
    assert moved == [(TARE_KEY, time)]


def test_escape_gives_a_dragged_tare_back(plots):
    plots.set_tares_movable(True)
    moving, moved = heard(plots.tare_moving), heard(plots.tare_moved)
    drag(plots, tag(plots), tag(plots) + QPoint(20, 0), release=False)
    QTest.keyClick(plots, Qt.Key.Key_Escape)
    QTest.mouseRelease(plots, LEFT, pos=tag(plots) + QPoint(20, 0))
    assert moving[-1] == (TARE_KEY, TARE_TIME)
    assert moved == []


def test_a_tare_that_may_not_be_moved_stays(plots):
    moving, moved = heard(plots.tare_moving), heard(plots.tare_moved)
    drag(plots, tag(plots), tag(plots) + QPoint(20, 0))
    QTest.keyClick(plots, Qt.Key.Key_T)
    QTest.keyClick(plots, Qt.Key.Key_Delete)
    assert moving == moved == []


def test_keys_take_move_and_remove_a_tare(plots):
    plots.set_tares_movable(True)
    moved, removed, walked = heard(plots.tare_moved), heard(plots.tare_removed), heard(plots.walked)
    QTest.keyClick(plots, Qt.Key.Key_T)
    assert "tare at 11:42 taken" in plots.accessibleDescription()
    QTest.keyClick(plots, Qt.Key.Key_Right)
    QTest.keyClick(plots, Qt.Key.Key_Left)
    QTest.keyClick(plots, Qt.Key.Key_Delete)
    assert moved == [(TARE_KEY, TARE_TIME + 60), (TARE_KEY, TARE_TIME - 60)]
    assert removed == [TARE_KEY]
    QTest.keyClick(plots, Qt.Key.Key_Escape)
    QTest.keyClick(plots, Qt.Key.Key_Right)
    assert len(walked) == 1


def test_a_tare_is_asked_for_before_the_chosen_row(plots):
    plots.set_tares_movable(True)
    asked = heard(plots.tare_asked)
    plots.set_selection([45])
    QTest.keyClick(plots, Qt.Key.Key_Insert)
    run, time = asked[0]
    assert run == 2
    assert at(16, 9, 36) < time < at(16, 10)
    plots.set_selection([40])
    QTest.keyClick(plots, Qt.Key.Key_Insert)
    assert len(asked) == 1, "nothing lies before the first point of a run"


def test_heads_and_tags_tell_more_in_their_tool_tips(plots):
    plots.set_tares_movable(True)
    x = int(plots.time_layout().axis.panels()[0].left) + 10
    words = plots.words_at(QPointF(x, 40))
    assert words.startswith("run 1, 14\u00a0Oct\u00a02025 08:00 to 15:36 UTC, 20 visits, drift +8.8")
    assert "Delete" in plots.words_at(QPointF(tag(plots)))
    assert plots.words_at(QPointF(x, 200)) == ""


@pytest.mark.parametrize("scale", [0.9, 1.6])
def test_a_larger_text_moves_everything_and_cuts_nothing(look, qtbot, scale):
    widget = TimePlots(look)
    qtbot.addWidget(widget)
    widget.set_plots(drift_plots(), (2.6, 1))
    look.choose(wanted="dark", text_scale=scale)
    widget.resize(widget.sizeHint())
    with text_placed() as placed:
        widget.grab()
    assert len(placed) > 15
    assert [one for one in placed if one.drawn != one.words] == []
    assert widget.time_layout().top == round(52 * scale)


def test_focus_is_seen(plots, qtbot):
    plots.clearFocus()
    before = shot(plots)
    plots.activateWindow()
    plots.setFocus()
    qtbot.waitUntil(plots.hasFocus)
    assert is_accent(plots, shot(plots), 0, 250) and not is_accent(plots, before, 0, 250)


def test_the_left_out_point_can_be_chosen_to_be_taken_in_again(plots):
    chosen = heard(plots.rows_chosen)
    QTest.mouseClick(plots, LEFT, pos=place(plots, LEFT_OUT))
    assert chosen == [(LEFT_OUT,)]
