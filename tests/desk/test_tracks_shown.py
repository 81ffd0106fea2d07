"""What the tracks show: values at the crosshair, selection, choice of tracks, every text in its room at any size."""

import pytest
from PySide6.QtCore import QPoint, Qt
from PySide6.QtGui import QColor, QContextMenuEvent
from PySide6.QtWidgets import QApplication, QMenu

from plumbwell.desk.look import Look
from plumbwell.desk.tracks.tracks import Tracks
from plumbwell.plates.axis import head_height
from plumbwell.plates.figure_of import survey_plate
from plumbwell.plates.lettering import ELLIPSIS, text_placed
from plumbwell.plates.numbers import number, with_sd
from plumbwell.plates.survey_tracks import effect_tracks, survey_tracks


@pytest.fixture(scope="module")
def plate(well):
    return survey_plate(well)


@pytest.fixture
def look(qapp):
    made = Look()
    made.choose(wanted="light")
    yield made
    Look().apply()


def shown(qtbot, look, plate, *, tracks=None, size=(640, 480), window=None, memory=None, **changes):
    """The tracks of a plate in a widget of a size, a third of the hole in view."""
    widget = Tracks(look, memory=memory)
    qtbot.addWidget(widget)
    widget.resize(*size)
    low, high = plate.depth_range
    values = {
        "depth_label": "MD",
        "unit": "m",
        "upward": False,
        "stations": sorted(station.depth for station in plate.stations),
        "markers": plate.markers,
        "measured": plate.depth_range,
    }
    widget.set_tracks(survey_tracks(plate, wide=True) if tracks is None else tracks, **{**values, **changes})
    widget.set_window(*(window or (low + (high - low) / 3, low + 2 * (high - low) / 3)))
    return widget


def reduction_tracks(plate):
    stations = sorted(plate.stations, key=lambda station: station.depth)
    depths = [station.depth for station in stations]
    return effect_tracks(
        depths,
        large=[("free air", [0.3086 * z for z in depths]), ("shells", [-0.19 * z for z in depths])],
        small=[("terrain", [0.25 + 0.0003 * z for z in depths], None)],
        left_over=[station.anomaly for station in stations],
        left_over_sd=[station.anomaly_sd for station in stations],
        origins=[(name, [size] * len(depths)) for name, size in (("depth", 4.0), ("reading", 3.0), ("drift", 1.0))],
    )


def texts(widget):
    """What is written while the widget is painted anew."""
    widget._kept = widget._heads = None
    with text_placed() as placed:
        widget.grab()
    return placed


def test_the_crosshair_reads_the_values_of_the_survey(qtbot, look, plate):
    widget = shown(qtbot, look, plate)
    interval = next(row for row in plate.intervals if row.top > widget.depth_window[0] + 100)
    above, below = (
        next(station for station in plate.stations if station.depth == depth)
        for depth in (interval.top, interval.base)
    )
    depth = interval.top + 0.25 * (interval.base - interval.top)
    widget.set_crosshair(depth)
    gravity, left, density, difference = survey_tracks(plate, wide=True)
    words = "".join(text.drawn for text in texts(widget))
    for track, first, last in ((gravity, above.gravity, below.gravity), (left, above.anomaly, below.anomaly)):
        assert number(0.75 * first + 0.25 * last, track.decimals, signed=track.signed) in words
    assert with_sd(interval.density, interval.sd, decimals=density.decimals) in words
    assert with_sd(interval.difference, interval.difference_sd, decimals=difference.decimals, signed=True) in words
    assert f"log {number(plate.log.at(depth), density.decimals)}" in words
    assert number(depth, 1) in [text.drawn for text in texts(widget)]
    assert f"At {number(depth, 1)} m MD: gravity" in widget.accessibleDescription()


def test_the_read_out_goes_with_the_crosshair(qtbot, look, plate):
    widget = shown(qtbot, look, plate)
    before = len(texts(widget))
    widget.set_crosshair(sum(widget.depth_window) / 2)
    assert len(texts(widget)) > before + 3
    widget.set_crosshair(widget.depth_window[1] + 50.0)
    assert len(texts(widget)) == before, "out of the window there is nothing to read"
    widget.set_crosshair(None)
    assert len(texts(widget)) == before and "At " not in widget.accessibleDescription()


def test_the_printed_sd_is_one_whatever_the_bars_are(qtbot, look, plate):
    widget = shown(qtbot, look, plate)
    interval = next(row for row in plate.intervals if row.top > widget.depth_window[0] + 100)
    widget.set_crosshair((interval.top + interval.base) / 2)
    density = survey_tracks(plate, wide=True)[2]
    for bars in (1, 2):
        look.choose(bars=bars)
        wanted = with_sd(interval.density, interval.sd, decimals=density.decimals)
        assert any(text.drawn.startswith(wanted) for text in texts(widget))


@pytest.mark.parametrize("scale", [0.9, 1.0, 1.6])
@pytest.mark.parametrize("size", [(760, 520), (640, 480), (480, 360)])
@pytest.mark.parametrize("stage", ["density", "reduction"])
def test_every_text_has_its_room_and_no_number_is_shortened(qtbot, look, plate, scale, size, stage):
    look.choose(text_scale=scale)
    tracks = None if stage == "density" else reduction_tracks(plate)
    widget = shown(qtbot, look, plate, tracks=tracks, size=size)
    top, base = widget.depth_window
    for part in (0.02, 0.4, 0.98):
        widget.set_crosshair(top + part * (base - top))
        placed = texts(widget)
        assert len(placed) > 12
        for text in placed:
            shortened = text.drawn != text.words
            assert not (shortened and any(figure.isdigit() for figure in text.words)), text.words
            if shortened:
                assert text.drawn.endswith(ELLIPSIS)
            if text.allowed is not None:
                assert text.needed.left() >= text.allowed[0] - 0.01, text.drawn
                assert text.needed.right() <= text.allowed[1] + 0.01, text.drawn
            assert -0.01 <= text.needed.left() and text.needed.right() <= size[0] + 0.51, text.drawn
            assert -0.01 <= text.needed.top() and text.needed.bottom() <= size[1] + 2, text.drawn


@pytest.mark.parametrize("scale", [0.9, 1.0, 1.6])
def test_words_that_stay_do_not_overlap(qtbot, look, plate, scale):
    look.choose(text_scale=scale)
    for tracks in (None, reduction_tracks(plate)):
        placed = texts(shown(qtbot, look, plate, tracks=tracks, size=(700, 500)))
        boxes = [(text.drawn, text.needed.adjusted(0.5, 1, -0.5, -2)) for text in placed if text.drawn.strip()]
        for index, (words, box) in enumerate(boxes):
            for other_words, other in boxes[index + 1 :]:
                assert not box.intersects(other), (words, other_words)


@pytest.mark.parametrize("scale", [0.9, 1.0, 1.6])
def test_one_ink_line_runs_under_all_heads(qtbot, look, plate, scale):
    look.choose(text_scale=scale)
    image = shown(qtbot, look, plate).grab().toImage()
    row, ink = head_height(look.theme) - 1, QColor(look.theme.roles["ink"])
    assert all(image.pixelColor(x, row) == ink for x in range(image.width()))
    assert any(image.pixelColor(x, row + 1) != ink for x in range(image.width()))


def test_elevations_are_written_with_their_own_sign(qtbot, look, plate):
    widget = shown(qtbot, look, plate, upward=True, depth_label="elevation", window=(-60.0, 300.0))
    widget.set_crosshair(100.0)
    words = [text.drawn for text in texts(widget)]
    assert "\u2212100.0" in words and "\u2212200" in words and "elevation" in words
    assert "60 to \u2212300 m elevation" in widget.accessibleDescription()


def test_the_ground_is_a_line_and_the_level_of_the_sea_is_not(qtbot, look, plate):
    strong = QColor(look.theme.roles["strong"])
    for upward, wanted in ((False, True), (True, False)):
        widget = shown(qtbot, look, plate, upward=upward, measured=(-60.0, 300.0), window=(-61.3, 90.0))
        gap = int(widget._places().tracks[0].right) + 4
        image = widget.grab().toImage()
        row = round(widget._places().axis.y(0.0))
        assert (strong in [image.pixelColor(gap, row + near) for near in (-1, 0, 1)]) is wanted


def test_the_selection_is_a_band_with_rings_and_an_overlay(qtbot, look, plate):
    widget = shown(qtbot, look, plate)
    first, second = [row for row in plate.intervals if row.top > widget.depth_window[0] + 60][:2]
    places = widget._places()
    spans = [(first.top, first.base), (second.top, second.base)]
    widget.set_selection(spans, [first.top, first.base, second.base], said="intervals 5 and 6")
    image = widget.grab().toImage()
    accent, tint = (QColor(look.theme.roles[role]) for role in ("accent", "tint"))
    x = int(places.tracks[2].left) + 3
    rows = [y for y in range(image.height()) if image.pixelColor(x, y) == accent]
    ends = [round(places.axis.y(depth)) for depth in (first.top, second.base)]
    assert rows == [pytest.approx(end, abs=1) for end in ends], "neighbours are one band"
    assert image.pixelColor(2, sum(ends) // 2) == tint, "from the fan at the left"
    assert image.pixelColor(image.width() - 3, sum(ends) // 2 + 1) == tint
    for depth in (first.top, first.base, second.base):
        frame, track = places.tracks[0], widget._scene.tracks[0]
        column = round(track.x(next(s.gravity for s in plate.stations if s.depth == depth), frame))
        row = round(frame.y(depth))
        assert any(image.pixelColor(column + step, row + 2).saturation() > 150 for step in (3, 4, 5))
    assert "intervals 5 and 6 chosen" in widget.accessibleDescription()
    widget.set_selection(spans)
    assert f"{number(first.top, 1)} to {number(second.base, 1)} m MD chosen" in widget.accessibleDescription()
    widget.set_selection([(first.top, first.top)])
    image = widget.grab().toImage()
    assert [y for y in range(image.height()) if image.pixelColor(x, y) == accent] == [rows[0]]
    assert f"{number(first.top, 1)} m MD chosen" in widget.accessibleDescription()


@pytest.mark.parametrize("words", ["Sallowick Limestone", "gravity", "log, mean and range"])
def test_the_band_shows_behind_names(qtbot, look, plate, words):
    widget = shown(qtbot, look, plate)
    box = [text.needed for text in texts(widget) if text.drawn == words][-1]
    axis = widget._places().axis

    def depth(y):
        return axis.depth_top + (y - axis.top) / (axis.base - axis.top) * (axis.depth_base - axis.depth_top)

    widget.set_selection([(depth(box.top() - 20), depth(box.bottom() + 20))])
    image = widget.grab().toImage()
    tint = QColor(look.theme.roles["tint"])
    before = [image.pixelColor(int(box.left()) - 1, y) for y in range(int(box.top()), int(box.bottom()))]
    assert all(colour == tint for colour in before)


def test_stale_curves_keep_their_place_at_half_strength(qtbot, look, plate):
    widget = shown(qtbot, look, plate)
    fresh = widget.grab().toImage()
    widget.set_stale(True)
    stale = widget.grab().toImage()
    frame, track = widget._places().tracks[2], widget._scene.tracks[2]
    step = next(step for step in track.steps if step.top > widget.depth_window[0] + 50)
    row = round(frame.y((step.top + step.base) / 2))
    columns = range(int(track.x(step.value, frame)) - 3, int(track.x(step.value, frame)) + 4)
    dark = [min(image.pixelColor(x, row).lightness() for x in columns) for image in (fresh, stale)]
    assert dark[0] < 60 < 110 < dark[1] < 180
    head = [(x, y) for x in range(0, 300, 3) for y in range(0, 50)]
    assert all(fresh.pixel(*at) == stale.pixel(*at) for at in head), "words are not dimmed"


def test_hovering_costs_no_new_curves(qtbot, look, plate, monkeypatch):
    widget = shown(qtbot, look, plate)
    widget.grab()
    painted = []
    monkeypatch.setattr("plumbwell.desk.tracks.track_layers.draw_curves", lambda *args: painted.append(args))
    for depth in (600.0, 610.0, None):
        widget.set_crosshair(depth)
        widget.set_hovered(depth)
        widget.set_selection([(600.0, 620.0)], [600.0])
        widget.grab()
    assert painted == []
    widget.set_window(500.0, 700.0)
    widget.grab()
    assert len(painted) == 4


def test_narrow_windows_keep_density_and_difference_unless_one_chose(qtbot, look, plate):
    memory = {}
    widget = shown(qtbot, look, plate, memory=memory, stage="density")
    titles = [title for title, _ in widget.track_choices()]
    assert titles == ["gravity", "left over", "density", "difference"]
    widget.set_narrow(True)
    assert [title for title, is_shown in widget.track_choices() if is_shown] == ["density", "difference"]
    widget.choose_tracks(["left over", "density"])
    assert [title for title, is_shown in widget.track_choices() if is_shown] == ["left over", "density"]
    again = shown(qtbot, look, plate, memory=memory, stage="density")
    assert [title for title, is_shown in again.track_choices() if is_shown] == ["left over", "density"]
    other = shown(qtbot, look, plate, memory=memory, stage="other")
    assert all(is_shown for _, is_shown in other.track_choices())
    widget.choose_tracks([])
    assert [title for title, is_shown in widget.track_choices() if is_shown] == ["left over", "density"]


def test_titles_that_have_no_room_side_by_side_leave_the_lesser_tracks_out(qtbot, look, plate):
    widget = shown(qtbot, look, plate, size=(900, 480))
    assert len(widget._scene.tracks) == 4
    widget.resize(360, 480)
    widget.grab()
    assert [track.title for track in widget._scene.tracks] == ["density", "difference"]
    widget.resize(900, 480)
    widget.grab()
    assert len(widget._scene.tracks) == 4


def test_the_menu_chooses_tracks(qtbot, look, plate):
    widget = shown(qtbot, look, plate)
    event = QContextMenuEvent(QContextMenuEvent.Reason.Keyboard, QPoint(5, 5), widget.mapToGlobal(QPoint(5, 5)))
    QApplication.sendEvent(widget, event)
    menu = widget.findChild(QMenu)
    gravity = menu.actions()[0]
    assert (gravity.text(), gravity.isChecked()) == ("gravity", True)
    gravity.trigger()
    menu.close()
    assert [title for title, is_shown in widget.track_choices() if is_shown] == ["left over", "density", "difference"]
    assert [track.title for track in widget._scene.tracks] == ["left over", "density", "difference"]
    widget.choose_tracks(["density"])
    assert [action.isEnabled() for action in widget.menu().actions()[:4]] == [True, True, False, True]


def test_a_tag_clears_the_number_that_it_covers_in_part(qtbot, look, plate):
    widget = shown(qtbot, look, plate)
    axis = widget._places().axis
    widget.set_crosshair(700.0 + 12 * (axis.depth_base - axis.depth_top) / (axis.base - axis.top))
    image = widget.grab().toImage()
    row = round(axis.y(700.0)) - 3
    ground = QColor(look.theme.roles["ground"])
    assert all(image.pixelColor(x, row) == ground for x in range(22, int(axis.right)))


def test_without_tracks_there_is_an_axis_and_no_word_of_values(qtbot, look, plate):
    widget = shown(qtbot, look, plate, tracks=[])
    widget.set_crosshair(600.0)
    assert "600.0" in [text.drawn for text in texts(widget)]
    assert widget.accessibleDescription() == "no tracks"
    assert widget.focusPolicy() == Qt.FocusPolicy.StrongFocus


def test_where_even_the_least_tracks_have_no_room_the_main_one_stays_unless_another_is_asked_for(qtbot, look, plate):
    narrow = shown(qtbot, look, plate, size=(240, 480))
    assert [title for title, is_shown in narrow.track_choices() if is_shown] == ["density"]
    narrow.choose_tracks(["density", "difference"])
    assert [title for title, is_shown in narrow.track_choices() if is_shown] == ["density", "difference"]


def test_the_edge_of_a_band_does_not_strike_through_the_values_at_the_crosshair(qtbot, look, plate):
    widget = shown(qtbot, look, plate, size=(900, 480))
    axis = widget._places().axis
    line = round(axis.y(axis.depth_top + 0.5 * (axis.depth_base - axis.depth_top)))
    per_px = (axis.depth_base - axis.depth_top) / (axis.base - axis.top)
    depth = axis.depth_top + (line - axis.top) * per_px
    widget.set_crosshair(depth)
    # Ten px above the crosshair lies the middle of the words.
    widget.set_selection([(depth - 60 * per_px, depth - 10 * per_px)])
    image, accent = widget.grab().toImage(), QColor(look.theme.roles["accent"])
    columns = [x for x in range(image.width()) if image.pixelColor(x, line - 10) == accent]
    gaps = [right - left for left, right in zip(columns, columns[1:], strict=False) if right - left > 30]
    assert len(columns) > 100 and len(gaps) >= 3, "the edge is there, and leaves out the words of each track"
