"""The desk in its window: menu row, workspace, doors and problems, status line; where actions become acts.

It owns nothing of a survey: the document does. What the person wants is asked for here and handed to the document.
"""

from __future__ import annotations

import os
from collections.abc import Sequence
from datetime import datetime
from pathlib import Path

from PySide6.QtCore import QObject, QPoint, Qt
from PySide6.QtWidgets import QFileDialog, QStackedWidget, QVBoxLayout, QWidget

from plumbwell import __version__
from plumbwell.desk.asking import Asking
from plumbwell.desk.document import Document
from plumbwell.desk.frame.actions import Actions
from plumbwell.desk.frame.body import MARGIN
from plumbwell.desk.frame.find import FindEntry
from plumbwell.desk.frame.menu_row import MenuRow
from plumbwell.desk.frame.notice import Notice
from plumbwell.desk.frame.status import status_words
from plumbwell.desk.frame.status_line import StatusLine
from plumbwell.desk.handing_over import HandingOver
from plumbwell.desk.jobs import Stopped
from plumbwell.desk.look import next_bars
from plumbwell.desk.opening.doors import Doors
from plumbwell.desk.opening.failure_log import LOG_NAME
from plumbwell.desk.opening.problems import Problems
from plumbwell.desk.opening.samples import SAMPLES, sample_folder
from plumbwell.desk.settings import RECENT
from plumbwell.desk.shell import Shell
from plumbwell.desk.stages import states
from plumbwell.desk.tray.history_page import HistoryRow
from plumbwell.desk.workspace import NARROW, Workspace
from plumbwell.files.keeper import EPOCH
from plumbwell.files.new_survey import write_new_survey
from plumbwell.study.acts import ChooseRecipe, NamePoint
from plumbwell.study.cautions import CAUTIONS
from plumbwell.study.history import History, Point
from plumbwell.survey.errors import PlumbwellError
from plumbwell.survey.recipe import KEYS
from plumbwell.survey.survey import Survey

TEXT_STEP = 0.1
NEEDS_SURVEY = (
    "again", "name", "copy folder", "write", "copy", "all", "filter", "use", "note", "tare", "drop tare", "columns",
    "tracks", "whole", *(f"stage {key}" for key in states.STAGES),
)  # fmt: skip


class Desk(QObject):
    """Everything in the window of Plumbwell.

    Parameters
    ----------
    shell : Shell
        The window it lives in.
    home : Path
        The user's data folder.
    """

    def __init__(self, shell: Shell, home: Path) -> None:
        super().__init__(shell)
        self.shell, self.look, self.settings, self.home = shell, shell.look, shell.settings, home
        look, settings = self.look, self.settings
        self.document = Document(home, self)
        self.actions = Actions(shell, self.do)
        front = QStackedWidget()
        self.doors, self.problems = Doors(look), Problems(look)
        front.addWidget(self.doors)
        self._refusal = framed(self.problems)
        front.addWidget(self._refusal)
        self.workspace = Workspace(look, self.document, settings, front)
        self.row = MenuRow(
            look, self.actions.bar, self.actions.of["undo"], self.actions.of["redo"], self.actions.surveys,
            self.actions.recipes,
        )  # fmt: skip
        self.status = StatusLine(look)
        self.notice = Notice(look)
        centre = QWidget()
        column = QVBoxLayout(centre)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(0)
        column.addWidget(self.row)
        column.addWidget(self.workspace, 1)
        column.addWidget(self.notice)
        column.addWidget(self.status)
        shell.setCentralWidget(centre)
        self.asking = Asking(self.document, self.workspace, self.notice)
        self.handing_over = HandingOver(self.document, self.workspace, self.status, self.notice)
        self.workspace.restore_sizes()
        self._connect()
        self._mark_choices()
        self._show_nothing()
        shell.inhabited = self
        self.resized()

    def _mark_choices(self) -> None:
        look = self.look
        for key in (
            f"theme {look.wanted}", f"depth {look.depth.kind}", f"unit {look.depth.unit}", f"bars {look.theme.bars}",
        ):  # fmt: skip
            self.actions.check(key)

    # -- connections -----------------------------------------------------------------------------------------

    def _connect(self) -> None:
        document, work = self.document, self.workspace
        document.opened.connect(self._opened)
        document.not_opened.connect(self._not_opened)
        document.changed.connect(self._changed)
        document.reduced.connect(self._reduced)
        document.not_reduced.connect(self._not_reduced)
        document.told.connect(self.notice.say)
        document.progressed.connect(self.status.set_progress)
        work.pointed.connect(self._tell)
        work.stage_changed.connect(lambda _: self._tell())
        work.use_wanted.connect(self.asking.use)
        work.recipe.key_changed.connect(self._set_key)
        work.recipe.recipe_chosen.connect(lambda name: self.asking.take(ChooseRecipe(name=name)))
        work.recipe.recipe_added.connect(self.asking.add_recipe)
        work.history.go_to.connect(lambda number: self.asking.say(document.go_to(number)))
        work.history.point_named.connect(lambda name: self.asking.take(NamePoint(name=name)))
        work.reasons.closed.connect(lambda: work.ledger.setFocus(Qt.FocusReason.OtherFocusReason))
        self.doors.door_chosen.connect(self._door)
        self.doors.recent_chosen.connect(lambda path: self.open(Path(path)))
        self.problems.read_again.connect(lambda: self.do("again"))
        self.status.bars_clicked.connect(lambda: self.do(f"bars {next_bars(self.look.theme.bars)}"))
        self.status.unit_clicked.connect(lambda: self.do(f"unit {'ft' if self.look.depth.unit == 'm' else 'm'}"))
        self.status.kind_clicked.connect(self._next_kind)
        self.status.stop_clicked.connect(document.stop)
        self.row.find_field.set_actions(self._entries)
        self.look.changed.connect(self._look_changed)
        self.look.depth_changed.connect(self._tell)
        for name in SAMPLES:
            action = self.actions.samples.addAction(SAMPLES[name])
            action.triggered.connect(lambda _=False, which=name: self.open(sample_folder(which)))
        self.actions.recent.aboutToShow.connect(lambda: self._list_recent(self.actions.recent))
        self.actions.surveys.aboutToShow.connect(lambda: self._list_recent(self.actions.surveys))
        self.actions.recipes.aboutToShow.connect(self._list_recipes)

    # -- opening ---------------------------------------------------------------------------------------------

    def open(self, path: Path) -> None:
        """Open a survey folder, or that of a survey.toml."""
        self._asked = path
        self.notice.clear()
        self.status.set_progress(0.0, "reading the files")
        self.document.open(path)

    _asked: Path | None = None
    _why_not = ""
    _told_recipe: tuple[object, ...] = ()

    def _show_nothing(self) -> None:
        self.row.survey.say("none")
        self.row.recipe.say("default")
        self.actions.enable(NEEDS_SURVEY, False)
        self._enable_history()
        self.workspace.show_nothing()
        self.doors.set_recent(self.settings.texts(RECENT))
        self.workspace.front.setCurrentWidget(self.doors)
        self.doors.setFocus(Qt.FocusReason.OtherFocusReason)
        self._tell()

    def _opened(self) -> None:
        folder, survey = self.document.folder, self.document.survey
        assert folder is not None and survey is not None
        self.status.set_progress(None, "")
        self.settings.add_recent(str(folder))
        self._sentences: dict[str, str] = {}
        self.row.survey.say(survey.site.name)
        self.shell.setWindowTitle(f"{survey.site.name} – Plumbwell")
        self.workspace.handover.set_folder(folder.parent / f"{folder.name}_results")
        self.actions.enable(NEEDS_SURVEY, True)
        self._show_recipe()
        self._show_history()
        self._tell()

    def _not_opened(self, path: str, error: Exception) -> None:
        self.status.set_progress(None, "")
        if isinstance(error, Stopped):
            self.notice.say(f"Stopped: {path} was not opened.")
            return
        if (survey := self.document.survey) is not None:
            self.notice.say(f"{survey.site.name} is still open: a click on a stage leads back to it.")
        self.problems.show_error(Path(path), error)
        self.workspace.front.setCurrentWidget(self._refusal)
        self.actions.enable(("again",), True)

    def _door(self, which: str) -> None:
        if which in SAMPLES:
            self.open(sample_folder(which))
        else:
            self.do(which)

    def _list_recent(self, menu: object) -> None:
        menu.clear()  # type: ignore[attr-defined]
        for path in self.settings.texts(RECENT):
            action = menu.addAction(as_named(path))  # type: ignore[attr-defined]
            action.setEnabled(os.path.exists(path))
            action.triggered.connect(lambda _=False, which=path: self.open(Path(which)))
        menu.addSeparator()  # type: ignore[attr-defined]
        menu.addAction(self.actions.of["open"])  # type: ignore[attr-defined]

    def _list_recipes(self) -> None:
        menu, case = self.actions.recipes, self.document.case
        menu.clear()
        for name in () if case is None else case.recipe_names:
            action = menu.addAction(as_named(name))
            action.setCheckable(True)
            action.setChecked(case is not None and name == case.chosen_name)
            action.triggered.connect(lambda _=False, which=name: self.asking.take(ChooseRecipe(name=which)))
        menu.addAction("Settings of the recipe").triggered.connect(lambda: self.workspace.open_page("recipe"))

    # -- telling what changed --------------------------------------------------------------------------------

    def _set_key(self, key: str, value: object) -> None:
        wrong = self.asking.recipe_key(key, value)
        if wrong is not None:
            self.workspace.recipe.refuse(key, wrong)

    def _changed(self) -> None:
        self._show_recipe()
        self._show_history()
        self._tell()

    def _not_reduced(self, error: Exception) -> None:
        if isinstance(error, PlumbwellError):
            why = f"The survey cannot be reduced as it stands now: {str(error).rstrip('.')}."
        elif isinstance(error, MemoryError):
            why = "The memory was not enough to reduce the survey as it stands now."
        else:
            why = "A fault of the program stopped the reduction of the survey as it stands now."
        history = self.document.history
        undo = " Undo takes the last act back." if history is not None and history.can_undo else ""
        stands = " The numbers shown are still those of before." if self.workspace.shown is not None else ""
        self._why_not = f"{why}{stands}{undo}"
        self.notice.say(self._why_not, wrong=True)

    def _reduced(self) -> None:
        if self._why_not and self.notice.words == self._why_not:
            self.notice.clear()
        self._why_not = ""
        self._show_recipe()
        self._tell()

    def _enable_history(self) -> None:
        history = self.document.history
        self.actions.enable(("undo",), history is not None and history.can_undo)
        self.actions.enable(("redo",), history is not None and history.can_redo)

    def _show_recipe(self) -> None:
        document, page = self.document, self.workspace.recipe
        case, survey = document.case, document.survey
        if case is None or survey is None:
            return
        stations: tuple[str, ...] = ()
        if document.results is not None:
            placed = document.results.stations
            stations = tuple(one for one, role in zip(placed.label, placed.role, strict=True) if role == "column")
        told = (case.recipe_names, case.chosen_name, case.chosen, survey.recipe, stations)
        if told == self._told_recipe:
            return
        self._told_recipe = told
        page.set_names(case.recipe_names, case.chosen_name)
        page.set_recipe(case.chosen, survey.recipe, stations=stations)
        changed = len(case.changed_keys())
        self.workspace.tray.set_state("recipe", f"{changed} changed" if changed else "")
        self.row.recipe.say(case.chosen_name)

    def _show_history(self) -> None:
        document = self.document
        history, survey = document.history, document.survey
        self._enable_history()
        if survey is None or history is None:
            return
        line = {point.number for point in history.line()}
        before = set()
        at: int | None = history.cursor
        while at is not None:
            before.add(at)
            at = history.points[at].parent
        self.workspace.history.set_points(
            [
                HistoryRow(
                    number=point.number,
                    when_words=_moment(point.when),
                    who=point.who,
                    sentence=self._sentence(history, point, survey),
                    name=point.name,
                    here=point.number == history.cursor,
                    ahead=point.number in line and point.number not in before,
                    branch=point.number not in line,
                )
                for point in history.points
            ]
        )
        acts = len(history.points) - 1
        self.workspace.tray.set_state("history", str(acts) if acts else "")

    def _sentence(self, history: History, point: Point, survey: Survey) -> str:
        """What led to a point; told once, for a point never changes."""
        if point.hash not in self._sentences:
            self._sentences[point.hash] = history.sentence(point.number, survey)
        return self._sentences[point.hash]

    # -- actions ---------------------------------------------------------------------------------------------

    def do(self, key: str) -> None:
        """Do the action of a key; see `Actions`."""
        kind, _, which = key.partition(" ")
        work, look = self.workspace, self.look
        plain = {
            "undo": lambda: self.asking.say(self.document.undo()),
            "redo": lambda: self.asking.say(self.document.redo()),
            "quit": self.shell.close,
            "copy": work.ledger.copy,
            "all": work.ledger.choose_all,
            "filter": work.ledger.open_filter,
            "columns": work.ledger.open_columns,
            "tracks": lambda: work.tracks.menu().popup(work.tracks.mapToGlobal(QPoint(0, 0))),
            "use": lambda: self.asking.use(self.asking.chosen_readings()),
            "note": self.asking.note,
            "tare": lambda: self.asking.tare(drop=False),
            "drop tare": lambda: self.asking.tare(drop=True),
            "whole": work.selection.show_whole,
            "tray": work.turn_tray,
            "larger": lambda: self._scale(look.theme.text_scale + TEXT_STEP),
            "smaller": lambda: self._scale(look.theme.text_scale - TEXT_STEP),
            "normal": lambda: self._scale(1.0),
            "open": self._choose_folder,
            "new": self._choose_new,
            "again": self._again,
            "name": self.asking.name,
            "copy folder": work.handover.choose_copy,
            "write": self._go_write,
            "keys": self._tell_keys,
            "caution": lambda: self.notice.say(" ".join(CAUTIONS)),
            "log": lambda: self.notice.say(f"The log is {self.home / LOG_NAME}; it holds no readings."),
            "about": lambda: self.notice.say(
                f"Plumbwell {__version__}: gravity surveyed below ground, turned into rock density with honest errors."
            ),
        }
        if key in plain:
            plain[key]()
        elif kind == "stage":
            work.go_to_stage(which)
        elif kind == "theme":
            look.choose(wanted=which)
            self.settings["theme"] = which
        elif kind == "bars":
            look.choose(bars=int(which))
            self.settings["bars"] = int(which)
        elif kind in ("depth", "unit"):
            look.choose_depth(**{"kind" if kind == "depth" else "unit": which})
            self.settings[kind] = which
        self._mark_choices()

    def _scale(self, scale: float) -> None:
        self.look.choose(text_scale=scale)
        self.settings["text scale"] = self.look.theme.text_scale

    def _next_kind(self) -> None:
        kinds = ("MD", "TVD", "elevation")
        self.do(f"depth {kinds[(kinds.index(self.look.depth.kind) + 1) % 3]}")

    def _choose_folder(self) -> None:
        folder = QFileDialog.getExistingDirectory(self.shell, "Open a survey folder", self.settings.text("folder", ""))
        if folder:
            self.settings["folder"] = str(Path(folder).parent)
            self.open(Path(folder))

    def _choose_new(self) -> None:
        name, _ = QFileDialog.getSaveFileName(self.shell, "Start a survey folder", self.settings.text("folder", ""))
        if not name:
            return
        try:
            write_new_survey(Path(name))
        except PlumbwellError as error:
            self.notice.say(str(error), wrong=True)
            return
        except OSError as error:
            why = error.strerror or type(error).__name__
            self.notice.say(f"{name} cannot be written: {why}. Name another folder.", wrong=True)
            return
        self.open(Path(name))

    def _again(self) -> None:
        refused = self.workspace.front.currentWidget() is self._refusal
        folder = self._asked if refused else self.document.folder
        if folder is not None:
            self.open(folder)

    def _go_write(self) -> None:
        self.workspace.go_to_stage(states.HANDOVER)
        self.workspace.handover.write.setFocus(Qt.FocusReason.OtherFocusReason)

    def _tell_keys(self) -> None:
        self.notice.say(
            "Ctrl+K finds and does everything. Ctrl+2 to Ctrl+5 and Ctrl+7 go to the stages; arrows walk the rows; "
            "Space leaves readings out or takes them in; Ctrl+F filters; Ctrl+C copies; Ctrl+Z and Ctrl+Shift+Z undo "
            "and redo; the wheel zooms depth, with Shift the values; a double click fits."
        )

    def _entries(self) -> Sequence[FindEntry]:
        entries = [
            FindEntry(
                words=action.text().replace("&", "").rstrip("…"),
                detail=action.shortcut().toString(),
                run=action.trigger,
            )
            for action in self.actions.of.values()
            if action.isEnabled()
        ]
        work = self.workspace
        for key, one in KEYS.items() if self.document.survey is not None else ():
            entries.append(
                FindEntry(words=one.label, detail="recipe", run=lambda key=key: work.open_recipe(key))  # type: ignore[misc]
            )
        for words, detail, run in work.places():
            entries.append(FindEntry(words=words, detail=detail, run=run))
        return entries

    # -- telling ---------------------------------------------------------------------------------------------

    def _tell(self) -> None:
        work, look = self.workspace, self.look
        waiting = "no result" if work.why_not else "reducing"
        if self.document.survey is None:
            waiting = "No survey open"
        self.status.set_left(status_words(work, chosen=work.chosen_rows(), waiting=waiting))
        saved = self.document.saved
        kind = look.depth.kind if work.shown is None else work.shown.scale.kind
        self.status.set_right(
            bars=look.theme.reach_words if work.shown is not None and work.stage != states.HANDOVER else None,
            unit=look.depth.unit,
            kind=kind,
            saved="" if saved is None else datetime.fromtimestamp(saved).strftime("%H:%M"),
        )

    def _look_changed(self) -> None:
        self._tell()
        self._mark_choices()

    def resized(self) -> None:
        """Lay anew for the size that the window has."""
        self.workspace.set_narrow(self.shell.width() < NARROW)

    def closing(self) -> None:
        """Keep the sizes, end the work, let go of the dossier."""
        self.workspace.keep_sizes()
        self.document.close()


def framed(page: QWidget) -> QWidget:
    """A page with the margins that the body of the window has."""
    frame = QWidget()
    column = QVBoxLayout(frame)
    column.setContentsMargins(MARGIN, 0, MARGIN, 0)
    column.addWidget(page)
    return frame


def as_named(words: str) -> str:
    """A name as a menu shows it, where a single & would underline what follows."""
    return words.replace("&", "&&")


def _moment(seconds: float) -> str:
    """A time of the history (s since 2000-01-01 UTC), in the zone of the machine."""
    moment = datetime.fromtimestamp(seconds + EPOCH)
    return f"{moment.day} {moment:%b %Y, %H:%M:%S}"
