"""Every column of every output table, described once: heading, unit, meaning, and where it comes from.

Files, frames and the desk's ledger read the tables from here. Values are taken from the results in SI and
stand in the unit of the heading; NaN, and a text without characters, means not known.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass
from operator import attrgetter

import numpy as np

from plumbwell.density.layer_boundaries import layer_boundaries
from plumbwell.reduction.positions import well_path
from plumbwell.study.repeats import (
    repeat_difference,
    repeat_difference_sd,
    repeat_hours,
    repeat_pairs,
    repeat_standardised,
)
from plumbwell.study.results import Results
from plumbwell.study.visit_table import visit_redundancy, visit_table
from plumbwell.survey.column import Array
from plumbwell.survey.units import LABELS

Values = Array | tuple[str, ...]
NUMBER, TEXT, TIME = "number", "text", "time"
FACTORS = {label: factor for table in LABELS.values() for label, (factor, _) in table.items()}


@dataclass(frozen=True, slots=True, kw_only=True)
class TableColumn:
    """One column of an output table.

    Parameters
    ----------
    name : str
    unit : str or None
        Unit label of the written numbers; None for texts, counts and ratios.
    what : str
        Meaning and sign, in one line.
    kind : str
        "number", "text" or "time" (s since 2000-01-01 UTC, written as ISO 8601).
    get : callable
        Results -> (rows,) SI values, or texts.
    """

    name: str
    unit: str | None = None
    what: str
    kind: str = NUMBER
    get: Callable[[Results], Values]

    @property
    def heading(self) -> str:
        """The heading as written: `density [g/cm3]`."""
        return self.name if self.unit is None else f"{self.name} [{self.unit}]"

    def values(self, results: Results) -> Values:
        """The column in the unit of its heading, (rows,) each; texts as they are, times in s."""
        values = self.get(results)
        if isinstance(values, tuple) or self.unit is None:
            return values
        return np.asarray(values, dtype=np.float64) / FACTORS[self.unit]


@dataclass(frozen=True, slots=True, kw_only=True)
class Table:
    """One output table.

    Parameters
    ----------
    file : str
        Name of its file.
    columns : tuple of TableColumn
    rows : callable
        Results -> number of rows; None where the survey has no such table.
    leading : callable
        Results -> columns of texts that stand before all others: (heading, one text a row).
    """

    file: str
    columns: tuple[TableColumn, ...]
    rows: Callable[[Results], int | None]
    leading: Callable[[Results], tuple[tuple[str, tuple[str, ...]], ...]] = lambda results: ()

    def column(self, name: str) -> TableColumn:
        """The column of a name (without its unit); KeyError when there is none."""
        for one in self.columns:
            if one.name == name:
                return one
        raise KeyError(name)


def _text(name: str, what: str, get: Callable[[Results], tuple[str, ...]]) -> TableColumn:
    return TableColumn(name=name, what=what, kind=TEXT, get=get)


def _number(name: str, unit: str | None, what: str, get: Callable[[Results], Values]) -> TableColumn:
    return TableColumn(name=name, unit=unit, what=what, get=get)


def _column(path: str) -> Callable[[Results], Array]:
    """Values of the column that stands at a dotted path below the results."""
    find = attrgetter(path)
    return lambda results: find(results).values


def _flags(of_rows: Iterable[tuple[str, tuple[int, ...]]], number: int) -> tuple[str, ...]:
    """Codes of the findings at each row, in their order, each once."""
    codes: list[dict[str, None]] = [{} for _ in range(number)]
    for code, rows in of_rows:
        for row in rows:
            codes[row][code] = None
    return tuple(";".join(one) for one in codes)


def _station_flags(results: Results) -> tuple[str, ...]:
    return _flags(((one.code, one.stations) for one in results.findings), len(results.stations))


def _interval_flags(results: Results) -> tuple[str, ...]:
    return _flags(((one.code, one.intervals) for one in results.findings), len(results.intervals))


def _station_gravity_sd(results: Results) -> Array:
    datum = results.network.gravity.datum
    return np.where(datum == np.arange(len(datum)), np.nan, results.stations.gravity_sd.values)


def _tvd(results: Results, elevation: Array) -> Array:
    return results.survey.site.datum_elevation - elevation


def _station_tvd(results: Results) -> Array:
    return _tvd(results, results.stations.located.positions.elevation.values)


def _unknown(results: Results) -> Array:
    return np.full(len(results.stations), np.nan)


STATION_COLUMNS = (
    _text("station", "label of the station", lambda r: r.stations.label),
    _text("role", "column, or base: in the network, in no interval", lambda r: r.stations.role),
    _number("depth", "m", "measured depth of the mark", _column("stations.located.mark_depth")),
    _number("tvd", "m", "vertical depth of the sensor below the depth datum", _station_tvd),
    _number(
        "elevation",
        "m",
        "elevation of the sensor above sea level",
        _column("stations.located.positions.elevation"),
    ),
    _number("east", "m", "east of the collar, the sensor's", _column("stations.located.positions.east")),
    _number("north", "m", "north of the collar, the sensor's", _column("stations.located.positions.north")),
    _number(
        "gravity",
        "mGal",
        "gravity, downward positive; without a tie 0 at the datum station",
        _column("stations.gravity"),
    ),
    _number(
        "gravity_sd",
        "mGal",
        "its sd; without a tie that of the difference from the datum station",
        _station_gravity_sd,
    ),
    _number(
        "visits",
        None,
        "used visits; 0 for a tie without used rows",
        lambda r: r.stations.visits.astype(float),
    ),
    _number(
        "normal_gravity", "mGal", "normal gravity on the ellipsoid", _column("stations.parts.normal_gravity")
    ),
    _number(
        "free_air",
        "mGal",
        "normal gravity at the station less that on the ellipsoid",
        _column("stations.parts.free_air"),
    ),
    _number(
        "shell",
        "mGal",
        "attraction of the reference rock between ground and station",
        _column("stations.parts.shell"),
    ),
    _number("terrain", "mGal", "attraction of the terrain", _unknown),
    _number("water", "mGal", "attraction of bodies of water", _unknown),
    _number("openings", "mGal", "attraction of openings", _unknown),
    _number("bodies", "mGal", "attraction of bodies", _unknown),
    _number(
        "anomaly",
        "mGal",
        "gravity less all known parts; without a tie less its value at the datum station",
        _column("stations.anomalies.anomaly"),
    ),
    _text("flags", "codes of the findings here", _station_flags),
)


def _at_top(of: Callable[[Results], Array]) -> Callable[[Results], Array]:
    return lambda results: of(results)[results.intervals.densities.pairs.top]


def _at_base(of: Callable[[Results], Array]) -> Callable[[Results], Array]:
    return lambda results: of(results)[results.intervals.densities.pairs.base]


def _mark_depth(results: Results) -> Array:
    return results.stations.located.mark_depth.values


def _log_coverage(results: Results) -> Array:
    coverage = results.intervals.log_coverage.values
    return coverage if results.survey.logs else np.full(len(coverage), np.nan)


INTERVAL_COLUMNS = (
    _text("from_station", "station at the top", lambda r: r.intervals.from_station),
    _text("to_station", "station at the base", lambda r: r.intervals.to_station),
    _number("top", "m", "measured depth of the upper mark", _at_top(_mark_depth)),
    _number("base", "m", "measured depth of the lower mark", _at_base(_mark_depth)),
    _number("top_tvd", "m", "vertical depth of the upper sensor", _at_top(_station_tvd)),
    _number("base_tvd", "m", "vertical depth of the lower sensor", _at_base(_station_tvd)),
    _number(
        "thickness", "m", "vertical distance between the sensors", _column("intervals.densities.thickness")
    ),
    _number(
        "gradient",
        "mGal/m",
        "change of gravity, less known masses and normal gravity, over thickness",
        _column("intervals.densities.gradient"),
    ),
    _number("density", "g/cm3", "interval density, shell form", _column("intervals.density")),
    _number(
        "density_sd",
        "g/cm3",
        "its independent sd: readings, drift, tares, depth",
        _column("intervals.density_sd"),
    ),
    _number(
        "density_common_sd", "g/cm3", "sd of what all intervals share", _column("intervals.density_common_sd")
    ),
    _number("density_slab", "g/cm3", "slab form, (F - gradient)/(4 pi G)", _column("intervals.density_slab")),
    _number(
        "log_density", "g/cm3", "mean of the density log over the interval", _column("intervals.log_density")
    ),
    _number("log_coverage", None, "share of the interval that the log covers, 0 to 1", _log_coverage),
    _number("density_less_log", "g/cm3", "density less log_density", _column("intervals.density_less_log")),
    _number(
        "dof",
        None,
        "degrees of freedom of Student's t",
        lambda r: np.full(len(r.intervals), float(r.intervals.dof)),
    ),
    _text("flags", "codes of the findings here", _interval_flags),
)


def _boundary_depths(results: Results) -> Array:
    """Measured depth of the layers' boundaries, (m + 1,)."""
    survey, site = results.survey, results.survey.site
    edges = layer_boundaries(
        results.recipe.layer_boundaries,
        results.intervals.densities.pairs,
        results.stations.located,
        survey.markers,
        well_path(survey.path, north_correction=site.north_correction),
        site,
    )
    return np.zeros(0) if edges is None else edges.depth


def _of_layers(name: str) -> Callable[[Results], Array]:
    return lambda results: getattr(results.layers, name)


def _layer_flags(results: Results) -> tuple[str, ...]:
    if results.layers is None:
        return ()
    return tuple("conditional" if one else "" for one in results.layers.conditional.tolist())


LAYER_COLUMNS = (
    _number("top", "m", "measured depth of the upper boundary", lambda r: _boundary_depths(r)[:-1]),
    _number("base", "m", "measured depth of the lower boundary", lambda r: _boundary_depths(r)[1:]),
    _number("top_tvd", "m", "vertical depth of the upper boundary", lambda r: _tvd(r, _of_layers("top")(r))),
    _number(
        "base_tvd", "m", "vertical depth of the lower boundary", lambda r: _tvd(r, _of_layers("base")(r))
    ),
    _number("density", "g/cm3", "density of the layer; empty where no data reach", _of_layers("density")),
    _number("density_sd", "g/cm3", "its independent sd", _of_layers("sd")),
    _number("resolution", None, "diagonal of the resolution matrix", _of_layers("resolution")),
    _text("flags", "conditional where the sd holds the boundaries fixed", _layer_flags),
)


def _visit_effect(results: Results) -> Array:
    used = results.network.visits.of_row >= 0
    return np.where(used, results.readings.estimates.visit_effect.values, np.nan)


def _used(results: Results) -> tuple[str, ...]:
    return tuple("yes" if one else "no" for one in (results.network.visits.of_row >= 0).tolist())


READING_COLUMNS = (
    _number(
        "calibrated", "mGal", "reading in units of gravity, scale applied", _column("readings.calibrated")
    ),
    _number("tide", "mGal", "tide correction, added", _column("readings.tide")),
    _number("tilt", "mGal", "tilt correction, added", _column("readings.tilt")),
    _number(
        "pressure_effect", "mGal", "effect of air pressure, subtracted", _column("readings.pressure_effect")
    ),
    _number("to_station", "mGal", "to the station's sensor depth, added", _column("readings.to_station")),
    _number("run_bias", "mGal", "constant of the run", _column("readings.estimates.run_bias")),
    _number("drift", "mGal", "polynomial and tares", _column("readings.estimates.drift")),
    _number("visit_effect", "mGal", "what a visit's readings share; empty for unused rows", _visit_effect),
    _number(
        "residual",
        "mGal",
        "what is left; for unused rows observed less predicted",
        _column("readings.estimates.residual"),
    ),
    _number(
        "standardised_residual", None, "residual over its own sd", _column("readings.estimates.standardised")
    ),
    _number(
        "redundancy",
        None,
        "share of a reading that others check, 0 to 1",
        _column("readings.estimates.redundancy"),
    ),
    _text("used", "yes, or no: out of use, or at no station", _used),
)


def _name_of(heading: str) -> str:
    return heading.partition("[")[0].strip().lower()


def raw_columns(results: Results) -> tuple[tuple[str, tuple[str, ...]], ...]:
    """The readings' own columns as written; one named like one of ours is called `raw NAME`."""
    raw = results.survey.readings.raw
    taken = {one.name for one in READING_COLUMNS}
    columns = []
    for heading, cells in zip(raw.headings, raw.cells, strict=True):
        while _name_of(heading) in taken:
            heading = f"raw {heading}"
        taken.add(_name_of(heading))
        columns.append((heading, cells))
    return tuple(columns)


def _run_of(results: Results, which: int) -> tuple[str, ...]:
    visits, names = results.network.visits, results.survey.readings.run.names
    return tuple(names[code] for code in visits.run[repeat_pairs(visits)[which]].tolist())


def _first_of(results: Results, which: int) -> Array:
    visits = results.network.visits
    return visits.first[repeat_pairs(visits)[which]]


def _repeat_station(results: Results) -> tuple[str, ...]:
    visits, label = results.network.visits, results.stations.label
    return tuple(label[one] for one in visits.station[repeat_pairs(visits)[0]].tolist())


def _time(name: str, what: str, get: Callable[[Results], Array]) -> TableColumn:
    return TableColumn(name=name, what=what, kind=TIME, get=get)


REPEAT_COLUMNS = (
    _text("station", "label of the station", _repeat_station),
    _text("run_1", "run of the earlier visit", lambda r: _run_of(r, 0)),
    _time("time_1", "first used reading of the earlier visit", lambda r: _first_of(r, 0)),
    _text("run_2", "run of the later visit", lambda r: _run_of(r, 1)),
    _time("time_2", "first used reading of the later visit", lambda r: _first_of(r, 1)),
    _number(
        "difference",
        "mGal",
        "later less earlier visit, after all corrections and drift",
        lambda r: repeat_difference(r.network),
    ),
    _number(
        "difference_sd",
        "mGal",
        "its sd, with what drift and tares may absorb",
        lambda r: repeat_difference_sd(r.network),
    ),
    _number("standardised", None, "difference over its sd", lambda r: repeat_standardised(r.network)),
    _number("hours_between", None, "time_2 less time_1, h", lambda r: repeat_hours(r.network.visits)),
)


def _visit_run(results: Results) -> tuple[str, ...]:
    names = results.survey.readings.run.names
    return tuple(names[code] for code in results.network.visits.run.tolist())


def _visit_station(results: Results) -> tuple[str, ...]:
    label = results.stations.label
    return tuple(label[one] for one in results.network.visits.station.tolist())


def _of_visits(name: str) -> Callable[[Results], Array]:
    """Values that stand in the table of visits."""
    find = attrgetter(name)
    return lambda results: np.asarray(find(visit_table(results)), dtype=np.float64)


def _visit_standardised(results: Results) -> Array:
    visits = visit_table(results)
    return visits.residual / visits.residual_sd


def _leave_out(results: Results) -> Array:
    settle = results.network.settling
    return np.where(settle.leave_out < 0, np.nan, settle.leave_out.astype(np.float64))


VISIT_COLUMNS = (
    _text("run", "label of the run", _visit_run),
    _text("station", "label of the station", _visit_station),
    _time("time", "first used reading of the visit", lambda r: r.network.visits.first),
    _number("readings", None, "used readings of the visit", _of_visits("count")),
    _number("level", "mGal", "its mean less run bias and gravity of the station", _of_visits("level")),
    _number("level_sd", "mGal", "its sd, by reading and re-seating noise", _of_visits("level_sd")),
    _number("residual", "mGal", "what drift and tares leave of the level", _of_visits("residual")),
    _number("residual_sd", "mGal", "its sd; empty where nothing checks the visit", _of_visits("residual_sd")),
    _number("standardised", None, "residual over residual_sd", _visit_standardised),
    _number("redundancy", None, "share of the visit's mean that others check, 0 to 1", visit_redundancy),
    _number(
        "creep",
        "mGal",
        "first reading less the mean of the visit's later half, drift out",
        lambda r: r.network.settling.creep,
    ),
    _number("creep_sd", "mGal", "its sd, by reading noise and drift rate", lambda r: r.network.settling.sd),
    _number(
        "leave_out", None, "first readings that creep, to be left out; empty: cannot be told", _leave_out
    ),
)

TABLES: dict[str, Table] = {
    "stations": Table(file="stations.csv", columns=STATION_COLUMNS, rows=lambda r: len(r.stations)),
    "intervals": Table(file="intervals.csv", columns=INTERVAL_COLUMNS, rows=lambda r: len(r.intervals)),
    "layers": Table(
        file="layers.csv",
        columns=LAYER_COLUMNS,
        rows=lambda r: None if r.layers is None else len(r.layers.density),
    ),
    "readings_reduced": Table(
        file="readings_reduced.csv",
        columns=READING_COLUMNS,
        rows=lambda r: len(r.survey.readings),
        leading=raw_columns,
    ),
    "repeats": Table(
        file="repeats.csv", columns=REPEAT_COLUMNS, rows=lambda r: len(repeat_pairs(r.network.visits)[0])
    ),
    "visits": Table(file="visits.csv", columns=VISIT_COLUMNS, rows=lambda r: len(r.network.visits)),
}
