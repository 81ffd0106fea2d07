"""Plots against time as painted: whiskers, bands, crosses, wedges, tares and words, each where it belongs."""

from dataclasses import replace

import numpy as np
import pytest
from PySide6.QtGui import QColor, QImage

from made_time_plots import LEFT_OUT, TARE_TIME, at, drift_plots
from plumbwell.plates.lettering import text_placed
from plumbwell.plates.painting import painting
from plumbwell.plates.theme import theme_named
from plumbwell.plates.time_axis import TimeView
from plumbwell.plates.time_curves import draw_time_curves, point_places
from plumbwell.plates.time_frame import draw_time_frame, time_layout
from plumbwell.plates.time_plot import (
    RunPanel,
    TareMark,
    TimePlot,
    run_spans,
    time_points,
    told_extremes,
    value_window,
)
from plumbwell.plates.time_words import (
    draw_chosen_rings,
    draw_chosen_time,
    draw_tares,
    draw_time_words,
    drawn_tares,
    shortened_rate,
)


def painted(plots, theme, *, width=640, height=500, view=None, chosen=()):
    """A picture of plots with its layout, and the texts in it."""
    image = QImage(width, height, QImage.Format.Format_RGB32)
    image.fill(theme.colour("ground"))
    layout = time_layout(plots, theme, width=width, height=height, weights=(2.6, 1)[: len(plots)], view=view)
    with text_placed() as placed, painting(image) as painter:
        draw_time_frame(painter, plots, layout, theme)
        draw_chosen_time(painter, plots, layout, theme, chosen)
        draw_time_curves(painter, plots, layout, theme)
        draw_chosen_rings(painter, plots, layout, theme, chosen)
        draw_tares(painter, plots, layout, theme)
        draw_time_words(painter, plots, layout, theme)
    return image, layout, list(placed)


def like(image, x, y, colour, *, within=90):
    """Whether a pixel is near to a colour."""
    pixel = QColor(image.pixel(int(x), int(y)))
    wanted = QColor(colour)
    return (
        abs(pixel.red() - wanted.red()) + abs(pixel.green() - wanted.green()) + abs(pixel.blue() - wanted.blue())
        < within
    )


def lone_plot(value=10.0, sd=4.0, **changes):
    """A plot of one run with three points far from each other; the middle one has a standard deviation."""
    points = time_points(
        [at(14, 8), at(14, 12), at(14, 16)], [0.0, value, 20.0], rows=[0, 1, 2], sds=[float("nan"), sd, float("nan")]
    )
    run = RunPanel(name="run 1", run_index=0, points=points)
    return TimePlot(title="residual", unit="µGal", panels=(run,), low=-30.0, high=50.0, **changes)


@pytest.mark.parametrize(("bars", "reach"), [(1, 1.0), (2, 2.0), (95, 3.182)])
def test_whiskers_reach_as_many_standard_deviations_as_the_theme_says(bars, reach):
    theme = replace(theme_named("light"), bars=bars, freedom=3)
    image, layout, _ = painted((lone_plot(),), theme)
    scale, x = layout.frames[0].scale, layout.axis.panels()[0].x(at(14, 12))
    column = [y for y in range(int(scale.top), int(scale.base)) if like(image, x, y, theme.roles["run_1"], within=200)]
    a_unit = (scale.base - scale.top) / 80.0
    assert max(column) - min(column) == pytest.approx(2 * reach * 4.0 * a_unit, abs=3)


def test_a_gross_outlier_flattens_nothing_and_is_told_at_the_edge():
    theme = theme_named("light")
    calm, wild = drift_plots()[0], drift_plots(outlier=9000.0)[0]
    low, high = value_window(calm)
    wild_low, wild_high = value_window(wild)
    assert wild_high - wild_low < 1.1 * (high - low)
    _, _, placed = painted((wild,), theme)
    assert any(one.drawn.startswith("+9\u00a00") for one in placed)
    assert not any(one.drawn.startswith("+9\u00a00") for one in painted((calm,), theme)[2])


def test_a_short_run_on_another_level_is_no_outlier():
    def run(index, level, count):
        hours = range(count)
        points = time_points([at(14 + index, hour) for hour in hours], [level + hour for hour in hours], rows=hours)
        return RunPanel(name=f"run {index}", run_index=index, points=points)

    low, high = value_window(TimePlot(title="", unit="", panels=(run(0, 0.0, 22), run(1, 5000.0, 5))))
    assert low < 0 < 5004 < high


def test_values_that_are_all_left_out_are_still_in_view():
    points = time_points([at(14, 8), at(14, 9)], [140.0, 150.0], rows=[0, 1], excluded=True)
    low, high = value_window(TimePlot(title="", unit="", panels=(RunPanel(name="", run_index=0, points=points),)))
    assert low < 140.0 and high > 150.0


@pytest.mark.parametrize("odd", [float("nan"), float("inf")])
def test_what_is_no_number_is_not_drawn_and_does_no_harm(odd):
    points = time_points([at(14, 8), at(14, 9), odd], [1.0, odd, 3.0], rows=[0, 1, 2], sds=[1.0, 1.0, odd])
    plot = TimePlot(title="residual", unit="µGal", panels=(RunPanel(name="run 1", run_index=0, points=points),))
    _, layout, placed = painted((plot,), theme_named("light"))
    assert layout.frames[0].scale.low < 1.0 < layout.frames[0].scale.high
    assert any(one.drawn == "08:00" for one in placed)


def test_a_point_left_out_is_a_muted_cross_at_its_place():
    theme = theme_named("light")
    plots = drift_plots()
    image, layout, _ = painted(plots, theme)
    panel, run = layout.axis.panels()[1], plots[0].panels[1]
    place = run.points.rows.tolist().index(LEFT_OUT)
    x, y = panel.x(float(run.points.times[place])), layout.frames[0].scale.y(float(run.points.values[place]))
    assert like(image, x, y, theme.roles["muted"])
    for lean in (-1, 1):
        assert like(image, x + 2, y + 2 * lean, theme.roles["muted"], within=150)
    assert not like(image, x, y - 12, theme.roles["run_2"], within=150), "no whisker"


def test_repeated_stations_are_filled_and_single_ones_hollow():
    theme = theme_named("light")
    plots = drift_plots()
    image, layout, _ = painted(plots, theme, width=1200)
    run, panel, scale = plots[0].panels[2], layout.axis.panels()[2], layout.frames[0].scale
    for place, filled in ((1, True), (2, False)):
        x, y = panel.x(float(run.points.times[place])), scale.y(float(run.points.values[place]))
        assert like(image, round(x), round(y), theme.roles["run_3"]) == filled


def test_nothing_of_a_curve_is_painted_outside_its_panel():
    theme = theme_named("light")
    plots = drift_plots(sd=200.0)
    layout = time_layout(
        plots,
        theme,
        width=640,
        height=500,
        weights=(2.6, 1),
        view=TimeView(zoom=3.0, hidden=0.3),
        windows=((0.0, 20.0), (-1.0, 1.0)),
    )
    image = QImage(640, 500, QImage.Format.Format_RGB32)
    image.fill(theme.colour("ground"))
    with painting(image) as painter:
        draw_time_curves(painter, plots, layout, theme)
    ground = theme.colour("ground").rgb()
    reach = 6  # marks stand whole at the very edge
    allowed = [
        (panel.left - reach, frame.scale.top - reach, panel.right + reach, frame.scale.base + reach)
        for panel in layout.axis.shown()
        for frame in layout.frames
    ]
    stray = [
        (x, y)
        for x in range(0, 640, 3)
        for y in range(500)
        if image.pixel(x, y) != ground
        and not any(left <= x <= right and top <= y <= base for left, top, right, base in allowed)
    ]
    assert stray == []


def test_the_line_of_a_tare_runs_through_all_plots_at_its_time():
    theme = theme_named("light")
    plots = drift_plots()
    image, layout, placed = painted(plots, theme)
    ((tare, _, x),) = drawn_tares(plots, layout)
    assert tare.time == TARE_TIME
    for frame in layout.frames:
        assert like(image, round(x), frame.scale.base - 3, theme.roles["accent"])
    assert {"tare −38 ± 6 µGal", "11:42"} <= {one.drawn for one in placed}


def with_tares(count):
    """The main plot with so many tares late in its last run, ten minutes apart, besides the one there is."""
    main = drift_plots()[0]
    tares = tuple(
        TareMark(key=100 + key, time=at(16, 15, 30) - 600 * key, words=f"tare +{key} ± 6 µGal") for key in range(count)
    )
    return replace(main, panels=(*main.panels[:2], replace(main.panels[2], tares=tares)))


def test_the_words_of_a_late_tare_stand_at_its_left():
    _, layout, placed = painted((with_tares(1),), theme_named("light"))
    late = max(x for _, _, x in drawn_tares((with_tares(1),), layout))
    (words,) = [one for one in placed if "+0 ±" in one.drawn]
    assert words.needed.right() < late
    assert words.drawn == words.words


def test_words_of_many_tares_never_overlap():
    _, layout, placed = painted((with_tares(9),), theme_named("light"))
    told = [one for one in placed if "tare" in one.drawn]
    assert len(drawn_tares((with_tares(9),), layout)) == 10
    assert len(told) >= 4
    for place, one in enumerate(told):
        assert not any(one.needed.intersects(other.needed) for other in told[place + 1 :])


def test_a_single_chosen_row_is_a_line_through_all_plots_and_rings():
    theme = theme_named("light")
    plots = drift_plots()
    image, layout, _ = painted(plots, theme, chosen=(41,))
    plain, _, _ = painted(plots, theme)
    x = layout.axis.panels()[2].x(float(plots[0].panels[2].points.times[1]))
    for frame in layout.frames:
        assert like(image, round(x), frame.scale.base - 3, theme.roles["accent"])
        assert not like(plain, round(x), frame.scale.base - 3, theme.roles["accent"])
    y = layout.frames[0].scale.y(float(plots[0].panels[2].points.values[1]))
    assert like(image, x + 7, y, theme.roles["accent"])


@pytest.mark.parametrize("name", ["light", "dark"])
@pytest.mark.parametrize("scale", [0.9, 1.0, 1.3, 1.6])
@pytest.mark.parametrize(("width", "height"), [(640, 500), (480, 400), (1100, 700)])
def test_no_word_is_cut_off_at_any_text_scale(name, scale, width, height):
    theme = theme_named(name, scale)
    _, _, placed = painted(drift_plots(outlier=900.0), theme, width=width, height=height)
    assert len(placed) > 12
    for one in placed:
        assert one.drawn == one.words, one
        assert one.allowed is None or one.allowed[0] - 0.01 <= one.needed.left(), one
        assert one.allowed is None or one.needed.right() <= one.allowed[1] + 0.01, one
        assert one.needed.left() >= -0.01 and one.needed.right() <= width + 0.01, one
        assert one.needed.top() >= 0 and one.needed.bottom() <= height, one


def test_numbers_and_times_do_not_overlap_each_other():
    theme = theme_named("light", 1.6)
    _, _, placed = painted(drift_plots(), theme, width=480, height=400)
    boxes = [one.needed.adjusted(1, 1, -1, -1) for one in placed if one.drawn]
    for place, box in enumerate(boxes):
        assert not any(box.intersects(other) for other in boxes[place + 1 :]), placed[place]


def test_names_of_runs_that_have_no_room_are_short_for_all():
    theme = theme_named("light")
    plot = drift_plots()[0]
    many = replace(
        plot,
        panels=tuple(
            RunPanel(
                name=f"run {run + 1}",
                run_index=run,
                points=time_points([at(1, 8) + 86400 * run, at(1, 12) + 86400 * run], [0.0, 1.0], rows=[0, 1]),
            )
            for run in range(14)
        ),
    )
    drawn = [one.drawn for one in painted((many,), theme)[2]]
    assert {"1", "2", "14"} <= set(drawn)
    assert "run 1" not in drawn


def test_a_slope_without_room_loses_its_unit_and_then_itself_but_never_figures():
    theme = theme_named("light")
    words = "+8.8\u00a0±\u00a00.8 µGal/h"
    assert shortened_rate(theme, words, 500) == words
    assert shortened_rate(theme, words, 70) == "+8.8\u00a0±\u00a00.8"
    assert shortened_rate(theme, words, 30) == ""


def test_stacked_plots_share_the_place_of_a_run():
    spans = run_spans(drift_plots())
    assert [span.name for span in spans] == ["run 1", "run 2", "run 3"]
    assert spans[0].last - spans[0].first == pytest.approx(19 * 24 * 60)


def test_hundred_thousand_points_keep_their_spikes_and_are_thinned():
    count = 100_000
    values = np.sin(np.arange(count) / 900.0)
    values[54_321], values[12_345] = 1.9, -1.9
    points = time_points(at(14, 8) + np.arange(count) * 0.3, values, rows=np.arange(count), sds=np.full(count, 0.1))
    plot = TimePlot(
        title="residual", unit="µGal", panels=(RunPanel(name="run 1", run_index=0, points=points),), low=-2.0, high=2.0
    )
    theme = theme_named("light")
    image, layout, _ = painted((plot,), theme)
    panel = layout.axis.shown()[0]
    x, y, inside = point_places(panel, plot.panels[0], layout.frames[0].scale)
    kept = told_extremes(x[inside], y[inside])
    assert len(kept) <= 2 * (panel.right - panel.left + 2)
    for spike in (54_321, 12_345):
        assert spike in inside[kept]
        assert like(image, round(float(x[spike])), round(float(y[spike])), theme.roles["run_1"])


def test_columns_that_do_not_belong_together_are_refused():
    with pytest.raises(ValueError, match="columns of"):
        time_points([1.0, 2.0], [1.0, 2.0], rows=[1])
