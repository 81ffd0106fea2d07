"""Headings of a table matched to the columns we know, and their cells as SI columns with their origin.

Names match without regard to case and surrounding blanks; a measured column states its unit in
square brackets. Columns that nobody knows stay in the raw table; one that looks like a misspelt
known one is pointed out.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from difflib import get_close_matches

import numpy as np
from numpy.typing import NDArray

from plumbwell.files.collected import Collected, first_rows
from plumbwell.files.label_texts import unfit_label
from plumbwell.files.number_cells import MEND_MISSING, MEND_TEXT, BadCell, numbers_of
from plumbwell.files.text_table import FORMULA_MARKS, TextTable, heading_parts
from plumbwell.survey.column import Array, Column, Origin, constant_column, frozen
from plumbwell.survey.errors import shown
from plumbwell.survey.units import Unit, known_labels, unit

SENTINELS = (-999.25, -999.0, -9999.0, -99999.0, -999999.0, 999.25, 9999.0, 99999.0, 999999.0, 1e30)
# No value is larger in size, in SI by dimension; beyond it the unit or the cell is wrong.
REACH = {"m": 1e7, "m/s2": 20.0, "kg/m3": 1e5, "Pa": 1e8, "K": 1e4, "rad": 100.0, "counts": 1e9}
REACH_OF_DEPTH = 20e3  # m, beyond the deepest hole


@dataclass(frozen=True, slots=True)
class Known:
    """A column that a table may have.

    Parameters
    ----------
    name : str
    dimensions : tuple of str
        SI units of the dimensions that its unit may have; empty for text.
    required : bool
    """

    name: str
    dimensions: tuple[str, ...] = ()
    required: bool = False


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Matched:
    """The known columns of a table: their places, units, and the names that are there but unusable."""

    table: TextTable
    known: dict[str, Known]
    places: dict[str, int]
    units: dict[str, Unit]
    unusable: frozenset[str]

    def has(self, name: str) -> bool:
        """True when the table has that column and its heading is right."""
        return name in self.places

    def heading(self, name: str) -> str:
        """The heading as written, fit for a message."""
        return shown(self.table.raw.headings[self.places[name]])

    def cells(self, name: str) -> tuple[str, ...]:
        """Texts of a column; empty texts when the table has no such column."""
        if name in self.places:
            return self.table.raw.cells[self.places[name]]
        return ("",) * len(self.table)

    def origin(self, name: str) -> Origin:
        """Where a column stands."""
        return Origin(
            file=self.table.file,
            heading=self.table.raw.headings[self.places[name]],
            lines=self.table.lines,
            cells=self.cells(name),
        )


def match_columns(table: TextTable, known: tuple[Known, ...], collected: Collected) -> Matched:
    """The known columns of a table; wrong units, missing and doubled columns become problems."""
    by_name = {one.name: one for one in known}
    places: dict[str, int] = {}
    units: dict[str, Unit] = {}
    unusable: set[str] = set()
    strangers: list[str] = []
    for place, heading in enumerate(table.raw.headings):
        name, label = heading_parts(heading)
        one = by_name.get(name.casefold())
        if one is None:
            strangers.append(heading)
            continue
        if one.name in places or one.name in unusable:
            collected.problem(
                table.file,
                table.header_line,
                shown(heading),
                found=f"the column {one.name} twice",
                expected="every column name once",
                mend="rename or remove one of the two",
            )
            unusable.add(one.name)
            places.pop(one.name, None)
            continue
        found = _unit_of(one, heading, label, table, collected) if one.dimensions else None
        if one.dimensions and found is None:
            unusable.add(one.name)
            continue
        places[one.name] = place
        if found is not None:
            units[one.name] = found
    missing = [one for one in known if one.name not in places and one.name not in unusable]
    _report_missing(table, [one for one in missing if one.required], strangers, collected)
    _point_out(table, [one for one in missing if not one.required], strangers, collected)
    return Matched(table=table, known=by_name, places=places, units=units, unusable=frozenset(unusable))


def wanted_heading(one: Known) -> str:
    """The heading of a column as it should be written, with the first unit that serves."""
    return f"{one.name} [{known_labels(one.dimensions[0]).split(',')[0]}]" if one.dimensions else one.name


def _unit_of(
    one: Known, heading: str, label: str | None, table: TextTable, collected: Collected
) -> Unit | None:
    expected = f"one of the units {known_labels(*one.dimensions)}"
    if not label:
        collected.problem(
            table.file,
            table.header_line,
            shown(heading),
            found="a measured column without a unit",
            expected=expected,
            mend=f"write the unit in square brackets, as in {wanted_heading(one)}",
        )
        return None
    for dimension in one.dimensions:
        try:
            return unit(label, dimension)
        except ValueError:
            continue
    collected.problem(
        table.file,
        table.header_line,
        shown(heading),
        found=f'the unit "{shown(label)}"',
        expected=expected,
        mend=f"write one of these units in square brackets, as in {wanted_heading(one)}",
    )
    return None


def _near(names: list[str], strangers: list[str], *, cutoff: float) -> dict[str, str]:
    """For each name the unknown heading whose spelling is nearest, where one is near."""
    plain: dict[str, str] = {}
    for heading in strangers:
        name = heading_parts(heading)[0].casefold().split("(")[0].strip().replace(" ", "_")
        plain.setdefault(name, heading)
    near: dict[str, str] = {}
    for name in names:
        if found := get_close_matches(name, plain, n=1, cutoff=cutoff):
            near[name] = plain[found[0]]
    return near


def _report_missing(
    table: TextTable, missing: list[Known], strangers: list[str], collected: Collected
) -> None:
    near = _near([one.name for one in missing], strangers, cutoff=0.6)
    for one in missing:
        heading = wanted_heading(one)
        mend = f"add the column {heading}"
        if one.name in near:
            mend = f'rename the column "{shown(near[one.name])}" to {heading}, if that is it'
        names = ", ".join(shown(name) for name in table.raw.headings[:12])
        collected.problem(
            table.file,
            table.header_line,
            one.name,
            found=f"no such column (the header has {names})",
            expected=f"a column {heading}",
            mend=mend,
        )


def _point_out(table: TextTable, missing: list[Known], strangers: list[str], collected: Collected) -> None:
    named = {one.name: one for one in missing}
    for name, heading in _near(list(named), strangers, cutoff=0.8).items():
        collected.note(
            "unknown_column",
            "look",
            f"{table.file}, row {table.header_line}, {shown(heading)}",
            f'the column "{shown(heading)}" is not known and is only carried along',
            f"if it is meant so, rename it to {wanted_heading(named[name])}",
        )


def measured(
    matched: Matched,
    name: str,
    collected: Collected,
    *,
    use: NDArray[np.bool_] | None = None,
    required: bool = False,
    least: float = -np.inf,
    above: bool = False,
) -> Column:
    """A measured column in SI, NaN where a cell is empty or wrong.

    Parameters
    ----------
    name : str
        A known column; when the table lacks it, a column of NaN without origin comes back.
    use : (n,) bool array or None
        Rows that count; what is wrong in the others is a note.
    required : bool
        An empty cell in a row that counts is a problem.
    least : float
        Limit in the written unit; with `above` the least itself is refused.
    """
    table = matched.table
    if not matched.has(name):
        return constant_column(name, matched.known[name].dimensions[0], np.full(len(table), np.nan))
    cells, heading, written = matched.cells(name), matched.heading(name), matched.units[name]
    values, bad, minuses = numbers_of(cells)
    if minuses:
        collected.note(
            "typographic_minus",
            "note",
            f"{table.file}, {heading}",
            f"{minuses} cells begin with a typographic minus or dash, taken as a minus",
            "write a plain hyphen-minus",
        )
    counted = np.ones(len(table), dtype=bool) if use is None else use
    expected = "a number such as 12.5"
    if required:
        without = "write the value" if use is None else "write the value, or set use = no in the row"
        bad = [replace(one, mend=without) if one.mend in (MEND_TEXT, MEND_MISSING) else one for one in bad]
        bad += [
            BadCell(row, "an empty cell", without)
            for row in np.flatnonzero(counted).tolist()
            if cells[row] == ""
        ]
    report_bad(matched, name, bad, expected, counted, collected)
    marks = _refuse_sentinels(matched, name, values, counted, collected, required=required and use is not None)
    low = (values < least) | (above & (values == least))
    si = values * written.factor + written.offset
    reach = REACH_OF_DEPTH if name == "depth" else REACH[written.dimension]
    for row in np.flatnonzero(counted & ~marks & (low | (np.abs(si) > reach))).tolist():
        most = (reach - written.offset) / written.factor
        expected = f"a number above {least:g}" if above else f"a number of {least:g} or more"
        collected.problem(
            table.file,
            int(table.lines[row]),
            heading,
            found=f'"{shown(cells[row])}"',
            expected=expected if low[row] else f"a number of at most {most:.6g} {written.label} in size",
            mend="correct the value, or the unit in the heading" if not low[row] else "correct the value",
        )
    return Column(key=name, unit=written.dimension, values=frozen(si), origin=matched.origin(name))


def report_bad(
    matched: Matched,
    name: str,
    bad: list[BadCell],
    expected: str,
    counted: NDArray[np.bool_],
    collected: Collected,
) -> None:
    """Bad cells of rows that count become problems, those of unused rows one note."""
    table, unused = matched.table, []
    for cell in sorted(bad, key=lambda one: one.row):
        line = int(table.lines[cell.row])
        if not counted[cell.row]:
            unused.append(line)
            continue
        collected.problem(
            table.file, line, matched.heading(name), found=cell.found, expected=expected, mend=cell.mend
        )
    if unused:
        collected.note(
            "unused_row_unreadable",
            "note",
            f"{table.file}, {first_rows(unused)}, {matched.heading(name)}",
            f"in rows with use = no, {len(unused)} cells of this column cannot be read and count as missing",
            "correct them if the rows are to be used",
        )


def _refuse_sentinels(
    matched: Matched,
    name: str,
    values: Array,
    counted: NDArray[np.bool_],
    collected: Collected,
    *,
    required: bool,
) -> NDArray[np.bool_]:
    """Marks for a missing value (-999.25 ...), far from all other values, are problems; True in their rows.

    A negative mark need not repeat.
    """
    refused = np.zeros(len(values), dtype=bool)
    known = values[counted & ~np.isnan(values)]
    if not np.isin(known, SENTINELS).any():
        return refused
    others = known[~np.isin(known, SENTINELS)]
    if not len(others):
        return refused
    low, high = float(others.min()), float(others.max())
    reach = max(high - low, 1e-3 * max(abs(low), abs(high)))
    for mark in SENTINELS:
        rows = np.flatnonzero(counted & (values == mark)).tolist()
        if len(rows) > (mark > 0.0) and not low - reach <= mark <= high + reach:
            refused[rows] = True
            lines = [int(matched.table.lines[row]) for row in rows]
            many = f" in {len(rows)} rows ({first_rows(lines)})" if len(rows) > 1 else ""
            collected.problem(
                matched.table.file,
                lines[0],
                matched.heading(name),
                found=f"{mark:g}{many}, far from all other values",
                expected="an empty cell where there is no value",
                mend=_empty_mend(len(rows), required),
            )
    return refused


def _empty_mend(rows: int, required: bool) -> str:
    cells, where = ("this cell", "this row") if rows == 1 else ("these cells", "these rows")
    return f"empty {cells}, or set use = no in {where}" if required else f"empty {cells}"


def refuse_unfit(
    matched: Matched, name: str, collected: Collected, *, use: NDArray[np.bool_] | None = None
) -> None:
    """Labels with control characters, or without end, are problems in rows that count."""
    unfit = {cell: wrong for cell in set(matched.cells(name)) if (wrong := unfit_label(cell)) is not None}
    if not unfit:
        return
    for row, cell in enumerate(matched.cells(name)):
        if cell in unfit and (use is None or use[row]):
            wrong = unfit[cell]
            collected.problem(
                matched.table.file,
                int(matched.table.lines[row]),
                matched.heading(name),
                found=wrong.found,
                expected=wrong.expected,
                mend=wrong.mend,
            )


def texts(matched: Matched, name: str) -> list[str | None]:
    """The labels of a column, None where a cell is empty or there is no such column.

    The apostrophe that our own tables put before a label which a spreadsheet would take for a formula is taken off.
    """
    cells = matched.cells(name)
    return [(cell[1:] if cell[:1] == "'" and cell[1:2] in FORMULA_MARKS else cell) or None for cell in cells]
