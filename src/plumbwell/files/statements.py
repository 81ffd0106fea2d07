"""What survey.toml states, as values checked one by one and turned to SI.

Tables that survey.toml names are read elsewhere; here stand their names, with the line of the key.
"""

from __future__ import annotations

from dataclasses import dataclass
from datetime import tzinfo

from plumbwell.survey.instrument import Instrument, Run
from plumbwell.survey.recipe import Recipe
from plumbwell.survey.site import Site


@dataclass(frozen=True, slots=True, kw_only=True)
class NamedFile:
    """A file that survey.toml names: key for messages, name as written, line of the key."""

    key: str
    name: str
    row: int | None


@dataclass(frozen=True, slots=True, kw_only=True)
class LogStatement:
    """One [[log]] table: the file, the curves by name (None: not stated), heights in m."""

    file: NamedFile
    density: str | None = None
    caliper: str | None = None
    correction: str | None = None
    datum_height: float
    depth_shift: float = 0.0
    minimum_coverage: float = 0.8


@dataclass(frozen=True, slots=True, kw_only=True)
class TareStatement:
    """One [[tare]] table: run, UTC seconds since 2000-01-01, size and sd in m/s2, line of the table."""

    run: str
    time: float
    size: float | None
    size_sd: float | None
    row: int | None


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Statements:
    """All that survey.toml states; tables by the name of their key in [data].

    Parameters
    ----------
    site : Site or None
        None when something required is missing or wrong.
    north_stated : bool
        False when the default of `north` stands.
    instruments : tuple of Instrument
        Without their calibration tables; `calibrations` names those by instrument.
    instruments_written : bool
        False when survey.toml has no [instrument.*] table and the default stands.
    zone : tzinfo or None
        Of times without a zone.
    tables : dict
        Of readings, places, ties, path, markers, tide, ocean_loading: those that are named.
    unread : tuple of NamedFile
        Files that must be there and are not read, because what they hold is not taken into account.
    recipe_rows : dict
        Line of each key of the recipe that is written.
    not_applied : tuple of (str, str)
    """

    site: Site | None
    north_stated: bool
    instruments: tuple[Instrument, ...]
    instruments_written: bool
    calibrations: dict[str, NamedFile]
    runs: tuple[Run, ...]
    tares: tuple[TareStatement, ...]
    tables: dict[str, NamedFile]
    unread: tuple[NamedFile, ...]
    logs: tuple[LogStatement, ...]
    zone: tzinfo | None
    barometer_elevation: float | str | None
    recipe: Recipe
    recipe_given: frozenset[str]
    recipe_rows: dict[str, int | None]
    not_applied: tuple[tuple[str, str], ...]
