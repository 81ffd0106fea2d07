"""Every action of the window, made once: menus, shortcuts and the find field share them."""

from __future__ import annotations

from collections.abc import Callable

from PySide6.QtCore import QObject
from PySide6.QtGui import QAction, QActionGroup, QKeySequence
from PySide6.QtWidgets import QMenu, QMenuBar, QWidget

from plumbwell.desk.stages import states


class Actions(QObject):
    """The menus of the window and their actions, by key.

    Parameters
    ----------
    window : QWidget
        Owns the actions, so that their shortcuts work everywhere in it.
    does : callable
        Called with the key of an action that was triggered.
    """

    def __init__(self, window: QWidget, does: Callable[[str], None]) -> None:
        super().__init__(window)
        self._window, self._does = window, does
        self.of: dict[str, QAction] = {}
        self.bar = QMenuBar()
        self.samples, self.recent = QMenu("Open a sample survey"), QMenu("Recent surveys")
        self.surveys, self.recipes = QMenu(), QMenu()
        self._file()
        self._edit()
        self._view()
        self._stages()
        self._help()

    def _action(self, menu: QMenu, key: str, words: str, *shortcuts: str, tip: str = "") -> QAction:
        action = QAction(words, self._window)
        action.setShortcuts([QKeySequence(one) for one in shortcuts])
        action.setToolTip(tip or words.replace("&", ""))
        action.triggered.connect(lambda _=False, wanted=key: self._does(wanted))
        self._window.addAction(action)
        menu.addAction(action)
        self.of[key] = action
        return action

    def _choices(self, menu: QMenu, *of: tuple[str, str, str]) -> None:
        group = QActionGroup(menu)
        for key, words, shortcut in of:
            action = self._action(menu, key, words, *filter(None, (shortcut,)))
            action.setCheckable(True)
            group.addAction(action)

    def _file(self) -> None:
        menu = self.bar.addMenu("&File")
        self._action(menu, "open", "&Open a survey folder…", "Ctrl+O")
        menu.addMenu(self.samples)
        menu.addMenu(self.recent)
        self._action(menu, "new", "Start a survey &folder…", "Ctrl+N")
        self._action(menu, "again", "&Read the folder again", "F5")
        menu.addSeparator()
        self._action(menu, "name", "&Name this point of the history…", "Ctrl+S")
        self._action(menu, "copy folder", "Save a &copy as survey folder…", "Ctrl+Shift+S")
        self._action(menu, "write", "&Write the outputs…", "Ctrl+E")
        menu.addSeparator()
        self._action(menu, "quit", "&Quit", "Ctrl+Q")

    def _edit(self) -> None:
        menu = self.bar.addMenu("&Edit")
        self._action(menu, "undo", "&Undo", "Ctrl+Z")
        self._action(menu, "redo", "&Redo", "Ctrl+Shift+Z", "Ctrl+Y")
        menu.addSeparator()
        self._action(menu, "copy", "&Copy the rows")
        self._action(menu, "all", "Choose &all rows")
        self._action(menu, "filter", "&Filter the ledger", "Ctrl+F")
        menu.addSeparator()
        self._action(menu, "use", "&Leave readings out, or take them in…")
        self._action(menu, "note", "&Note on readings…", "Ctrl+M")
        self._action(menu, "tare", "Add a &tare before this reading…")
        self._action(menu, "drop tare", "&Drop the tare of this run nearest to this reading")

    def _view(self) -> None:
        menu = self.bar.addMenu("&View")
        self._choices(
            menu.addMenu("&Theme"), ("theme system", "As the system", ""), ("theme light", "Light", ""),
            ("theme dark", "Dark", ""),
        )  # fmt: skip
        size = menu.addMenu("Text &size")
        self._action(size, "larger", "Larger", "Ctrl++", "Ctrl+=")
        self._action(size, "smaller", "Smaller", "Ctrl+-")
        self._action(size, "normal", "As designed", "Ctrl+0")
        self._choices(
            menu.addMenu("&Depth"), ("depth MD", "Measured depth (MD)", ""),
            ("depth TVD", "True vertical depth (TVD)", ""), ("depth elevation", "Elevation", ""),
        )  # fmt: skip
        self._choices(menu.addMenu("&Unit of depth"), ("unit m", "Metres", ""), ("unit ft", "Feet", ""))
        self._choices(
            menu.addMenu("&Bars and bands"), ("bars 1", "One standard deviation", ""),
            ("bars 2", "Two standard deviations", ""), ("bars 95", "95 % confidence (Student's t)", ""),
        )  # fmt: skip
        menu.addSeparator()
        self._action(menu, "columns", "&Columns of the ledger…")
        self._action(menu, "tracks", "T&racks…")
        self._action(menu, "whole", "The &whole hole", "Ctrl+Home")
        self._action(menu, "tray", "&Fold or open the tray", "Ctrl+T")

    def _stages(self) -> None:
        menu = self.bar.addMenu("&Stage")
        for key in states.STAGES:
            self._action(menu, f"stage {key}", states.NAMES[key], f"Ctrl+{states.NUMBERS[key]}")

    def _help(self) -> None:
        menu = self.bar.addMenu("&Help")
        self._action(menu, "keys", "&Keys", "F1")
        self._action(menu, "caution", "&Caution")
        self._action(menu, "log", "Where the &log is")
        self._action(menu, "about", "&About Plumbwell")

    def enable(self, keys: tuple[str, ...], able: bool) -> None:
        """Make actions possible, or not."""
        for key in keys:
            self.of[key].setEnabled(able)

    def check(self, key: str) -> None:
        """Mark the choice in force."""
        self.of[key].setChecked(True)
