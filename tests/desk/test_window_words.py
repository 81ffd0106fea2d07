"""Words of the real window that lie in one another's way, and what it says of several rows at once."""

from __future__ import annotations

from itertools import pairwise

from PySide6.QtCore import Qt
from PySide6.QtGui import QColor

from plumbwell.desk.frame.status import status_words
from plumbwell.desk.stages import states
from plumbwell.plates.depth_scale import ELEVATION
from plumbwell.plates.painting import whole
from plumbwell.plates.track_marks import knocked_out, placed_readout
from reduced_surveys import WELL


def written(image, box, line, readout=()):
    """How many px of a box are as dark as muted words, but for the rows of the crosshair and its words."""
    return sum(
        image.pixelColor(x, y).lightness() < 170
        for x in range(int(box.left()), int(box.right()))
        for y in range(int(box.top()), int(box.bottom()))
        if abs(y - line) > 1 and not any(one.contains(x + 0.5, y + 0.5) for one in readout)
    )


def test_a_name_gives_way_to_the_crosshair(driven):
    window = driven()
    window.open(WELL)
    window.stage(states.DENSITY)
    tracks = window.work.tracks
    places, layers = tracks._layers()
    # The last name is that of a layer, which stands clear of all curves.
    box, axis = layers.names[-1], places.axis
    line = whole(box.center().y())
    assert written(tracks.grab().toImage(), box, line) > 20
    share = (line - axis.top) / (axis.base - axis.top)
    depth = axis.depth_top + share * (axis.depth_base - axis.depth_top)
    tracks.set_crosshair(depth)
    readout = [
        knocked_out(one.box)
        for track, own in zip(window.tracks, places.tracks, strict=True)
        for one in placed_readout(track, own, window.look.theme, depth)
    ]
    assert written(tracks.grab().toImage(), box, line, readout) == 0
    tracks.set_crosshair(None)
    assert written(tracks.grab().toImage(), box, line) > 20


def test_a_band_does_not_strike_through_a_depth_number(driven):
    window = driven()
    window.open(WELL)
    window.stage(states.DENSITY)
    tracks, accent = window.work.tracks, window.look.theme.roles["accent"]
    axis = tracks._places().axis
    tracks.set_selection([(100.0, 150.0)])
    image, y = tracks.grab().toImage(), whole(axis.y(100.0))
    columns = [x for x in range(image.width()) if image.pixelColor(x, y) == QColor(accent)]
    assert len(columns) > image.width() / 2, "the edge runs through the tracks"
    gap = max(right - left for left, right in pairwise(columns) if left < axis.right)
    assert gap > 15, "and leaves out the number"


def test_several_rows_are_counted_with_their_reach_and_no_value_between_them(driven):
    window = driven()
    window.open(WELL)
    window.stage(states.DENSITY)
    window.work.selection.choose("interval", (2, 8))
    window.settle()
    words = " ".join(value for _, value in status_words(window.work, chosen=window.work.chosen_rows(), waiting=""))
    assert words == "2 intervals chosen 66.0 to 271.0 m MD"


def test_a_visit_whose_last_reading_was_left_out_is_marked_as_changed(driven):
    window = driven()
    window.open(WELL)
    window.work.selection.choose("reading", (7,))
    window.settle()
    window.key(window.work.ledger, Qt.Key.Key_Space)
    window.answer("pump started")
    window.wait()
    window.stage(states.DRIFT)
    marks = window.work.ledger.table.marks
    assert [row for row, mark in enumerate(marks) if mark == "changed"] == [1]


def test_elevations_that_fall_down_the_hole_have_the_wedge_turned(driven):
    window = driven()
    window.open(WELL)
    window.stage(states.DENSITY)
    assert window.work.ledger.rows.wedge_of("top") == "down"
    window.look.choose_depth(kind=ELEVATION)
    window.settle()
    assert window.work.ledger.rows.wedge_of("top") == "up"


def test_writing_is_the_main_action_and_the_caution_stands_between_rules(driven):
    window = driven()
    window.open(WELL)
    window.stage(states.HANDOVER)
    panel, theme = window.work.handover, window.look.theme
    image = panel.write.grab().toImage()
    assert image.pixelColor(1, 1) == QColor(theme.roles["accent"])
    caution = panel._cautions.grab().toImage()
    ink = QColor(theme.roles["ink"])
    for row in (0, caution.height() - 1):
        assert all(caution.pixelColor(x, row) == ink for x in range(caution.width()))


def test_a_long_survey_name_and_its_last_depth_are_told_whole(driven):
    from plumbwell.plates.lettering import text_placed

    window = driven()
    window.open(WELL)
    for kind in ("MD", ELEVATION):
        window.look.choose_depth(kind=kind)
        window.settle()
        with text_placed() as placed:
            window.work.strip.grab()
        assert "Tolly Bank well (invented)" in [one.drawn for one in placed]
        assert any(one.drawn == one.words and one.drawn.startswith("53 stations") for one in placed)
