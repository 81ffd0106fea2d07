"""The Reduction stage: stations, each effect a column and a track."""

from __future__ import annotations

import numpy as np

from plumbwell.desk.ledger.table import LedgerColumn, LedgerTable
from plumbwell.desk.shown import STATION, Shown
from plumbwell.desk.stages.columns import (
    along_hole,
    depth_column,
    table_column,
    table_in_depth,
)
from plumbwell.survey.column import Array

SEEN = 5e-4
"""mGal: a change of normal gravity that three decimals show."""


def density_below(shown: Shown) -> Array:
    """g/cm3 of the rock below each station, NaN where none is known; for the fan."""
    found = np.full(len(shown.results.stations), np.nan)
    for interval, station in zip(
        shown.plate.intervals, shown.results.intervals.densities.pairs.top.tolist(), strict=True
    ):
        if interval.density is not None:
            found[station] = interval.density
    return found


def reduction_table(shown: Shown) -> LedgerTable:
    """The ledger of stations with every part that is taken out of gravity."""
    results = shown.results
    table = "stations"
    along = along_hole(results)
    tvd = table_column(results, table, "tvd", title="TVD", unit="m", decimals=1, shown=False)
    columns = [
        table_column(results, table, "station", title="station", shown=_labels_tell(shown)),
        depth_column(
            "depth", "depth", shown.numbers_of(shown.depths.stations), unit=shown.scale.unit, label=shown.scale.label,
            what="depth of the station",
        ),
        tvd,
        table_column(results, table, "elevation", title="elevation", decimals=1, shown=False),
        table_column(results, table, "visits", title="visits", decimals=0, shown=False),
        # Its standard deviation is that of what is left over, and stands there.
        table_column(results, table, "gravity", title="gravity", decimals=3),
        table_column(results, table, "normal_gravity", title="normal", decimals=3, shown=False),
        LedgerColumn(
            key="latitude", name="latitude", unit="mGal", heading="normal_gravity_less_first [mGal]",
            values=along, decimals=3, signed=True, narrow=False,
            shown=bool(np.nanmax(np.abs(along), initial=0.0) > SEEN),
            what="normal gravity on the ellipsoid, less that of the first station of the column",
        ),
        table_column(results, table, "free_air", title="free air", decimals=3, signed=True, narrow=False),
        table_column(results, table, "shell", title="shells", decimals=3, signed=True, narrow=False),
        table_column(results, table, "anomaly", title="left over", sd="gravity_sd", signed=True),
    ]
    in_column = shown.depths.column
    depth = np.where(in_column, shown.depths.stations, np.nan)
    return table_in_depth(
        results, "reduction", STATION, "stations", columns=columns, top=depth, base=depth, density=density_below(shown)
    )


def _labels_tell(shown: Shown) -> bool:
    """Whether labels say more than depths written as text."""
    def is_depth(label: str) -> bool:
        try:
            float(label.rstrip("b"))
        except ValueError:
            return False
        return True

    return not all(is_depth(label) for label in shown.results.stations.label)
