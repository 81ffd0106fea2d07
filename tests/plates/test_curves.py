"""Curves in tracks: cut at the edge, thinned without losing a spike, named where there is room."""

import itertools

import pytest
from PySide6.QtCore import QRectF
from PySide6.QtGui import QColor, QImage

from plumbwell.plates.axis import Frame
from plumbwell.plates.fan import draw_fan, interval_ribbons, ribbon_shape, station_ribbons
from plumbwell.plates.naming import draw_curve_names, draw_layer_names, line_extent, step_extent
from plumbwell.plates.painting import painting
from plumbwell.plates.polyline import inside_pieces, thinned_pieces
from plumbwell.plates.track import Point, Step, Track, draw_selection_band, draw_track

FRAME = Frame(left=100, top=50, right=300, base=450, depth_top=0.0, depth_base=100.0)


def blank(theme):
    image = QImage(400, 500, QImage.Format.Format_RGB32)
    image.fill(theme.colour("ground"))
    return image


def test_lines_are_cut_at_the_edges_of_the_frame():
    pieces = inside_pieces([(0, 100), (200, 100), (200, 600), (250, 600), (250, 100)], FRAME)
    assert pieces == [[(100.0, 100.0), (200.0, 100.0), (200.0, 450.0)], [(250.0, 450.0), (250.0, 100.0)]]
    assert inside_pieces([(0, 0), (10, 10)], FRAME) == []


def test_a_log_keeps_its_spikes_and_its_gaps():
    depths = [index * 0.001 for index in range(100_000)]
    values = [2.5] * 100_000
    values[31_234], values[31_260] = 1.2, 3.3
    for index in range(60_000, 62_000):
        values[index] = None
    track = Track(
        title="density", unit="", low=1.0, high=3.5, line_depths=tuple(depths), line_values=tuple(values)
    )
    pieces = thinned_pieces(depths, values, track, FRAME)
    assert len(pieces) == 2
    xs = [x for piece in pieces for x, _ in piece]
    assert min(xs) == pytest.approx(track.x(1.2, FRAME))
    assert max(xs) == pytest.approx(track.x(3.3, FRAME))
    assert len(xs) < 4 * 2 * 401
    assert pieces[0][-1][1] < FRAME.y(60.0) < FRAME.y(61.9) < pieces[1][0][1]
    assert all(a[1] <= b[1] for piece in pieces for a, b in itertools.pairwise(piece))


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
        line_depths=(-10.0, 50.0, 130.0),
        line_values=(2.0, -40.0, 2.5),
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
        line_depths=log_depths,
        line_values=tuple(2.3 if z < 40 else 2.4 if z < 60 else 2.6 for z in log_depths),
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
    assert len(boxes) == 4, "the one below the frame is left out, one beside another is moved over"
    assert not any(a.intersects(b) for a, b in itertools.combinations(boxes, 2))
    curve = step_extent(track, FRAME)
    for box, depth in zip(boxes, (0.0, 40.0, 41.0, 60.0), strict=True):
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
        draw_selection_band(painter, FRAME, light, top=25.0, base=50.0)
        draw_selection_band(painter, FRAME, light, top=75.0, base=75.0)
    accent, tint = QColor(light.roles["accent"]), QColor(light.roles["tint"])
    column = [image.pixelColor(200, y) for y in range(500)]
    assert [y for y, colour in enumerate(column) if colour == accent] == [150, 250, 350]
    assert all(colour == tint for colour in column[151:250])
