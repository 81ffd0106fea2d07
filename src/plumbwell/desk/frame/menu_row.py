"""The menu row: menus at the left; undo, redo, the survey and recipe choosers and the find field at the right."""

from __future__ import annotations

from PySide6.QtCore import QPoint, QRectF, QSize, Qt
from PySide6.QtGui import QAction, QKeyEvent, QPaintEvent
from PySide6.QtWidgets import QHBoxLayout, QMenu, QMenuBar, QSizePolicy, QWidget

from plumbwell.desk.frame.find import FindField
from plumbwell.desk.look import Look
from plumbwell.desk.parts.icons import draw_icon
from plumbwell.desk.parts.words import Pressed, draw_focus, middle_baseline
from plumbwell.plates.lettering import draw_text, text_width
from plumbwell.plates.painting import painting

HEIGHT = 34
WIDEST_VALUE, LEAST_VALUE = 190, 56


class IconButton(Pressed):
    """An action of the menu row as an icon: undo and redo."""

    def __init__(self, name: str, action: QAction, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._name, self._look, self._action = name, look, action
        self.setFocusPolicy(Qt.FocusPolicy.TabFocus)
        self.setSizePolicy(QSizePolicy.Policy.Fixed, QSizePolicy.Policy.Fixed)
        self.clicked.connect(action.trigger)
        action.changed.connect(self._follow)
        look.changed.connect(self.updateGeometry)
        self._follow()

    def _follow(self) -> None:
        self.setEnabled(self._action.isEnabled())
        self.setAccessibleName(self._action.text().replace("&", ""))
        self.setToolTip(self._action.toolTip())
        self.update()

    def sizeHint(self) -> QSize:
        side = self._look.theme.px(26)
        return QSize(side, side)

    def paintEvent(self, event: QPaintEvent) -> None:
        theme = self._look.theme
        size = theme.px(16)
        with painting(self) as painter:
            if self.underMouse() and self.isEnabled():
                painter.fillRect(self.rect(), theme.colour("sunk"))
            inset = (self.width() - size) / 2
            draw_icon(
                painter, self._name, theme, "ink" if self.isEnabled() else "strong", x=inset, y=inset, size=size
            )
            if self.hasFocus():
                draw_focus(painter, theme, QRectF(self.rect()))


class MenuWord(Pressed):
    """A chooser of the menu row: a small muted label, the value, a chevron; a menu opens beneath."""

    def __init__(self, label: str, menu: QMenu, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._label, self._menu, self._look = label, menu, look
        self._value = ""
        self.setFocusPolicy(Qt.FocusPolicy.TabFocus)
        self.setSizePolicy(QSizePolicy.Policy.Maximum, QSizePolicy.Policy.Fixed)
        self.clicked.connect(self._open)
        look.changed.connect(self.updateGeometry)

    def say(self, value: str) -> None:
        """Show another value."""
        self._value = value
        self.setAccessibleName(f"{self._label}: {value}")
        self.setToolTip(value)
        self.updateGeometry()
        self.update()

    def _open(self) -> None:
        self._menu.popup(self.mapToGlobal(QPoint(0, self.height())))

    def _widths(self) -> tuple[int, int]:
        theme = self._look.theme
        label = round(text_width(theme, "small", self._label)) + theme.px(6)
        value = min(round(text_width(theme, "text", self._value)) + 2, theme.px(WIDEST_VALUE))
        return label, value

    def sizeHint(self) -> QSize:
        theme = self._look.theme
        label, value = self._widths()
        return QSize(label + value + theme.px(22) + 8, theme.px(26))

    def minimumSizeHint(self) -> QSize:
        theme = self._look.theme
        label, value = self._widths()
        return QSize(label + min(value, theme.px(LEAST_VALUE)) + theme.px(22) + 8, theme.px(26))

    def keyPressEvent(self, event: QKeyEvent) -> None:
        if event.key() == Qt.Key.Key_Down:
            self._open()
        else:
            super().keyPressEvent(event)

    def paintEvent(self, event: QPaintEvent) -> None:
        theme = self._look.theme
        label, _ = self._widths()
        value = self.width() - label - theme.px(22) - 8
        baseline = middle_baseline(theme, "text", self.height())
        with painting(self) as painter:
            if self.underMouse():
                painter.fillRect(self.rect(), theme.colour("sunk"))
            draw_text(painter, theme, self._label, x=4, baseline=baseline, face="small", role="muted")
            draw_text(
                painter, theme, self._value, x=4 + label, baseline=baseline, room=(4 + label, 4 + label + value)
            )
            size = theme.px(14)
            draw_icon(
                painter, "chevron-down", theme, "muted", x=8 + label + value, y=(self.height() - size) / 2, size=size
            )
            if self.hasFocus():
                draw_focus(painter, theme, QRectF(self.rect()))


class MenuRow(QWidget):
    """Menus, undo and redo, choosers, find field."""

    def __init__(
        self, look: Look, menus: QMenuBar, undo: QAction, redo: QAction, surveys: QMenu, recipes: QMenu,
        parent: QWidget | None = None,
    ) -> None:  # fmt: skip
        super().__init__(parent)
        self._look = look
        menus.setNativeMenuBar(False)
        self.survey = MenuWord("survey", surveys, look, self)
        self.recipe = MenuWord("recipe", recipes, look, self)
        self.find_field = FindField(look, self)
        row = QHBoxLayout(self)
        row.setContentsMargins(6, 0, 16, 1)
        row.setSpacing(8)
        # Menus keep their words; where room is short, values and the find field are narrower.
        menus.setSizePolicy(QSizePolicy.Policy.Minimum, QSizePolicy.Policy.Preferred)
        # At its own height: a taller bar keeps its words at the top, above the line of the others.
        row.addWidget(menus, 0, Qt.AlignmentFlag.AlignVCenter)
        row.addStretch(1)
        row.addWidget(IconButton("undo-2", undo, look, self))
        row.addWidget(IconButton("redo-2", redo, look, self))
        row.addSpacing(8)
        row.addWidget(self.survey)
        row.addSpacing(4)
        row.addWidget(self.recipe)
        row.addSpacing(8)
        row.addWidget(self.find_field)
        look.changed.connect(self._measure)
        self._measure()

    def _measure(self) -> None:
        self.setFixedHeight(self._look.theme.px(HEIGHT))
