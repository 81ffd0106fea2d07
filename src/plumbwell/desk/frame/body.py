"""The body of the window: ledger, fan and the plots of a stage side by side, heads on one line.

Only lays them; what they show is put into them by the workspace. The boundary between ledger and plots is dragged
by a grip that paints nothing, so that the thread runs through unbroken.
"""

from __future__ import annotations

from collections.abc import Sequence

from PySide6.QtCore import QPoint, Qt, Signal
from PySide6.QtGui import QKeyEvent, QMouseEvent, QPainter, QPaintEvent, QResizeEvent
from PySide6.QtWidgets import QStackedWidget, QWidget

from plumbwell.desk.hole.fan import Fan
from plumbwell.desk.ledger.ledger import Ledger
from plumbwell.desk.look import Look
from plumbwell.plates.painting import hairline_down, painting

MARGIN = 16
GAP = 20
GRIP = 7
FAN_WIDTHS = {"interval": 60, "station": 52}
NARROW_FAN = 48
LEAST_LEDGER, LEAST_PLOTS = 220, 210
DEPTH_SHARE, TIME_SHARE, NARROW_SHARE = 0.55, 0.58, 0.61
"""Most of the width that a ledger takes of its own accord, beside tracks and beside plots against time."""

KEY_STEP = 24


class Grip(QWidget):
    """The boundary that is dragged; also with Left and Right when it has the focus."""

    dragged = Signal(int)

    def __init__(self, look: Look, parent: QWidget) -> None:
        super().__init__(parent)
        self._look = look
        self._from: QPoint | None = None
        self.setCursor(Qt.CursorShape.SplitHCursor)
        self.setFocusPolicy(Qt.FocusPolicy.TabFocus)
        self.setAccessibleName("Boundary between ledger and plots, Left and Right move it")

    def mousePressEvent(self, event: QMouseEvent) -> None:
        self._from = event.position().toPoint()

    def mouseMoveEvent(self, event: QMouseEvent) -> None:
        if self._from is not None:
            self.dragged.emit(event.position().toPoint().x() - self._from.x())

    def mouseReleaseEvent(self, event: QMouseEvent) -> None:
        self._from = None

    def keyPressEvent(self, event: QKeyEvent) -> None:
        steps = {Qt.Key.Key_Left: -KEY_STEP, Qt.Key.Key_Right: KEY_STEP}
        if event.key() in steps:
            self.dragged.emit(steps[Qt.Key(event.key())])
        else:
            super().keyPressEvent(event)

    def paintEvent(self, event: QPaintEvent) -> None:
        if self.underMouse() or self.hasFocus():
            painter: QPainter
            with painting(self) as painter:
                hairline_down(painter, GRIP // 2, 0, self.height(), self._look.theme.colour("accent"))

    def focusInEvent(self, event: object) -> None:
        self.update()

    def focusOutEvent(self, event: object) -> None:
        self.update()

    def enterEvent(self, event: object) -> None:
        self.update()

    def leaveEvent(self, event: object) -> None:
        self.update()


class Body(QWidget):
    """Ledger, fan and plots.

    Parameters
    ----------
    look : Look
    ledger : Ledger
    fan : Fan
    plots : QStackedWidget
        The plots of the stages, one in front.

    Signals
    -------
    shared(int)
        The person gave the ledger another width, px.
    """

    shared = Signal(int)

    def __init__(
        self, look: Look, ledger: Ledger, fan: Fan, plots: QStackedWidget, parent: QWidget | None = None
    ) -> None:
        super().__init__(parent)
        self._look = look
        self.ledger, self.fan, self.plots = ledger, fan, plots
        for part in (ledger, fan, plots):
            part.setParent(self)
        self._grip = Grip(look, self)
        self._grip.dragged.connect(self._drag)
        self._kind: str | None = None
        self._wanted: int | None = None
        self._edges = [0]
        self._narrow = False
        look.changed.connect(self.lay)

    def set_fan(self, kind: str | None) -> None:
        """Show the fan of intervals or stations, or a gap in its place."""
        self._kind = kind
        self.fan.setVisible(kind is not None)
        self.lay()

    def set_shares(self, *, wanted: int | None, edges: Sequence[int], narrow: bool) -> None:
        """Take the width the person gave the ledger (None: none yet), where its columns end, and if room is short."""
        self._wanted, self._edges, self._narrow = wanted, list(edges), narrow
        self.lay()

    def ledger_width(self) -> int:
        """The width of the ledger in px: as the person gave it, else that of the columns that leave the plots room."""
        middle = self.fan_width()
        least_plots = self._look.theme.px(LEAST_PLOTS)
        most = max(self.width() - MARGIN - middle - least_plots, LEAST_LEDGER)
        if self._wanted is not None:
            return min(max(self._wanted, LEAST_LEDGER), most)
        share = int((self.width() - MARGIN - middle) * self._most_share())
        whole = [edge for edge in self._edges if edge <= min(share, most)]
        return min(max(whole[-1] if whole else share, LEAST_LEDGER), most)

    def _most_share(self) -> float:
        if self._narrow:
            return NARROW_SHARE
        return DEPTH_SHARE if self._kind is not None else TIME_SHARE

    def fan_width(self) -> int:
        """The width of the fan, or of the gap in its place, px."""
        if self._kind is None:
            return GAP
        return NARROW_FAN if self._narrow else FAN_WIDTHS[self._kind]

    def lay(self) -> None:
        """Give every part its place."""
        height, ledger = self.height(), self.ledger_width()
        middle = self.fan_width()
        self.ledger.setGeometry(MARGIN, 0, ledger, height)
        self.fan.setGeometry(MARGIN + ledger, 0, middle, height)
        left = MARGIN + ledger + middle
        self.plots.setGeometry(left, 0, max(self.width() - left - MARGIN, 0), height)
        grip = left - GRIP // 2 if self._kind is not None else MARGIN + ledger + GAP // 2 - GRIP // 2
        self._grip.setGeometry(grip, 0, GRIP, height)
        self._grip.raise_()

    def _drag(self, step: int) -> None:
        self._wanted = self.ledger_width() + step
        self.lay()
        self.shared.emit(self.ledger_width())

    def resizeEvent(self, event: QResizeEvent) -> None:
        super().resizeEvent(event)
        self.lay()
