"""The scroll bar of a ledger, laid over the empty edge right of its last numbers.

It is there while the pointer is over the ledger and paints its grip alone, so that rows and the thread run into the
fan without a bar between.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from PySide6.QtCore import QEvent, QObject, QRect, Qt
from PySide6.QtGui import QPaintEvent
from PySide6.QtWidgets import QScrollBar, QStyle, QStyleOptionSlider

from plumbwell.desk.ledger.ledger_cells import row_height
from plumbwell.desk.look import Look
from plumbwell.plates.painting import painting

if TYPE_CHECKING:
    from plumbwell.desk.ledger.ledger_view import LedgerView

WIDTH, GRIP = 8, 4


class LedgerRail(QScrollBar):
    """A vertical scroll bar that mirrors the one of the rows.

    Parameters
    ----------
    look : Look
    rows : LedgerView
    """

    def __init__(self, look: Look, rows: LedgerView) -> None:
        super().__init__(Qt.Orientation.Vertical, rows)
        self._look, self._rows = look, rows
        self._inside = False
        bar = rows.verticalScrollBar()
        bar.rangeChanged.connect(self._take_range)
        bar.valueChanged.connect(self.setValue)
        self.valueChanged.connect(bar.setValue)
        self.setFocusPolicy(Qt.FocusPolicy.NoFocus)
        self.setAttribute(Qt.WidgetAttribute.WA_OpaquePaintEvent, False)
        self.hide()
        rows.installEventFilter(self)

    def place(self, viewport: QRect) -> None:
        """Lie along the right edge of the rows' viewport."""
        width = self._look.theme.px(WIDTH)
        self.setGeometry(viewport.right() + 1 - width, viewport.top(), width, viewport.height())
        self.setPageStep(viewport.height())
        self.setSingleStep(row_height(self._look.theme))
        self._appear()
        self.raise_()

    def _take_range(self, least: int, most: int) -> None:
        self.setRange(least, most)
        self._appear()

    def _appear(self) -> None:
        self.setVisible(self._inside and self.maximum() > self.minimum())

    def paintEvent(self, event: QPaintEvent) -> None:
        option = QStyleOptionSlider()
        self.initStyleOption(option)
        style = self.style()
        grip = style.subControlRect(
            QStyle.ComplexControl.CC_ScrollBar, option, QStyle.SubControl.SC_ScrollBarSlider, self
        )
        width = self._look.theme.px(GRIP)
        left = (self.width() - width) // 2
        with painting(self) as painter:
            role = "strong" if self.underMouse() or self.isSliderDown() else "rule"
            painter.fillRect(QRect(left, grip.top(), width, grip.height()), self._look.theme.colour(role))

    def eventFilter(self, watched: QObject, event: QEvent) -> bool:
        if event.type() in (QEvent.Type.Enter, QEvent.Type.Leave):
            self._inside = event.type() == QEvent.Type.Enter
            self._appear()
        return super().eventFilter(watched, event)
