"""The tracks under hand and keyboard: zoomed and panned windows, brushed depths, chosen points, value scales."""

import pytest
from PySide6.QtCore import QEvent, QPoint, QPointF, Qt
from PySide6.QtGui import QWheelEvent
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication

from plumbwell.desk.look import Look
from plumbwell.desk.tracks.track_window import held, whole_window, zoomed
from plumbwell.desk.tracks.tracks import Tracks
from plumbwell.plates.track import OriginBar, Point, Step, Track

LEFT, MIDDLE = Qt.MouseButton.LeftButton, Qt.MouseButton.MiddleButton
NONE, SHIFT, CTRL = (
    Qt.KeyboardModifier.NoModifier,
    Qt.KeyboardModifier.ShiftModifier,
    Qt.KeyboardModifier.ControlModifier,
)
MEASURED = (100.0, 500.0)
DEPTHS = [100.0 + 25.0 * n for n in range(17)]


def given_tracks():
    points = tuple(Point(depth=z, value=0.001 * z, sd=0.01) for z in DEPTHS)
    steps = tuple(
        Step(top=top, base=base, value=2.4, sd=0.02) for top, base in zip(DEPTHS, DEPTHS[1:], strict=False)
    )
    bars = tuple(OriginBar(depth=z, sd=5.0, shares=(0.7, 0.3)) for z in DEPTHS)
    return [
        Track(title="left over", unit="mGal", low=0.0, high=0.6, points=points),
        Track(title="density", unit="g/cm\u00b3", low=2.0, high=3.0, weight=2.0, steps=steps),
        Track(title="sd", unit="\u00b5Gal", low=0.0, high=7.0, bars=bars, origins=("depth", "reading")),
    ]


class Hand:
    """A widget of tracks with a hand on it, which shows every window that it asks for."""

    def __init__(self, qtbot, *, window=(200.0, 400.0), unit="m", measured=MEASURED, obeys=True):
        look = Look()
        look.choose(wanted="light")
        self.widget = Tracks(look)
        qtbot.addWidget(self.widget)
        self.widget.resize(600, 452)
        self.widget.set_tracks(
            given_tracks(),
            depth_label="MD",
            unit=unit,
            upward=False,
            stations=DEPTHS,
            markers=[("Oster Chalk", 150.0)],
            measured=measured,
        )
        self.widget.set_window(*window)
        self.widget.show()
        self.windows, self.brushed, self.chosen, self.walked, self.hovered = [], [], [], [], []
        if obeys:
            self.widget.window_wanted.connect(self.widget.set_window)
        self.widget.window_wanted.connect(lambda *window: self.windows.append(window))
        self.widget.range_brushed.connect(lambda *span: self.brushed.append(span))
        self.widget.point_chosen.connect(lambda *chosen: self.chosen.append(chosen))
        self.widget.walked.connect(self.walked.append)
        self.widget.depth_hovered.connect(self.hovered.append)

    @property
    def axis(self):
        return self.widget._places().axis

    def at(self, depth, track=1, part=0.5):
        """The place of a depth in a track."""
        frame = self.widget._places().tracks[track]
        return QPoint(int(frame.left + part * (frame.right - frame.left)), round(frame.y(depth)))

    def on_axis(self, depth):
        return QPoint(int(self.axis.right / 2), round(self.axis.y(depth)))

    def depth(self, place):
        """The depth at a place."""
        axis = self.axis
        return axis.depth_top + (place.y() - axis.top) / (axis.base - axis.top) * (axis.depth_base - axis.depth_top)

    def wheel(self, place, turned, modifiers=NONE, sideways=False):
        turn = QPoint(turned, 0) if sideways else QPoint(0, turned)
        event = QWheelEvent(
            QPointF(place),
            QPointF(self.widget.mapToGlobal(place)),
            QPoint(),
            turn,
            Qt.MouseButton.NoButton,
            modifiers,
            Qt.ScrollPhase.NoScrollPhase,
            False,
        )
        QApplication.sendEvent(self.widget, event)

    def drag(self, start, end, button=LEFT, release=True):
        QTest.mousePress(self.widget, button, NONE, start)
        for part in (0.3, 0.7, 1.0):
            between = start + QPoint(round(part * (end - start).x()), round(part * (end - start).y()))
            QTest.mouseMove(self.widget, between)
        if release:
            QTest.mouseRelease(self.widget, button, NONE, end)


@pytest.fixture
def hand(qtbot):
    yield Hand(qtbot)
    Look().apply()


@pytest.mark.parametrize("turned", [120, -120, 480, 15])
@pytest.mark.parametrize("depth", [210.0, 300.0, 395.0])
def test_the_wheel_zooms_about_the_pointer(hand, turned, depth):
    place = hand.at(depth)
    before = hand.depth(place)
    hand.wheel(place, turned)
    (top, base), length = hand.windows[-1], 200.0
    assert base - top < length if turned > 0 else base - top > length
    assert hand.depth(place) == pytest.approx(before, abs=1e-9)


def test_zooming_in_and_out_again_comes_back(hand):
    place = hand.at(333.0)
    for turned in (120, 120, -120, -120):
        hand.wheel(place, turned)
    assert hand.widget.depth_window == (pytest.approx(200.0), pytest.approx(400.0))


@pytest.mark.parametrize(("unit", "least"), [("m", 0.5), ("ft", 1.6)])
def test_no_zoom_goes_below_half_a_metre(qtbot, unit, least):
    hand = Hand(qtbot, unit=unit)
    place = hand.at(300.0)
    before = hand.depth(place)
    for _ in range(80):
        hand.wheel(place, 240)
    top, base = hand.widget.depth_window
    assert base - top == pytest.approx(least)
    assert hand.depth(place) == pytest.approx(before, abs=1e-6)
    count = len(hand.windows)
    hand.wheel(place, 240)
    assert len(hand.windows) == count, "nothing is asked for that is there already"


def test_the_window_stays_near_what_was_measured(hand):
    for _ in range(80):
        hand.wheel(hand.at(sum(hand.widget.depth_window) / 2), -240)
    top, base = hand.widget.depth_window
    assert base - top == pytest.approx(800.0) and (top, base) == (pytest.approx(-100.0), pytest.approx(700.0))
    hand.widget.set_window(200.0, 300.0)
    for _ in range(30):
        QTest.keyClick(hand.widget, Qt.Key.Key_PageDown)
    assert hand.widget.depth_window == (pytest.approx(450.0), pytest.approx(550.0)), "half its length beyond"
    for _ in range(30):
        QTest.keyClick(hand.widget, Qt.Key.Key_PageUp)
    assert hand.widget.depth_window == (pytest.approx(50.0), pytest.approx(150.0))


def test_windows_that_are_asked_for_are_shown_by_who_is_asked(qtbot):
    hand = Hand(qtbot, obeys=False)
    hand.wheel(hand.at(300.0), 120)
    assert len(hand.windows) == 1 and hand.widget.depth_window == (200.0, 400.0)


@pytest.mark.parametrize(("button", "on_axis"), [(MIDDLE, False), (MIDDLE, True), (LEFT, True)])
def test_dragging_pans_with_the_hand(hand, button, on_axis):
    start = hand.on_axis(300.0) if on_axis else hand.at(300.0)
    taken = hand.depth(start)
    end = start + QPoint(3, -60)
    hand.drag(start, end, button)
    assert hand.depth(end) == pytest.approx(taken)
    top, base = hand.widget.depth_window
    assert base - top == pytest.approx(200.0) and top > 200.0
    assert hand.brushed == hand.chosen == []


def test_a_drag_in_the_tracks_brushes_depths(hand):
    start, end = hand.at(350.0), hand.at(250.0, track=2)
    wanted = (hand.depth(end), hand.depth(start))
    hand.drag(start, end)
    assert hand.brushed == [(pytest.approx(wanted[0]), pytest.approx(wanted[1]))]
    assert hand.windows == hand.chosen == []


def test_a_brush_is_seen_while_it_is_dragged_and_goes_no_farther_than_the_window(hand):
    hand.drag(hand.at(350.0), hand.at(250.0), release=False)
    tint = hand.widget.look.theme.colour("tint")
    x = hand.at(300.0, part=0.1).x()
    image = hand.widget.grab().toImage()
    assert image.pixelColor(x, hand.at(330.0).y()) == tint
    assert image.pixelColor(x, hand.at(380.0).y()) != tint
    below = QPoint(x, hand.widget.height() + 300)
    QTest.mouseMove(hand.widget, below)
    QTest.mouseRelease(hand.widget, LEFT, NONE, below)
    assert hand.brushed[0][1] == pytest.approx(400.0)
    assert hand.widget.grab().toImage().pixelColor(x, hand.at(330.0).y()) != tint


def test_escape_drops_a_brush(hand):
    hand.drag(hand.at(350.0), hand.at(250.0), release=False)
    QTest.keyClick(hand.widget, Qt.Key.Key_Escape)
    QTest.mouseRelease(hand.widget, LEFT, NONE, hand.at(250.0))
    assert hand.brushed == hand.chosen == []


@pytest.mark.parametrize(
    ("track", "depth", "wanted"), [(0, 303.0, 300.0), (0, 314.0, 325.0), (1, 303.0, 312.5), (2, 322.0, 325.0)]
)
def test_a_click_chooses_the_nearest_point_or_the_step(hand, track, depth, wanted):
    QTest.mouseClick(hand.widget, LEFT, NONE, hand.at(depth, track=track))
    QTest.mouseClick(hand.widget, LEFT, SHIFT, hand.at(depth, track=track))
    QTest.mouseClick(hand.widget, LEFT, CTRL, hand.at(depth, track=track))
    assert hand.chosen == [(wanted, False), (wanted, True), (wanted, True)]
    assert hand.brushed == []


def test_a_click_on_the_axis_or_a_head_chooses_nothing(hand):
    QTest.mouseClick(hand.widget, LEFT, NONE, hand.on_axis(300.0))
    QTest.mouseClick(hand.widget, LEFT, NONE, QPoint(hand.at(300.0).x(), 20))
    QTest.mouseClick(hand.widget, Qt.MouseButton.RightButton, NONE, hand.at(300.0))
    assert hand.chosen == hand.windows == hand.brushed == []


def test_the_pointer_tells_its_depth_and_the_crosshair_follows(hand):
    place = hand.at(287.0)
    QTest.mouseMove(hand.widget, place)
    assert hand.hovered[-1] == pytest.approx(hand.depth(place))
    assert hand.widget._crosshair == pytest.approx(hand.depth(place))
    assert f"At {hand.depth(place):.1f} m MD" in hand.widget.accessibleDescription()
    QTest.mouseMove(hand.widget, QPoint(place.x(), 10))
    assert hand.hovered[-1] is None and hand.widget._crosshair is None
    QTest.mouseMove(hand.widget, place)
    QApplication.sendEvent(hand.widget, QEvent(QEvent.Type.Leave))
    assert hand.hovered[-1] is None and "At " not in hand.widget.accessibleDescription()


def test_the_nearest_point_grows_under_the_pointer(hand):
    near, far = hand.at(301.0, track=0), hand.at(312.0, track=0)
    QTest.mouseMove(hand.widget, near)
    assert hand.widget._hovered == 300.0
    QTest.mouseMove(hand.widget, far)
    assert hand.widget._hovered is None


def test_double_clicks_fit_depth_and_values(hand):
    own = hand.widget._scene.tracks[0]
    place = hand.at(300.0, track=0)
    value = own.value_at(place.x(), hand.widget._places().tracks[0])
    hand.wheel(place, 240, SHIFT)
    zoomed_in = hand.widget._scene.tracks[0]
    assert zoomed_in.high - zoomed_in.low < own.high - own.low
    assert zoomed_in.value_at(place.x(), hand.widget._places().tracks[0]) == pytest.approx(value)
    assert hand.windows == [] and hand.widget._scene.tracks[1].high == 3.0, "one track alone"
    QTest.mouseDClick(hand.widget, LEFT, NONE, QPoint(place.x(), 15))
    assert (hand.widget._scene.tracks[0].low, hand.widget._scene.tracks[0].high) == (own.low, own.high)
    QTest.mouseDClick(hand.widget, LEFT, NONE, place)
    top, base = hand.windows[-1]
    assert top <= 100.0 and base >= 500.0 and base - top < 420.0


def test_zoomed_values_stay_when_new_values_arrive(hand):
    hand.wheel(hand.at(300.0, track=0), 120, SHIFT, sideways=True)
    ends = [(track.low, track.high) for track in hand.widget._scene.tracks]
    hand.widget.set_tracks(
        given_tracks(), depth_label="MD", unit="m", upward=False, stations=DEPTHS, markers=[], measured=MEASURED
    )
    assert [(track.low, track.high) for track in hand.widget._scene.tracks] == ends
    assert ends[0] != (0.0, 0.6)


def test_the_keyboard_walks_pans_zooms_and_fits(hand):
    keys = Qt.Key
    QTest.keyClick(hand.widget, keys.Key_Down)
    QTest.keyClick(hand.widget, keys.Key_Up)
    assert hand.walked == [1, -1]
    QTest.keyClick(hand.widget, keys.Key_PageDown)
    assert hand.widget.depth_window == (pytest.approx(360.0), pytest.approx(560.0))
    QTest.keyClick(hand.widget, keys.Key_PageUp)
    QTest.keyClick(hand.widget, keys.Key_Plus)
    top, base = hand.widget.depth_window
    assert base - top == pytest.approx(200.0 / 1.5)
    assert (top + base) / 2 == pytest.approx(300.0)
    QTest.keyClick(hand.widget, keys.Key_Minus)
    assert hand.widget.depth_window == (pytest.approx(200.0), pytest.approx(400.0))
    hand.widget.set_crosshair(220.0)
    QTest.keyClick(hand.widget, keys.Key_Plus)
    top, base = hand.widget.depth_window
    assert (220.0 - top) / (base - top) == pytest.approx(0.1), "about the crosshair"
    QTest.keyClick(hand.widget, keys.Key_Home)
    assert hand.widget.depth_window == whole_window(MEASURED, "m")


def test_the_keyboard_is_seen_where_it_is(hand):
    accent = hand.widget.look.theme.colour("accent")

    def framed():
        image = hand.widget.grab().toImage()
        return all(image.pixelColor(0, y).saturation() > 100 for y in range(5, image.height(), 40)), image

    hand.widget.activateWindow()
    hand.widget.setFocus()
    QApplication.processEvents()
    seen, image = framed()
    assert seen and abs(image.pixelColor(0, 200).hue() - accent.hue()) < 10
    hand.widget.clearFocus()
    assert not framed()[0]


def test_windows_of_a_single_depth_can_be_held():
    assert held((10.0, 10.1), (10.0, 10.0), "m") == (pytest.approx(9.75), pytest.approx(10.25))
    top, base = zoomed((0.0, 1.0), 0.1, 0.5, (0.0, 0.0), "m")
    assert base - top == pytest.approx(0.5)
    assert whole_window((0.0, 100.0), "ft") == (pytest.approx(-1.2), pytest.approx(101.2))
