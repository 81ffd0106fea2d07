"""All views about one survey, made once; and what is in front in them: the stage, the result, the selection.

Only holds them: the workspace lays them out and fills them, the thread keeps them in step.
"""

from __future__ import annotations

from PySide6.QtCore import Signal
from PySide6.QtWidgets import QStackedWidget, QWidget

from plumbwell.desk.frame.body import Body
from plumbwell.desk.frame.stage_line import StageLine
from plumbwell.desk.hole.fan import Fan
from plumbwell.desk.hole.strip import Strip
from plumbwell.desk.ledger.ledger import Ledger
from plumbwell.desk.look import Look
from plumbwell.desk.selection import Selection
from plumbwell.desk.settings import Settings
from plumbwell.desk.shown import Shown
from plumbwell.desk.stages import states
from plumbwell.desk.stages.handover_panel import HandoverPanel
from plumbwell.desk.times.time_plots import TimePlots
from plumbwell.desk.tracks.tracks import Tracks
from plumbwell.desk.tray.covariance_view import CovarianceView
from plumbwell.desk.tray.docket_page import DocketPage
from plumbwell.desk.tray.history_page import HistoryPage
from plumbwell.desk.tray.reason_bar import ReasonBar
from plumbwell.desk.tray.recipe_page import RecipePage
from plumbwell.desk.tray.settle_view import SettleView
from plumbwell.desk.tray.tray import Tray


class Views(QWidget):
    """The views of the desk.

    Parameters
    ----------
    look : Look
    settings : Settings
    parent : QWidget or None

    Signals
    -------
    pointed
        What the status line tells has changed.
    """

    pointed = Signal()

    def __init__(self, look: Look, settings: Settings, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._look, self._settings = look, settings
        self.selection = Selection(self)
        self.shown: Shown | None = None
        self.stage = states.READINGS
        self.strip = Strip(look, self)
        self.stage_line = StageLine(look, self)
        self.ledger = Ledger(look, settings, self)
        self.fan = Fan(look, self)
        self.tracks = Tracks(look, self, memory=settings)
        self.times = TimePlots(look, self)
        self.handover = HandoverPanel(look, self)
        self.plots = QStackedWidget(self)
        for view in (self.tracks, self.times, self.handover):
            self.plots.addWidget(view)
        self.body = Body(look, self.ledger, self.fan, self.plots, self)
        self.reasons = ReasonBar(look, settings, self)
        self.tray = Tray(look, self)
        self.docket = DocketPage(look)
        self.recipe = RecipePage(look)
        self.history = HistoryPage(look)
        self.settle = SettleView(look)
        self.neighbours = CovarianceView(look)
