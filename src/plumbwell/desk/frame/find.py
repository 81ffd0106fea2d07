"""The find field of the menu row: any act, stage, page, setting, station or interval, by a few of its letters.

It lists what it is given and runs what is chosen; what there is to find is told by others when it opens.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from math import ceil

from PySide6.QtCore import (
    QAbstractListModel,
    QEvent,
    QModelIndex,
    QObject,
    QPersistentModelIndex,
    QPoint,
    QRect,
    QSize,
    Qt,
)
from PySide6.QtGui import QFocusEvent, QKeyEvent, QMouseEvent, QPainter, QPaintEvent, QResizeEvent
from PySide6.QtWidgets import (
    QApplication,
    QLineEdit,
    QListView,
    QStyle,
    QStyledItemDelegate,
    QStyleOptionViewItem,
    QWidget,
)

from plumbwell.desk.look import Look
from plumbwell.desk.parts.icons import ICON_SIZE, draw_icon
from plumbwell.desk.parts.words import ENTER_KEYS, middle_baseline
from plumbwell.plates.lettering import draw_text, face_font, text_width
from plumbwell.plates.painting import hairline_across, painting

HINT, SHORTCUT = "Find or do", "Ctrl+K"
WIDTH, LEAST_WIDTH, HEIGHT, TEXT_X = 196, 110, 26, 20
LIST_WIDTH, ROW, MOST_ROWS = 460, 26, 12
MOST_FOUND = 100
NOTHING = "Nothing of this name"

Index = QModelIndex | QPersistentModelIndex
_ROOT = QModelIndex()


@dataclass(frozen=True, slots=True)
class FindEntry:
    """One thing that can be found.

    Parameters
    ----------
    words : str
        What it is called: "Go to station TB-12", "Export tables".
    detail : str
        Where it stands or its shortcut: "Edit menu, Ctrl+Z", "640.0 m MD"; searched too.
    run : callable
        Does it.
    """

    words: str
    detail: str
    run: Callable[[], object]


Sought = tuple[str, str, FindEntry]
"""An entry with its words and detail made ready for searching."""


def sought(entries: Sequence[FindEntry]) -> list[Sought]:
    """Return entries ready for searching: what is done once and not at each letter."""
    return [(entry.words.casefold(), entry.detail.casefold(), entry) for entry in entries]


def _together(part: str, text: str) -> float:
    """How well letters fit that must stand together; 0 where they do not."""
    at, best = text.find(part), 0.0
    while at >= 0:
        if at == 0 or not text[at - 1].isalnum():
            end = at + len(part)
            whole = end == len(text) or not text[end].isalnum()
            return 100.0 + (20.0 if whole else 0.0) + (10.0 if at == 0 else 0.0)
        best = 60.0
        at = text.find(part, at + 1)
    return best


def _shortening(part: str) -> re.Pattern[str]:
    """What a shortened name matches: each letter follows the one before it at once, or begins a word."""
    letters = [re.escape(letter) for letter in part]
    begins = r"(?<![^\W_])"
    return re.compile(begins + letters[0] + "".join(f"(?:{one}|.*?{begins}{one})" for one in letters[1:]))


def _in_order(part: str) -> re.Pattern[str]:
    """What letters in their order match, whatever is between them."""
    return re.compile(".*?".join(re.escape(letter) for letter in part))


def found(query: str, entries: Sequence[Sought]) -> list[FindEntry]:
    """Return the entries that fit a query, the best first; the first of all for an empty one.

    Every word of the query must fit. Whole words count most, then beginnings of words, then letters that stand
    together, then shortened names ("tb12" for "TB-12", "rd" for "Reference density"). Where nothing fits so, letters
    in their order do, the closest together first. Of equal fits the shorter name is better.
    """
    parts = query.casefold().split()
    if not parts:
        return [entry for _, _, entry in entries[:MOST_FOUND]]
    for pattern in (_shortening, _in_order):
        loose = [(part, pattern(part)) for part in parts]
        ranked: list[tuple[float, int]] = []
        for number, (words, detail, _) in enumerate(entries):
            total = -0.01 * len(words)
            for part, looks in loose:
                fit = _together(part, words) or 0.6 * _together(part, detail)
                if not fit:
                    match = looks.search(words)
                    if match is None:
                        break
                    fit = 10.0 * len(part) / (match.end() - match.start())
                total += fit
            else:
                ranked.append((-total, number))
        if ranked:
            return [entries[number][2] for _, number in sorted(ranked)[:MOST_FOUND]]
    return []


class FoundModel(QAbstractListModel):
    """The entries that fit."""

    def __init__(self, parent: QObject) -> None:
        super().__init__(parent)
        self.entries: list[FindEntry] = []

    def set_entries(self, entries: list[FindEntry]) -> None:
        """Show other entries."""
        self.beginResetModel()
        self.entries = entries
        self.endResetModel()

    def rowCount(self, parent: Index = _ROOT) -> int:
        return 0 if parent.isValid() else len(self.entries)

    def data(self, index: Index, role: int = Qt.ItemDataRole.DisplayRole) -> str | None:
        """Return what a row says to people and screen readers."""
        if role in (Qt.ItemDataRole.DisplayRole, Qt.ItemDataRole.AccessibleTextRole):
            entry = self.entries[index.row()]
            return ", ".join(filter(None, (entry.words, entry.detail)))
        return None


class FoundDelegate(QStyledItemDelegate):
    """Paints an entry: its words, and at the right its detail."""

    def __init__(self, look: Look, model: FoundModel, parent: QObject) -> None:
        super().__init__(parent)
        self.look = look
        self.model = model

    def sizeHint(self, option: QStyleOptionViewItem, index: Index) -> QSize:
        return QSize(self.look.theme.px(100), self.look.theme.px(ROW))

    def paint(self, painter: QPainter, option: QStyleOptionViewItem, index: Index) -> None:
        """Paint one entry."""
        theme, entry = self.look.theme, self.model.entries[index.row()]
        box, state = QRect(option.rect), option.state  # type: ignore[attr-defined]
        chosen = bool(state & QStyle.StateFlag.State_Selected)
        if chosen or state & QStyle.StateFlag.State_MouseOver:
            painter.fillRect(box, theme.colour("tint" if chosen else "sunk"))
        baseline = box.top() + middle_baseline(theme, "text", box.height())
        left, right = box.left() + theme.px(12), box.right() - theme.px(12)
        detail = min(text_width(theme, "small", entry.detail), (right - left) / 2)
        draw_text(
            painter,
            theme,
            entry.detail,
            x=right - detail,
            baseline=baseline,
            face="small",
            role="muted",
            room=(right - detail, right + 1),
        )
        face = "emphasis" if chosen else "text"
        end = right - detail - (theme.px(12) if entry.detail else 0)
        draw_text(painter, theme, entry.words, x=left, baseline=baseline, face=face, room=(left, end))


class FoundList(QListView):
    """The list under the field; it lies in the window itself, so that the keyboard stays with the field."""

    def __init__(self, look: Look, parent: QWidget) -> None:
        super().__init__(parent)
        self.look = look
        self.entries = FoundModel(self)
        self.setModel(self.entries)
        self.setItemDelegate(FoundDelegate(look, self.entries, self))
        self.setUniformItemSizes(True)
        self.setFocusPolicy(Qt.FocusPolicy.NoFocus)
        self.setFrameShape(QListView.Shape.NoFrame)
        self.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        self.setMouseTracking(True)
        self.setAccessibleName("Found")
        self.hide()

    def paintEvent(self, event: QPaintEvent) -> None:
        super().paintEvent(event)
        if not self.entries.entries:
            theme, view = self.look.theme, self.viewport()
            with painting(view) as painter:
                left = theme.px(12)
                draw_text(
                    painter,
                    theme,
                    NOTHING,
                    x=left,
                    baseline=middle_baseline(theme, "text", view.height()),
                    role="muted",
                    room=(left, view.width()),
                )


class FindField(QWidget):
    """The field with its magnifier, its shortcut at the right and the list beneath.

    Return does the chosen entry, Up and Down walk, Escape leaves; afterwards the keyboard is where it was before.
    """

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self._actions: Callable[[], Sequence[FindEntry]] = tuple
        self._entries: list[Sought] = []
        self._before: QWidget | None = None
        self.edit = QLineEdit(self)
        self.edit.setFrame(False)
        self.edit.setStyleSheet("QLineEdit, QLineEdit:focus { border: 0; padding: 0; }")
        self.edit.setPlaceholderText(HINT)
        self.edit.setAccessibleName(HINT)
        self.edit.setAccessibleDescription("Letters of an act, a page, a setting, a station or an interval; Ctrl+K")
        self.edit.textEdited.connect(self._search)
        self.edit.installEventFilter(self)
        self.list: FoundList | None = None
        self.setFocusProxy(self.edit)
        application = QApplication.instance()
        if isinstance(application, QApplication):
            application.focusChanged.connect(self._focus_changed)
        look.changed.connect(self._look_changed)
        self._look_changed()

    def set_actions(self, actions: Callable[[], Sequence[FindEntry]]) -> None:
        """Give the function that tells what there is to find; it is asked each time the field opens."""
        self._actions = actions

    def open(self) -> None:
        """Put the keyboard into the field and list what there is."""
        self.edit.setFocus(Qt.FocusReason.ShortcutFocusReason)
        self.edit.selectAll()
        self._search()

    @property
    def is_open(self) -> bool:
        """Whether the list is seen."""
        return self.list is not None and self.list.isVisible()

    @property
    def shown(self) -> tuple[FindEntry, ...]:
        """The entries of the list, best first; none while it is closed."""
        return tuple(self.list.entries.entries) if self.list is not None and self.is_open else ()

    def close_list(self) -> None:
        """Close the list and empty the field."""
        self.edit.clear()
        if self.list is not None:
            self.list.hide()

    def _begin(self) -> None:
        self._entries = sought(self._actions())
        if self.list is None or self.list.parentWidget() is not self.window():
            self.list = FoundList(self.look, self.window())
            self.list.clicked.connect(lambda index: self._run(index.row()))
            self._dress_list()

    def _search(self) -> None:
        if not self.is_open:
            self._begin()
        assert self.list is not None
        self.list.entries.set_entries(found(self.edit.text(), self._entries))
        self._place()
        self.list.show()
        self.list.raise_()
        if self.list.entries.entries:
            self.list.setCurrentIndex(self.list.entries.index(0))
        self._tell()

    def _place(self) -> None:
        assert self.list is not None
        theme, window = self.look.theme, self.window()
        rows = min(max(len(self.list.entries.entries), 1), MOST_ROWS)
        corner = self.mapTo(window, QPoint(self.width(), self.height()))
        width = min(theme.px(LIST_WIDTH), corner.x())
        height = min(rows * theme.px(ROW) + 2, max(window.height() - corner.y() - 4, theme.px(ROW) + 2))
        self.list.setGeometry(corner.x() - width, corner.y() + 2, width, height)

    def _tell(self) -> None:
        if self.list is not None:
            index = self.list.currentIndex()
            self.edit.setAccessibleDescription(str(self.list.entries.data(index)) if index.isValid() else NOTHING)

    def _step(self, step: int) -> None:
        if not self.is_open:
            self._search()
            return
        assert self.list is not None
        count = len(self.list.entries.entries)
        if count:
            row = (self.list.currentIndex().row() + step) % count
            self.list.setCurrentIndex(self.list.entries.index(row))
            self._tell()

    def _run(self, row: int) -> None:
        entries = self.shown
        if not 0 <= row < len(entries):
            return
        self._leave()
        entries[row].run()

    def _leave(self) -> None:
        self.close_list()
        before, self._before = self._before, None
        if before is not None and before.isVisible():
            before.setFocus(Qt.FocusReason.OtherFocusReason)
        else:
            self.edit.clearFocus()

    def eventFilter(self, watched: QObject, event: QEvent) -> bool:
        if isinstance(event, QKeyEvent) and event.type() == QEvent.Type.KeyPress:
            return self._key(event)
        if isinstance(event, QFocusEvent):
            self.update()
            if event.type() == QEvent.Type.FocusOut and event.reason() not in (
                Qt.FocusReason.PopupFocusReason,
                Qt.FocusReason.ActiveWindowFocusReason,
            ):
                self.close_list()
        return super().eventFilter(watched, event)

    def _key(self, event: QKeyEvent) -> bool:
        steps = {Qt.Key.Key_Down: 1, Qt.Key.Key_Up: -1}
        if event.key() in steps:
            self._step(steps[Qt.Key(event.key())])
        elif event.key() in ENTER_KEYS:
            if self.list is not None and self.is_open:
                self._run(self.list.currentIndex().row())
        elif event.key() == Qt.Key.Key_Escape:
            self._leave()
        else:
            return False
        return True

    def _focus_changed(self, old: QWidget | None, new: QWidget | None) -> None:
        if new is self.edit and old is not None and old is not self.edit:
            self._before = old

    def _look_changed(self) -> None:
        self.edit.setFont(face_font(self.look.theme, "text"))
        if self.list is not None:
            self._dress_list()
            self._place()
        self._arrange()
        self.updateGeometry()
        self.update()

    def _dress_list(self) -> None:
        assert self.list is not None
        roles = self.look.theme.roles
        self.list.setStyleSheet(f"QListView {{ border: 1px solid {roles['rule']}; background: {roles['ground']}; }}")

    def sizeHint(self) -> QSize:
        theme = self.look.theme
        return QSize(theme.px(WIDTH), theme.px(HEIGHT))

    def minimumSizeHint(self) -> QSize:
        theme = self.look.theme
        return QSize(theme.px(LEAST_WIDTH), theme.px(HEIGHT))

    def _arrange(self) -> None:
        theme = self.look.theme
        left = theme.px(TEXT_X)
        right = self.width() - ceil(text_width(theme, "small", SHORTCUT)) - theme.px(6)
        self.edit.setGeometry(left, 0, max(right - left, 0), self.height() - 2)

    def resizeEvent(self, event: QResizeEvent) -> None:
        self._arrange()
        if self.is_open:
            self._place()

    def mousePressEvent(self, event: QMouseEvent) -> None:
        self.open()

    def paintEvent(self, event: QPaintEvent) -> None:
        theme = self.look.theme
        focus = self.edit.hasFocus()
        with painting(self) as painter:
            size = theme.px(ICON_SIZE) - 1
            draw_icon(painter, "search", theme, "muted", x=0, y=(self.height() - 2 - size) / 2, size=size)
            draw_text(
                painter,
                theme,
                SHORTCUT,
                x=self.width(),
                baseline=middle_baseline(theme, "text", self.height() - 2),
                face="small",
                role="muted",
                align="right",
                room=(self.edit.geometry().right(), self.width()),
            )
            thick, role = (2, "accent") if focus else (1, "strong")
            hairline_across(painter, 0, self.width(), self.height() - thick, theme.colour(role), thick)
