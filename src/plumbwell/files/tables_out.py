"""Output tables as CSV text: UTF-8, comma, one line feed a row, headings as `study.tables` names them.

Numbers have up to 12 significant digits, covariances 17; what is not known is an empty cell. A text that a
spreadsheet would run as a formula gets an apostrophe in front; control characters but tab and line end, which
a terminal would obey, are written as escapes.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence

import numpy as np

from plumbwell.earth.constants import MILLIGAL
from plumbwell.files.text_table import FORMULA_MARKS
from plumbwell.files.times import iso
from plumbwell.study.alternative_columns import COLUMNS as ALTERNATIVE_COLUMNS
from plumbwell.study.alternatives import Alternative
from plumbwell.study.results import Results
from plumbwell.study.tables import TABLES, TEXT, TIME, Table, TableColumn, Values
from plumbwell.survey.column import Array

MOST_WHOLE = 1000
"""Rows up to which a covariance is written whole."""

NUMBER = re.compile(r"[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?")
_CONTROL = re.compile(r"[\x00-\x08\x0b\x0c\x0e-\x1f\x7f-\x9f\u2028\u2029]")
_UNPLAIN = re.compile(r"[,\"\r\n]")
_DOUBTFUL = re.compile(_CONTROL.pattern + r"|[,\"\r]|(?:^|\n)(?:[=+\-@#]|[^\S\n])|[^\S\n](?:\n|$)")


def cell(text: str) -> str:
    """A text as it stands in a CSV cell: quoted where it must be, a formula disarmed, no control characters."""
    text = _CONTROL.sub(lambda found: found[0].encode("unicode_escape").decode(), text)
    if text[:1] in FORMULA_MARKS and text and not NUMBER.fullmatch(text):
        text = "'" + text
    if _UNPLAIN.search(text) or text[:1] == "#" or text != text.strip():
        return '"' + text.replace('"', '""') + '"'
    return text


def text_cells(texts: Sequence[str]) -> Sequence[str]:
    """Texts as cells; a column without a doubtful character is passed on as it is."""
    joined = "\n".join(texts)
    if joined.count("\n") < max(len(texts), 1) and not _DOUBTFUL.search(joined):
        return texts
    return [cell(one) for one in texts]


def number_cells(values: Array, form: str = "%.12g") -> list[str]:
    """Numbers as cells, empty where they are not known."""
    values = np.asarray(values, dtype=np.float64) + 0.0  # no cell says -0
    different, which = np.unique(values, return_inverse=True)
    if 2 * len(different) < len(values):  # a constant of each run: format each value once
        return np.array(number_cells(different, form), dtype=object)[which].tolist()
    cells = [form % value for value in values.tolist()]
    for row in np.flatnonzero(~np.isfinite(values)).tolist():
        cells[row] = ""
    return cells


def csv_text(headings: Iterable[str], columns: Iterable[Sequence[str]]) -> str:
    """A table as text, from headings and ready cells column by column."""
    lines = [",".join(cell(one) for one in headings), *map(",".join, zip(*columns, strict=True))]
    return "\n".join(lines) + "\n"


def column_cells(column: TableColumn, results: Results) -> Sequence[str]:
    """The cells of one column."""
    return value_cells(column.kind, column.values(results))


def value_cells(kind: str, values: Values) -> Sequence[str]:
    """The cells of values of some kind, in the unit of their heading."""
    if kind == TEXT:
        return text_cells(values)  # type: ignore[arg-type]
    if kind == TIME:
        return [iso(value) if np.isfinite(value) else "" for value in values]  # type: ignore[arg-type]
    return number_cells(values)  # type: ignore[arg-type]


def alternatives_text(rows: Sequence[Alternative]) -> str:
    """alternatives.csv: what else could have been done with drift, tares and noise."""
    return csv_text(
        [one.heading for one in ALTERNATIVE_COLUMNS],
        [value_cells(one.kind, one.values(rows)) for one in ALTERNATIVE_COLUMNS],
    )


def table_text(table: Table, results: Results) -> str:
    """One table as CSV text."""
    leading = table.leading(results)
    cells = {one.heading: column_cells(one, results) for one in table.columns}
    if table is TABLES["readings_reduced"]:
        cells["residual [mGal]"] = closing_residuals(cells, results)
    headings = [*(heading for heading, _ in leading), *cells]
    return csv_text(headings, [*(text_cells(texts) for _, texts in leading), *cells.values()])


def closing_residuals(cells: dict[str, Sequence[str]], results: Results) -> list[str]:
    """Residuals as written: what the other written numbers of the row leave.

    Twelve digits hold an absolute gravity of 980 000 mGal to 1e-6 mGal only. The residual is small and has
    digits to spare, so it takes up what the others lost in rounding (at most some 1e-6 mGal): the sum that
    gives the station's gravity then closes to 1e-9 mGal with the numbers as they stand in the files.
    """

    def written(heading: str) -> Array:
        return np.array([float(text) if text else np.nan for text in cells[heading]])

    cells_of_gravity = column_cells(TABLES["stations"].column("gravity"), results)
    gravity = np.array([float(text) if text else np.nan for text in cells_of_gravity])
    station = results.stations.located.placement.station
    at_station = np.where(station >= 0, gravity[np.maximum(station, 0)], np.nan)
    # The large numbers meet first, so that the double precision of their sum is that of the small remainder.
    left = written("calibrated [mGal]") - written("run_bias [mGal]") - at_station
    left = left + written("tide [mGal]") + written("tilt [mGal]") - written("pressure_effect [mGal]")
    left = left + written("to_station [mGal]") - written("drift [mGal]")
    left = left - np.nan_to_num(written("visit_effect [mGal]"))
    residual = results.readings.estimates.residual.values
    # Where gravity or drift is not known nothing is to close, and the residual is still the same.
    left = np.where(np.isnan(left), residual / MILLIGAL, left)
    return number_cells(np.where(np.isnan(residual), np.nan, left))


def _whole(corner: str, labels: Sequence[str], covariance: Array) -> str:
    cells = [cell(one) for one in labels]
    flat = number_cells(covariance.ravel(), "%.17g")
    number = len(labels)
    lines = [",".join([corner, *cells])]
    lines += [",".join([name, *flat[row * number : (row + 1) * number]]) for row, name in enumerate(cells)]
    return "\n".join(lines) + "\n"


def _neighbours(labels: Sequence[str], variance: Array, with_next: Array) -> str:
    """Diagonal and pairs of neighbours in depth, as rows of a, b, covariance."""
    cells = [cell(one) for one in labels]
    own, beside = number_cells(variance, "%.17g"), number_cells(with_next, "%.17g")
    lines = ["a,b,covariance"]
    for row, name in enumerate(cells):
        lines.append(f"{name},{name},{own[row]}")
        if row + 1 < len(cells):
            lines.append(f"{name},{cells[row + 1]},{beside[row]}")
    return "\n".join(lines) + "\n"


def _symmetric(matrix: Array, variance: Array) -> Array:
    """The matrix freed of rounding: symmetric, with the variances of the table on its diagonal."""
    matrix = 0.5 * (matrix + matrix.T)
    np.fill_diagonal(matrix, variance)
    known = np.isfinite(variance)
    return np.where(known[:, None] & known[None, :], matrix, np.nan)


def density_covariance(results: Results) -> str:
    """density_covariance.csv: independent errors of the interval densities, (g/cm3)2."""
    intervals, unit = results.intervals, 1000.0**2
    labels = [intervals.label(row) for row in range(len(intervals))]
    spread, variance = intervals.errors.independent, intervals.density_sd.values**2 / unit
    if len(labels) <= MOST_WHOLE:
        return _whole("interval", labels, _symmetric(spread.matrix() / unit, variance))
    upper = np.arange(len(labels) - 1)
    beside = spread.between(upper, upper + 1) / unit
    return _neighbours(labels, variance, beside + 0.0 * (variance[1:] + variance[:-1]))


def common_covariance(results: Results) -> str:
    """common_covariance.csv: what all intervals share, (g/cm3)2; above 1000 a row a factor, g/cm3."""
    intervals = results.intervals
    labels = [intervals.label(row) for row in range(len(intervals))]
    if len(labels) <= MOST_WHOLE:
        variance = intervals.density_common_sd.values**2 / 1000.0**2
        shared = intervals.errors.common_covariance() / 1000.0**2
        return _whole("interval", labels, _symmetric(shared, variance))
    lines = [",".join(["factor", *(cell(one) for one in labels)])]
    known = np.where(np.isfinite(intervals.density.values), 1.0, np.nan)
    for name, factor in intervals.errors.factors.items():
        lines.append(",".join([cell(name), *number_cells(known * factor / 1000.0, "%.17g")]))
    return "\n".join(lines) + "\n"


def station_covariance(results: Results) -> str:
    """station_covariance.csv: errors of station gravity, mGal2; 0 throughout at a datum station."""
    gravity, labels, unit = results.network.gravity, results.stations.label, MILLIGAL**2
    spread, ties = gravity.independent(), gravity.ties
    variance = results.stations.gravity_sd.values**2 / unit
    if len(labels) <= MOST_WHOLE:
        return _whole("station", labels, _symmetric((spread.matrix() + ties @ ties.T) / unit, variance))
    upper = np.arange(len(labels) - 1)
    beside = spread.between(upper, upper + 1) + np.sum(ties[:-1] * ties[1:], axis=1)
    return _neighbours(labels, variance, beside / unit + 0.0 * (variance[1:] + variance[:-1]))


COVARIANCES = {
    "density_covariance.csv": density_covariance,
    "common_covariance.csv": common_covariance,
    "station_covariance.csv": station_covariance,
}


def csv_texts(results: Results) -> dict[str, str]:
    """All CSV files of a reduction: name and text of each, in the order of the handbook."""
    texts = {
        table.file: table_text(table, results) for table in TABLES.values() if table.rows(results) is not None
    }
    texts.update((name, text_of(results)) for name, text_of in COVARIANCES.items())
    return texts


def csv_notes(results: Results) -> list[str]:
    """What a reader of the CSV files has to be told."""
    notes = []
    if len(results.intervals) > MOST_WHOLE:
        notes.append(
            "density_covariance.csv holds the diagonal and pairs of neighbours in depth only, and "
            "common_covariance.csv one row a factor (g/cm3 for one sd of it): there are more than "
            f"{MOST_WHOLE} intervals"
        )
    if len(results.stations) > MOST_WHOLE:
        notes.append(
            "station_covariance.csv holds the diagonal and pairs of neighbours in depth only: there are more "
            f"than {MOST_WHOLE} stations"
        )
    if results.layers is None:
        notes.append("layers.csv is not written: the recipe asks for no layers, or there is no interval")
    return notes
