"""The look of the real window: nothing clipped at any size, theme or text scale; everything said and reached."""

from __future__ import annotations

import pytest
from PySide6.QtCore import QObject, Qt
from PySide6.QtGui import QAccessible, QGuiApplication
from PySide6.QtWidgets import QAbstractButton, QComboBox, QLineEdit, QWidget

from plumbwell.desk.stages import states
from plumbwell.desk.tray.blocks import Block
from plumbwell.plates.lettering import text_placed
from reduced_surveys import MINE, SHAFT, WELL

NUMBERS = set("0123456789.,±−+ \u00a0—:")


def clipped(placed) -> list[str]:
    """Texts that stand beyond their room, and numbers that were shortened."""
    found = []
    for one in placed:
        number = bool(one.words) and set(one.words) <= NUMBERS
        if number and one.drawn != one.words:
            found.append(f"number {one.words!r} shown as {one.drawn!r}")
        if one.allowed is not None and (
            one.needed.left() < one.allowed[0] - 1.0 or one.needed.right() > one.allowed[1] + 1.0
        ):
            found.append(f"{one.drawn!r} needs {one.needed.left():.0f} to {one.needed.right():.0f} of {one.allowed}")
    return found


def painted(window):
    """Every text of one whole painting of the window."""
    with text_placed() as placed:
        window.shell.grab()
    assert len(placed) > 40
    return placed


@pytest.mark.parametrize("scale", [0.9, 1.0, 1.5])
@pytest.mark.parametrize("size", [(1440, 900), (1180, 720), (2560, 1440)])
@pytest.mark.parametrize("folder", [WELL, SHAFT], ids=["well", "real shaft"])
def test_no_text_is_clipped(driven, folder, size, scale):
    window = driven(size=size, scale=scale)
    window.open(folder)
    found = []
    for stage in states.STAGES:
        window.stage(stage)
        for page in ("docket", "recipe", "history", "settle", "neighbours"):
            if page in window.work.page_keys:
                window.work.open_page(page)
        window.work.ledger.walk(1)
        found += [f"{stage}: {one}" for one in clipped(painted(window))]
    assert not found, "\n".join(found)


def test_switches_change_everything_live_and_nothing_is_clipped(driven):
    window = driven()
    window.open(WELL)
    window.stage(states.DENSITY)
    light = window.shell.grab().toImage().pixelColor(3, 3)
    for wish in ("theme dark", "unit ft", "depth elevation", "bars 95", "larger", "larger"):
        window.desk.do(wish)
        window.settle()
        assert not clipped(painted(window)), wish
    dark = window.shell.grab().toImage().pixelColor(3, 3)
    assert light.lightness() > 200 and dark.lightness() < 60
    window.shell.resize(1180, 720)
    window.settle()
    assert not clipped(painted(window))


def test_the_look_is_found_again_at_the_next_start(driven):
    window = driven()
    window.open(WELL)
    for wish in ("theme dark", "unit ft", "depth TVD", "bars 1"):
        window.desk.do(wish)
    window.stage(states.REDUCTION)
    window.close()
    # The maker of windows sets theme and scale itself; the rest is remembered.
    again = driven(theme="dark")
    again.open(WELL)
    assert (again.look.depth.kind, again.look.depth.unit, again.look.theme.bars) == ("TVD", "ft", 1)
    assert again.work.stage == states.REDUCTION


def test_heads_of_ledger_and_tracks_stand_on_one_line(driven):
    for scale in (0.9, 1.0, 1.5):
        window = driven(scale=scale)
        window.open(WELL)
        window.stage(states.DENSITY)
        picture = window.shell.grab().toImage()
        ink = window.look.theme.colour("ink").name()
        head = window.work.ledger.mapTo(window.shell, window.work.ledger.rect().topLeft()).y()
        row = head + window.work.ledger.body_top() - 1
        left = window.work.ledger.mapTo(window.shell, window.work.ledger.rect().topLeft()).x()
        right = window.work.plots.mapTo(window.shell, window.work.plots.rect().topRight()).x()
        inked = sum(picture.pixelColor(x, row).name() == ink for x in range(left, right))
        assert inked > 0.97 * (right - left), scale
        window.close()


def interactive(root: QWidget) -> list[QWidget]:
    """Controls that a person can use, those in sight."""
    kinds = (QAbstractButton, QComboBox, QLineEdit)
    # The corner of a table is a bare button of Qt's own that has nothing to do here.
    return [
        one
        for one in root.findChildren(QWidget)
        if isinstance(one, kinds) and one.isVisible() and type(one) is not QAbstractButton
    ]


def test_every_control_has_a_name_and_can_be_reached_by_keyboard(driven):
    window = driven()
    window.open(WELL)
    nameless, unreached = [], []
    for stage in states.STAGES:
        window.stage(stage)
        for page in window.work.page_keys:
            window.work.open_page(page)
            window.settle()
            for control in interactive(window.shell):
                interface = QAccessible.queryAccessibleInterface(control)
                if not interface.text(QAccessible.Text.Name).strip():
                    nameless.append(f"{stage}, {page}: {type(control).__name__}")
                # Words of a block are reached from the block itself, which the arrow keys make the current one.
                if isinstance(control.parentWidget(), Block) and not control.parentWidget().hasFocus():
                    continue
                if control.isEnabled() and control.focusPolicy() == Qt.FocusPolicy.NoFocus:
                    unreached.append(f"{stage}, {page}: {type(control).__name__} {control.accessibleName()}")
    inner = ("QTabBar", "CloseButton", "QToolButton")
    assert not [one for one in set(nameless) if not any(word in one for word in inner)]
    assert not [one for one in set(unreached) if "Word" in one]


def test_plots_say_in_words_what_they_show(driven):
    window = driven()
    window.open(MINE)
    work = window.work
    for stage, view in (
        (states.READINGS, work.times), (states.DRIFT, work.times), (states.REDUCTION, work.tracks),
        (states.DENSITY, work.tracks), (states.DENSITY, work.strip), (states.DENSITY, work.fan),
    ):  # fmt: skip
        window.stage(stage)
        said = view.accessibleDescription()
        assert view.accessibleName() and any(figure.isdigit() for figure in said), (stage, said)


def test_tab_walks_through_the_window_and_focus_is_seen(driven):
    window = driven()
    window.open(SHAFT)
    window.stage(states.DENSITY)
    seen: list[QObject] = []
    for _ in range(60):
        window.key(window.shell.focusWidget() or window.shell, Qt.Key.Key_Tab)
        seen.append(window.shell.focusWidget())
    owners = {type(one).__name__ for one in seen if one is not None}
    assert {"Strip", "Tracks"} <= owners and any("Ledger" in name or "Rows" in name for name in owners), owners


def test_the_window_follows_the_system_where_it_is_asked_to(driven, monkeypatch):
    window = driven(theme="system")
    assert window.look.theme.name == "light"
    monkeypatch.setattr(type(window.look), "_named", lambda self: "dark")
    QGuiApplication.styleHints().colorSchemeChanged.emit(Qt.ColorScheme.Dark)
    assert window.look.theme.name == "dark"
    monkeypatch.undo()
    window.desk.do("theme light")
    QGuiApplication.styleHints().colorSchemeChanged.emit(Qt.ColorScheme.Dark)
    assert window.look.theme.name == "light"
