"""The recipe as a form: every setting with its unit, its default, what it does and its source.

Made from `survey.recipe.KEYS`. A change is told by a signal and shown when the recipe comes back; the page changes
no recipe itself.
"""

from __future__ import annotations

from collections.abc import Sequence
from itertools import combinations
from typing import Any

from PySide6.QtCore import Qt, Signal
from PySide6.QtGui import QKeyEvent, QPaintEvent, QResizeEvent
from PySide6.QtWidgets import QScrollArea, QWidget

from plumbwell.desk.look import Look
from plumbwell.desk.parts.words import Caption, Chooser, Field, Word, middle_baseline
from plumbwell.desk.tray.recipe_editors import StationEditor
from plumbwell.desk.tray.recipe_row import RecipeRow, row_width, what_of
from plumbwell.plates.lettering import draw_text, text_width
from plumbwell.plates.painting import draw_mark, painting
from plumbwell.survey.recipe import Recipe, as_written

GROUPS = (
    ("Gravity and rock", ("normal_gravity", "height_form", "free_air", "gradient_sd", "reference_density")),
    ("Corrections", ("tide", "tide_factor", "pressure_admittance", "out_of_table", "scale_factor")),
    ("Drift and noise", ("drift_order", "drift_walk", "tares", "outliers", "noise")),
    (
        "Places",
        (
            "depth_sd",
            "depth_scale_sd",
            "datum_station",
            "datum_sd",
            "same_place",
            "min_thickness",
            "visit_gap",
        ),
    ),
    ("Layers", ("layers", "layer_boundaries")),
)
WITHOUT_EFFECT = ("terrain_tolerance",)
"""Keys that nothing in this version computes with; they are not shown."""

BAND, HEADING, AFTER_GROUP, COLUMN_GAP = 42, 26, 10, 24
MOST_COLUMNS = 4
NAME_WIDTH = 150


def spread(heights: Sequence[int], columns: int) -> list[int]:
    """Return the column of each group, in order, so that the highest column is as low as can be."""
    best, lowest = [0] * len(heights), sum(heights) + 1
    for cuts in combinations(range(1, len(heights)), min(columns, len(heights)) - 1):
        edges = [0, *cuts, len(heights)]
        highest = max(sum(heights[low:high]) for low, high in zip(edges, edges[1:], strict=False))
        if highest < lowest:
            lowest = highest
            best = [sum(1 for cut in cuts if cut <= index) for index in range(len(heights))]
    return best


class RecipeForm(QScrollArea):
    """The rows of all keys in groups, in as many columns as there is room for."""

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self.setFrameShape(QScrollArea.Shape.NoFrame)
        self.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        self.setFocusPolicy(Qt.FocusPolicy.NoFocus)
        self.sheet = QWidget()
        self.setWidget(self.sheet)
        self.rows: dict[str, RecipeRow] = {}
        self.headings: list[Caption] = []
        for title, keys in GROUPS:
            self.headings.append(Caption(title, look, self.sheet, face="emphasis"))
            for key in keys:
                self.rows[key] = RecipeRow(key, look, self.sheet)
                self.rows[key].resized.connect(self.arrange)
        look.changed.connect(self.arrange)

    def arrange(self) -> None:
        """Put the groups in their places."""
        theme = self.look.theme
        bar = self.verticalScrollBar().sizeHint().width()
        gap, least = theme.px(COLUMN_GAP), row_width(theme)
        room = self.width() - bar
        columns = min(max((room + gap) // (least + gap), 1), MOST_COLUMNS)
        width = max((room - (columns - 1) * gap) // columns, theme.px(80))
        # What is said about single rows must not move a group to another column.
        heights = [
            theme.px(HEADING + AFTER_GROUP) + sum(self.rows[key].base_height() for key in keys) for _, keys in GROUPS
        ]
        ends = [0] * columns
        for (_, keys), heading, column in zip(GROUPS, self.headings, spread(heights, columns), strict=True):
            x, y = column * (width + gap), ends[column]
            heading.setGeometry(x, y, width, theme.px(HEADING))
            y += theme.px(HEADING)
            for key in keys:
                row = self.rows[key]
                height = row.height_for(width)
                row.setGeometry(x, y, width, height)
                row.arrange()
                y += height
            ends[column] = y + theme.px(AFTER_GROUP)
        self.sheet.resize(max(room, width), max(ends))

    def resizeEvent(self, event: QResizeEvent) -> None:
        super().resizeEvent(event)
        self.arrange()


class RecipePage(QWidget):
    """The page of the recipe.

    Signals
    -------
    key_changed
        The person gave a key another value that may stand: the key, and the value as written in survey.toml. The
        value of `datum_station` is None for the highest station.
    recipe_chosen
        Another recipe of the survey is wanted; its name.
    recipe_added
        A new recipe is wanted, based on the chosen one; its name.
    """

    key_changed = Signal(str, object)
    recipe_chosen = Signal(str)
    recipe_added = Signal(str)

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self.names: tuple[str, ...] = ()
        self._at = ""
        self.chooser = Chooser(look, self)
        self.chooser.setAccessibleName("Recipe")
        self.chooser.activated.connect(self._choose)
        self.add = Word("New recipe", look, self)
        self.add.clicked.connect(self._begin_name)
        self.name = Field(look, self)
        self.name.setPlaceholderText("name, then Return")
        self.name.setAccessibleName("Name of the new recipe")
        self.name.returnPressed.connect(self._end_name)
        self.name.hide()
        self.refusal = Caption("", look, self, face="small", role="brick")
        self.refusal.hide()
        self.what = Caption("", look, self, face="small", role="muted", lines=2)
        self.form = RecipeForm(look, self)
        for key, row in self.form.rows.items():
            row.changed.connect(lambda value, key=key: self.key_changed.emit(key, value))
            row.pointed.connect(lambda key=key: self._show_what(key))
            row.left.connect(self._leave)
        self.setFocusProxy(self.chooser)
        look.changed.connect(self._arrange)
        self.set_names((), "")
        self.setAccessibleName("Recipe")

    def set_recipe(self, recipe: Recipe, folder: Recipe, *, stations: Sequence[str]) -> None:
        """Show a recipe beside that of the survey folder; emits nothing and leaves the keyboard where it is.

        Parameters
        ----------
        recipe, folder : Recipe
            The recipe in force, and the one that the folder states: what differs is marked as changed.
        stations : sequence of str
            Labels of the stations of the column, from the top down: what may be the datum.
        """
        written, stated = as_written(recipe), as_written(folder)
        for key, row in self.form.rows.items():
            if isinstance(row.editor, StationEditor):
                row.editor.offer(stations)
            row.show_value(written[key], stated[key])
        self.form.arrange()

    @property
    def changed_keys(self) -> tuple[str, ...]:
        """Keys whose values are others than the folder's."""
        return tuple(key for key, row in self.form.rows.items() if row.is_changed)

    def value_of(self, key: str) -> Any:
        """Return the shown value of a key, as written."""
        return self.form.rows[key].value

    def refuse(self, key: str, words: str) -> None:
        """Say beside a field why its value cannot be taken by this survey."""
        self.form.rows[key].refuse(words)

    def show_key(self, key: str) -> None:
        """Bring a setting into view and put the keyboard there; nothing for a key that is not shown."""
        row = self.form.rows.get(key)
        if row is not None:
            self.form.arrange()
            self.form.ensureWidgetVisible(row, 0, self.look.theme.px(HEADING))
            row.editor.setFocus(Qt.FocusReason.OtherFocusReason)

    def set_names(self, names: Sequence[str], chosen: str) -> None:
        """Show the names of the survey's recipes and which one is in force."""
        if tuple(names) != self.names:
            self.names = tuple(names)
            self.chooser.clear()
            self.chooser.addItems(list(names))
        self.chooser.setCurrentIndex(self.names.index(chosen) if chosen in self.names else -1)
        self._arrange()

    def _choose(self, index: int) -> None:
        self.recipe_chosen.emit(self.names[index])

    def _begin_name(self) -> None:
        self.name.clear()
        self._say_name("")
        self.name.show()
        self.add.hide()
        self.name.setFocus(Qt.FocusReason.OtherFocusReason)

    def _end_name(self) -> None:
        name = self.name.text().strip()
        if not name or not name.isprintable():
            self._say_name("Not taken; expected a name.")
        elif name in self.names:
            self._say_name("Not taken; there is one of this name.")
        else:
            self._close_name()
            self.recipe_added.emit(name)

    def _close_name(self) -> None:
        self.name.hide()
        self._say_name("")
        self.add.show()
        self.add.setFocus(Qt.FocusReason.OtherFocusReason)

    def _say_name(self, words: str) -> None:
        self.refusal.say(words)
        self.refusal.setVisible(bool(words))
        self.what.setVisible(not words)
        self.name.setAccessibleDescription(words)
        self.update()

    def keyPressEvent(self, event: QKeyEvent) -> None:
        if event.key() == Qt.Key.Key_Escape and self.name.isVisible():
            self._close_name()
        else:
            super().keyPressEvent(event)

    def _show_what(self, key: str) -> None:
        if any(part.hasFocus() for part in self.form.rows[key].editor.parts):
            self._at = key
        self.what.say(what_of(key))
        self.what.setToolTip(what_of(key))

    def _leave(self) -> None:
        row = self.form.rows.get(self._at)
        focused = row is not None and row.isAncestorOf(self.window().focusWidget() or self)
        self.what.say(what_of(self._at) if focused else "")

    def _recipe_end(self) -> int:
        theme = self.look.theme
        return round(text_width(theme, "small", "recipe")) + theme.px(8)

    def _arrange(self) -> None:
        theme = self.look.theme
        row, x = theme.px(24), self._recipe_end()
        width = min(max(self.chooser.sizeHint().width(), theme.px(80)), theme.px(NAME_WIDTH))
        top = theme.px(4)
        self.chooser.setGeometry(x, top, width, row)
        x += width + theme.px(20)
        baseline = top + middle_baseline(theme, "text", row - 2)
        self.add.stand_at(x=x, baseline=baseline)
        self.name.setGeometry(x, top, theme.px(NAME_WIDTH), row)
        said = x + theme.px(NAME_WIDTH) + theme.px(24)
        self.refusal.setGeometry(said + theme.px(14), top, max(self.width() - said - theme.px(14), 0), row)
        self.what.setGeometry(said, 0, max(self.width() - said - theme.px(12), 0), theme.px(BAND) - theme.px(4))
        self.form.setGeometry(0, theme.px(BAND), self.width(), max(self.height() - theme.px(BAND), 0))
        self.update()

    def resizeEvent(self, event: QResizeEvent) -> None:
        self._arrange()

    def paintEvent(self, event: QPaintEvent) -> None:
        theme = self.look.theme
        baseline = theme.px(4) + middle_baseline(theme, "text", theme.px(24) - 2)
        with painting(self) as painter:
            draw_text(
                painter,
                theme,
                "recipe",
                x=0,
                baseline=baseline,
                face="small",
                role="muted",
                room=(0, self._recipe_end()),
            )
            if self.refusal.words:
                draw_mark(painter, theme, "error", x=self.refusal.x() - theme.px(9), y=baseline - theme.px(4.5))
