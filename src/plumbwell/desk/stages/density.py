"""The Density stage: interval densities, the log, their difference."""

from __future__ import annotations

import numpy as np

from plumbwell.desk.ledger.table import LedgerColumn, LedgerTable
from plumbwell.desk.shown import INTERVAL, Shown
from plumbwell.desk.stages.columns import (
    depth_column,
    table_column,
    table_in_depth,
    values_of,
)

AMBER_RATIO = 3.0


def density_table(shown: Shown) -> LedgerTable:
    """The ledger of intervals."""
    results = shown.results
    table, scale = "intervals", shown.scale
    top, base = shown.interval_edges
    logged = bool(np.isfinite(values_of(results, table, "log_density")).any())
    sd = values_of(results, table, "density_sd")
    difference = values_of(results, table, "density_less_log")
    with np.errstate(invalid="ignore", divide="ignore"):
        ratio = difference / sd
    columns = [
        table_column(results, table, "from_station", title="from", unit="station", shown=False),
        table_column(results, table, "to_station", title="to", unit="station", shown=False),
        depth_column("top", "top", shown.numbers_of(top), unit=scale.unit, label=scale.label, what="upper station"),
        depth_column("base", "base", shown.numbers_of(base), unit=scale.unit, label=scale.label, what="lower station"),
        table_column(results, table, "thickness", title="thickness", unit="m TVD", decimals=1, shown=False),
        table_column(
            results, table, "gradient", title="gradient", decimals=5, signed=True, narrow=False, shown=not logged
        ),
        table_column(results, table, "density", title="density", sd="density_sd"),
        table_column(
            results, table, "density_common_sd", title="common sd", decimals=4, shown=not logged, narrow=False
        ),
        table_column(results, table, "density_slab", title="slab", decimals=3, shown=not logged, narrow=False),
        table_column(results, table, "log_density", title="log", decimals=3, shown=logged),
        table_column(results, table, "log_coverage", title="log cover", unit="0 to 1", decimals=2, shown=False),
        table_column(
            results, table, "density_less_log", title="difference", sd="density_sd", signed=True, shown=logged,
            narrow=False,
        ),
        LedgerColumn(
            key="ratio", name="ratio", unit="to sd", heading="ratio", values=ratio, decimals=1, signed=True,
            amber_from=AMBER_RATIO, shown=logged, what="difference over the sd of the density",
        ),
    ]
    density = np.array(
        [np.nan if one.density is None else one.density for one in shown.plate.intervals], dtype=np.float64
    )
    return table_in_depth(
        results, "density", INTERVAL, "intervals", columns=columns, top=top, base=base, density=density
    )
