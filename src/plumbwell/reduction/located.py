"""Stations with their positions, from the top down."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from plumbwell.reduction.positions import Positions, WellPath, positions
from plumbwell.reduction.stations import Placement, RowDepths
from plumbwell.survey.column import Column, Input, Law, computed, constant_column, frozen, frozen_index
from plumbwell.survey.site import Site


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Located:
    """Stations from the top down: the placement of all rows, and where each station lies.

    Parameters
    ----------
    placement : Placement
    mark_depth, sensor_depth : Column, (s,), m
        Measured depth; NaN for surveyed places.
    positions : Positions
    """

    placement: Placement
    mark_depth: Column
    sensor_depth: Column
    positions: Positions


STATION_DEPTH = Law(
    "depth of the station",
    "that of the reading that founded it, or of its place",
    "definition",
    lambda of_reading, of_place: np.where(np.isnan(of_place), of_reading, of_place),
)


def located(placement: Placement, depths: RowDepths, path: WellPath, site: Site) -> Located:
    """The stations of a placement, ordered from the top down, with their positions.

    Parameters
    ----------
    placement : Placement
    depths : RowDepths
    path : WellPath
    site : Site
    """
    on_path = site.datum_elevation - path.at(placement.sensor_depth)[0]
    elevation = np.where(np.isnan(placement.elevation), on_path, placement.elevation)
    order = np.argsort(-elevation, kind="stable")
    new = np.empty(len(order) + 1, dtype=np.intp)
    new[order] = np.arange(len(order))
    new[-1] = -1
    arranged = replace(
        placement,
        label=tuple(placement.label[one] for one in order.tolist()),
        role=tuple(placement.role[one] for one in order.tolist()),
        mark_depth=frozen(placement.mark_depth[order]),
        sensor_depth=frozen(placement.sensor_depth[order]),
        east=frozen(placement.east[order]),
        north=frozen(placement.north[order]),
        elevation=frozen(placement.elevation[order]),
        elevation_sd=frozen(placement.elevation_sd[order]),
        founder=frozen_index(placement.founder[order]),
        station=frozen_index(new[placement.station]),
    )
    alone = arranged.founder < 0
    rows = frozen_index(np.maximum(arranged.founder, 0))

    def depth(key: str, of: Column, stated: np.ndarray) -> Column:
        of_place = constant_column(f"place_{key}", "m", np.where(alone, stated, np.nan))
        return computed(key, "m", STATION_DEPTH, Input("of_reading", of, rows), Input("of_place", of_place))

    sensor = depth("sensor_depth", depths.sensor, arranged.sensor_depth)
    surveyed = {
        key: constant_column(key, "m", getattr(arranged, key)) for key in ("east", "north", "elevation")
    }
    return Located(
        placement=arranged,
        mark_depth=depth("depth", depths.mark, arranged.mark_depth),
        sensor_depth=sensor,
        positions=positions(sensor_depth=sensor, path=path, site=site, **surveyed),
    )
