"""The look in force: theme, text scale, bars of one or two sd or 95 %, depth kind and unit; one switch each.

Every widget of the desk holds the one `Look`, paints with `look.theme` and repaints when it has `changed`.
"""

from __future__ import annotations

from dataclasses import replace

from PySide6.QtCore import QObject, Qt, Signal
from PySide6.QtGui import QColor, QGuiApplication, QPalette
from PySide6.QtWidgets import QApplication

from plumbwell.plates.depth_scale import DepthScale
from plumbwell.plates.lettering import face_font
from plumbwell.plates.theme import CONFIDENCE, Theme, theme_named

SYSTEM, LIGHT, DARK = "system", "light", "dark"
LEAST_SCALE, MOST_SCALE = 0.9, 1.6
BARS = (2, 1, CONFIDENCE)
"""What bars can be, the usual one first."""


class Look(QObject):
    """Theme, text scale, bars, depth kind and depth unit of the window.

    Signals
    -------
    changed
        Something of the look is another one: measure anew and repaint. What is shown in numbers stays.
    depth_changed
        Depth kind or unit is another one: tables and plates are to be made anew.
    """

    changed = Signal()
    depth_changed = Signal()

    def __init__(self, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self.wanted = SYSTEM
        self.depth = DepthScale()
        self.theme: Theme = theme_named(self._named())
        QGuiApplication.styleHints().colorSchemeChanged.connect(self._system_changed)

    def _system_changed(self) -> None:
        """The system went from light to dark or back: the window goes along where it is to look as the system."""
        if self.wanted == SYSTEM:
            self.choose()

    def _named(self) -> str:
        if self.wanted != SYSTEM:
            return self.wanted
        dark = QGuiApplication.styleHints().colorScheme() == Qt.ColorScheme.Dark
        return DARK if dark else LIGHT

    def choose(
        self, *, wanted: str | None = None, text_scale: float | None = None, bars: int | None = None
    ) -> None:
        """Take another theme ("system", "light", "dark"), text scale (0.9 to 1.6), or bars: 1 or 2 (sd), 95 (%)."""
        self.wanted = self.wanted if wanted is None else wanted
        scale = self.theme.text_scale if text_scale is None else min(max(text_scale, LEAST_SCALE), MOST_SCALE)
        bars = self.theme.bars if bars is None else bars
        self.theme = replace(theme_named(self._named(), round(scale, 2)), bars=bars, freedom=self.theme.freedom)
        self.apply()
        self.changed.emit()

    def take_freedom(self, freedom: int | None) -> None:
        """Take the degrees of freedom of the numbers shown; bars of 95 % reach accordingly."""
        if freedom != self.theme.freedom:
            self.theme = replace(self.theme, freedom=freedom)
            if self.theme.bars == CONFIDENCE:
                self.changed.emit()

    def choose_depth(self, *, kind: str | None = None, unit: str | None = None) -> None:
        """Take another depth kind ("MD", "TVD", "elevation") or unit ("m", "ft")."""
        self.depth = DepthScale(kind=kind or self.depth.kind, unit=unit or self.depth.unit)
        self.depth_changed.emit()

    def apply(self) -> None:
        """Set palette, font and the short style sheet of the application."""
        application = QApplication.instance()
        if isinstance(application, QApplication):
            application.setPalette(palette(self.theme))
            application.setFont(face_font(self.theme, "text"))
            # A style sheet makes every widget measure itself anew, so an equal one is not set again.
            if application.styleSheet() != (sheet := style_sheet(self.theme)):
                application.setStyleSheet(sheet)


def next_bars(bars: int) -> int:
    """The bars that come after some at one click."""
    return BARS[(BARS.index(bars) + 1) % len(BARS)]


def palette(theme: Theme) -> QPalette:
    """The Qt palette of a theme."""
    made = QPalette()
    role = QPalette.ColorRole
    for group in (QPalette.ColorGroup.Active, QPalette.ColorGroup.Inactive, QPalette.ColorGroup.Disabled):
        text = theme.colour("strong" if group == QPalette.ColorGroup.Disabled else "ink")
        pairs: dict[QPalette.ColorRole, QColor] = {
            role.Window: theme.colour("ground"),
            role.Base: theme.colour("ground"),
            role.AlternateBase: theme.colour("ground"),
            role.Button: theme.colour("ground"),
            role.ToolTipBase: theme.colour("sunk"),
            role.ToolTipText: theme.colour("ink"),
            role.WindowText: text,
            role.Text: text,
            role.ButtonText: text,
            role.PlaceholderText: theme.colour("muted"),
            role.Highlight: theme.colour("tint"),
            role.HighlightedText: theme.colour("ink"),
            role.Accent: theme.colour("accent"),
            role.Link: theme.colour("accent"),
            role.LinkVisited: theme.colour("accent"),
            role.Light: theme.colour("hair"),
            role.Midlight: theme.colour("hair"),
            role.Mid: theme.colour("rule"),
            role.Dark: theme.colour("strong"),
            role.Shadow: theme.colour("strong"),
        }
        for which, colour in pairs.items():
            made.setColor(group, which, colour)
    return made


def style_sheet(theme: Theme) -> str:
    """The style sheet: menus, scroll bars, splitters, tool tips and plain fields; colours by role."""
    roles = theme.roles
    pad, bar = round(5 * theme.text_scale), round(10 * theme.text_scale)
    return f"""
QMenuBar {{ background: {roles["ground"]}; color: {roles["ink"]}; border: 0; }}
QMenuBar::item {{ background: transparent; padding: {pad}px {2 * pad}px; }}
QMenuBar::item:selected {{ background: {roles["sunk"]}; }}
QMenu {{ background: {roles["ground"]}; color: {roles["ink"]}; border: 1px solid {roles["rule"]}; }}
QMenu::item {{ padding: {pad}px {5 * pad}px {pad}px {4 * pad}px; }}
QMenu::item:selected {{ background: {roles["tint"]}; color: {roles["ink"]}; }}
QMenu::item:disabled {{ color: {roles["strong"]}; }}
QMenu::separator {{ height: 1px; background: {roles["rule"]}; margin: 4px 0; }}
QToolTip {{ background: {roles["sunk"]}; color: {roles["ink"]}; border: 1px solid {roles["rule"]}; padding: 4px; }}
QSplitter::handle {{ background: {roles["ground"]}; }}
QSplitter::handle:hover {{ background: {roles["tint"]}; }}
QScrollBar {{ background: {roles["ground"]}; border: 0; }}
QScrollBar:vertical {{ width: {bar}px; }}
QScrollBar:horizontal {{ height: {bar}px; }}
QScrollBar::handle {{ background: {roles["rule"]}; border: 0; margin: 2px; min-height: 24px; min-width: 24px; }}
QScrollBar::handle:hover {{ background: {roles["strong"]}; }}
QScrollBar::add-line, QScrollBar::sub-line {{ width: 0; height: 0; }}
QScrollBar::add-page, QScrollBar::sub-page {{ background: transparent; }}
QLineEdit {{ background: transparent; border: 0; border-bottom: 1px solid {roles["strong"]}; padding: 2px 1px;
  selection-background-color: {roles["tint"]}; selection-color: {roles["ink"]}; }}
QLineEdit:focus {{ border-bottom: 2px solid {roles["accent"]}; }}
"""
