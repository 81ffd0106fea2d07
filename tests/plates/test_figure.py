"""The plate of a survey as a whole: files, room for every text, the head line, odd surveys."""

import os
import subprocess
import sys
import xml.etree.ElementTree as ElementTree
from dataclasses import replace

import pytest
from PySide6.QtGui import QColor, QImage

from plumbwell.plates.figure import (
    draw_figure,
    figure_image,
    figure_size,
    plate_layout,
    svg_bytes,
    write_png,
    write_svg,
)
from plumbwell.plates.ledger_excerpt import interval_excerpt
from plumbwell.plates.lettering import ELLIPSIS, FAMILY, plate_family, text_placed
from plumbwell.plates.log_curve import LogCurve
from plumbwell.plates.plate import PlateFinding, PlateStation, SurveyPlate
from plumbwell.plates.survey_tracks import survey_tracks
from plumbwell.plates.theme import theme_named


def _changed(plate, changes):
    """Return a plate with some densities changed: row to (density, keeps its sd)."""
    rows = [
        replace(row, density=changes[index]) if index in changes else row
        for index, row in enumerate(plate.intervals)
    ]
    return replace(plate, intervals=tuple(rows))


ODD = {
    "one interval": lambda make: make(1, span=30.0, log=False, markers=False),
    "one interval with log": lambda make: make(1, span=30.0),
    "twenty": lambda make: make(20, span=420.0),
    "sixty": lambda make: make(60),
    "four hundred": lambda make: make(400, span=4200.0),
    "a thousand": lambda make: make(1000, span=5200.0, log_samples=6000),
    "no density": lambda make: replace(make(30, log=False), intervals=()),
    "log but no density": lambda make: replace(make(30), intervals=()),
    "one station": lambda make: SurveyPlate(
        title="Tolmire 4",
        stations=(PlateStation(label="1", depth=12.0, gravity=981342.118, gravity_sd=0.012),),
    ),
    "nothing at all": lambda make: SurveyPlate(title="Tolmire 4"),
    "no log": lambda make: make(24, log=False, caution="Relative gravity: no station is tied. " * 8),
    "no sd": lambda make: (
        lambda plate: replace(
            plate, intervals=tuple(replace(row, sd=None, difference_sd=None) for row in plate.intervals)
        )
    )(make(24)),
    "above ground": lambda make: (
        lambda plate: replace(
            plate,
            stations=(
                PlateStation(label="tower", depth=-22.0, gravity=-6.789, gravity_sd=0.004),
                *plate.stations,
            ),
        )
    )(make(12, span=180.0)),
    "off the scale": lambda make: _changed(
        make(24), {3: 1.1, 7: 3.9, 11: -4.2, 14: None, 15: None, 18: 9.7, 20: 1.59, 22: 3.41}
    ),
    "prior alone": lambda make: (
        lambda plate: replace(
            plate, intervals=tuple(replace(row, from_prior=True, sd=0.3) for row in plate.intervals)
        )
    )(make(6)),
    "long names": lambda make: (
        lambda plate: replace(
            plate,
            title="A name that goes on and on " * 12,
            subtitle="a subtitle that goes on and on " * 12,
            depth_label="measured depth along hole",
            anomaly_label="left over after everything known was taken out",
            markers=tuple(
                (name + " of the unreasonably long formation", depth) for name, depth in plate.markers
            ),
            remarks=("a remark that goes on and on " * 20, *plate.remarks),
            findings=(
                PlateFinding(severity="error", depth=3.0, words="words that go on " * 60),
                *plate.findings,
            ),
        )
    )(make(20)),
    "drift": lambda make: replace(
        make(30, log=False, markers=False),
        intervals=(),
        depth_label="chainage",
        openings=((120.0, 180.0),),
        waters=((420.0, 450.0),),
    ),
    "crowded names": lambda make: make(20, markers=False, markers_close=True),
    "feet": lambda make: make(20, span=12345.0, depth_unit="ft", depth_label="TVD"),
}


@pytest.fixture(params=sorted(ODD), scope="module")
def odd_plate(request, qapp, invented_plate):
    """Each of the odd surveys."""

    def make(*args, markers_close=False, **kwargs):
        plate = invented_plate(*args, **kwargs)
        if markers_close:
            plate = replace(plate, markers=tuple((f"Bed {index}", 700.0 + 2 * index) for index in range(90)))
        return plate

    return ODD[request.param](make)


@pytest.fixture(scope="module")
def odd_drawing(odd_plate):
    """An odd survey as drawn in the light theme: image and texts."""
    return _drawn(odd_plate, theme_named("light"))


def _drawn(plate, theme):
    with text_placed() as placed:
        image = figure_image(plate, theme, 1)
    return image, placed


def test_the_bundled_font_is_used(invented):
    assert plate_family() == FAMILY


def test_every_text_has_its_room(odd_drawing):
    image, placed = odd_drawing
    assert placed
    for text in placed:
        assert 0 <= text.needed.left() and text.needed.right() <= image.width(), text.drawn
        assert 0 <= text.needed.top() and text.needed.bottom() <= image.height(), text.drawn
        if text.allowed is not None:
            assert text.needed.left() >= text.allowed[0] - 0.01, text.drawn
            assert text.needed.right() <= text.allowed[1] + 0.01, text.drawn


def test_no_number_is_ever_shortened(odd_drawing):
    _, placed = odd_drawing
    shortened = [text.words for text in placed if text.drawn != text.words]
    assert not [words for words in shortened if words.strip("\u2212+\u00b1\u00a0.")[:1].isdigit()]
    assert all(text.drawn.endswith(ELLIPSIS) for text in placed if text.drawn != text.words)


def test_no_two_texts_overlap(odd_drawing):
    _, placed = odd_drawing
    boxes = [(text.drawn, text.needed.adjusted(0.5, 1, -0.5, -2)) for text in placed if text.drawn.strip()]
    boxes.sort(key=lambda item: item[1].top())
    for index, (words, box) in enumerate(boxes):
        for other_words, other in boxes[index + 1 :]:
            if other.top() >= box.bottom():
                break
            assert not box.intersects(other), (words, other_words)


def _check_head_line(image, plate, theme):
    layout = plate_layout(plate, theme)
    ink = QColor(theme.roles["ink"])
    row = layout.body_top - 1
    columns = range(int(layout.strip_right) + 16, layout.width - 16)
    assert all(image.pixelColor(column, row) == ink for column in columns)
    # It is one row thick: beside ticks and curves the ground shows above and below it.
    for near in (row - 1, row + 1):
        assert sum(image.pixelColor(column, near) == ink for column in columns) < len(columns) / 4


def test_the_line_under_the_heads_is_unbroken_on_one_row(odd_plate, odd_drawing):
    _check_head_line(odd_drawing[0], odd_plate, theme_named("light"))


def test_the_line_under_the_heads_is_unbroken_in_every_theme(invented, any_theme):
    plate = invented(20)
    _check_head_line(figure_image(plate, any_theme, 1), plate, any_theme)


def test_size_grows_with_rows_and_stays_landscape(invented, light):
    sizes = {rows: figure_size(invented(rows), light) for rows in (1, 20, 40, 60, 85, 400)}
    assert sizes[1] == sizes[20] == (1440, 900)
    assert 900 < sizes[40][1] <= sizes[60][1] <= 1440
    assert all(height <= width == 1440 for width, height in sizes.values())
    heights = [plate_layout(invented(rows), light).row_height for rows in (20, 40, 70)]
    assert heights[0] == heights[1] == 24
    assert 14 <= heights[2] < 24


def test_every_interval_is_in_the_ledger_or_the_ledger_is_left_out(invented, light):
    for rows in (1, 20, 60, 85):
        _, placed = _drawn(invented(rows), light)
        words = {text.drawn for text in placed}
        assert {str(number) for number in range(1, rows + 1)} <= words
    layout = plate_layout(invented(400), light)
    assert layout.excerpt is None


def test_the_plate_says_what_it_shows(invented, light):
    plate = invented(20, caution="Relative gravity: no station is tied to an absolute value.")
    words = [text.drawn for text in _drawn(plate, light)[1]]
    for expected in (
        "Tolmire 4",
        "21 stations, invented",
        plate.caution,
        "bars and bands 2 sd",
        "density",
        "difference",
        "left over",
        "log",
        "gravity",
        "MD",
        "mGal",
        "g/cm\u00b3",
        "density, g/cm\u00b3",
        "Marrow Shale",
        *plate.remarks,
        *(finding.words for finding in plate.findings),
    ):
        assert expected in words, expected
    assert {text.drawn for text in _drawn(plate, light)[1] if "\u00b1" in text.drawn}


def test_gravity_stands_where_nothing_is_left_over(invented, light):
    plate = invented(10, gravity_label="gravity from station 1")
    bare = replace(plate, stations=tuple(replace(station, anomaly=None) for station in plate.stations))
    words = [text.drawn for text in _drawn(bare, light)[1]]
    assert "left over" not in words
    assert any(word.startswith("gravity from") for word in words)


def test_no_key_of_tones_without_a_density(invented, light):
    words = [text.drawn for text in _drawn(replace(invented(10), intervals=()), light)[1]]
    assert "density, g/cm\u00b3" not in words


def test_values_outside_the_scale_are_told(invented, light):
    plate = _changed(invented(24, log=False), {11: -4.2, 18: 9.7})
    words = [text.drawn for text in _drawn(plate, light)[1]]
    assert sum(word.startswith("9.70") for word in words) == 2, "in the ledger and at the edge of the track"
    assert sum(word.startswith("\u22124.20") for word in words) == 2


def test_the_svg_parses_and_holds_neither_bitmaps_nor_fonts(odd_plate):
    theme = theme_named("light")
    root = ElementTree.fromstring(svg_bytes(odd_plate, theme))
    tags = {element.tag.rpartition("}")[2] for element in root.iter()}
    assert root.attrib["viewBox"] == "0 0 {} {}".format(*figure_size(odd_plate, theme))
    assert (root.attrib["width"], root.attrib["height"]) == tuple(map(str, figure_size(odd_plate, theme)))
    assert not tags & {"image", "text", "font", "linearGradient", "script"}
    assert {"path", "rect", "title"} <= tags


def test_files_are_equal_when_plates_are(invented, light, tmp_path):
    for run in ("first", "second"):
        (tmp_path / run).mkdir()
        write_svg(tmp_path / run / "figure.svg", invented(20), light)
        write_png(tmp_path / run / "figure.png", invented(20), light)
    for name in ("figure.svg", "figure.png"):
        assert (tmp_path / "first" / name).read_bytes() == (tmp_path / "second" / name).read_bytes()
    picture = QImage(str(tmp_path / "first" / "figure.png"))
    assert (picture.width(), picture.height()) == (2880, 1800)


def test_the_log_is_shown_whole_unless_it_is_wild(invented, light):
    plate = invented(20)
    least, greatest = plate.log.low, plate.log.high
    track = next(track for track in survey_tracks(plate, wide=False) if track.title == "density")
    assert track.low < least < greatest < track.high
    spiked = replace(plate, log=LogCurve(depth=plate.log.depth, value=[0.01, *plate.log.value[1:]]))
    track = next(track for track in survey_tracks(spiked, wide=False) if track.title == "density")
    assert track.low > 1.5
    assert "0.010" in [text.drawn for text in _drawn(spiked, light)[1]]


def _findings(count):
    return tuple(
        PlateFinding(severity="error" if n == 3 else "look", depth=10.0 * n, words=f"Finding number {n}.")
        for n in range(count)
    )


def test_the_plate_grows_until_every_finding_is_told(invented, light):
    plate = invented(30, findings=_findings(8))
    image, placed = _drawn(plate, light)
    assert figure_size(invented(30, findings=()), light)[1] < image.height() <= 1440
    words = [text.drawn for text in placed]
    assert sum(word.startswith("Finding number") for word in words) == 8
    assert not any(word.endswith(" more") for word in words)


def test_findings_that_do_not_fit_are_counted(invented, light):
    words = [text.drawn for text in _drawn(invented(20, findings=_findings(40)), light)[1]]
    told = sum(word.startswith("Finding number") for word in words)
    assert 2 <= told < 40
    assert f"{40 - told} more" in words


@pytest.mark.parametrize("rows", [52, 400], ids=["below a long ledger", "without a ledger"])
def test_findings_without_any_room_are_counted_at_the_foot(invented, light, rows):
    words = [text.drawn for text in _drawn(invented(rows, findings=_findings(8)), light)[1]]
    assert not any(word.startswith("Finding") for word in words)
    assert "8 findings, 1 error" in words


def test_a_ratio_in_amber_has_its_mark(invented, light):
    plate = invented(3)
    rows = tuple(
        replace(row, flagged=False, ratio=ratio)
        for row, ratio in zip(plate.intervals, (2.9, -3.0, None), strict=True)
    )
    excerpt = interval_excerpt(replace(plate, intervals=rows))
    assert excerpt.marks == (None, "look", None)


def test_a_top_above_the_first_station_is_not_drawn_against_the_head_line(invented, light):
    plate = invented(20)
    first = plate.depth_range[0]
    image, _ = _drawn(replace(plate, markers=(("Above", first - 1.0),)), light)
    without, _ = _drawn(replace(plate, markers=()), light)
    top = plate_layout(plate, light).body_top
    right = range(image.width() - 200, image.width())
    assert all(
        image.pixelColor(x, y) == without.pixelColor(x, y) for y in range(top, top + 8) for x in right
    )


def test_depth_numbers_end_at_one_column(invented, light):
    placed = _drawn(invented(60), light)[1]
    body = [text for text in placed if text.words in ("200", "400", "800", "1\u00a0000", "1\u00a0200")]
    rights = {round(text.needed.right(), 2) for text in body if text.needed.left() > 600}
    assert len(rights) == 1


def test_a_file_that_cannot_be_written_is_an_error(invented, light, tmp_path):
    for write in (write_svg, write_png):
        with pytest.raises(OSError):
            write(tmp_path / "nowhere" / "figure", invented(2), light)


def test_an_error_while_drawing_leaves_the_process_alive(invented, light, monkeypatch):
    def fails(*args, **kwargs):
        raise RuntimeError("no strip")

    monkeypatch.setattr("plumbwell.plates.figure.draw_strip", fails)
    for draw in (figure_image, svg_bytes):
        with pytest.raises(RuntimeError, match="no strip"):
            draw(invented(2), light)
    assert callable(draw_figure)


def test_larger_text_keeps_its_room(invented):
    _, placed = _drawn(invented(20), theme_named("light", 1.2))
    for text in placed:
        if text.allowed is not None:
            assert text.needed.right() <= text.allowed[1] + 0.01, text.drawn


DRAWING_ALONE = """
import sys
from pathlib import Path
from plumbwell.plates.figure import write_png, write_svg
from plumbwell.plates.plate import PlateInterval, PlateStation, SurveyPlate
from plumbwell.plates.theme import theme_named
plate = SurveyPlate(
    title="Tolmire 4",
    stations=tuple(PlateStation(label=str(n), depth=10.0 * n, gravity=2.0 * n) for n in range(5)),
    intervals=tuple(
        PlateInterval(number=n, top=10.0 * n, base=10.0 * n + 10, density=2.4, sd=0.01) for n in range(4)
    ),
)
for write, name in ((write_svg, "figure.svg"), (write_png, "figure.png")):
    write(Path(sys.argv[1]) / name, plate, theme_named("print"))
from PySide6.QtGui import QGuiApplication
assert type(QGuiApplication.instance()) is QGuiApplication
assert "PySide6.QtWidgets" not in sys.modules
"""


def test_without_screen_and_application_every_run_writes_the_same(checkout, tmp_path):
    written = []
    for run in ("1", "2"):
        folder = tmp_path / run
        folder.mkdir()
        environment = {
            name: value
            for name, value in os.environ.items()
            if name not in ("DISPLAY", "WAYLAND_DISPLAY", "QT_QPA_PLATFORM")
        }
        environment.update(PYTHONPATH=str(checkout / "src"), PYTHONHASHSEED=run)
        done = subprocess.run(
            [sys.executable, "-W", "error", "-c", DRAWING_ALONE, str(folder)],
            env=environment,
            capture_output=True,
            text=True,
        )
        assert (done.returncode, done.stderr) == (0, "")
        written.append([(folder / name).read_bytes() for name in ("figure.svg", "figure.png")])
    assert written[0] == written[1]
    assert min(len(content) for content in written[0]) > 10000
