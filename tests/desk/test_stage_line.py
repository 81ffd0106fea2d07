"""The stage line: states by shape and colour, what the keyboard and the screen reader get, texts in their room."""

from dataclasses import replace

import pytest
from PySide6.QtCore import QPoint, Qt
from PySide6.QtGui import QAccessible, QColor
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication

from plumbwell.desk.frame.stage_line import StageLine
from plumbwell.desk.look import Look
from plumbwell.plates.lettering import text_placed
from plumbwell.plates.stage_line import LINE_AT, StagePlace, StageState, shown_figure, stage_height, stage_places
from plumbwell.plates.theme import theme_named

WIDTH = 1224
STAGES = (
    StageState(key="readings", number=2, name="Readings", figure="412 readings", state="in_order"),
    StageState(
        key="drift",
        number=3,
        name="Drift",
        figure="\u03c7\u00b2 0.98, 1 tare",
        state="look",
        hint="Visit 17 disagrees.",
    ),
    StageState(
        key="reduction", number=4, name="Reduction", figure="\u00b1 6 \u00b5Gal", state="in_order", current=True
    ),
    StageState(key="density", number=5, name="Density", figure="\u00b1 0.007, 3 findings", state="resting"),
    StageState(key="handover", number=7, name="Handover", figure="not started", state="not_started"),
)


@pytest.fixture
def look(qapp):
    look = Look()
    look.theme = theme_named("light")
    return look


@pytest.fixture
def line(qtbot, look):
    line = StageLine(look)
    qtbot.addWidget(line)
    line.resize(WIDTH, line.height())
    line.set_stages(STAGES)
    line.show()
    qtbot.waitUntil(line.isActiveWindow)
    return line


def told(line):
    heard = []
    line.stage_chosen.connect(heard.append)
    return heard


def node(line, index):
    """The button of a stage, as a click at its node finds it."""
    place = stage_places(STAGES, line.width())[index]
    return line.childAt(QPoint(place.node, LINE_AT))


def shown(line):
    with text_placed() as placed:
        image = line.grab().toImage()
    return image, placed


def changed(index, **changes):
    values = {name: getattr(STAGES[index], name) for name in ("key", "number", "name", "figure", "hint")}
    stage = StageState(**{**values, "state": STAGES[index].state, "current": STAGES[index].current, **changes})
    return (*STAGES[:index], stage, *STAGES[index + 1 :])


def test_a_click_on_node_name_or_figure_chooses_the_stage(line):
    heard = told(line)
    places = stage_places(STAGES, line.width())
    for index, (across, y) in enumerate(((0, LINE_AT), (30, 34), (60, 52))):
        point = QPoint(places[index].node + across, y)
        QTest.mouseClick(line.childAt(point), Qt.MouseButton.LeftButton)
    assert heard == ["readings", "drift", "reduction"]


def test_arrows_walk_along_the_line_and_return_chooses(line):
    heard = told(line)
    node(line, 2).setFocus()
    for key in (Qt.Key.Key_Right, Qt.Key.Key_Return, Qt.Key.Key_Right, Qt.Key.Key_Right, Qt.Key.Key_Space):
        QTest.keyClick(QApplication.focusWidget(), key)
    assert heard == ["density", "handover"], "at the end the walk stays"
    for _ in range(9):
        QTest.keyClick(QApplication.focusWidget(), Qt.Key.Key_Left)
    assert QApplication.focusWidget() is node(line, 0)


def test_the_tab_key_stops_once_at_the_stage_in_front(line):
    stops = [index for index in range(5) if node(line, index).focusPolicy() & Qt.FocusPolicy.TabFocus]
    assert stops == [2]


def test_the_focus_stays_at_its_stage_when_states_change(line):
    node(line, 3).setFocus()
    line.set_stages(changed(3, state="computing", figure="computing"))
    assert QApplication.focusWidget() is node(line, 3)
    assert "computing" in node(line, 3).accessibleName()


def test_the_focus_is_framed(line, look):
    image, _ = shown(line)
    button = node(line, 1)
    corner = button.geometry().topLeft() + QPoint(20, 0)
    accent = QColor(look.theme.roles["accent"])
    assert image.pixelColor(corner) != accent
    button.setFocus()
    image, _ = shown(line)
    assert image.pixelColor(corner) == accent


def test_a_screen_reader_finds_every_stage_with_what_it_shows(line):
    spoken = QAccessible.queryAccessibleInterface(line)
    assert spoken.text(QAccessible.Text.Name) == "stage line"
    stages = [spoken.child(index) for index in range(spoken.childCount())]
    assert {stage.role() for stage in stages} == {QAccessible.Role.Button}
    names = [stage.text(QAccessible.Text.Name) for stage in stages]
    assert names == [
        "Readings, 412 readings, in order, Ctrl+2",
        "Drift, \u03c7\u00b2 0.98, 1 tare, wants a look, Ctrl+3",
        "Reduction, \u00b1 6 \u00b5Gal, in order, in front, Ctrl+4",
        "Density, \u00b1 0.007, 3 findings, rests on little, wants a look, Ctrl+5",
        "Handover, not started, Ctrl+7",
    ]
    assert stages[1].text(QAccessible.Text.Description) == "Visit 17 disagrees."


@pytest.mark.parametrize("name", ["light", "dark"])
def test_each_state_has_its_node(line, look, name):
    look.theme = theme_named(name)
    look.changed.emit()
    line.set_stages(changed(0, state="error"))
    image, _ = shown(line)
    colours = {role: QColor(look.theme.roles[role]) for role in ("ink", "amber", "brick", "accent", "ground")}
    at = [image.pixelColor(place.node, LINE_AT) for place in stage_places(STAGES, WIDTH)]
    assert at == [colours[role] for role in ("brick", "amber", "accent", "amber", "ground")]
    line.set_stages(changed(0, state="waiting", figure="waiting"))
    image, _ = shown(line)
    first = stage_places(STAGES, WIDTH)[0].node
    ring = {image.pixelColor(x, y).name() for x in range(first - 5, first + 6) for y in (LINE_AT - 4, LINE_AT + 4)}
    assert image.pixelColor(first, LINE_AT) == colours["ground"] and len(ring) > 2, "a ring of dots"


def test_what_rests_on_little_is_never_shown_as_in_order(line, look):
    amber = QColor(look.theme.roles["amber"])

    def amber_below(index, right=160):
        image, _ = shown(line)
        place = stage_places(STAGES, WIDTH)[index]
        box = [(x, y) for x in range(place.node + 11, place.node + right) for y in range(40, 60)]
        return sum(image.pixelColor(x, y) == amber for x, y in box)

    assert amber_below(3) > 0
    assert amber_below(0) == 0
    line.set_stages(changed(2, state="resting"))
    assert amber_below(2, right=21) > 15, "in front too, with the triangle before its figure"


def test_the_plumb_line_hangs_from_the_stage_in_front_to_the_rule(line, look):
    image, _ = shown(line)
    node_column = stage_places(STAGES, WIDTH)[2].node
    accent, rule = QColor(look.theme.roles["accent"]), QColor(look.theme.roles["rule"])
    base = stage_height(look.theme) - 1
    assert all(image.pixelColor(node_column, y) == accent for y in range(LINE_AT, base - 2))
    assert image.pixelColor(2, base) == image.pixelColor(WIDTH - 1, base) == rule
    assert line.height() == base + 1 == 66


def test_the_way_to_a_stage_not_started_is_dotted(line, look):
    image, _ = shown(line)
    places = stage_places(STAGES, WIDTH)
    strong = QColor(look.theme.roles["strong"])
    inked = [
        sum(image.pixelColor(x, LINE_AT) == strong for x in range(first.node + 10, second.node - 10))
        / (second.node - first.node - 20)
        for first, second in zip(places, places[1:], strict=False)
    ]
    assert inked[:3] == [1.0, 1.0, 1.0]
    assert 0.2 < inked[3] < 0.3


@pytest.mark.parametrize("width", [960, 1224])
@pytest.mark.parametrize("scale", [0.9, 1.0, 1.6])
def test_texts_keep_to_their_stage_and_numbers_are_not_cut(line, look, width, scale):
    look.theme = theme_named("light", scale)
    look.changed.emit()
    line.resize(width, line.height())
    line.set_stages([*STAGES, *changed(0, key="masses")[:1], *changed(0, key="plan")[:1]])
    _, placed = shown(line)
    for text in placed:
        assert text.allowed[0] <= text.needed.left() + 0.01
        assert text.needed.right() <= text.allowed[1] + 0.01 <= width
        assert text.needed.bottom() < line.height() - 1
    boxes = [text.needed for text in placed]
    assert not any(one.intersects(two) for n, one in enumerate(boxes) for two in boxes[n + 1 :])
    figures = [text.drawn for text in placed if text.drawn.startswith("\u00b1 0.007")]
    assert figures in (["\u00b1 0.007, 3 findings"], ["\u00b1 0.007\u2026"])


def test_hovering_tells_the_finding_and_a_figure_that_was_shortened(line):
    assert line.hint_of(STAGES[1]) == "Visit 17 disagrees."
    assert line.hint_of(STAGES[3]) == ""
    line.resize(500, line.height())
    assert line.hint_of(STAGES[3]) == "Density: \u00b1 0.007, 3 findings"
    assert line.hint_of(STAGES[1]) == "Drift: \u03c7\u00b2 0.98, 1 tare\nVisit 17 disagrees."


def test_other_stages_take_the_place_of_those_before(line):
    heard = told(line)
    line.set_stages(STAGES[:2])
    line.set_stages(STAGES[3:])
    spoken = QAccessible.queryAccessibleInterface(line)
    assert spoken.childCount() >= 2
    place = stage_places(STAGES[3:], line.width())[1]
    QTest.mouseClick(line.childAt(QPoint(place.node, LINE_AT)), Qt.MouseButton.LeftButton)
    assert heard == ["handover"]
    assert line.accessibleDescription() == "no stage in front"
    assert line.childAt(QPoint(place.node, LINE_AT)).focusPolicy() == Qt.FocusPolicy.ClickFocus


def test_a_state_that_does_not_exist_is_refused():
    with pytest.raises(ValueError, match="state 'fine' is none of in_order, look, error"):
        StageState(key="drift", number=3, name="Drift", figure="", state="fine")


def test_the_count_of_findings_is_the_last_to_go(qapp):
    light = theme_named("light")
    place = StagePlace(node=0.0, left=11.0, right=11.0 + 150.0, figure_left=11.0)
    stage = StageState(
        key="readings", number=2, name="Readings", figure="376 readings, 1 out, 3 findings", state="look"
    )
    assert shown_figure(light, stage, place) == "376 readings, 3 findings"
    narrow = replace(place, right=11.0 + 80.0)
    assert shown_figure(light, stage, narrow) == "3 findings"
    quiet = replace(stage, figure="376 readings, 1 out", state="in_order")
    assert shown_figure(light, quiet, replace(place, right=11.0 + 90.0)).startswith("376 readings")
