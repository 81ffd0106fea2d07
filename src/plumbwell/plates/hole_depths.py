"""Depths of a survey as they are shown: measured depth, vertical depth or elevation, in metres or feet.

Measured depth is shown only where every station of the column lies on the path; else vertical depth stands for it.
All depths here grow downward; elevation is held as its negative (`DepthScale`).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from plumbwell.plates.depth_scale import MD, TVD, DepthScale
from plumbwell.reduction.positions import WellPath, well_path
from plumbwell.study.results import Results
from plumbwell.survey.column import Array

BETWEEN = 65
"""Places between two stations at which the path is asked: an arc is then followed to a millimetre."""

ROUNDING = 1e-6


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class HoleDepths:
    """The depths of one reduced survey in one scale.

    Parameters
    ----------
    scale : DepthScale
        The scale in force: that which was asked for, or vertical depth where it has no meaning.
    path : WellPath
    datum_elevation : float
        m, of the zero of measured depth.
    stations : (s,) array
        Depth of each station, of the mark for measured depth, else of the sensor; NaN where it has none.
    column : (s,) bool array
        Stations that stand in the strip and the tracks: of the column, with a depth.
    measured : bool
        Whether measured depth can be shown at all.
    """

    scale: DepthScale
    path: WellPath
    datum_elevation: float
    stations: Array
    column: NDArray[np.bool_]
    measured: bool

    def of_hole(self, measured_depth: Array) -> Array:
        """The shown depth of places in the hole, given by measured depth in m."""
        if self.scale.kind == MD:
            return np.asarray(measured_depth, dtype=np.float64) / self.scale.factor
        return self.of_vertical(self.path.at(np.asarray(measured_depth, dtype=np.float64))[0])

    def of_vertical(self, tvd: Array) -> Array:
        """The shown depth of places given by vertical depth in m, where vertical depth or elevation is shown."""
        down = tvd if self.scale.kind == TVD else tvd - self.datum_elevation
        return down / self.scale.factor

    def place_at(self, results: Results, depth: float) -> tuple[float, float] | None:
        """Measured depth of the mark and vertical depth of the sensor, m, at a shown depth among the column's stations.

        Between two stations they follow the path; what the sensor is off the mark changes evenly from one to the
        other. None above the first station and below the last; the measured depth is NaN where there is none.
        """
        column = np.flatnonzero(self.column)
        order = column[np.argsort(self.stations[column], kind="stable")]
        at = self.stations[order]
        if not len(order) or not at[0] - ROUNDING <= depth <= at[-1] + ROUNDING:
            return None
        down = depth * self.scale.factor
        if not self.measured:
            return float("nan"), down if self.scale.kind == TVD else down + self.datum_elevation
        lower = min(int(np.searchsorted(at, depth, side="right")), len(order) - 1)
        ends = order[[max(lower - 1, 0), lower]]
        located = results.stations.located
        mark, tvd = located.mark_depth.values[ends], located.positions.tvd.values[ends]
        off = tvd - self.path.at(mark)[0]
        marks = np.linspace(mark[0], mark[1], BETWEEN)
        verticals = self.path.at(marks)[0] + np.linspace(off[0], off[1], BETWEEN)
        shown = marks / self.scale.factor if self.scale.kind == MD else self.of_vertical(verticals)
        return float(np.interp(depth, shown, marks)), float(np.interp(depth, shown, verticals))


def hole_depths(results: Results, scale: DepthScale | None = None) -> HoleDepths:
    """The depths of a reduced survey.

    Parameters
    ----------
    results : Results
    scale : DepthScale or None
        None: measured depth in metres.
    """
    wanted = DepthScale() if scale is None else scale
    located, site = results.stations.located, results.survey.site
    in_column = np.array([role == "column" for role in results.stations.role], dtype=bool)
    mark = located.mark_depth.values
    measured = bool(np.isfinite(mark[in_column]).all())
    if wanted.kind == MD and not measured:
        wanted = DepthScale(kind=TVD, unit=wanted.unit)
    path = well_path(results.survey.path, north_correction=site.north_correction)
    depths = HoleDepths(
        scale=wanted,
        path=path,
        datum_elevation=site.datum_elevation,
        stations=mark / wanted.factor,
        column=in_column,
        measured=measured,
    )
    stations = mark / wanted.factor if wanted.kind == MD else depths.of_vertical(located.positions.tvd.values)
    return HoleDepths(
        scale=wanted,
        path=path,
        datum_elevation=site.datum_elevation,
        stations=stations,
        column=in_column & np.isfinite(stations),
        measured=measured,
    )
