"""What tracks are painted with: bars of one or two sd, a second recipe, effects by name, stacked bars, marks."""

from dataclasses import replace

import numpy as np
import pytest
from PySide6.QtGui import QColor, QImage

from plumbwell.plates.axis import Frame
from plumbwell.plates.curve_rows import all_extents, curve_extent
from plumbwell.plates.lettering import text_placed
from plumbwell.plates.log_curve import LogCurve
from plumbwell.plates.naming import draw_curve_names, draw_origin_names
from plumbwell.plates.painting import painting
from plumbwell.plates.track import EffectCurve, OriginBar, Point, Step, Track
from plumbwell.plates.track_curves import draw_track
from plumbwell.plates.track_marks import (
    draw_chosen_steps,
    draw_hovered,
    draw_rings,
    draw_selection_bands,
    merged_spans,
)

FRAME = Frame(left=100, top=60, right=300, base=460, depth_top=0.0, depth_base=100.0)


def drawn(theme, *draws):
    image = QImage(400, 500, QImage.Format.Format_RGB32)
    image.fill(theme.colour("ground"))
    with painting(image) as painter:
        for draw in draws:
            draw(painter)
    return image


def track_of(**changes):
    return Track(**{"title": "density", "unit": "", "low": 1.8, "high": 3.0, **changes})


def inked(image, row, theme, colour="ground"):
    """Px columns of a row that have not the colour of a role."""
    ground = QColor(theme.roles[colour])
    return [x for x in range(image.width()) if image.pixelColor(x, row) != ground]


@pytest.mark.parametrize(("bars", "reach"), [(1, 1.0), (2, 2.0), (95, 3.182)])
def test_bands_and_whiskers_reach_one_or_two_sd_or_95_per_cent(qapp, light, bars, reach):
    # 3.182: Student's t of 3 degrees of freedom (scipy.stats.t.ppf).
    theme = replace(light, bars=bars, freedom=3)
    assert theme.reach == pytest.approx(reach, abs=5e-4)
    steps = (Step(top=0.0, base=40.0, value=2.4, sd=0.05),)
    points = (Point(depth=70.0, value=2.4, sd=0.05),)
    track = track_of(steps=steps, points=points)
    image = drawn(theme, lambda painter: draw_track(painter, track, FRAME, theme))
    for row in (FRAME.y(20.0), FRAME.y(70.0)):
        columns = inked(image, round(row), theme)
        assert columns[0] == pytest.approx(track.x(2.4 - reach * 0.05, FRAME), abs=1.5)
        assert columns[-1] == pytest.approx(track.x(2.4 + reach * 0.05, FRAME), abs=1.5)


def test_a_second_recipe_is_dashed_and_has_no_band(qapp, light):
    steps = (Step(top=0.0, base=100.0, value=2.2),)
    beside = (Step(top=0.0, base=100.0, value=2.7, sd=0.1),)
    track = track_of(steps=steps, beside=beside, beside_name="slab form")
    image = drawn(light, lambda painter: draw_track(painter, track, FRAME, light))
    x = round(track.x(2.7, FRAME))
    inks = [min(image.pixelColor(x - near, y).lightness() for near in (0, 1)) < 120 for y in range(62, 458)]
    changes = sum(a != b for a, b in zip(inks, inks[1:], strict=False))
    assert changes > 60, "dashes of 5 px and gaps of 3 px"
    columns = [column for column in inked(image, 250, light) if column > x - 20]
    assert not columns or max(columns) - min(columns) <= 3, "no band"
    with text_placed() as placed:
        drawn(light, lambda painter: draw_curve_names(painter, track, FRAME, light))
    assert [text.drawn for text in placed] == ["slab form"]


def test_a_staircase_of_ten_thousand_steps_keeps_its_extremes(qapp, light):
    values = np.full(10_000, 2.4)
    values[5005] = 2.9
    edges = np.linspace(0.0, 100.0, 10_001).tolist()
    steps = tuple(
        Step(top=top, base=base, value=value)
        for top, base, value in zip(edges, edges[1:], values.tolist(), strict=False)
    )
    track = track_of(steps=steps)
    image = drawn(light, lambda painter: draw_track(painter, track, FRAME, light))
    columns = inked(image, int(FRAME.y(50.06)), light)
    assert columns[-1] == pytest.approx(track.x(2.9, FRAME), abs=6)
    assert inked(image, 300, light)[-1] < track.x(2.5, FRAME)


def effects():
    depths = [10.0 * n for n in range(11)]
    solid = EffectCurve(name="free air", points=tuple(Point(depth=z, value=2.7) for z in depths))
    dashed = EffectCurve(name="shells", points=tuple(Point(depth=z, value=2.1) for z in depths), dashes=(6.0, 3.0))
    return track_of(lines=(solid, dashed))


def test_each_effect_has_its_name_beside_it(qapp, light):
    track = effects()
    with text_placed() as placed:
        drawn(light, lambda painter: draw_curve_names(painter, track, FRAME, light))
    boxes = {text.drawn: text.needed for text in placed}
    assert set(boxes) == {"free air", "shells"}
    for number, name in enumerate(("free air", "shells")):
        left, right = curve_extent(track, number, FRAME).between(boxes[name].top(), boxes[name].bottom())
        apart = min(abs(boxes[name].left() - right), abs(left - boxes[name].right()))
        assert apart < 12, name
        other_left, other_right = curve_extent(track, 1 - number, FRAME).between(60, 460)
        assert boxes[name].right() < other_left or boxes[name].left() > other_right


def test_a_name_never_stands_beyond_another_effect(qapp, light):
    curves = [("shells", 1.9), ("latitude", 2.0), ("free air", 2.6)]
    lines = tuple(
        EffectCurve(name=name, points=tuple(Point(depth=10.0 * n, value=value) for n in range(11)))
        for name, value in curves
    )
    track = track_of(lines=lines)
    with text_placed() as placed:
        drawn(light, lambda painter: draw_curve_names(painter, track, FRAME, light))
    boxes = {text.drawn: text.needed for text in placed}
    for name, value in curves:
        x = track.x(value, FRAME)
        assert min(abs(boxes[name].left() - x), abs(x - boxes[name].right())) < 14, name


def test_a_staircase_without_room_for_its_name_has_none(qapp, light):
    depths = [0.5 * n for n in range(201)]
    log = LogCurve.of(depths, [2.4 + 0.55 * (-1) ** n for n in range(201)])
    steps = (Step(top=0.0, base=100.0, value=2.4),)
    track = track_of(steps=steps, line=log, step_name="gravity", line_name="log")
    with text_placed() as placed:
        drawn(light, lambda painter: draw_curve_names(painter, track, FRAME, light))
    assert "gravity" not in [text.drawn for text in placed]


def test_a_log_of_two_samples_crosses_a_window_between_them(qapp, light):
    track = track_of(line=LogCurve.of([-500.0, 600.0], [2.0, 2.8]))
    image = drawn(light, lambda painter: draw_track(painter, track, FRAME, light))
    for depth in (1.0, 50.0, 99.0):
        columns = inked(image, int(FRAME.y(depth)), light)
        assert columns and np.mean(columns) == pytest.approx(track.x(2.0 + 0.8 * (depth + 500) / 1100, FRAME), abs=2)


def test_an_effect_without_room_for_its_name_is_named_all_the_same(qapp, light):
    points = tuple(Point(depth=10.0 * n, value=2.4) for n in range(11))
    track = track_of(lines=(EffectCurve(name="normal gravity along the hole", points=points),))
    with text_placed() as placed:
        drawn(light, lambda painter: draw_curve_names(painter, track, FRAME, light))
    assert placed[-1].drawn.startswith("normal g")
    assert placed[-1].needed.left() >= FRAME.left and placed[-1].needed.right() <= FRAME.right


def test_the_solid_effect_is_unbroken_and_the_other_dashed(qapp, light):
    track = effects()
    image = drawn(light, lambda painter: draw_track(painter, track, FRAME, light))

    def broken(value):
        x = round(track.x(value, FRAME))
        return any(
            min(image.pixelColor(x + near, y).lightness() for near in (-1, 0)) > 200 for y in range(70, 450)
        )

    assert (broken(2.7), broken(2.1)) == (False, True)


def bars(shares=(0.6, 0.3, 0.08, 0.02), depths=(20.0, 50.0, 80.0)):
    return track_of(
        low=0.0,
        high=8.0,
        bars=tuple(OriginBar(depth=depth, sd=6.0, shares=shares) for depth in depths),
        origins=("depth", "reading", "drift", "terrain")[: len(shares)],
    )


def test_a_bar_is_as_long_as_the_sd_and_shared_by_variance(qapp, light):
    track = bars()
    image = drawn(light, lambda painter: draw_track(painter, track, FRAME, light))
    row = round(FRAME.y(50.0))
    columns = inked(image, row, light)
    assert columns[0] == pytest.approx(100, abs=1) and columns[-1] == pytest.approx(track.x(6.0, FRAME), abs=1)
    middles = {"ink": 0.3, "strong": 0.75, "rule": 0.94}
    for role, part in middles.items():
        assert image.pixelColor(round(track.x(6.0 * part, FRAME)), row) == QColor(light.roles[role]), role


def test_each_origin_is_named_once_beside_the_bars(qapp, light):
    with text_placed() as placed:
        drawn(light, lambda painter: draw_origin_names(painter, bars(), FRAME, light))
    words = ", ".join(text.drawn for text in placed).split(", ")
    assert sorted(words) == ["depth", "drift", "reading", "terrain"]
    rows = [FRAME.y(depth) for depth in (20.0, 50.0, 80.0)]
    for text in placed:
        assert not any(text.needed.top() - 3 < row < text.needed.bottom() + 3 for row in rows)
        assert FRAME.left <= text.needed.left() and text.needed.right() <= FRAME.right + 0.01


def test_names_of_origins_stand_under_their_fill(qapp, light):
    with text_placed() as placed:
        drawn(light, lambda painter: draw_origin_names(painter, bars(), FRAME, light))
    lefts = {text.drawn: text.needed.left() for text in placed}
    assert lefts["depth"] == pytest.approx(FRAME.left + 1)
    assert lefts["reading"] == pytest.approx(bars().x(3.6, FRAME) + 1)


def test_a_bar_longer_than_the_scale_tells_its_sd(qapp, light):
    track = replace(bars(), high=5.0, decimals=1)
    with text_placed() as placed:
        drawn(light, lambda painter: draw_track(painter, track, FRAME, light))
    assert [text.drawn for text in placed] == ["6.0"] * 3


def test_crowded_bars_stay_apart(qapp, light):
    track = bars(depths=tuple(float(z) for z in range(1, 100)))
    image = drawn(light, lambda painter: draw_track(painter, track, FRAME, light))
    x = round(track.x(1.0, FRAME))
    inks = [image.pixelColor(x, y) == QColor(light.roles["ink"]) for y in range(60, 460)]
    assert sum(a and not b for a, b in zip(inks, inks[1:], strict=False)) == 99


def test_selected_neighbours_are_one_band():
    assert merged_spans([(20.0, 30.0), (0.0, 10.0), (10.0, 20.0), (50.0, 50.0), (60.0, 55.0)]) == [
        (0.0, 30.0),
        (50.0, 50.0),
        (55.0, 60.0),
    ]


def test_a_band_that_leaves_the_window_has_no_edge_there(qapp, light):
    image = drawn(light, lambda painter: draw_selection_bands(painter, FRAME, light, [(-10.0, 25.0), (90.0, 105.0)]))
    accent = QColor(light.roles["accent"])
    rows = [y for y in range(500) if image.pixelColor(200, y) == accent]
    assert rows == [160, 420]
    assert image.pixelColor(200, 61) == image.pixelColor(200, 459) == QColor(light.roles["tint"])
    assert inked(image, 470, light) == inked(image, 50, light) == []


def test_chosen_steps_have_an_overlay_of_three_px_and_others_none(qapp, light):
    steps = tuple(Step(top=25.0 * n, base=25.0 * n + 25.0, value=2.2 + 0.1 * n) for n in range(4))
    track = track_of(steps=steps)
    image = drawn(light, lambda painter: draw_chosen_steps(painter, track, FRAME, light, [(25.0, 50.0)]))
    accent = QColor(light.roles["accent"])
    for n in range(4):
        columns = [x for x in range(400) if image.pixelColor(x, round(FRAME.y(12.5 + 25.0 * n))) == accent]
        assert len(columns) == (3 if n == 1 else 0)
        assert all(abs(x - track.x(steps[n].value, FRAME)) <= 2 for x in columns)


def test_rings_stand_at_the_selected_stations_of_points_and_effects(qapp, light):
    points = tuple(Point(depth=10.0 * n, value=2.4 + 0.01 * n) for n in range(11))
    accent = QColor(light.roles["accent"])
    for track, values in ((track_of(points=points), [2.43]), (effects(), [2.7, 2.1])):
        image = drawn(light, lambda painter, track=track: draw_rings(painter, track, FRAME, light, [30.0, 33.0, 400.0]))
        row = round(FRAME.y(30.0))
        for value in values:
            x = round(track.x(value, FRAME))
            assert image.pixelColor(x, row) == QColor(light.roles["ground"])
            assert any(image.pixelColor(x + step, row) == accent for step in (4, 5))
        elsewhere = [y for y in range(500) if abs(y - row) > 8 and inked(image, y, light)]
        assert elsewhere == [], "neither where there is no station nor outside the window"


def test_a_hovered_point_has_grown_by_two_px(qapp, light):
    points = tuple(Point(depth=10.0 * n, value=2.4) for n in range(11))
    track = track_of(points=points)

    def width(*draws):
        image = drawn(light, *draws)
        row = round(FRAME.y(50.0))
        return sum(image.pixelColor(x, row).lightness() < 120 for x in range(400))

    plain = width(lambda painter: draw_track(painter, track, FRAME, light))
    grown = width(
        lambda painter: draw_track(painter, track, FRAME, light),
        lambda painter: draw_hovered(painter, track, FRAME, light, 50.0),
    )
    assert grown == plain + 2


def test_lines_go_on_to_the_points_beyond_the_window(qapp, light):
    points = (Point(depth=-50.0, value=2.0), Point(depth=150.0, value=2.8))
    track = track_of(points=points)
    image = drawn(light, lambda painter: draw_track(painter, track, FRAME, light))
    for depth in (2.0, 50.0, 98.0):
        columns = inked(image, round(FRAME.y(depth)), light)
        assert columns and np.mean(columns) == pytest.approx(track.x(2.0 + 0.8 * (depth + 50) / 200, FRAME), abs=2)
    low, high = all_extents(track, FRAME)[0].between(60, 460)
    assert low < track.x(2.25, FRAME) and high > track.x(2.55, FRAME)
