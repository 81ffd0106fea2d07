"""The picture of how the chosen interval's error goes with its neighbours'; another one is chosen by click or keys."""

from __future__ import annotations

from collections.abc import Sequence

from PySide6.QtCore import QRectF, QSize, Qt, Signal
from PySide6.QtGui import QFocusEvent, QKeyEvent, QMouseEvent, QPaintEvent, QResizeEvent
from PySide6.QtWidgets import QWidget

from plumbwell.desk.look import Look
from plumbwell.desk.words import draw_focus
from plumbwell.plates.covariance_picture import (
    TITLE_AT,
    CovarianceLayout,
    CovariancePicture,
    covariance_layout,
    draw_covariance,
    neighbour_sentence,
)
from plumbwell.plates.lettering import draw_text, wrapped
from plumbwell.plates.painting import painting

NOTHING_CHOSEN = "Choose an interval to see how its error goes with its neighbours\u2019"
STEPS = {int(Qt.Key.Key_Up): -1, int(Qt.Key.Key_Left): -1, int(Qt.Key.Key_Down): 1, int(Qt.Key.Key_Right): 1}


class CovarianceView(QWidget):
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
        super().__init__(parent)
        self._look = look
        self._picture: CovariancePicture | None = None
        self._empty = NOTHING_CHOSEN
        self._layout: CovarianceLayout | None = None
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setAccessibleName("Correlation with neighbours")
        self.setAccessibleDescription(self._empty)
        look.changed.connect(self._look_changed)

    def sizeHint(self) -> QSize:
        theme = self._look.theme
        return QSize(theme.px(600), theme.px(256))

    def minimumSizeHint(self) -> QSize:
        theme = self._look.theme
        return QSize(theme.px(200), theme.px(130))

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
        self._forget()

    def set_empty(self, words: str = NOTHING_CHOSEN) -> None:
        """Show no matrix, but words that say what to do next."""
        self._picture, self._empty = None, words
        self._forget()

    def covariance_layout(self) -> CovarianceLayout | None:
        """Return where the matrix lies, in px of the widget; None where there is none."""
        if self._layout is None and self._picture is not None:
            theme = self._look.theme
            self._layout = covariance_layout(self._picture, theme, width=self.width(), height=self.height())
        return self._layout

    def _look_changed(self) -> None:
        self._forget()
        self.updateGeometry()

    def _forget(self) -> None:
        self._layout = None
        picture = self._picture
        words = self._empty if picture is None else f"{picture.title}. {picture.sentence}"
        if words != self.accessibleDescription():
            self.setAccessibleDescription(words)
        self.update()

    def paintEvent(self, event: QPaintEvent) -> None:
        theme, layout = self._look.theme, self.covariance_layout()
        with painting(self) as painter:
            painter.fillRect(self.rect(), theme.colour("ground"))
            if self._picture is None or layout is None:
                baseline = theme.px(TITLE_AT)
                for words in wrapped(theme, "text", self._empty, self.width()):
                    draw_text(painter, theme, words, x=0, baseline=baseline, role="muted", room=(0, self.width()))
                    baseline += theme.px(20)
            else:
                draw_covariance(painter, self._picture, layout, theme, width=self.width())
            if self.hasFocus():
                draw_focus(painter, theme, QRectF(self.rect()))

    def resizeEvent(self, event: QResizeEvent) -> None:
        self._forget()

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

    def focusInEvent(self, event: QFocusEvent) -> None:
        self.update()
        super().focusInEvent(event)

    def focusOutEvent(self, event: QFocusEvent) -> None:
        self.update()
        super().focusOutEvent(event)
