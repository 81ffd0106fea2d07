"""Tool tips of painted widgets: words for the place under the pointer, and word when the pointer leaves.

They are shown from an event filter. A Python override of ``event`` is avoided everywhere in the desk: with it, an
error in a ``paintEvent`` ends the process inside the binding instead of reaching the failure dialog.
"""

from __future__ import annotations

from collections.abc import Callable

from PySide6.QtCore import QEvent, QObject, QPoint
from PySide6.QtGui import QHelpEvent
from PySide6.QtWidgets import QToolTip, QWidget


class Hints(QObject):
    """Shows the tool tips of a widget.

    Parameters
    ----------
    widget : QWidget
        Also the owner of this.
    words : callable
        Gives the words of a place in px of the widget, empty for none.
    left : callable or None
        Called when the pointer leaves the widget.
    """

    def __init__(
        self, widget: QWidget, words: Callable[[QPoint], str], *, left: Callable[[], None] | None = None
    ) -> None:
        super().__init__(widget)
        self._widget, self._words, self._left = widget, words, left
        widget.installEventFilter(self)

    def eventFilter(self, watched: QObject, event: QEvent) -> bool:
        kind = event.type()
        if kind == QEvent.Type.ToolTip and isinstance(event, QHelpEvent):
            words = self._words(event.pos())
            if words:
                QToolTip.showText(event.globalPos(), words, self._widget)
            else:
                QToolTip.hideText()
            return True
        if kind == QEvent.Type.Leave and self._left is not None:
            self._left()
        return False
