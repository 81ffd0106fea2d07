"""The tray: the lower part of the window with its pages, opened by their names.

In a wide window the docket stands at the left under its own name and one of the other pages at the right; in a
narrow one there is one page at a time. What the pages show is theirs.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from math import ceil

from PySide6.QtCore import QEvent, QRectF, QSize, Qt, Signal
from PySide6.QtGui import QAccessible, QAccessibleEvent, QFocusEvent, QKeyEvent, QMouseEvent, QPaintEvent, QResizeEvent
from PySide6.QtWidgets import QTabBar, QWidget

from plumbwell.desk.look import Look
from plumbwell.desk.parts.words import ENTER_KEYS, draw_focus, middle_baseline
from plumbwell.plates.lettering import draw_text, text_width
from plumbwell.plates.painting import hairline_across, painting

DOCKET = "docket"
ROW = 34
DOCKET_WIDTH, DOCKET_MARGIN = 436, 12
LEAST_RIGHT = 480
"""Least width of the other pages beside the docket; with less there is one page at a time."""

GAPS = (24, 14, 8)
STATE_GAP, FOCUS_ROOM = 6, 4
STEPS = {Qt.Key.Key_Left: -1, Qt.Key.Key_Right: 1}


@dataclass(frozen=True, slots=True)
class TrayPage:
    """A page of the tray: its key inside the program, its name and the widget that is it."""

    key: str
    name: str
    widget: QWidget


class PageNames(QTabBar):
    """A row of page names, the open one with the accent line.

    Signals
    -------
    wanted
        A name was clicked, or Return or Space pressed on it; its key.
    left_behind
        An arrow key leads beyond the row; -1 to the left, +1 to the right.
    """

    wanted = Signal(str)
    left_behind = Signal(int)

    def __init__(self, look: Look, parent: QWidget) -> None:
        super().__init__(parent)
        self.look = look
        self.keys: list[str] = []
        self.states: dict[str, str] = {}
        self.open = ""
        self._at = 0
        self._hovered = -1
        self._room = 1 << 20
        self.setDrawBase(False)
        self.setExpanding(False)
        self.setUsesScrollButtons(False)
        self.setElideMode(Qt.TextElideMode.ElideNone)
        self.setMouseTracking(True)
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setAccessibleName("Pages of the tray")

    def set_names(self, names: Sequence[tuple[str, str]], states: dict[str, str], room: int) -> None:
        """Show the names of pages (key, name), with their states where the room in px allows."""
        self.states, self._room = states, room
        if [(key, self.tabText(index)) for index, key in enumerate(self.keys)] != list(names):
            while self.count():
                self.removeTab(0)
            self.keys = [key for key, _ in names]
            for _, name in names:
                self.addTab(name)
            self._at = 0
        for index, key in enumerate(self.keys):
            state = states.get(key, "")
            self.setTabToolTip(index, f"{self.tabText(index)}, {state}" if state else "")
            self.setAccessibleTabName(index, f"{self.tabText(index)} {state}".strip())
        # Qt measures the tabs anew when a text is set.
        for index in range(self.count()):
            self.setTabText(index, self.tabText(index))
        self.updateGeometry()
        self.update()

    def show_open(self, key: str) -> None:
        """Show which page is open; a key that is not here leaves none open in this row."""
        self.open = key
        if key in self.keys:
            self._at = self.keys.index(key)
            self.setCurrentIndex(self._at)
        self.update()

    def _width_of(self, index: int, *, with_state: bool) -> int:
        theme = self.look.theme
        width = text_width(theme, "emphasis", self.tabText(index))
        state = self.states.get(self.keys[index], "")
        if state and with_state:
            width += theme.px(STATE_GAP) + text_width(theme, "small", state)
        return ceil(width)

    def _setting(self) -> tuple[int, bool]:
        """The gap between names and whether states are shown, so that all names have room."""
        for with_state in (True, False):
            total = sum(self._width_of(index, with_state=with_state) for index in range(len(self.keys)))
            for gap in GAPS:
                if total + self.look.theme.px(gap) * len(self.keys) <= self._room:
                    return self.look.theme.px(gap), with_state
        return self.look.theme.px(GAPS[-1]), False

    def tabSizeHint(self, index: int) -> QSize:
        gap, with_state = self._setting()
        width = self._width_of(index, with_state=with_state) + gap
        total = sum(self._width_of(one, with_state=with_state) + gap for one in range(len(self.keys)))
        if total > self._room:
            width = int(width * self._room / total)
        return QSize(width, self.look.theme.px(ROW))

    def minimumTabSizeHint(self, index: int) -> QSize:
        return self.tabSizeHint(index)

    def minimumSizeHint(self) -> QSize:
        return QSize(0, self.look.theme.px(ROW))

    def keyPressEvent(self, event: QKeyEvent) -> None:
        step = STEPS.get(Qt.Key(event.key()))
        if step is not None:
            if 0 <= self._at + step < self.count():
                self.focus_name(self._at + step)
            else:
                self.left_behind.emit(step)
        elif event.key() in (*ENTER_KEYS, Qt.Key.Key_Space) and self.count():
            self.wanted.emit(self.keys[self._at])
        else:
            event.ignore()

    def focus_name(self, index: int) -> None:
        """Put the keyboard on a name; a negative index counts from the end."""
        self._at = index % max(self.count(), 1)
        self.setFocus(Qt.FocusReason.OtherFocusReason)
        event = QAccessibleEvent(self, QAccessible.Event.Focus)
        event.setChild(self._at)
        QAccessible.updateAccessibility(event)
        self.update()

    @property
    def focused(self) -> str:
        """Key of the name on which the keyboard is."""
        return self.keys[self._at] if self.keys else ""

    def focusInEvent(self, event: QFocusEvent) -> None:
        if event.reason() in (Qt.FocusReason.TabFocusReason, Qt.FocusReason.BacktabFocusReason):
            self._at = self.keys.index(self.open) if self.open in self.keys else 0
        self.update()

    def focusOutEvent(self, event: QFocusEvent) -> None:
        self.update()

    def mousePressEvent(self, event: QMouseEvent) -> None:
        index = self.tabAt(event.position().toPoint())
        if event.button() == Qt.MouseButton.LeftButton and index >= 0:
            self._at = index
            self.wanted.emit(self.keys[index])

    def mouseReleaseEvent(self, event: QMouseEvent) -> None:
        event.accept()

    def wheelEvent(self, event: QEvent) -> None:
        event.ignore()

    def mouseMoveEvent(self, event: QMouseEvent) -> None:
        self._hover(self.tabAt(event.position().toPoint()))

    def leaveEvent(self, event: QEvent) -> None:
        self._hover(-1)

    def _hover(self, index: int) -> None:
        if index != self._hovered:
            self._hovered = index
            self.update()

    def paintEvent(self, event: QPaintEvent) -> None:
        theme = self.look.theme
        gap, with_state = self._setting()
        baseline = middle_baseline(theme, "emphasis", theme.px(ROW))
        with painting(self) as painter:
            for index, key in enumerate(self.keys):
                room = QRectF(self.tabRect(index))
                left = room.left()
                if self.hasFocus() and index == self._at and left < FOCUS_ROOM and not self.x():
                    left += FOCUS_ROOM  # at the tray's own edge the frame would lie on the first letter
                limit = (left, room.right() - min(gap, 8) + FOCUS_ROOM)
                is_open = key == self.open
                role = "ink" if is_open or index == self._hovered else "muted"
                face = "emphasis" if is_open else "text"
                box = draw_text(
                    painter, theme, self.tabText(index), x=left, baseline=baseline, face=face, role=role, room=limit
                )
                if is_open:
                    hairline_across(painter, box.left(), box.right(), 0, theme.colour("accent"), 2)
                state = self.states.get(key, "")
                end = box.right()
                if state and with_state:
                    x = box.right() + theme.px(STATE_GAP)
                    end = draw_text(
                        painter,
                        theme,
                        state,
                        x=x,
                        baseline=baseline,
                        face="small",
                        role="muted",
                        room=(x, room.right()),
                    ).right()
                if self.hasFocus() and index == self._at:
                    frame = QRectF(left - FOCUS_ROOM, 6, end - left + 2 * FOCUS_ROOM, theme.px(ROW) - 10)
                    draw_focus(painter, theme, frame)


class Tray(QWidget):
    """The tray with its row of names and its pages.

    Signals
    -------
    page_opened
        A page was opened, by its name or by `open_page`; its key. Also for a page that was open already, so that
        a tray folded to its names can be unfolded.
    """

    page_opened = Signal(str)

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self.pages: tuple[TrayPage, ...] = ()
        self._states: dict[str, str] = {}
        self._narrow = False
        self._single = self._right = ""
        self._left_names, self._right_names = PageNames(look, self), PageNames(look, self)
        for names in (self._left_names, self._right_names):
            names.wanted.connect(self.open_page)
        self._left_names.left_behind.connect(self._cross)
        self._right_names.left_behind.connect(self._cross)
        look.changed.connect(self._arrange)
        self.setAccessibleName("Tray")

    def _cross(self, step: int) -> None:
        """Take the keyboard from the end of one row of names to the other."""
        names = self._right_names if step > 0 else self._left_names
        if names.isVisible() and not names.hasFocus():
            names.focus_name(0 if step > 0 else -1)

    def set_pages(self, pages: Sequence[TrayPage]) -> None:
        """Show other pages. Those that are open stay open while they are among them; the widgets stay the caller's."""
        for old in self.pages:
            if all(old.widget is not page.widget for page in pages):
                old.widget.hide()
        self.pages = tuple(pages)
        keys = [page.key for page in self.pages]
        others = [key for key in keys if key != DOCKET]
        if self._single not in keys:
            self._single = keys[0] if keys else ""
        if self._right not in others:
            self._right = others[0] if others else ""
        for page in self.pages:
            if page.widget.parentWidget() is not self:
                page.widget.setParent(self)
        self._arrange()

    def open_page(self, key: str) -> None:
        """Open a page.

        Raises
        ------
        KeyError
            There is no page of this key.
        """
        if key not in (page.key for page in self.pages):
            raise KeyError(key)
        self._single = key
        if key != DOCKET:
            self._right = key
        self._arrange()
        self.page_opened.emit(key)

    def set_state(self, key: str, words: str) -> None:
        """Show a count or state after the name of a page; "" shows none."""
        if self._states.get(key, "") != words:
            self._states[key] = words
            self._arrange()

    def set_narrow(self, narrow: bool) -> None:
        """Show one page at a time, or the docket beside the others."""
        if narrow != self._narrow:
            self._narrow = narrow
            self._arrange()

    @property
    def is_single(self) -> bool:
        """Whether there is one page at a time: in a narrow window, or where two would have too little room."""
        theme = self.look.theme
        keys = [page.key for page in self.pages]
        too_little = self.width() < theme.px(DOCKET_WIDTH) + theme.px(LEAST_RIGHT)
        return self._narrow or too_little or DOCKET not in keys or len(keys) < 2

    @property
    def open_pages(self) -> tuple[str, ...]:
        """Keys of the pages that are open, from left to right; also while the tray is folded."""
        return (self._single,) if self.is_single else (DOCKET, self._right)

    @property
    def is_folded(self) -> bool:
        """Whether the tray is so low that only the names are seen."""
        return self.height() <= self.look.theme.px(ROW) + 4

    def minimumSizeHint(self) -> QSize:
        return QSize(self.look.theme.px(120), self.look.theme.px(ROW))

    def sizeHint(self) -> QSize:
        return QSize(self.look.theme.px(1192), self.look.theme.px(232))

    def resizeEvent(self, event: QResizeEvent) -> None:
        self._arrange()

    def _arrange(self) -> None:
        theme = self.look.theme
        row, single, opened = theme.px(ROW), self.is_single, self.open_pages
        aside = 0 if single else theme.px(DOCKET_WIDTH)
        for names, left, width, wanted in (
            (self._left_names, 0, aside, lambda key: not single and key == DOCKET),
            (self._right_names, aside, self.width() - aside, lambda key: single or key != DOCKET),
        ):
            names.set_names([(page.key, page.name) for page in self.pages if wanted(page.key)], self._states, width)
            names.setGeometry(left, 0, width, row)
            names.setVisible(width > 0 and names.count() > 0)
            names.show_open("" if self.is_folded else next((key for key in opened if wanted(key)), ""))
        for page in self.pages:
            left, width = (aside, self.width() - aside)
            if not single and page.key == DOCKET:
                left, width = 0, aside - theme.px(DOCKET_MARGIN)
            page.widget.setGeometry(left, row, max(width, 0), max(self.height() - row, 0))
            page.widget.setVisible(page.key in opened and not self.is_folded)
        self.update()

    def paintEvent(self, event: QPaintEvent) -> None:
        with painting(self) as painter:
            hairline_across(painter, 0, self.width(), 0, self.look.theme.colour("rule"))
