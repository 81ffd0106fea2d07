"""The stage line over the desk: any stage at any time, by mouse, arrow keys or a screen reader.

Paints with the painter of the plates. Each stage has an invisible button of its own, so that it can have the focus and
be read aloud. They are plain buttons to a screen reader, named with stage, figure, state and key: roles of our own
would need accessible interfaces made in Python, which the binding frees before Qt is done with them.
"""

from __future__ import annotations

from collections.abc import Sequence

from PySide6.QtCore import QRectF, QSize, Qt, Signal
from PySide6.QtGui import QKeyEvent, QPaintEvent, QResizeEvent
from PySide6.QtWidgets import QAbstractButton, QSizePolicy, QWidget

from plumbwell.desk.look import Look
from plumbwell.desk.parts.hints import Hints
from plumbwell.desk.parts.words import ENTER_KEYS, draw_focus
from plumbwell.plates.painting import painting
from plumbwell.plates.stage_line import (
    MARGIN,
    StageState,
    draw_stage_line,
    shown_figure,
    stage_height,
    stage_places,
)

LEAST_PART = 76
REACH = 9


class StageNode(QAbstractButton):
    """A stage's place on the line: takes the focus and the click, paints only the frame of the focus."""

    def __init__(self, line: StageLine, stage: StageState) -> None:
        super().__init__(line)
        Hints(self, lambda _: line.hint_of(self.stage))
        self._line = line
        self.stage = stage
        self.setCursor(Qt.CursorShape.PointingHandCursor)
        self.show_stage(stage)

    def show_stage(self, stage: StageState) -> None:
        """Take another state of the stage."""
        self.stage = stage
        # One stop of the Tab key for the line; the arrow keys walk along it.
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus if stage.current else Qt.FocusPolicy.ClickFocus)
        self.setAccessibleName(stage.spoken)
        self.setAccessibleDescription(stage.hint)

    def paintEvent(self, event: QPaintEvent) -> None:
        if self.hasFocus():
            with painting(self) as painter:
                draw_focus(painter, self._line.look.theme, QRectF(self.rect()))

    def keyPressEvent(self, event: QKeyEvent) -> None:
        steps = {Qt.Key.Key_Left: -1, Qt.Key.Key_Right: 1}
        if event.key() in steps:
            self._line.focus_beside(self, steps[Qt.Key(event.key())])
        elif event.key() in ENTER_KEYS:
            self.click()
        else:
            super().keyPressEvent(event)


class StageLine(QWidget):
    """The line of stages.

    Parameters
    ----------
    look : Look
    parent : QWidget, optional

    Signals
    -------
    stage_chosen(str)
        A stage was clicked, or chosen by Return or Space: its key.
    """

    stage_chosen = Signal(str)

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self._stages: tuple[StageState, ...] = ()
        self._nodes: list[StageNode] = []
        self.setAccessibleName("stage line")
        self.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Fixed)
        look.changed.connect(self._measure)

    def set_stages(self, stages: Sequence[StageState]) -> None:
        """Take the stages in their order, with their states; the keyboard's focus stays at its stage."""
        if [stage.key for stage in stages] != [stage.key for stage in self._stages]:
            for node in self._nodes:
                node.hide()
                node.deleteLater()
            self._nodes = [StageNode(self, stage) for stage in stages]
            for node in self._nodes:
                node.clicked.connect(self._choose)
                node.show()
        self._stages = tuple(stages)
        for node, stage in zip(self._nodes, stages, strict=True):
            node.show_stage(stage)
        if self._nodes and not any(stage.current for stage in stages):
            self._nodes[0].setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        front = next((stage.name for stage in stages if stage.current), None)
        self.setAccessibleDescription(f"{front} in front" if front else "no stage in front")
        self._measure()

    def _choose(self) -> None:
        node = self.sender()
        if isinstance(node, StageNode):
            self.stage_chosen.emit(node.stage.key)

    def focus_beside(self, node: StageNode, step: int) -> None:
        """Give the keyboard's focus to the stage beside one; at the ends it stays."""
        index = self._nodes.index(node) + step
        if 0 <= index < len(self._nodes):
            self._nodes[index].setFocus(Qt.FocusReason.TabFocusReason)

    def hint_of(self, stage: StageState) -> str:
        """Return what hovering over a stage tells: its figure where it was shortened, and the finding or reason."""
        if stage not in self._stages:
            return ""
        place = stage_places(self._stages, self.width())[self._stages.index(stage)]
        short = shown_figure(self.look.theme, stage, place) != stage.figure
        lines = [f"{stage.name}: {stage.figure}"] if short else []
        return "\n".join([*lines, stage.hint] if stage.hint else lines)

    def sizeHint(self) -> QSize:
        theme = self.look.theme
        return QSize(2 * MARGIN + theme.px(140) * max(len(self._stages), 1), stage_height(theme))

    def minimumSizeHint(self) -> QSize:
        parts = max(len(self._stages), 1)
        return QSize(2 * MARGIN + LEAST_PART * parts, stage_height(self.look.theme))

    def _measure(self) -> None:
        self.setFixedHeight(stage_height(self.look.theme))
        self._lay()
        self.updateGeometry()
        self.update()

    def _lay(self) -> None:
        height = stage_height(self.look.theme)
        for node, place in zip(self._nodes, stage_places(self._stages, self.width()), strict=True):
            left = place.node - REACH
            node.setGeometry(left, 2, int(place.right) + 4 - left, height - 5)

    def resizeEvent(self, event: QResizeEvent) -> None:
        self._lay()

    def paintEvent(self, event: QPaintEvent) -> None:
        theme = self.look.theme
        with painting(self) as painter:
            painter.fillRect(self.rect(), theme.colour("ground"))
            draw_stage_line(painter, self._stages, theme, self.width())
