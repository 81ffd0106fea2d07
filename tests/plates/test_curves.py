"""Curves in tracks: cut at the edge, thinned without losing a spike, named where there is room."""

import itertools
from dataclasses import replace

import numpy as np
import pytest
from PySide6.QtCore import QRectF
from PySide6.QtGui import QColor, QImage

from plumbwell.plates.axis import Frame
from plumbwell.plates.curve_rows import line_extent, step_extent
from plumbwell.plates.fan import draw_fan, interval_ribbons, ribbon_shape, station_ribbons
from plumbwell.plates.lettering import text_placed
from plumbwell.plates.log_curve import LogCurve
from plumbwell.plates.naming import draw_curve_names, draw_layer_names
from plumbwell.plates.painting import painting
from plumbwell.plates.polyline import inside_pieces, log_pieces
from plumbwell.plates.track import Point, Step, Track
from plumbwell.plates.track_curves import draw_track
from plumbwell.plates.track_marks import draw_selection_bands

FRAME = Frame(left=100, top=50, right=300, base=450, depth_top=0.0, depth_base=100.0)


def blank(theme):
    image = QImage(400, 500, QImage.Format.Format_RGB32)
    image.fill(theme.colour("ground"))
    return image


def test_lines_are_cut_at_the_edges_of_the_frame():
    def pieces(*places):
        x, y = np.array(places, dtype=float).T
        return [list(zip(*(side.tolist() for side in piece), strict=True)) for piece in inside_pieces(x, y, FRAME)]

    assert pieces((0, 100), (200, 100), (200, 600), (250, 600), (250, 100)) == [
        [(100.0, 100.0), (200.0, 100.0), (200.0, 450.0)],
        [(250.0, 450.0), (250.0, 100.0)],
    ]
    assert pieces((0, 0), (10, 10)) == pieces((150, 100)) == []
    assert pieces((150, 0), (150, 600)) == [[(150.0, 50.0), (150.0, 450.0)]], "across the whole frame"
    assert pieces((110, 60), (120, 70), (130, 80)) == [[(110.0, 60.0), (120.0, 70.0), (130.0, 80.0)]]


def crowded_log():
    depths = [index * 0.001 for index in range(100_000)]
    values = [2.4 + 0.1 * (-1) ** index for index in range(100_000)]
    values[31_234], values[31_260] = 1.2, 3.3
    for index in range(60_000, 62_000):
        values[index] = None
    return Track(
        title="density",
        unit="",
        low=1.0,
        high=3.5,
        line=LogCurve.of(depths, values),
        line_name="log",
    )


def test_a_crowded_log_keeps_its_spikes_and_its_gaps():
    track = crowded_log()
    pieces = log_pieces(track.line, track.low, track.high, FRAME)
    assert len(pieces) == 2
    assert min(piece.least.min() for piece in pieces) == pytest.approx(track.x(1.2, FRAME))
    assert max(piece.most.max() for piece in pieces) == pytest.approx(track.x(3.3, FRAME))
    assert sum(len(piece.least) for piece in pieces) <= 402
    assert pieces[0].y[-1] < FRAME.y(60.0) < FRAME.y(61.9) < pieces[1].y[0]
    assert all((np.diff(piece.y) > 0).all() for piece in pieces)
    means = np.concatenate([piece.x for piece in pieces])
    assert means[200] == pytest.approx(track.x(2.4, FRAME), abs=0.5)


def test_a_log_with_few_samples_is_drawn_through_each():
    track = stairs(line=LogCurve.of((10.0, 20.0, 30.0, 40.0, 50.0), (2.0, 2.1, None, 2.3, 2.4)))
    pieces = log_pieces(track.line, track.low, track.high, FRAME)
    assert [len(piece.x) for piece in pieces] == [2, 2]
    assert all(piece.least is None for piece in pieces)
    assert pieces[1].x[0] == pytest.approx(track.x(2.3, FRAME))
    assert pieces[1].y[0] == pytest.approx(FRAME.y(40.0))


def test_a_stretch_of_log_within_one_row_has_a_length():
    values = [2.4] * 5000 + [None] * 40 + [2.5] * 30 + [None] * 40 + [2.4] * 4890
    depths = [index * 0.01 for index in range(len(values))]
    track = stairs(line=LogCurve.of(depths, values))
    pieces = log_pieces(track.line, track.low, track.high, FRAME)
    assert len(pieces) == 3
    assert pieces[1].y[0] < pieces[1].y[-1]


def test_a_crowded_log_buries_neither_staircase_nor_itself(qapp, light):
    values = [2.3 + 0.1 * (-1) ** index for index in range(10_000)]
    depths = [index * 0.01 for index in range(10_000)]
    steps = (Step(top=0.0, base=100.0, value=2.35),)
    track = stairs(steps=steps, line=LogCurve.of(depths, values), line_name="log")
    image = blank(light)
    with painting(image) as painter:
        draw_track(painter, track, FRAME, light)
        boxes = draw_curve_names(painter, track, FRAME, light)
    row = 250
    lightness = {
        name: min(image.pixelColor(int(track.x(value, FRAME)) + near, row).lightness() for near in (0, 1))
        for name, value in (("step", 2.35), ("mean", 2.3), ("spread", 2.25), ("paper", 2.9))
    }
    assert lightness["step"] < 60
    assert lightness["step"] < lightness["mean"] < lightness["spread"] - 40
    assert lightness["spread"] < lightness["paper"]
    assert len(boxes) == 1


def test_a_gathered_log_says_that_it_is(qapp, light):
    said = []
    for frame in (replace(FRAME, right=380), FRAME):
        with text_placed() as placed, painting(blank(light)) as painter:
            draw_curve_names(painter, crowded_log(), frame, light)
        said += [text.drawn for text in placed]
    assert said == ["log, mean and range", "log"], "the short name where the long one has no room"


def test_gravity_of_unjoined_parts_is_not_joined(qapp, light):
    points = tuple(Point(depth=20.0 * row, value=2.0 + 0.2 * row, part=row // 3) for row in range(5))
    track = stairs(steps=(), points=points)
    image = blank(light)
    with painting(image) as painter:
        draw_track(painter, track, FRAME, light)

    def crossed(depth):
        y = round(FRAME.y(depth))
        return any(image.pixelColor(x, y) != light.colour("ground") for x in range(100, 300))

    assert [crossed(depth) for depth in (10.0, 30.0, 50.0, 70.0)] == [True, True, False, True]


def test_excursions_to_both_sides_are_told_at_one_depth(qapp, light):
    steps = (Step(top=0.0, base=50.0, value=3.9), Step(top=50.0, base=52.0, value=0.4))
    with text_placed() as placed, painting(blank(light)) as painter:
        draw_track(painter, stairs(steps=(*steps, Step(top=52.0, base=100.0, value=2.2))), FRAME, light)
    assert {text.drawn for text in placed} == {"3.900", "0.400"}
    steps = (Step(top=0.0, base=4.0, value=3.9), Step(top=4.0, base=6.0, value=0.4))
    with text_placed() as placed, painting(blank(light)) as painter:
        draw_track(painter, stairs(steps=steps), FRAME, light)
    assert {text.drawn for text in placed} == {"3.900", "0.400"}, "side by side, 12 px apart"


def test_a_layer_name_does_not_stand_on_the_next_top(qapp, light):
    markers = [("Upper seam", 10.0), ("Middle seam", 12.0), ("Lower seam", 14.0)]
    with text_placed() as placed, painting(blank(light)) as painter:
        draw_layer_names(painter, stairs(), FRAME, light, markers=markers)
    assert [text.drawn for text in placed] == ["Lower seam"]


def stairs(**changes):
    steps = (
        Step(top=0.0, base=40.0, value=2.3, sd=0.02),
        Step(top=40.0, base=60.0, value=2.2, sd=0.02),
        Step(top=60.0, base=100.0, value=2.6, sd=0.02),
    )
    values = {"title": "density", "unit": "g/cm\u00b3", "low": 1.8, "high": 3.0, "steps": steps}
    return Track(**{**values, **changes})


def test_bands_are_two_standard_deviations_wide(qapp, light):
    image = blank(light)
    with painting(image) as painter:
        draw_track(painter, stairs(), FRAME, light)
    row = 50 + 4 * 50
    shaded = [x for x in range(100, 300) if image.pixelColor(x, row) != QColor(light.roles["ground"])]
    track = stairs()
    assert shaded[0] == pytest.approx(track.x(2.2 - 0.04, FRAME), abs=1.5)
    assert shaded[-1] == pytest.approx(track.x(2.2 + 0.04, FRAME), abs=1.5)
    ink = [x for x in shaded if image.pixelColor(x, row).lightness() < 60]
    assert ink[len(ink) // 2] == pytest.approx(track.x(2.2, FRAME), abs=1)


def test_nothing_is_inked_outside_the_frame(qapp, light):
    image = blank(light)
    wild = stairs(
        steps=(Step(top=-50.0, base=50.0, value=9.0, sd=3.0), Step(top=50.0, base=170.0, value=-3.0, sd=2.0)),
        points=(
            Point(depth=-20.0, value=2.0),
            Point(depth=50.0, value=30.0, sd=1.0),
            Point(depth=120.0, value=2.0),
        ),
        line=LogCurve.of((-10.0, 50.0, 130.0), (2.0, -40.0, 2.5)),
    )
    with painting(image) as painter:
        draw_track(painter, wild, FRAME, light)
    ground = QColor(light.roles["ground"])
    for x, y in itertools.product((95, 305), range(0, 500)):
        assert image.pixelColor(x, y) == ground
    for x, y in itertools.product(range(0, 400), (44, 456)):
        assert image.pixelColor(x, y) == ground


def test_names_stand_beside_their_curve_away_from_the_other(qapp, light):
    log_depths = tuple(float(depth) for depth in range(101))
    track = stairs(
        step_name="gravity",
        line_name="log",
        line=LogCurve.of(log_depths, [2.3 if z < 40 else 2.4 if z < 60 else 2.6 for z in log_depths]),
    )
    with painting(blank(light)) as painter:
        gravity, log = draw_curve_names(painter, track, FRAME, light)
    assert FRAME.y(40.0) < gravity.center().y() < FRAME.y(60.0)
    assert gravity.right() < track.x(2.2, FRAME)
    assert log.left() > track.x(2.4, FRAME)
    assert not gravity.intersects(log)


def test_layer_names_stand_under_their_top_and_clear_of_curves(qapp, light):
    track = stairs()
    markers = [
        ("Oster Chalk", 0.0),
        ("Corran Salt", 40.0),
        ("A bed", 41.0),
        ("Kett Anhydrite", 60.0),
        ("Deep", 99.9),
    ]
    with painting(blank(light)) as painter:
        boxes = draw_layer_names(painter, track, FRAME, light, markers=markers)
    assert len(boxes) == 3, "the one below the frame is left out, and the one with a top running through it"
    assert not any(a.intersects(b) for a, b in itertools.combinations(boxes, 2))
    curve = step_extent(track, FRAME)
    for box, depth in zip(boxes, (0.0, 41.0, 60.0), strict=True):
        assert 4 < box.top() - FRAME.y(depth) < 10
        left, right = curve.between(box.top(), box.bottom())
        assert box.right() < left or box.left() > right
    assert line_extent(track, FRAME).between(FRAME.top, FRAME.base) is None


def test_ribbons_join_rows_to_depths(qapp):
    first, second = interval_ribbons(
        [(0.0, 10.0, 2.3, False), (10.0, 100.0, 2.7, False)], first_row=50, row_height=24
    )
    assert ribbon_shape(first, FRAME).boundingRect() == QRectF(100, 50, 200, 40)
    assert ribbon_shape(second, FRAME).boundingRect() == QRectF(100, 74, 200, 376)
    between = station_ribbons([0.0, 50.0, 100.0], [2.3, None], first_row=50, row_height=24)
    assert [(ribbon.row_top, ribbon.row_base) for ribbon in between] == [(62, 86), (86, 110)]


def test_a_ribbon_has_the_tone_of_its_density_and_the_selected_one_is_accented(qapp, light):
    from dataclasses import replace

    ribbons = interval_ribbons(
        [(0.0, 50.0, 2.3, False), (50.0, 100.0, 2.9, False)], first_row=50, row_height=24
    )
    ribbons[1] = replace(ribbons[1], selected=True)
    image = blank(light)
    with painting(image) as painter:
        draw_fan(painter, ribbons, FRAME, light)
    assert image.pixelColor(290, 150) == light.tone(2.3)
    assert image.pixelColor(290, 400) == light.tone(2.9)
    # The outline is 2 px about the edge, so the last column inside is accent.
    assert image.pixelColor(299, 400) == QColor(light.roles["accent"])


def test_the_selection_is_a_band_for_an_interval_and_a_line_for_a_station(qapp, light):
    image = blank(light)
    with painting(image) as painter:
        draw_selection_bands(painter, FRAME, light, [(25.0, 50.0), (75.0, 75.0)])
    accent, tint = QColor(light.roles["accent"]), QColor(light.roles["tint"])
    column = [image.pixelColor(200, y) for y in range(500)]
    assert [y for y, colour in enumerate(column) if colour == accent] == [150, 250, 350]
    assert all(colour == tint for colour in column[151:250])
