"""What a person laid on top of a survey: which rows count and why, notes, tares. The raw cells are never changed.

An overlay is plain values and compares by value. Laying it over gives a survey of its own; every column that it
does not touch is the very same object, so that what rests on those is found again.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from plumbwell.survey.column import Index
from plumbwell.survey.instrument import Tare
from plumbwell.survey.survey import Survey


@dataclass(frozen=True, slots=True)
class RowUse:
    """Whether a row of the readings is used, by the will of a person, and why.

    Parameters
    ----------
    row : int
        Place in the table of readings, the first being 0.
    use : bool
    reason : str
    """

    row: int
    use: bool
    reason: str = ""


@dataclass(frozen=True, slots=True)
class RowNote:
    """The note of a row of the readings in place of the folder's; an empty text takes that away."""

    row: int
    text: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Overlay:
    """Everything that lies on top of a survey. Compares by value.

    Parameters
    ----------
    rows : tuple of RowUse
        By rising row, each at most once.
    notes : tuple of RowNote
        By rising row, each at most once.
    tares : tuple of Tare
        Added to those that the folder lists, in order of time and run.
    dropped_tares : tuple of (str, float)
        Run and time, UTC s since 2000-01-01, of tares that the folder lists and that do not count.
    """

    rows: tuple[RowUse, ...] = ()
    notes: tuple[RowNote, ...] = ()
    tares: tuple[Tare, ...] = ()
    dropped_tares: tuple[tuple[str, float], ...] = ()

    def __bool__(self) -> bool:
        """True when anything lies on top."""
        return bool(self.rows or self.notes or self.tares or self.dropped_tares)

    @property
    def without_notes(self) -> Overlay:
        """The part that numbers depend on."""
        return replace(self, notes=()) if self.notes else self

    def with_rows(self, changed: dict[int, RowUse | None]) -> Overlay:
        """The overlay with the use of some rows changed; None takes a row's entry away."""
        entries: dict[int, RowUse | None] = {one.row: one for one in self.rows}
        entries.update(changed)
        return replace(self, rows=tuple(one for _, one in sorted(entries.items()) if one is not None))

    def with_notes(self, changed: dict[int, RowNote | None]) -> Overlay:
        """The overlay with the notes of some rows changed; None takes a row's entry away."""
        entries: dict[int, RowNote | None] = {one.row: one for one in self.notes}
        entries.update(changed)
        return replace(self, notes=tuple(one for _, one in sorted(entries.items()) if one is not None))


EMPTY = Overlay()


def laid_over(survey: Survey, overlay: Overlay) -> Survey:
    """The survey with an overlay on top; the same object when nothing lies on top.

    Parameters
    ----------
    survey : Survey
        As measured and stated.
    overlay : Overlay
        Its rows are rows of that survey's readings.
    """
    return with_notes(with_uses(survey, overlay), overlay)


def with_uses(survey: Survey, overlay: Overlay) -> Survey:
    """The survey with everything of an overlay that numbers depend on: rows in use, and tares."""
    readings = survey.readings
    if overlay.rows:
        use = readings.use.copy()
        use[rows_of(overlay)] = np.fromiter((one.use for one in overlay.rows), dtype=bool, count=len(overlay.rows))
        use.flags.writeable = False
        readings = replace(readings, use=use)
    tares = survey.tares
    if overlay.tares or overlay.dropped_tares:
        dropped = set(overlay.dropped_tares)
        tares = (*(one for one in tares if (one.run, one.time) not in dropped), *overlay.tares)
    if readings is survey.readings and tares is survey.tares:
        return survey
    return replace(survey, readings=readings, tares=tares)


def with_notes(survey: Survey, overlay: Overlay) -> Survey:
    """The survey with the notes of an overlay."""
    if not overlay.notes:
        return survey
    note = list(survey.readings.note)
    for one in overlay.notes:
        note[one.row] = one.text
    return replace(survey, readings=replace(survey.readings, note=tuple(note)))


def rows_of(overlay: Overlay) -> Index:
    """The rows whose use the overlay states, rising."""
    return np.fromiter((one.row for one in overlay.rows), dtype=np.intp, count=len(overlay.rows))
