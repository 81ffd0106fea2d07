"""The workspace: strip, stage line, ledger, fan, plots and tray about one survey, kept in step by the thread.

Takes results from the document and puts them into the views of the stage in front; hands what the person chooses,
points at and brings into view to the selection, and from there to every view.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence

from PySide6.QtCore import Qt, QTimer, Signal
from PySide6.QtGui import QPaintEvent
from PySide6.QtWidgets import QHBoxLayout, QSplitter, QStackedWidget, QVBoxLayout, QWidget

from plumbwell.desk.document import Document
from plumbwell.desk.following import FANS, LEVELS, TIMED, Following
from plumbwell.desk.frame.body import MARGIN
from plumbwell.desk.ledger.ledger_model import empty_table
from plumbwell.desk.look import Look
from plumbwell.desk.settings import Settings
from plumbwell.desk.shown import carried, shown
from plumbwell.desk.stages import states
from plumbwell.desk.stages.in_front import CANNOT_REDUCE, EMPTY, REDUCING, show_plots, stage_table
from plumbwell.desk.stages.tray_views import counted_findings
from plumbwell.desk.tray.docket_page import recipe_key_of
from plumbwell.desk.tray.tray import TrayPage
from plumbwell.desk.views import Views
from plumbwell.plates.numbers import number
from plumbwell.plates.painting import painting
from plumbwell.study.finding import Finding

NARROW = 1300
"""px of window width under which columns, tracks and pages are fewer."""

STALE_AFTER = 150
"""Milliseconds after which a result that is still on its way shows."""

STRIP_WIDTH, LEAST_STRIP, MOST_STRIP, STRIP_SHARE = 216, 168, 320, 0.22
TRAY_HEIGHT, TRAY_SHARE = 232, 0.36
MOST_PLACES = 2000
"""Stations and intervals that the find field offers."""


class Workspace(Views):
    """Everything about the survey in front.

    Signals
    -------
    stage_changed(str)
    use_wanted(tuple)
        The person wants readings taken out or in: rows.
    """

    stage_changed = Signal(str)
    use_wanted = Signal(object)

    def __init__(
        self, look: Look, document: Document, settings: Settings, front: QStackedWidget,
        parent: QWidget | None = None,
    ) -> None:  # fmt: skip
        super().__init__(look, settings, parent)
        self._document = document
        self.written: tuple[str, ...] = ()
        self._written_words = ""
        self._why_not = ""
        self._narrow = False
        self.page_keys: tuple[str, ...] = ()
        self._scale = look.theme.text_scale
        self._reach = 0.0
        self.front = front
        front.addWidget(self.body)
        self._lay_out()
        self._findings_later = QTimer(self, singleShot=True, interval=0)
        self._findings_later.timeout.connect(self._show_findings)
        self._stale = QTimer(self, singleShot=True, interval=STALE_AFTER)
        self._stale.timeout.connect(lambda: self._set_stale(True))
        self.following = Following(self, self.selection)
        self._connect()

    # -- laying ----------------------------------------------------------------------------------------------

    def _lay_out(self) -> None:
        middle = QWidget(self)
        column = QVBoxLayout(middle)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(0)
        column.addWidget(self.front, 1)
        column.addWidget(self.reasons)
        self._upright = QSplitter(Qt.Orientation.Vertical, self)
        lower = QWidget(self)
        self._lower = QVBoxLayout(lower)
        self._lower.setContentsMargins(MARGIN, 0, MARGIN, 0)
        self._lower.addWidget(self.tray)
        self._upright.addWidget(middle)
        self._upright.addWidget(lower)
        self._upright.setStretchFactor(0, 1)
        self._upright.setStretchFactor(1, 0)
        self._upright.setChildrenCollapsible(False)
        self._upright.setHandleWidth(4)
        right = QWidget(self)
        whole = QVBoxLayout(right)
        whole.setContentsMargins(0, 0, 0, 0)
        whole.setSpacing(0)
        whole.addWidget(self.stage_line)
        whole.addWidget(self._upright, 1)
        self._level = QSplitter(Qt.Orientation.Horizontal, self)
        self._level.addWidget(self.strip)
        self._level.addWidget(right)
        self._level.setStretchFactor(0, 0)
        self._level.setStretchFactor(1, 1)
        self._level.setChildrenCollapsible(False)
        self._level.setHandleWidth(2)
        all_over = QHBoxLayout(self)
        all_over.setContentsMargins(0, 0, 0, 0)
        all_over.addWidget(self._level)
        self._measure()

    def _measure(self) -> None:
        theme = self._look.theme
        if theme.text_scale != self._scale:
            self._scale = theme.text_scale
            self.fold_tray(self.tray.is_folded)
        self.strip.setMinimumWidth(LEAST_STRIP)
        self.strip.setMaximumWidth(max(theme.px(MOST_STRIP), MOST_STRIP))
        self.tray.setMinimumHeight(theme.px(34))

    def restore_sizes(self) -> None:
        """Take the sizes that were left the last time, or those of the design."""
        theme = self._look.theme
        level = self._settings.numbers("sizes/level")
        if not level:
            # Large text has more room for names, but never more than a share of the window.
            strip = max(min(theme.px(STRIP_WIDTH), int(STRIP_SHARE * self.window().width())), STRIP_WIDTH)
            level = [strip, max(self.window().width() - strip, 1)]
        self._level.setSizes(level)
        upright = self._settings.numbers("sizes/upright")
        if upright:
            self._upright.setSizes(upright)
        else:
            self.fold_tray(False)

    def keep_sizes(self) -> None:
        """Keep the sizes for the next time."""
        self._settings["sizes/level"] = self._level.sizes()
        self._settings["sizes/upright"] = self._upright.sizes()

    def fold_tray(self, folded: bool) -> None:
        """Fold the tray to the names of its pages, or open it."""
        theme, whole = self._look.theme, self._upright.height()
        height = theme.px(34)
        if not folded:
            # At large text the ledger comes first: the tray takes no more than its share.
            height = max(min(theme.px(TRAY_HEIGHT), int(TRAY_SHARE * whole)), height)
        self._upright.setSizes([max(whole - height, 0), height])

    def turn_tray(self) -> None:
        """Fold the tray where it is open, open it where it is folded; the next survey finds it so."""
        folded = not self.tray.is_folded
        self._settings["tray folded"] = folded
        self.fold_tray(folded)

    def set_narrow(self, narrow: bool) -> None:
        """Show fewer columns and tracks, and one page of the tray at a time."""
        self._narrow = narrow
        self.ledger.set_narrow(narrow)
        self.tracks.set_narrow(narrow)
        self.tray.set_narrow(narrow)
        self._share()

    def _share(self) -> None:
        wanted = self._settings.get(f"ledger width/{self.stage}")
        self.body.set_shares(
            wanted=wanted if isinstance(wanted, int) else None,
            edges=self.ledger.column_edges(),
            narrow=self._narrow,
        )

    def paintEvent(self, event: QPaintEvent) -> None:
        with painting(self) as painter:
            painter.fillRect(self.rect(), self._look.theme.colour("ground"))

    # -- connections -----------------------------------------------------------------------------------------

    def _connect(self) -> None:
        document = self._document
        document.opened.connect(self._take_survey)
        document.changed.connect(self.show_states)
        document.reduced.connect(self._take_result)
        document.not_reduced.connect(self._take_refusal)
        document.working.connect(self._take_working)
        self._look.depth_changed.connect(self._change_depths)
        self._look.changed.connect(self._measure)
        self._look.changed.connect(self._take_bars)
        self.stage_line.stage_chosen.connect(self.go_to_stage)
        self.ledger.use_toggled.connect(lambda rows: self.use_wanted.emit(self.readings_of(rows)))
        self.body.shared.connect(self._keep_share)
        self.strip.finding_chosen.connect(self._finding_of_strip)
        self.docket.go_there.connect(self.go_to_finding)

    # -- results ---------------------------------------------------------------------------------------------

    def _take_bars(self) -> None:
        """Scales hold the bars: where these reach farther than before, the plots are made anew."""
        if self._look.theme.reach != self._reach:
            self._reach = self._look.theme.reach
            if self.shown is not None:
                show_plots(self, self._look, self._document.case, self.shown, self._why_not or REDUCING)

    def _take_survey(self) -> None:
        self.shown, self._why_not = None, ""
        self.written, self._written_words = (), ""
        # A question about the rows of the survey before must not be answered about those of this one.
        if self.reasons.isVisible():
            self.reasons.let_be()
        self.selection.point()
        self.selection.choose("reading", ())
        self.docket.set_findings((), empty=REDUCING)
        self.tray.set_state("docket", "")
        self.handover.set_findings(())
        self.handover.say("")
        self.settle.set_visit(None)
        self.neighbours.set_empty()
        wanted = self._settings.text(f"stage/{self._document.folder}", states.READINGS)
        self.stage = wanted if wanted in states.STAGES else states.READINGS
        self.strip.set_nothing()
        self.front.setCurrentWidget(self.body)
        if self.tray.is_folded and not self._settings.get("tray folded"):
            self.fold_tray(False)
        self._set_pages()
        self._show_stage()
        self.ledger.setFocus(Qt.FocusReason.OtherFocusReason)
        self.stage_changed.emit(self.stage)

    def _take_working(self, working: bool) -> None:
        if working:
            self._why_not = ""
            self._stale.start()
        else:
            self._stale.stop()
            self._set_stale(False)

    def _set_stale(self, stale: bool) -> None:
        for view in (self.ledger, self.tracks, self.times, self.strip, self.fan):
            view.set_stale(stale)
        self.show_states(working=stale and not self._why_not)

    def _take_result(self) -> None:
        document = self._document
        assert document.reduced_case is not None and document.results is not None
        before = self.shown
        self.written, self._written_words, self._why_not = (), "", ""
        after = shown(document.reduced_case, document.results, self._look.depth)
        selection = self.selection
        if before is not None:
            # Rows of the result before are other rows, or none, in this one.
            selection.point()
            rows = carried(before, after, selection.level, selection.rows)
            self.shown = None
            selection.choose(selection.level, rows)
        self.shown = after
        self._look.take_freedom(after.results.intervals.dof)
        self._show_survey(fresh=before is None)

    def _take_refusal(self, error: Exception) -> None:
        """The present case cannot be reduced: the numbers that stand are those of another one."""
        self._why_not = CANNOT_REDUCE
        if self.shown is None:
            self.docket.set_findings((), empty=CANNOT_REDUCE)
            self._show_stage()
        else:
            self._set_stale(True)

    def _show_survey(self, *, fresh: bool) -> None:
        assert self.shown is not None
        plate, one = self.shown.plate, self.shown
        self.strip.set_plate(plate, upward=one.scale.upward)
        if fresh or self.selection.whole != plate.depth_range:
            self.selection.hold(plate.depth_range, window=None if fresh else self.selection.window)
        self._show_stage(fresh=fresh)
        self.following.show_window()
        self.following.show_chosen()
        # The densities are painted first; what is written about them follows in the same breath.
        self._findings_later.start()

    def _show_findings(self) -> None:
        if self.shown is None:
            return
        findings = self.shown.results.findings
        self.docket.set_findings(findings)
        self.tray.set_state("docket", counted_findings(findings))
        self.handover.set_findings(findings)

    def _change_depths(self) -> None:
        if self.shown is None:
            self._show_stage()
            return
        before = self.shown
        window = self.selection.window
        self.shown = shown(before.case, before.results, self._look.depth)
        low, high = before.plate.depth_range
        new_low, new_high = self.shown.plate.depth_range
        scale = (new_high - new_low) / (high - low)
        moved = (new_low + (window[0] - low) * scale, new_low + (window[1] - low) * scale)
        self.selection.hold(self.shown.plate.depth_range, window=moved)
        self.selection.point()
        self._show_survey(fresh=False)

    # -- stages ----------------------------------------------------------------------------------------------

    def go_to_stage(self, stage: str) -> None:
        """Bring a stage to the front; what is chosen is carried over to its rows."""
        if self._document.survey is None:
            return
        # What kept the survey from being seen (another folder that could not be read) is put away.
        self.front.setCurrentWidget(self.body)
        if stage == self.stage:
            return
        if self.shown is not None and stage in LEVELS and self.selection.level in LEVELS.values():
            rows = self.shown.converted(self.selection.level, self.selection.rows, LEVELS[stage])
            self.stage = stage
            self.selection.choose(LEVELS[stage], rows)
        self.stage = stage
        self._settings[f"stage/{self._document.folder}"] = stage
        self.selection.point()
        self._set_pages()
        self._show_stage()
        self.following.show_window()
        self.following.show_chosen()
        self.stage_changed.emit(stage)

    def _set_pages(self) -> None:
        pages = [TrayPage(key="docket", name="Docket", widget=self.docket)]
        opened = self._document.survey is not None
        if opened and self.stage in TIMED:
            pages.append(TrayPage(key="settle", name="Settle-down", widget=self.settle))
        if opened and self.stage == states.DENSITY:
            pages.append(TrayPage(key="neighbours", name="Neighbours", widget=self.neighbours))
        pages.append(TrayPage(key="recipe", name="Recipe", widget=self.recipe))
        pages.append(TrayPage(key="history", name="History", widget=self.history))
        self.page_keys = tuple(page.key for page in pages)
        self.tray.set_pages(pages)

    def _show_stage(self, *, fresh: bool = False) -> None:
        case = self._document.case
        table = stage_table(self.stage, case, self.shown, self._look.depth, self.written)
        if table is None:
            self.ledger.set_table(empty_table())
            self.ledger.set_empty(self._why_not or REDUCING)
        else:
            if not len(table):
                self.ledger.set_empty(EMPTY[self.stage])
            self.ledger.set_table(table)
        self.body.set_fan(FANS.get(self.stage))
        self._share()
        show_plots(self, self._look, case, self.shown, self._why_not or REDUCING)
        self.following.show_fan()
        self.show_states()
        if fresh and self.stage in FANS and self.ledger.in_depth_order():
            self.following.ledger_moved()

    def show_states(self, *, working: bool = False) -> None:
        """Tell the stages' figures and states."""
        document = self._document
        if document.survey is None:
            self.stage_line.set_stages(states.nothing_open())
            return
        # Of a case that cannot be reduced nothing is known: the figures of the one before would speak for it.
        results = None if self.shown is None or self._why_not else self.shown.results
        self.stage_line.set_stages(
            states.stage_states(
                document.survey, results, visits=self.shown.visits if self.shown else None, current=self.stage,
                working=working and results is not None,
                written=self._written_words,
            )
        )

    def _keep_share(self, width: int) -> None:
        self._settings[f"ledger width/{self.stage}"] = width

    # -- going to places -------------------------------------------------------------------------------------

    def readings_of(self, rows: Sequence[int]) -> tuple[int, ...]:
        """The readings that rows of the ledger in front stand for."""
        if self.following.level == "reading":
            return tuple(rows)
        return () if self.shown is None else self.shown.converted(self.following.level, tuple(rows), "reading")

    def go_to_finding(self, finding: Finding) -> None:
        """Go to the stage and the rows of a finding."""
        key = recipe_key_of(finding)
        if key is not None:
            self.open_recipe(key)
            return
        stage = states.stage_of(finding)
        level, rows = "reading", finding.rows
        if finding.intervals:
            level, rows = "interval", finding.intervals
        elif finding.stations:
            level, rows = "station", finding.stations
        if stage == states.DRIFT and finding.rows:
            level, rows = "reading", finding.rows
        self.go_to_stage(stage)
        if self.shown is not None and rows and stage in LEVELS:
            self.selection.choose(LEVELS[stage], self.shown.converted(level, rows, LEVELS[stage]))
        self.ledger.setFocus(Qt.FocusReason.OtherFocusReason)

    def _finding_of_strip(self, place: int) -> None:
        if self.shown is not None:
            graver = [one for one in self.shown.results.findings if one.severity != "note"]
            if 0 <= place < len(graver):
                self.go_to_finding(graver[place])

    # -- what the window asks --------------------------------------------------------------------------------

    def show_nothing(self) -> None:
        """No survey is open."""
        self.strip.set_nothing()
        self._set_pages()
        self.fold_tray(True)
        self.show_states()

    @property
    def why_not(self) -> str:
        """Why there is no result of the present case; empty where there is one, or one is on its way."""
        return self._why_not

    def set_written(self, names: Sequence[str], words: str) -> None:
        """The outputs of the present result were written."""
        self.written, self._written_words = tuple(names), words
        if self.stage == states.HANDOVER:
            self._show_stage()
        self.show_states()

    def chosen_rows(self) -> tuple[int, ...]:
        """The chosen rows of the ledger in front."""
        return self.following.chosen_here()

    def open_page(self, key: str) -> None:
        """Open a page of the tray."""
        if self.tray.is_folded:
            self.fold_tray(False)
        self.tray.open_page(key)

    def open_recipe(self, key: str) -> None:
        """Open the recipe at one of its keys."""
        self.open_page("recipe")
        self.recipe.show_key(key)

    def places(self) -> Iterator[tuple[str, str, Callable[[], None]]]:
        """Stations and intervals by name, with what goes to them."""
        one = self.shown
        if one is None:
            return
        for row, station in enumerate(one.results.stations.label[:MOST_PLACES]):
            depth = one.depths.stations[row]
            words = f"{number(one.scale.number_of(float(depth)), 1)} {one.unit_label()}" if depth == depth else ""
            yield f"Station {station}", words, lambda row=row: self._go_to(states.REDUCTION, "station", row)  # type: ignore[misc]
        top, base = one.interval_edges
        for row in range(min(len(top), MOST_PLACES)):
            words = f"{number(float(top[row]), 1)} to {number(float(base[row]), 1)} {one.unit_label()}"
            yield f"Interval {row + 1}", words, lambda row=row: self._go_to(states.DENSITY, "interval", row)  # type: ignore[misc]

    def _go_to(self, stage: str, level: str, row: int) -> None:
        self.go_to_stage(stage)
        self.selection.choose(level, (row,))
        self.ledger.setFocus(Qt.FocusReason.OtherFocusReason)
