"""reduced.las: interval density, its sd, log density and anomaly against depth, every half metre.

Density is that of the interval that holds the depth; the anomaly is straight between stations. Depth is the mark's
measured depth, as in the tables, or vertical depth below the datum where no column station lies on the path.
"""

from __future__ import annotations

from datetime import datetime, timedelta
from math import degrees
from textwrap import wrap

import numpy as np

from plumbwell import __version__
from plumbwell.earth.constants import MILLIGAL
from plumbwell.files.las import las_text
from plumbwell.study.cautions import CAUTIONS
from plumbwell.study.results import Results
from plumbwell.survey.column import Array, Index, frozen
from plumbwell.survey.site import Site

STEP = 0.5
MOST_ROWS = 2_000_000


def las_depth(results: Results) -> tuple[Array, bool]:
    """Depth of each station for the LAS file, (s,), m, and whether it is measured depth.

    Vertical depth below the datum where fewer than two column stations have a measured depth.
    """
    located = results.stations.located
    measured = located.mark_depth.values
    column = np.array([role == "column" for role in results.stations.role])
    if np.count_nonzero(np.isfinite(measured[column])) >= 2:
        return measured, True
    return results.survey.site.datum_elevation - located.positions.elevation.values, False


def reduced_las(results: Results) -> str | None:
    """Text of reduced.las; None where no interval reaches over two half metres of depth.

    Parameters
    ----------
    results : Results
    """
    depth, is_measured = las_depth(results)
    pairs = results.intervals.densities.pairs
    ends = np.sort(np.column_stack([depth[pairs.top], depth[pairs.base]]), axis=1)
    known = np.isfinite(ends[:, 0]) & np.isfinite(ends[:, 1])
    if not known.any():
        return None
    first, last = float(ends[known, 0].min()), float(ends[known, 1].max())
    start, stop = int(np.ceil(first / STEP - 1e-9)), int(np.floor(last / STEP + 1e-9))
    if stop <= start or stop - start >= MOST_ROWS:
        return None
    at = frozen(np.arange(start, stop + 1) * STEP)
    interval = _interval_at(at, np.where(known[:, None], ends, np.nan))

    def stepped(values: Array) -> Array:
        return np.where(interval >= 0, values[np.maximum(interval, 0)], np.nan) / 1000.0

    intervals = results.intervals
    kind = "MEASURED DEPTH OF THE MARK" if is_measured else "VERTICAL DEPTH OF THE SENSOR BELOW THE DATUM"
    return las_text(
        well=_well(results),
        curves=[
            ("DEPT", "M", kind, at),  # type: ignore[list-item]
            ("GDEN", "G/CM3", "INTERVAL DENSITY FROM GRAVITY", stepped(intervals.density.values)),  # type: ignore[list-item]
            ("GDSD", "G/CM3", "ITS INDEPENDENT STANDARD DEVIATION", stepped(intervals.density_sd.values)),  # type: ignore[list-item]
            ("LDEN", "G/CM3", "MEAN LOG DENSITY OF THE INTERVAL", stepped(intervals.log_density.values)),  # type: ignore[list-item]
            ("ANOM", "MGAL", "GRAVITY LESS KNOWN PARTS, DOWNWARD POSITIVE", _anomaly_at(at, depth, results)),  # type: ignore[list-item]
        ],
        parameters=_parameters(results),
        other=[
            f"Written by Plumbwell {__version__}. Densities hold from station to station.",
            "DEPT is measured depth from the depth datum: the mark's, as in intervals.csv."
            if is_measured
            else "DEPT is vertical depth below the depth datum: the stations have no measured depth.",
            *(line for caution in CAUTIONS for line in wrap(caution, 100)),
        ],
        decimals=5,
    )


def _interval_at(at: Array, ends: Array) -> Index:
    """Number of the interval that holds each depth, -1 for none; a shared end belongs to the lower one."""
    interval = np.full(len(at), -1, dtype=np.intp)
    tolerance = 1e-9
    order = np.argsort(-ends[:, 0], kind="stable")
    for number in order[np.isfinite(ends[order, 0])].tolist():
        upper, lower = ends[number]
        inside = slice(*np.searchsorted(at, [upper - tolerance, lower + tolerance]).tolist())
        free = interval[inside] < 0
        interval[inside] = np.where(free, number, interval[inside])
    return interval


def _anomaly_at(at: Array, depth: Array, results: Results) -> Array:
    """Anomaly (mGal), straight between neighbouring column stations; none across parts of the network."""
    anomaly = results.stations.anomalies.anomaly.values / MILLIGAL
    column = np.array([role == "column" for role in results.stations.role])
    used = np.flatnonzero(column & np.isfinite(depth) & np.isfinite(anomaly))
    used = used[np.argsort(depth[used], kind="stable")]
    if len(used) < 2:
        return np.full(len(at), np.nan)
    upper = np.clip(np.searchsorted(depth[used], at, side="right") - 1, 0, len(used) - 2)
    part = results.network.parts.of_station[used]
    together = part[upper] == part[upper + 1]
    inside = (at >= depth[used[0]] - 1e-9) & (at <= depth[used[-1]] + 1e-9)
    return np.where(together & inside, np.interp(at, depth[used], anomaly[used]), np.nan)


def _well(results: Results) -> list[tuple[str, str, str, str]]:
    site = results.survey.site
    first = datetime(2000, 1, 1) + timedelta(seconds=float(results.network.visits.first.min()))
    return [
        ("COMP", "", "", "COMPANY"),
        ("WELL", "", site.name, "WELL"),
        ("FLD", "", "", "FIELD"),
        ("LOC", "", f"{degrees(site.latitude):.6f} N {degrees(site.longitude):.6f} E", "LOCATION, WGS84"),
        ("PROV", "", "", "PROVINCE"),
        ("SRVC", "", "", "SERVICE COMPANY"),
        ("DATE", "", f"{first:%Y-%m-%d}", "DAY OF THE FIRST READING, UTC"),
        ("UWI", "", "", "UNIQUE WELL ID"),
    ]


def _parameters(results: Results) -> list[tuple[str, str, str, str]]:
    site = results.survey.site
    reference = results.recipe.reference_density
    stated = reference.upper() if isinstance(reference, str) else f"{reference / 1000.0:.4f}"
    return [
        ("EDAT", "M", f"{site.datum_elevation:.3f}", "ELEVATION OF THE DEPTH DATUM ABOVE SEA LEVEL"),
        ("ECOL", "M", f"{site.collar_elevation:.3f}", "ELEVATION OF THE COLLAR"),
        ("EGRD", "M", f"{site.ground_elevation:.3f}", "ELEVATION OF THE GROUND"),
        ("FREE", "MGAL/M", f"{results.choice.gradient / MILLIGAL:.6f}", "FREE-AIR GRADIENT"),
        ("RREF", "G/CM3" if not isinstance(reference, str) else "", stated, "REFERENCE DENSITY"),
        *((name, "", text, what) for name, what, text in _carried(site)),
        ("ABSG", "", "YES" if results.absolute else "NO", "GRAVITY IS TIED TO A KNOWN VALUE"),
    ]


def _carried(site: Site) -> list[tuple[str, str, str]]:
    """Mnemonic, meaning and text of what survey.toml only carries."""
    names = {
        "vertical_datum": ("VDAT", "VERTICAL DATUM"),
        "horizontal_crs": ("HCRS", "COORDINATE REFERENCE SYSTEM"),
        "easting": ("EAST", "EASTING OF THE COLLAR"),
        "northing": ("NORT", "NORTHING OF THE COLLAR"),
    }
    return [(*names[key], text) for key, text in site.carried if key in names]
