"""The picture of how the chosen interval's error goes with its neighbours'; another one is chosen by click or keys."""

from __future__ import annotations

from collections.abc import Sequence

from PySide6.QtCore import Qt, Signal
from PySide6.QtGui import QKeyEvent, QMouseEvent, QPainter
from PySide6.QtWidgets import QWidget

from plumbwell.desk.look import Look
from plumbwell.desk.tray.small_picture import SmallPicture
from plumbwell.plates.covariance_picture import (
    CovarianceLayout,
    CovariancePicture,
    covariance_layout,
    draw_covariance,
    neighbour_sentence,
)

NOTHING_CHOSEN = "Choose an interval to see how its error goes with its neighbours\u2019"
STEPS = {int(Qt.Key.Key_Up): -1, int(Qt.Key.Key_Left): -1, int(Qt.Key.Key_Down): 1, int(Qt.Key.Key_Right): 1}


class CovarianceView(SmallPicture):
    """Correlations of an interval's density with those of its neighbours.

    Parameters
    ----------
    look : Look
    parent : QWidget, optional

    Signals
    -------
    chosen : int
        Place, in the labels given, of the interval that was clicked or that the keys lead to.
    """

    chosen = Signal(int)

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(
            look, parent, name="Correlation with neighbours", empty=NOTHING_CHOSEN, height=256, least_height=130
        )
        self._picture: CovariancePicture | None = None
        self._layout: CovarianceLayout | None = None
        self.forget()

    def set_matrix(
        self,
        labels: Sequence[str],
        matrix: Sequence[Sequence[float]],
        chosen: int,
        *,
        sds: Sequence[float] = (),
        sd_name: str = "sd, g/cm\u00b3",
        title: str = "",
        sentence: str = "",
    ) -> None:
        """Show correlations about a chosen interval.

        Parameters
        ----------
        labels : sequence of str
            Names of intervals from the top down.
        matrix : sequence of sequence of float
            Correlations between them; plain nested lists, -1 to 1.
        chosen : int
            Place of the chosen interval in them.
        sds : sequence of float
            Standard deviations of the intervals; may be empty.
        sd_name : str
            What stands over those.
        title, sentence : str
            Where the usual ones do not hold, others.

        Raises
        ------
        ValueError
            Labels, matrix and standard deviations do not belong together.
        """
        count = len(labels)
        if len(matrix) != count or any(len(row) != count for row in matrix) or len(sds) not in (0, count):
            raise ValueError(f"{count} labels to a matrix of {len(matrix)} rows and {len(sds)} standard deviations")
        if not 0 <= chosen < count:
            raise ValueError(f"interval {chosen} is none of {count}")
        self._picture = CovariancePicture(
            title=title or f"Interval {labels[chosen]} and its neighbours",
            labels=tuple(labels),
            matrix=matrix,
            chosen=chosen,
            sds=tuple(sds),
            sd_name=sd_name if sds else "",
            sentence=sentence or neighbour_sentence(matrix, chosen),
        )
        self.forget()

    def set_empty(self, words: str = NOTHING_CHOSEN) -> None:
        """Show no matrix, but words that say what to do next."""
        self._picture, self._empty = None, words
        self.forget()

    def covariance_layout(self) -> CovarianceLayout | None:
        """Return where the matrix lies, in px of the widget; None where there is none."""
        if self._layout is None and self._picture is not None:
            theme = self._look.theme
            self._layout = covariance_layout(self._picture, theme, width=self.width(), height=self.height())
        return self._layout

    def said(self) -> str:
        """The title and the sentence of the picture."""
        picture = self._picture
        return super().said() if picture is None else f"{picture.title}. {picture.sentence}"

    def is_shown(self) -> bool:
        """Whether an interval is chosen."""
        return self._picture is not None

    def paint(self, painter: QPainter) -> None:
        """Paint the matrix."""
        layout = self.covariance_layout()
        if self._picture is not None and layout is not None:
            draw_covariance(painter, self._picture, layout, self._look.theme, width=self.width())

    def forget(self) -> None:
        """Measure the matrix anew."""
        self._layout = None
        super().forget()

    def mousePressEvent(self, event: QMouseEvent) -> None:
        layout = self.covariance_layout()
        if self._picture is None or layout is None or event.button() != Qt.MouseButton.LeftButton:
            return
        place = layout.place_at(event.position().x(), event.position().y(), self._picture.chosen)
        if place is not None and place != self._picture.chosen:
            self.chosen.emit(place)

    def keyPressEvent(self, event: QKeyEvent) -> None:
        if event.key() not in STEPS or self._picture is None:
            super().keyPressEvent(event)
            return
        place = self._picture.chosen + STEPS[event.key()]
        if 0 <= place < len(self._picture.labels):
            self.chosen.emit(place)
