"""The history: every act with its time, the newest at the top, and a word at each that goes there.

The page shows points and asks for them; keeping and replaying acts is left to others.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from math import ceil

from PySide6.QtCore import (
    QAbstractListModel,
    QModelIndex,
    QPersistentModelIndex,
    QPoint,
    QRect,
    QRectF,
    QSize,
    Qt,
    Signal,
)
from PySide6.QtGui import QFocusEvent, QKeyEvent, QMouseEvent, QPainter, QResizeEvent
from PySide6.QtWidgets import QListView, QStyle, QStyledItemDelegate, QStyleOptionViewItem, QWidget

from plumbwell.desk.look import Look
from plumbwell.desk.parts.words import ENTER_KEYS, Caption, Field, Word, draw_focus, middle_baseline
from plumbwell.plates.lettering import draw_text, text_width
from plumbwell.plates.painting import draw_mark, hairline_across, hairline_down

ROW, BAND = 28, 36
BAR, MARK_X, TIME_X, GAP = 3, 15, 30, 14
NAME_WIDTH, WHO_WIDTH = 200, 160
LONGEST_NAME = 80
BACK, AHEAD, ASIDE = "Go back to here", "Go forward to here", "Go over to here"
HERE = "present point"

Index = QModelIndex | QPersistentModelIndex
_ROOT = QModelIndex()


@dataclass(frozen=True, slots=True)
class HistoryRow:
    """One point of the history.

    Parameters
    ----------
    number : int
        Number of the point, told when it is gone to.
    when_words : str
        Its time, as people read it.
    who, sentence, name : str
        Who did it, what was done, and the name that a person gave the point ("" for none).
    here : bool
        The present point.
    ahead : bool
        Undone; redo leads there.
    branch : bool
        On another branch: neither undo nor redo leads there.
    """

    number: int
    when_words: str
    who: str
    sentence: str
    name: str = ""
    here: bool = False
    ahead: bool = False
    branch: bool = False


def way_of(row: HistoryRow) -> str:
    """Return the word that goes to a point; "" for the present one."""
    if row.here:
        return ""
    return AHEAD if row.ahead else ASIDE if row.branch else BACK


class HistoryModel(QAbstractListModel):
    """The points as a list, newest first; a screen reader gets each as a sentence."""

    def __init__(self, parent: QWidget) -> None:
        super().__init__(parent)
        self.rows: tuple[HistoryRow, ...] = ()

    def set_rows(self, rows: Sequence[HistoryRow]) -> None:
        """Show other points."""
        self.beginResetModel()
        self.rows = tuple(rows)
        self.endResetModel()

    def rowCount(self, parent: Index = _ROOT) -> int:
        return 0 if parent.isValid() else len(self.rows)

    def data(self, index: Index, role: int = Qt.ItemDataRole.DisplayRole) -> str | None:
        """Return what a row says to people and screen readers."""
        if role in (Qt.ItemDataRole.DisplayRole, Qt.ItemDataRole.AccessibleTextRole):
            row = self.rows[index.row()]
            state = HERE if row.here else "undone" if row.ahead else "another branch" if row.branch else ""
            return ", ".join(filter(None, (row.when_words, row.sentence, row.who, row.name, state)))
        if role == Qt.ItemDataRole.ToolTipRole:
            return self.rows[index.row()].sentence
        return None


class HistoryDelegate(QStyledItemDelegate):
    """Paints a point: mark, time, what was done, name, who, and the word that goes there."""

    def __init__(self, look: Look, view: QListView, model: HistoryModel) -> None:
        super().__init__(view)
        self.look = look
        self.view = view
        self.model = model
        self.time_width = 0

    def sizeHint(self, option: QStyleOptionViewItem, index: Index) -> QSize:
        return QSize(self.look.theme.px(200), self.look.theme.px(ROW))

    def measure(self) -> None:
        """Measure the widest time, so that sentences stand under one another."""
        widths = (text_width(self.look.theme, "small", row.when_words) for row in self.model.rows)
        self.time_width = ceil(max(widths, default=0.0))

    def way_box(self, row: HistoryRow, box: QRect) -> QRect:
        """Return where the word that goes to a point stands, in px of the viewport."""
        width = ceil(text_width(self.look.theme, "text", way_of(row)))
        return QRect(box.right() + 1 - width, box.top(), width, box.height())

    def paint(self, painter: QPainter, option: QStyleOptionViewItem, index: Index) -> None:
        """Paint one point."""
        row, theme = self.model.rows[index.row()], self.look.theme
        box, state = QRect(option.rect), option.state  # type: ignore[attr-defined]
        top, left = box.top(), box.left()
        baseline = top + middle_baseline(theme, "text", theme.px(ROW) - 1)
        hovered = bool(state & QStyle.StateFlag.State_MouseOver)
        painter.save()
        if row.here:
            painter.fillRect(box, theme.colour("tint"))
            hairline_down(painter, left, top, top + box.height(), theme.colour("accent"), theme.px(BAR))
        elif hovered:
            painter.fillRect(box, theme.colour("sunk"))
        hairline_across(painter, left, box.right() + 1, box.bottom(), theme.colour("hair"))
        aside = row.ahead or row.branch
        role = "muted" if aside else "ink"
        if aside:
            draw_mark(painter, theme, "excluded", x=left + theme.px(MARK_X), y=top + theme.px(ROW) / 2)
        x: float = left + theme.px(TIME_X)
        draw_text(painter, theme, row.when_words, x=x, baseline=baseline, face="small", role="muted")
        x += self.time_width + theme.px(GAP)
        limit = self._paint_right(painter, row, box, baseline, hovered=hovered)
        name = min(text_width(theme, "name", row.name), (limit - x) / 2) + theme.px(GAP) if row.name else 0
        face = "emphasis" if row.here else "text"
        said = draw_text(
            painter, theme, row.sentence, x=x, baseline=baseline, face=face, role=role, room=(x, max(limit - name, x))
        )
        if row.name:
            x = said.right() + theme.px(GAP)
            draw_text(painter, theme, row.name, x=x, baseline=baseline, face="name", role=role, room=(x, limit))
        if self.view.hasFocus() and self.view.currentIndex() == index:
            draw_focus(painter, theme, QRectF(box))
        painter.restore()

    def _paint_right(self, painter: QPainter, row: HistoryRow, box: QRect, baseline: float, *, hovered: bool) -> float:
        """Paint the way and, before it, who; return where the room for the sentence ends."""
        theme = self.look.theme
        widest = max(text_width(theme, "text", words) for words in (BACK, AHEAD, ASIDE))
        limit = box.right() + 1 - widest - theme.px(GAP)
        if row.here:
            draw_text(
                painter,
                theme,
                HERE,
                x=box.right() - theme.px(4),
                baseline=baseline,
                face="small",
                role="muted",
                align="right",
            )
        else:
            way = draw_text(
                painter, theme, way_of(row), x=box.right() + 1, baseline=baseline, role="accent", align="right"
            )
            hairline_across(painter, way.left(), way.right(), baseline + 2, theme.colour("accent"), 2 if hovered else 1)
        state = "undone" if row.ahead else "another branch" if row.branch else ""
        words = ", ".join(filter(None, (row.who, state)))
        if not words:
            return limit
        room = min(text_width(theme, "small", words), theme.px(WHO_WIDTH))
        x = limit - room
        draw_text(painter, theme, words, x=x, baseline=baseline, face="small", role="muted", room=(x, limit + 1))
        return x - theme.px(GAP)


class HistoryView(QListView):
    """The list: arrows walk, Return or a click on the word goes to the point.

    Signals
    -------
    go_to
        A point is wanted; its number.
    """

    go_to = Signal(int)

    def __init__(self, look: Look, parent: QWidget) -> None:
        super().__init__(parent)
        self.look = look
        self.rows = HistoryModel(self)
        self.painter = HistoryDelegate(look, self, self.rows)
        self.setModel(self.rows)
        self.setItemDelegate(self.painter)
        self.setUniformItemSizes(True)
        self.setFrameShape(QListView.Shape.NoFrame)
        self.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        self.setVerticalScrollMode(QListView.ScrollMode.ScrollPerPixel)
        self.setMouseTracking(True)
        self.viewport().setAttribute(Qt.WidgetAttribute.WA_Hover)
        self.setAccessibleName("History, newest first")
        self.setAccessibleDescription("Return goes to the point.")
        look.changed.connect(self._look_changed)

    def _look_changed(self) -> None:
        self.painter.measure()
        self.scheduleDelayedItemsLayout()
        self.viewport().update()

    def set_rows(self, rows: Sequence[HistoryRow]) -> None:
        """Show other points, the present one as the current row; the scroll position stays where it can."""
        before = self.verticalScrollBar().value()
        self.rows.set_rows(rows)
        self.painter.measure()
        here = next((index for index, row in enumerate(self.rows.rows) if row.here), 0)
        if self.rows.rows:
            self.verticalScrollBar().setValue(before)
            self.setCurrentIndex(self.rows.index(here))

    def _over_way(self, at: QPoint) -> HistoryRow | None:
        index = self.indexAt(at)
        if not index.isValid():
            return None
        row = self.rows.rows[index.row()]
        return row if way_of(row) and self.painter.way_box(row, self.visualRect(index)).contains(at) else None

    def mouseMoveEvent(self, event: QMouseEvent) -> None:
        over = self._over_way(event.position().toPoint())
        self.viewport().setCursor(Qt.CursorShape.PointingHandCursor if over else Qt.CursorShape.ArrowCursor)
        super().mouseMoveEvent(event)

    def mouseReleaseEvent(self, event: QMouseEvent) -> None:
        super().mouseReleaseEvent(event)
        over = self._over_way(event.position().toPoint())
        if over is not None and event.button() == Qt.MouseButton.LeftButton:
            self.go_to.emit(over.number)

    def keyPressEvent(self, event: QKeyEvent) -> None:
        index = self.currentIndex()
        if event.key() in ENTER_KEYS and index.isValid():
            if way_of(self.rows.rows[index.row()]):
                self.go_to.emit(self.rows.rows[index.row()].number)
        else:
            super().keyPressEvent(event)

    def focusInEvent(self, event: QFocusEvent) -> None:
        super().focusInEvent(event)
        self.viewport().update()


class HistoryPage(QWidget):
    """The page of the history.

    Signals
    -------
    go_to
        The survey is wanted as it was at a point; its number.
    point_named
        The present point is to have a name.
    """

    go_to = Signal(int)
    point_named = Signal(str)

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self.view = HistoryView(look, self)
        self.view.go_to.connect(self.go_to)
        self.name = Field(look, self)
        self.name.setMaxLength(LONGEST_NAME)
        self.name.setPlaceholderText("name of the present point")
        self.name.setAccessibleName("Name of the present point")
        self.name.returnPressed.connect(self._name_point)
        self.give = Word("Name this point", look, self)
        self.give.clicked.connect(self._name_point)
        self.empty = Caption("Nothing has been done yet. Every act is kept and listed here.", look, self, role="muted")
        self.setFocusProxy(self.view)
        look.changed.connect(self._arrange)
        self.setAccessibleName("History")
        self.set_points(())

    def set_points(self, points: Sequence[HistoryRow]) -> None:
        """Show the points of the history.

        Parameters
        ----------
        points : sequence of HistoryRow
            In any order; shown by number, the newest at the top.
        """
        rows = sorted(points, key=lambda row: -row.number)
        self.view.set_rows(rows)
        here = next((row for row in rows if row.here), None)
        if not (self.name.hasFocus() and self.name.isModified()):
            self.name.setText(here.name if here else "")
        for widget in (self.view, self.name, self.give):
            widget.setVisible(bool(rows))
        self.empty.setVisible(not rows)

    def start_naming(self) -> None:
        """Put the keyboard into the field of the name, its text selected."""
        self.name.setFocus(Qt.FocusReason.ShortcutFocusReason)
        self.name.selectAll()

    def _name_point(self) -> None:
        words = " ".join(self.name.text().split())
        if words:
            self.name.setText(words)
            self.point_named.emit(words)

    def keyPressEvent(self, event: QKeyEvent) -> None:
        if event.key() == Qt.Key.Key_Escape and self.name.isModified():
            here = next((row for row in self.view.rows.rows if row.here), None)
            self.name.setText(here.name if here else "")
        else:
            super().keyPressEvent(event)

    def _arrange(self) -> None:
        theme = self.look.theme
        row, top = theme.px(24), theme.px(2)
        self.name.setGeometry(0, top, theme.px(NAME_WIDTH), row)
        self.give.stand_at(x=theme.px(NAME_WIDTH + 16), baseline=top + middle_baseline(theme, "text", row - 2))
        self.view.setGeometry(0, theme.px(BAND), self.width(), max(self.height() - theme.px(BAND), 0))
        self.empty.setGeometry(0, theme.px(4), self.width(), theme.px(19))

    def resizeEvent(self, event: QResizeEvent) -> None:
        self._arrange()
