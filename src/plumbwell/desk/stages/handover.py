"""The Handover stage: what goes out, file by file, and what stands in each."""

from __future__ import annotations

from collections.abc import Collection

import numpy as np

from plumbwell.desk.ledger.table import TEXT, LedgerColumn, LedgerTable
from plumbwell.desk.shown import Shown
from plumbwell.desk.stages.columns import counted_rows
from plumbwell.files.output_folder import SUMMARY
from plumbwell.files.tables_out import COVARIANCES
from plumbwell.study.tables import TABLES

FILE = "file"
HOLDS = {
    "stations.csv": "gravity of stations, each effect",
    "intervals.csv": "densities with sd, log, difference",
    "layers.csv": "densities of layers",
    "readings_reduced.csv": "every row with drift and residual",
    "repeats.csv": "how repeated visits agree",
    "visits.csv": "every visit: residual, redundancy, creep",
    "density_covariance.csv": "covariance of the densities",
    "common_covariance.csv": "covariance of what all densities share",
    "station_covariance.csv": "covariance of station gravity",
    "reduced.las": "density, sd, log, anomaly, LAS 2.0",
    "figure.svg": "core strip, ledger and tracks",
    "figure.png": "the same as a picture",
    SUMMARY: "recipe, findings, input hashes",
}


def handover_table(shown: Shown, written: Collection[str]) -> LedgerTable:
    """The ledger of the files that go out.

    Parameters
    ----------
    shown : Shown
    written : collection of str
        Names of the files that were written of this very result.
    """
    results = shown.results
    rows: dict[str, float] = {}
    for table in TABLES.values():
        number = table.rows(results)
        if number is not None:
            rows[table.file] = float(number)
    rows.update(dict.fromkeys(COVARIANCES, np.nan))
    rows["density_covariance.csv"] = rows["common_covariance.csv"] = float(len(results.intervals))
    rows["station_covariance.csv"] = float(len(results.stations))
    names = (*rows, "reduced.las", "figure.svg", "figure.png", SUMMARY)
    n = len(names)
    columns = (
        LedgerColumn(key="file", name="file", heading="file", values=names, kind=TEXT),
        LedgerColumn(
            key="rows", name="rows", heading="rows", values=np.array([rows.get(name, np.nan) for name in names]),
            decimals=0,
        ),
        LedgerColumn(
            key="holds", name="holds", heading="holds", values=tuple(HOLDS[name] for name in names), kind=TEXT,
            narrow=False,
        ),
        LedgerColumn(
            key="state", name="state", heading="state", kind=TEXT,
            values=tuple("written" if name in written else "" for name in names), shown=bool(written),
        ),
    )
    nothing = np.full(n, np.nan)
    return LedgerTable(
        stage="handover", level=FILE, numbers=counted_rows(n), columns=columns, marks=(None,) * n, hints=("",) * n,
        excluded=np.zeros(n, dtype=bool), top=nothing, base=nothing, density=nothing,
    )
