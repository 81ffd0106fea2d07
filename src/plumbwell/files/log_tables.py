"""A log file beside the survey, LAS or CSV, as a density log with its depth rising.

The density curve is the one that survey.toml names, else the only one with the dimension of a
density; where several could be meant none is taken and that is told.
"""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

import numpy as np

from plumbwell.files.collected import Collected, first_rows
from plumbwell.files.known_columns import REACH_OF_DEPTH
from plumbwell.files.las import las_of, las_unit
from plumbwell.files.number_cells import numbers_of
from plumbwell.files.paths import named_bytes
from plumbwell.files.side_tables import reordered
from plumbwell.files.statements import LogStatement
from plumbwell.files.text_table import heading_parts, read_table
from plumbwell.survey.column import Array, Column, Index, Origin, frozen, frozen_index
from plumbwell.survey.errors import shown
from plumbwell.survey.log import DensityLog
from plumbwell.survey.units import LABELS, known_labels, unit

DENSITY, LENGTH = "kg/m3", "m"
DENSEST = 10000.0  # kg/m3
LIGHTEST, HEAVIEST = 800.0, 6000.0  # kg/m3, limits of the median of a log of rock
GRAM_PER_CM3 = 1000.0
DEPTHS = ("dept", "depth", "md")
NULL_MARKS = (-999.25, -999.0, -9999.0, -9999.25, -99999.0)


@dataclass(frozen=True, slots=True)
class _Curve:
    """A curve as written: name without unit, unit label, heading, texts, values (None: texts)."""

    name: str
    label: str
    heading: str
    cells: tuple[str, ...]
    values: Array | None


@dataclass(frozen=True, slots=True)
class _Curves:
    file: str
    curves: tuple[_Curve, ...]
    lines: Index


def read_log(folder: Path, stated: LogStatement, collected: Collected) -> DensityLog | None:
    """The density log of one [[log]] table, or None when it has problems or no density can be taken."""
    name = stated.file.name
    data = named_bytes(folder, name, key=stated.file.key, row=stated.file.row, collected=collected)
    if data is None:
        return None
    file, before = shown(name), len(collected.problems)
    is_las = name.lower().endswith(".las") or data.removeprefix(b"\xef\xbb\xbf").lstrip()[:1] == b"~"
    curves = _from_las(data, file, collected) if is_las else _from_csv(data, file, collected)
    if curves is None:
        return None
    index = _index(curves, is_las, stated, collected)
    density = _density(curves, stated, collected)
    if index is None or density is None:
        return None
    depth_column = _column(curves, index, "depth", LENGTH, collected, index=True)
    density_column = _column(curves, density, "density", DENSITY, collected)
    extra = {
        key: column
        for key, dimension in (("caliper", LENGTH), ("correction", DENSITY))
        if (wanted := getattr(stated, key)) is not None
        and (curve := _named(curves, wanted, f"{key} curve", stated, collected)) is not None
        and (column := _column(curves, curve, key, dimension, collected)) is not None
    }
    if density_column is not None:
        _check_densities(curves, density, density_column, collected)
    if depth_column is None or density_column is None or len(collected.problems) > before:
        return None
    columns = _rising({"depth": depth_column, "density": density_column, **extra}, file, collected)
    return DensityLog(
        file=name,
        curve=density.name,
        datum_height=stated.datum_height,
        depth_shift=stated.depth_shift,
        minimum_coverage=stated.minimum_coverage,
        **columns,
    )


def _from_las(data: bytes, file: str, collected: Collected) -> _Curves | None:
    las = las_of(data, file=file, collected=collected)
    if las is None:
        return None
    return _Curves(
        file,
        tuple(
            _Curve(one.mnemonic, las_unit(one.unit), f"{one.mnemonic}.{one.unit}", one.cells, one.values)
            for one in las.curves
        ),
        las.lines,
    )


def _from_csv(data: bytes, file: str, collected: Collected) -> _Curves | None:
    table = read_table(data, file=file, rows_are="log values", collected=collected)
    if table is None:
        return None
    curves = []
    for heading, cells in zip(table.raw.headings, table.raw.cells, strict=True):
        name, label = heading_parts(heading)
        values, bad, _ = numbers_of(cells)
        curves.append(_Curve(name, label or "", shown(heading), cells, None if bad else values))
    return _Curves(file, tuple(curves), table.lines)


def _index(curves: _Curves, is_las: bool, stated: LogStatement, collected: Collected) -> _Curve | None:
    """The curve of depths: the first of a LAS file, the column `depth` of a CSV."""
    if is_las:
        return curves.curves[0]
    found = next((one for one in curves.curves if one.name.casefold() in DEPTHS), None)
    if found is None:
        collected.problem(
            curves.file,
            None,
            "depth",
            found=f"no column of depths (the header has {_names(curves)})",
            expected="a column depth [m]",
            mend="rename the column of depths to depth [m], with its unit",
        )
    return found


def _names(curves: _Curves) -> str:
    return ", ".join(one.heading for one in curves.curves[:12])


def _named(
    curves: _Curves, wanted: str, what: str, stated: LogStatement, collected: Collected
) -> _Curve | None:
    found = next(
        (one for one in curves.curves if wanted.casefold() in (one.name.casefold(), one.heading.casefold())),
        None,
    )
    if found is None:
        collected.problem(
            curves.file,
            None,
            None,
            found=f'no curve "{shown(wanted)}", which survey.toml names as the {what}',
            expected=f"one of {_names(curves)}",
            mend=f"correct the name in the [[log]] of {curves.file} in survey.toml",
        )
    return found


def _density(curves: _Curves, stated: LogStatement, collected: Collected) -> _Curve | None:
    """The density curve that is named, else the only one with the dimension of density."""
    if stated.density is not None:
        return _named(curves, stated.density, "density curve", stated, collected)
    fitting = [one for one in curves.curves if one.label and _is_density(one.label)]
    named = (stated.correction or "").casefold()
    fitting = [one for one in fitting if one.name.casefold() != named]
    if len(fitting) == 1:
        return fitting[0]
    names = ", ".join(one.heading for one in fitting)
    if fitting:
        collected.note(
            "log_several_densities",
            "look",
            curves.file,
            f"several curves have the dimension of density ({names}); none is taken",
            f'write density = "{shown(fitting[0].name)}" in the [[log]] of this file, if that is it',
        )
    else:
        collected.problem(
            curves.file,
            None,
            None,
            found=f"no curve with a unit of density (curves: {_names(curves)})",
            expected=f"a curve in one of {known_labels(DENSITY)}",
            mend="write the unit of the density curve, or remove the log from survey.toml",
        )
    return None


def _is_density(label: str) -> bool:
    try:
        unit(label, DENSITY)
    except ValueError:
        return False
    return True


def _column(
    curves: _Curves, curve: _Curve, key: str, dimension: str, collected: Collected, *, index: bool = False
) -> Column | None:
    """A curve in SI; a text, an unknown unit or a missing depth is a problem."""
    file, heading = curves.file, shown(curve.heading)
    try:
        written = unit(curve.label, dimension)
    except ValueError as error:
        found = f'the unit "{shown(curve.label)}"' if curve.label else "a curve without a unit"
        collected.problem(
            file, None, heading, found=found, expected=str(error), mend="write the unit of the curve"
        )
        return None
    if curve.values is None:
        _, bad, _ = numbers_of(curve.cells)
        for cell in bad[:20]:
            collected.problem(
                file,
                int(curves.lines[cell.row]),
                heading,
                found=cell.found,
                expected="a number",
                mend=cell.mend,
            )
        return None
    if index and np.isnan(curve.values).any():
        row = int(np.flatnonzero(np.isnan(curve.values))[0])
        collected.problem(
            file,
            int(curves.lines[row]),
            heading,
            found="an empty cell",
            expected="a depth in every row",
            mend="write the depth, or remove the row",
        )
        return None
    si = curve.values * written.factor + written.offset
    if index:
        far = np.flatnonzero(np.abs(si) > REACH_OF_DEPTH).tolist()
        for row in far[:1]:
            collected.problem(
                file,
                int(curves.lines[row]),
                heading,
                found=f'"{shown(curve.cells[row])}"',
                expected=f"depths of at most {REACH_OF_DEPTH / written.factor:.6g} {written.label} in size",
                mend=f"correct the value ({len(far)} such), or the unit of the curve",
            )
    else:
        for mark in NULL_MARKS:
            rows = np.flatnonzero(curve.values == mark).tolist()
            if rows:
                lines = [int(curves.lines[row]) for row in rows]
                collected.problem(
                    file,
                    lines[0],
                    heading,
                    found=f"{mark:g} in {len(rows)} rows ({first_rows(lines)}), not the file's null value",
                    expected="one null value, as the header states it (in a CSV an empty cell)",
                    mend="correct the null value in the header, or these values",
                )
    return Column(
        key=key,
        unit=dimension,
        values=frozen(si),
        origin=Origin(file=file, heading=curve.heading, lines=curves.lines, cells=curve.cells),
    )


def _check_densities(curves: _Curves, curve: _Curve, column: Column, collected: Collected) -> None:
    out = (column.values <= 0.0) | (column.values > DENSEST)
    # Marks of what is missing were told of already.
    written = column.values if curve.values is None else curve.values
    marks = np.isin(written, NULL_MARKS)
    known = written[~marks & ~np.isnan(written)]
    if known.size and _refuse_median(curves, curve, float(np.median(known)), collected):
        return
    rows = np.flatnonzero(out & ~marks).tolist()
    if rows:
        lines = [int(curves.lines[row]) for row in rows]
        collected.problem(
            curves.file,
            lines[0],
            shown(curve.heading),
            found=f"the density {shown(curve.cells[rows[0]])} ({len(rows)} such, {first_rows(lines)})",
            expected="densities above 0, at most 10 g/cm3",
            mend="correct the unit of the curve, or write the null value where the log is bad",
        )


def _refuse_median(curves: _Curves, curve: _Curve, median: float, collected: Collected) -> bool:
    """A curve whose median no rock has is a problem that says which unit would fit; True when it is."""
    factors = {factor: label for label, (factor, _) in reversed(LABELS[DENSITY].items())}
    factor = unit(curve.label, DENSITY).factor
    if LIGHTEST <= median * factor <= HEAVIEST:
        return False
    fitting = [label for other, label in factors.items() if LIGHTEST <= median * other <= HEAVIEST]
    mend = "name the density curve as density in the [[log]] of this file, or correct its unit"
    if fitting:
        mend = f"write the unit {' or '.join(sorted(fitting))} at the curve, which would fit; or name another curve"
    collected.problem(
        curves.file,
        None,
        shown(curve.heading),
        found=f"densities whose median is {median * factor / GRAM_PER_CM3:.4g} g/cm3",
        expected=f"a median of {LIGHTEST / GRAM_PER_CM3:g} to {HEAVIEST / GRAM_PER_CM3:g} g/cm3",
        mend=mend,
    )
    return True


def _rising(columns: dict[str, Column], file: str, collected: Collected) -> dict[str, Column]:
    """The columns with depth strictly rising: turned, ordered, of equal depths the first; each is told."""
    depth = columns["depth"].values
    steps = np.diff(depth)
    if (steps < 0).any():
        if (steps <= 0).all():
            collected.note("log_turned", "note", file, "the log runs upward and was turned", "nothing")
        else:
            collected.note(
                "log_unordered",
                "look",
                file,
                "the depths of the log go up and down; they were ordered",
                "check whether two passes stand in one file",
            )
    order = np.argsort(depth, kind="stable")
    kept = order[np.concatenate(([True], np.diff(depth[order]) > 0.0))]
    if len(kept) < len(order):
        collected.note(
            "log_depth_twice",
            "look",
            file,
            f"{len(order) - len(kept)} depths of the log occur again; the first value of each is taken",
            "remove the others",
        )
    if len(kept) == len(order) and (steps > 0).all():
        return columns
    return {key: reordered(column, frozen_index(kept)) for key, column in columns.items()}
