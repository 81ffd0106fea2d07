"""Acts on tares: take a jump of the instrument into account, or leave one out of account."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import ClassVar

from plumbwell.earth.constants import MILLIGAL
from plumbwell.reduction.tide_effect import utc_time
from plumbwell.study.act import Act, ActRefused
from plumbwell.study.act_wording import size_words, tare_words
from plumbwell.study.case import Case
from plumbwell.study.docket.wording import listed, moment
from plumbwell.study.overlay import with_uses
from plumbwell.survey.errors import shown
from plumbwell.survey.instrument import Tare
from plumbwell.survey.survey import Survey


@dataclass(frozen=True, slots=True, kw_only=True)
class _OfTare(Act):
    """An act on a tare, by its run and its time (UTC, s since 2000-01-01)."""

    run: str
    time: float

    def __post_init__(self) -> None:
        object.__setattr__(self, "time", float(self.time))

    @property
    def _place(self) -> tuple[str, float]:
        return (self.run, self.time)


def _check_run(survey: Survey, run: str) -> None:
    if run not in survey.readings.run.names:
        names = listed([shown(one) for one in survey.readings.run.names])
        raise ActRefused(f'There is no run "{shown(run)}"; the readings have {names}.')


@dataclass(frozen=True, slots=True, kw_only=True)
class AddTare(_OfTare):
    """Take a jump of the instrument into account, from the first reading at or after its time.

    Parameters
    ----------
    run : str
    time : float
        UTC, s since 2000-01-01.
    size, size_sd : float or None
        m/s2, taken to twelve digits of a mGal. Both: prior knowledge; size alone: held; neither: estimated.
    """

    size: float | None = None
    size_sd: float | None = None
    kind: ClassVar[str] = "add_tare"

    def apply(self, case: Case) -> Case:
        """The case with the tare."""
        survey = case.survey
        _check_run(survey, self.run)
        if not all(one is None or math.isfinite(one) for one in (self.time, self.size, self.size_sd)):
            raise ActRefused("Time, size and sd of a tare are plain numbers.")
        if self.size is None and self.size_sd is not None:
            raise ActRefused("Give the size that the sd belongs to, or leave both out.")
        if self.size_sd is not None and self.size_sd <= 0.0:
            raise ActRefused("The sd of a tare is above zero; a size without sd is held as it is.")
        laid = with_uses(survey, case.overlay)
        if self._place in {(one.run, one.time) for one in laid.tares}:
            raise ActRefused(f"There is a tare in {tare_words(*self._place)} already.")
        self._check_inside(laid)
        tare = Tare(run=self.run, time=self.time, size=_to_milligal(self.size), size_sd=_to_milligal(self.size_sd))
        overlay = case.overlay
        if self._place in overlay.dropped_tares and tare in survey.tares:
            kept = tuple(one for one in overlay.dropped_tares if one != self._place)
            return replace(case, overlay=replace(overlay, dropped_tares=kept))
        tares = sorted((*overlay.tares, tare), key=lambda one: (one.time, one.run))
        return replace(case, overlay=replace(overlay, tares=tuple(tares)))

    def _check_inside(self, survey: Survey) -> None:
        """Refuse a tare before or after all used readings of its run: it would have no effect."""
        readings = survey.readings
        mine = readings.use & (readings.run.code == readings.run.names.index(self.run))
        times = utc_time(readings, survey.instruments).values[mine]
        if not len(times):
            raise ActRefused(f"No reading of run {shown(self.run)} is in use: a tare in it would have no effect.")
        if not times.min() < self.time <= times.max():
            raise ActRefused(
                f"A tare in {tare_words(*self._place)} would have no effect: the used readings of the run go "
                f"from {moment(float(times.min()))} to {moment(float(times.max()))}."
            )

    def sentence(self, case: Case) -> str:
        """The tare, and what is known of its size."""
        return f"Took a tare in {tare_words(*self._place)} into account{size_words(self.size, self.size_sd)}"


def _to_milligal(size: float | None) -> float | None:
    """A size in m/s2 that twelve digits of a mGal give back exactly, so that a survey folder can state it."""
    return None if size is None else float(f"{size / MILLIGAL:.12g}") * MILLIGAL


@dataclass(frozen=True, slots=True, kw_only=True)
class DropTare(_OfTare):
    """Leave a tare out of account, one that a person added or one that the folder lists."""

    kind: ClassVar[str] = "drop_tare"

    def apply(self, case: Case) -> Case:
        """The case without the tare."""
        _check_run(case.survey, self.run)
        overlay = case.overlay
        added = tuple(one for one in overlay.tares if (one.run, one.time) != self._place)
        if added != overlay.tares:
            return replace(case, overlay=replace(overlay, tares=added))
        listed_there = self._place in {(one.run, one.time) for one in case.survey.tares}
        if not listed_there or self._place in overlay.dropped_tares:
            raise ActRefused(f"There is no tare in {tare_words(*self._place)}.")
        dropped = sorted((*overlay.dropped_tares, self._place), key=lambda one: (one[1], one[0]))
        return replace(case, overlay=replace(overlay, dropped_tares=tuple(dropped)))

    def sentence(self, case: Case) -> str:
        """Which tare no longer counts."""
        return f"Left the tare in {tare_words(*self._place)} out of account"
