"""Ledger columns made from the output tables, so that window, files and frames show the same numbers.

A column of `study.tables` is taken as it is; only its unit may be another one (microgal for milligal).
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from plumbwell.desk.ledger.table import NUMBER, TEXT, LedgerColumn, LedgerTable
from plumbwell.plates.depth_scale import MD
from plumbwell.study.finding import SEVERITIES, Finding
from plumbwell.study.results import Results
from plumbwell.study.tables import TABLES
from plumbwell.survey.column import Array

PRINTED = {"g/cm3": "g/cm³", "uGal": "µGal"}
MICROGAL_PER_MILLIGAL = 1000.0


def values_of(results: Results, table: str, name: str) -> Any:
    """The values of a column of an output table, in the unit of its heading."""
    return TABLES[table].column(name).values(results)


def table_column(
    results: Results, table: str, name: str, *, title: str, microgal: bool = False, sd: str = "", **look: Any
) -> LedgerColumn:
    """A ledger column from an output table.

    Parameters
    ----------
    results : Results
    table, name : str
        Where it stands in `study.tables`.
    title : str
        Its name in the head.
    microgal : bool
        Shown in microgal, written in milligal.
    sd : str
        Name of the column of the same table that is its standard deviation; "" for none.
    **look
        Further parameters of `LedgerColumn`; `unit` where the one of the table is not what the head says.
    """
    one = TABLES[table].column(name)
    factor = MICROGAL_PER_MILLIGAL if microgal else 1.0
    unit = "uGal" if microgal else one.unit
    values = one.values(results)
    if isinstance(values, np.ndarray):
        values = values * factor if microgal else values
    sds = values_of(results, table, sd) * factor if sd else None
    look.setdefault("unit", PRINTED.get(unit, unit) if unit else "")
    look.setdefault("kind", TEXT if isinstance(values, tuple) else NUMBER)
    return LedgerColumn(
        key=name,
        name=title,
        heading=f"{name} [{unit}]" if unit else name,
        values=values,
        sds=sds,
        what=one.what,
        **look,
    )


def along_hole(results: Results) -> Array:
    """Normal gravity on the ellipsoid, mGal, less that of the first station of the column: the change of latitude."""
    normal = np.asarray(values_of(results, "stations", "normal_gravity"))
    column = [row for row, role in enumerate(results.stations.role) if role == "column"]
    return normal - normal[column[0]] if column else normal - normal[:1]


def depth_column(key: str, title: str, depth: Array, *, unit: str, label: str, **look: Any) -> LedgerColumn:
    """A column of depths as they are written, one decimal.

    Copied, `top` is measured depth as in the files; what is not measured depth is named so: `top_tvd [m]`.
    """
    kind = "" if label == MD else f"_{label.lower()}"
    return LedgerColumn(
        key=key, name=title, unit=f"{unit} {label}", heading=f"{key}{kind} [{unit}]", values=depth, decimals=1, **look
    )


def marks_of(
    findings: Iterable[Finding], which: str, n: int
) -> tuple[list[str | None], list[str]]:
    """The gravest mark of the findings at each row, and what they say.

    Parameters
    ----------
    findings : iterable of Finding
    which : str
        "rows", "stations" or "intervals".
    n : int
        Number of rows.
    """
    marks: list[str | None] = [None] * n
    hints: list[str] = [""] * n
    for finding in findings:
        for row in getattr(finding, which):
            before = marks[row]
            if before is None or SEVERITIES.index(finding.severity) > SEVERITIES.index(before):
                marks[row] = finding.severity
            hints[row] = f"{hints[row]}\n{finding.text}".strip()
    return marks, hints


def counted_rows(n: int) -> tuple[str, ...]:
    """Row numbers from 1 as texts."""
    return tuple(map(str, range(1, n + 1)))


def nothing_excluded(n: int) -> NDArray[np.bool_]:
    """No row is struck through."""
    return np.zeros(n, dtype=bool)


def table_in_depth(
    results: Results, stage: str, level: str, which: str, *, columns: Sequence[LedgerColumn], top: Array, base: Array,
    density: Array,
) -> LedgerTable:
    """A ledger whose rows lie along the hole and cannot be excluded one by one.

    Parameters
    ----------
    results : Results
    stage : str
    level : str
        What a row is for the selection: `INTERVAL` or `STATION`.
    which : str
        What a row is for the findings: "stations" or "intervals".
    columns : sequence of LedgerColumn
    top, base, density : numpy.ndarray
        Of each row, shape (n,): its depths, m, and the rock between or below, g/cm3, NaN where unknown.
    """
    marks, hints = marks_of(results.findings, which, len(density))
    return LedgerTable(
        stage=stage,
        level=level,
        numbers=counted_rows(len(density)),
        columns=tuple(columns),
        marks=tuple(marks),
        hints=tuple(hints),
        excluded=nothing_excluded(len(density)),
        top=top,
        base=base,
        density=density,
    )


def has_any(values: Array | Sequence[float]) -> bool:
    """Whether there is any number other than zero."""
    array = np.asarray(values, dtype=np.float64)
    return bool(np.any(np.nan_to_num(array) != 0.0))
