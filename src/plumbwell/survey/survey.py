"""One survey as measured: the frozen whole that every step of the reduction starts from."""

from __future__ import annotations

from dataclasses import dataclass

from plumbwell.survey.instrument import Instrument, Run, Tare
from plumbwell.survey.log import DensityLog
from plumbwell.survey.places import Markers, Path, Places, Ties, TimeSeries
from plumbwell.survey.readings import Readings
from plumbwell.survey.recipe import Recipe
from plumbwell.survey.site import Site


@dataclass(frozen=True, slots=True, kw_only=True)
class ReadingNote:
    """Something seen while reading the files that is not an error: code, severity, place, text, mend."""

    code: str
    severity: str
    place: str
    text: str
    mend: str


@dataclass(frozen=True, slots=True, kw_only=True)
class InputFile:
    """A file that was read: name within the folder, SHA-256 of its bytes."""

    name: str
    sha256: str


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Survey:
    """Everything that was measured and stated, nothing that was computed.

    Parameters
    ----------
    site : Site
    instruments, runs, tares : tuples
    readings : Readings
    places, ties, path, markers : or None where the survey has none
    logs : tuple of DensityLog
    tide_table, loading : TimeSeries or None
    barometer_elevation : float, "station" or None
        m above sea level; None: the ground at the collar.
    recipe : Recipe
        As the folder states it.
    recipe_given : frozenset of str
        The keys that the folder writes itself.
    not_applied : tuple of (str, str)
        What the folder names and this version does not take into account: (what, where it is named).
    notes : tuple of ReadingNote
    files : tuple of InputFile
    """

    site: Site
    instruments: tuple[Instrument, ...]
    runs: tuple[Run, ...] = ()
    tares: tuple[Tare, ...] = ()
    readings: Readings
    places: Places | None = None
    ties: Ties | None = None
    path: Path | None = None
    markers: Markers | None = None
    logs: tuple[DensityLog, ...] = ()
    tide_table: TimeSeries | None = None
    loading: TimeSeries | None = None
    barometer_elevation: float | str | None = None
    recipe: Recipe
    recipe_given: frozenset[str] = frozenset()
    not_applied: tuple[tuple[str, str], ...] = ()
    notes: tuple[ReadingNote, ...] = ()
    files: tuple[InputFile, ...] = ()
