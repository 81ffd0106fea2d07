"""LAS files, read strictly and written by the narrow rules (CWLS LAS 2.0, September 1992).

Nothing is split, padded or guessed: a row whose count of values does not fit the curves is a
problem with its physical line. The null value is compared as a number and never applied to the index.
"""

from __future__ import annotations

import math
import os
import re
import unicodedata
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import ArrayLike

from plumbwell.files.collected import Collected
from plumbwell.files.las_header import HeaderLine, Sections, sections_of
from plumbwell.files.las_rows import RUN_TOGETHER, even_columns, rows_of
from plumbwell.files.paths import UnfitFile, plain_bytes, text_of
from plumbwell.files.text_table import physical_lines
from plumbwell.survey.column import Array, Index, frozen, frozen_index
from plumbwell.survey.errors import InputError, shown
from plumbwell.survey.units import unit

USUAL_NULL = -999.25
_PLAIN = re.compile(r"[0-9+\-.eE\n]*+")
_NUMBER = re.compile(r"[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]{1,3})?")
_MISSING = re.compile(r"(?i)\*+|[+-]?1\.#\w+|[+-]?nan")


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class LasCurve:
    """One curve of a LAS file, (n,) values.

    Parameters
    ----------
    mnemonic : str
        As written; the second of two alike has `[2]` behind it.
    cells : tuple of str
        As written.
    values : (n,) float64 array or None
        NaN where missing; None for a curve of texts.
    """

    mnemonic: str
    unit: str
    description: str
    cells: tuple[str, ...]
    values: Array | None


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class LasFile:
    """A LAS file as written; the first curve is the index.

    Parameters
    ----------
    version : float
    wrap : bool
        As the header says.
    null : float
    well, parameters : tuple of HeaderLine
    lines : (n,) int array
        Physical line of each row (of its index value, in a wrapped file).
    """

    file: str
    version: float
    wrap: bool
    null: float
    well: tuple[HeaderLine, ...]
    parameters: tuple[HeaderLine, ...]
    curves: tuple[LasCurve, ...]
    other: tuple[str, ...]
    lines: Index


def read_las(path: str | os.PathLike[str]) -> LasFile:
    """The contents of a LAS 2.0 (or 1.2) file.

    Raises
    ------
    InputError
        With everything that is wrong with it.
    """
    collected = Collected()
    name = shown(Path(path).name)
    try:
        data = plain_bytes(Path(path))
    except UnfitFile as unfit:
        collected.problem(name, unfit.row, None, found=unfit.found, expected=unfit.expected, mend=unfit.mend)
        raise InputError(collected.problems) from None
    las = las_of(data, file=name, collected=collected)
    collected.raise_problems()
    assert las is not None
    return las


def las_of(data: bytes, *, file: str, collected: Collected) -> LasFile | None:
    """The LAS file that some bytes hold, or None; problems and notes are collected."""
    try:
        text = text_of(data)
    except UnfitFile as unfit:
        collected.problem(file, unfit.row, None, found=unfit.found, expected=unfit.expected, mend=unfit.mend)
        return None
    if (end := text.find("\x1a")) >= 0:
        if text[end:].strip("\x1a \t\r\n"):
            collected.note(
                "las_end_mark",
                "look",
                file,
                "the file goes on after an end mark (0x1A); the rest is not read",
                "check the file",
            )
        text = text[:end]
    before = len(collected.problems)
    sections = sections_of(physical_lines(text), file=file, collected=collected)
    if len(collected.problems) > before:
        return None  # what else is missing follows from that
    version, wrap, null = _stated(sections, file, collected)
    names = sections.headers.get("C", [])
    if not names:
        collected.problem(
            file,
            None,
            None,
            found="no curve section (~C), or an empty one",
            expected="a line for each curve under ~C",
            mend="write the curve section, or export the log anew",
        )
    if sections.data_line is None:
        collected.problem(
            file,
            None,
            None,
            found="no data section (~A)",
            expected="the values under a line that begins with ~A",
            mend="the file may be cut off: export the log anew",
        )
    elif not sections.data:
        collected.problem(
            file,
            sections.data_line,
            None,
            found="a data section (~A) without data",
            expected="a row of values for each depth",
            mend="export the log anew",
        )
    if len(collected.problems) > before:
        return None
    even = None if wrap else even_columns(sections, len(names))
    if even is None:
        rows = rows_of(sections, len(names), wrap=wrap, file=file, collected=collected)
        if rows is None:
            return None
        even = [line for line, _ in rows], list(zip(*(cells for _, cells in rows), strict=True))
    lines, columns = frozen_index(np.array(even[0], dtype=np.intp)), even[1]
    curves = _curves(names, columns, lines, null, file, collected)
    well = sections.headers.get("W", [])
    if version < 2.0:
        # version 1.2 has the value behind the colon, except for the depths and the null value
        well = [
            one
            if one.mnemonic.upper() in ("STRT", "STOP", "STEP", "NULL")
            else HeaderLine(one.mnemonic, one.unit, one.description, one.value, one.line)
            for one in well
        ]
    las = LasFile(
        file=file,
        version=version,
        wrap=wrap,
        null=null,
        well=tuple(well),
        curves=tuple(curves),
        parameters=tuple(sections.headers.get("P", ())),
        other=tuple(sections.other),
        lines=lines,
    )
    _check_index(las, sections, collected)
    return las if len(collected.problems) == before else None


def _stated(sections: Sections, file: str, collected: Collected) -> tuple[float, bool, float]:
    """Version, wrap and null value as the header states them, or the usual ones with a note."""
    version = 2.0
    stated = sections.value("V", "VERS")
    number = _float(stated.value) if stated is not None else None
    if number is None:
        collected.note(
            "las_version",
            "look",
            file,
            "the file does not state its version and is read as LAS 2.0",
            "write VERS. 2.0 under ~V",
        )
    elif number >= 3.0 or number < 1.0:
        collected.problem(
            file,
            stated.line if stated else None,
            "VERS",
            found=f"LAS version {shown(stated.value if stated else '')}",
            expected="LAS 2.0 (or 1.2)",
            mend="save the log as LAS 2.0",
        )
    elif number < 2.0:
        version = number
        collected.note(
            "las_version",
            "note",
            file,
            f"the file is LAS {number:g}, in which value and description stand the other way round",
            "nothing",
        )
    wrap = sections.value("V", "WRAP")
    null = sections.value("W", "NULL")
    value = _float(null.value) if null is not None else None
    if null is not None and null.value and value is None:
        collected.problem(
            file,
            null.line,
            "NULL",
            found=f'"{shown(null.value)}"',
            expected="a number such as -999.25",
            mend="correct the null value",
        )
    if value is None:
        collected.note(
            "las_null",
            "look",
            file,
            f"the file states no null value; {USUAL_NULL:g} is taken as missing",
            "write NULL. -999.25 under ~W",
        )
    return (
        version,
        wrap is not None and wrap.value.upper().startswith("Y"),
        USUAL_NULL if value is None else value,
    )


def _float(text: str) -> float | None:
    text = text.strip()
    return float(text) if _NUMBER.fullmatch(text) else None


def _curves(
    names: list[HeaderLine],
    columns: list[tuple[str, ...]],
    lines: Index,
    null: float,
    file: str,
    collected: Collected,
) -> list[LasCurve]:
    seen: dict[str, int] = {}
    curves = []
    for place, (name, cells) in enumerate(zip(names, columns, strict=True)):
        key = name.mnemonic.upper()
        seen[key] = seen.get(key, 0) + 1
        mnemonic = name.mnemonic if seen[key] == 1 else f"{name.mnemonic}[{seen[key]}]"
        if seen[key] == 2:
            collected.note(
                "las_curve_twice",
                "look",
                f"{file}, row {name.line}",
                f"two curves are called {shown(name.mnemonic)}; the second is {shown(mnemonic)} here",
                "rename one of them",
            )
        values, missing = _values(cells)
        if values is None:
            for row, cell in enumerate(cells):
                if cut := RUN_TOGETHER.fullmatch(cell):
                    collected.problem(
                        file,
                        int(lines[row]),
                        shown(mnemonic),
                        found=f'"{shown(cell)}", values that run together',
                        expected="a blank between values",
                        mend=f"part them, perhaps {cut[1]} and {cut[2]}",
                    )
                    if collected.full(file):
                        break
        if missing:
            collected.note(
                "las_unreadable",
                "look",
                f"{file}, {shown(mnemonic)}",
                f"{missing} values such as ***** or 1.#IND count as missing",
                "nothing, if they are missing",
            )
        if values is not None and place > 0:
            values[np.abs(values - null) <= 1e-6 * max(1.0, abs(null))] = math.nan
        curves.append(
            LasCurve(
                mnemonic=mnemonic,
                unit=name.unit,
                description=name.description,
                cells=cells,
                values=None if values is None else frozen(values),
            )
        )
    return curves


def _values(cells: Sequence[str]) -> tuple[Array | None, int]:
    """Numbers of a curve and how many cells mean "missing"; None when a cell is a text."""
    if _PLAIN.fullmatch("\n".join(cells)):
        try:
            values = np.array(list(map(float, cells)), dtype=np.float64)
            return (values, 0) if np.isfinite(values).all() else (None, 0)
        except ValueError:
            pass
    numbers, missing = np.empty(len(cells)), 0
    for row, cell in enumerate(cells):
        number = _float(cell)
        if number is None:
            if cell and not _MISSING.fullmatch(cell):
                return None, 0
            missing += 1
            number = math.nan
        numbers[row] = number
    return (numbers, missing) if np.isfinite(numbers).any() or missing == len(cells) else (None, 0)


def _check_index(las: LasFile, sections: Sections, collected: Collected) -> None:
    """The index has no gaps; its unit is that of STRT, STOP and STEP; what STRT and STOP say is compared."""
    index, file = las.curves[0], las.file
    name = shown(index.mnemonic)
    if index.values is None:
        return
    for row in np.flatnonzero(np.isnan(index.values)).tolist()[:20]:
        collected.problem(
            file,
            int(las.lines[row]),
            name,
            found=f'"{shown(index.cells[row])}"',
            expected="a number in the index curve",
            mend="remove the row, or write its depth",
        )
    stated = {key: line for key in ("STRT", "STOP", "STEP") if (line := sections.value("W", key)) is not None}
    if not stated:
        collected.note(
            "las_range", "note", file, "the header states no STRT and STOP; the data are taken", "nothing"
        )
    for key, line in stated.items():
        if line.unit and index.unit and not _same_unit(line.unit, index.unit):
            collected.problem(
                file,
                line.line,
                key,
                found=f'the unit "{shown(line.unit)}", and "{shown(index.unit)}" at the curve {name}',
                expected="one unit for the depths",
                mend=f"find out which is right, and write it at {key} and at {name}",
            )
    step = _float(stated["STEP"].value) if "STEP" in stated else None
    slack = abs(step) / 2 if step else 1e-6
    for key, actual in (("STRT", float(index.values[0])), ("STOP", float(index.values[-1]))):
        number = _float(stated[key].value) if key in stated else None
        if number is not None and abs(number - actual) > slack + 1e-6:
            collected.note(
                "las_range",
                "look",
                f"{file}, row {stated[key].line}, {key}",
                f"{key} says {number:g}, the data {actual:g}; the data are taken",
                "check whether the file is whole",
            )
    steps = np.abs(np.diff(index.values))
    if step and len(steps) and np.abs(steps - abs(step)).max() > 0.01 * abs(step) + 1e-6:
        collected.note(
            "las_step",
            "note",
            file,
            f"STEP says {step:g}, the data have {steps.min():g} to {steps.max():g}; the data are taken",
            "nothing, if the log is irregular",
        )


def las_unit(label: str) -> str:
    """A unit label of a LAS file in the spelling that our table of units knows; F is the foot there."""
    return {"F": "ft", "FT.": "ft", "GM/C3": "g/cm3", "GR/CC": "g/cc", "K/CM3": "kg/m3"}.get(
        label.strip().upper(), label.strip()
    )


def _same_unit(one: str, other: str) -> bool:
    if one.upper() == other.upper():
        return True
    try:
        return unit(las_unit(one), "m").factor == unit(las_unit(other), "m").factor
    except ValueError:
        return False


Head = tuple[str, str, str, str]


def _plain(text: str) -> str:
    """Text of a header part: ASCII only, no colon, no line end."""
    letters = [c for c in unicodedata.normalize("NFKD", text) if not unicodedata.combining(c)]
    text = "".join(c if c.isprintable() else " " for c in letters)
    return text.encode("ascii", "replace").decode().replace(":", ";").strip()


def las_text(
    *,
    well: Sequence[Head],
    curves: Sequence[tuple[str, str, str, ArrayLike]],
    parameters: Sequence[Head] = (),
    other: Sequence[str] = (),
    decimals: int = 4,
) -> str:
    """Text of a LAS 2.0 file by the rules of 1992: ASCII, unwrapped, no exponents, no colon in data.

    Parameters
    ----------
    well, parameters : sequence of (mnemonic, unit, value, description)
        STRT, STOP, STEP and NULL are made here from the first curve, in its unit; STEP is 0 where
        the index is not evenly spaced.
    curves : sequence of (mnemonic, unit, description, values)
        The first is the index, without missing values; NaN elsewhere is written as the null value.
    other : sequence of str
        Lines of the section ~O.
    decimals : int
        Digits behind the point of every value.

    Raises
    ------
    ValueError
        When curves differ in length, there is no row, or the index has a missing value.
    """
    columns = [np.asarray(values, dtype=np.float64) for *_, values in curves]
    if not columns or not len(columns[0]) or any(len(one) != len(columns[0]) for one in columns):
        raise ValueError("LAS curves need one length and at least one row")
    index, unit_label = columns[0], curves[0][1]
    if not np.isfinite(index).all():
        raise ValueError("the index of a LAS file has a missing value")
    steps = np.diff(index)
    even = len(steps) > 0 and float(np.abs(steps - steps[0]).max()) < 0.5 * 10.0**-decimals
    ranges = (
        ("STRT", index[0], "FIRST INDEX VALUE"),
        ("STOP", index[-1], "LAST INDEX VALUE"),
        ("STEP", steps[0] if even else 0.0, "STEP"),
    )
    head: list[Head] = [(name, unit_label, f"{value:.{decimals}f}", what) for name, value, what in ranges]
    head += [("NULL", "", f"{USUAL_NULL:.2f}", "NULL VALUE"), *well]
    blocks = [
        (
            "~VERSION INFORMATION",
            [
                ("VERS", "", "2.0", "CWLS LOG ASCII STANDARD - VERSION 2.0"),
                ("WRAP", "", "NO", "ONE LINE PER DEPTH STEP"),
            ],
        ),
        ("~WELL INFORMATION", head),
        ("~CURVE INFORMATION", [(name, label, "", what) for name, label, what, _ in curves]),
        ("~PARAMETER INFORMATION", list(parameters)),
    ]
    lines = []
    for title, rows in blocks:
        if rows:
            lines += [title, *(_head_line(row) for row in rows)]
    if other:
        lines += ["~OTHER INFORMATION", *(_plain(line).replace("~", "-") for line in other)]
    lines.append("~ASCII LOG DATA")
    table = [
        [f"{USUAL_NULL:.{decimals}f}" if not math.isfinite(v) else f"{v:.{decimals}f}" for v in one.tolist()]
        for one in columns
    ]
    widths = [max(map(len, one)) + 1 for one in table]
    lines += [
        " ".join(cell.rjust(width) for cell, width in zip(row, widths, strict=True))
        for row in zip(*table, strict=True)
    ]
    return "\n".join(lines) + "\n"


def _head_line(row: Head) -> str:
    mnemonic, label, value, what = (_plain(part) for part in row)
    mnemonic = re.sub(r"[\s.]", "_", mnemonic)
    left = f"{mnemonic}.{label.replace(' ', '')}"
    return f" {left:<14} {value:>24} : {what}"
