"""How gravity changes with depth at each reading, to bring the readings of one station to one depth.

The slope is that of first-pass gravity in the interval that holds the reading's depth, the nearest interval
beyond the ends; where there is none, the free-air gradient less that of the reference rock.
"""

from __future__ import annotations

import numpy as np

from plumbwell.earth.constants import FOUR_PI_G
from plumbwell.reduction.effects import FreeAirChoice
from plumbwell.reduction.located import Located
from plumbwell.reduction.reference_rock import ReferenceLayers
from plumbwell.survey.column import Array, Column, Index, constant_column
from plumbwell.survey.site import Site


def gravity_slopes(
    gravity: Array,
    where: Located,
    top: Index,
    base: Index,
    *,
    reference: ReferenceLayers,
    choice: FreeAirChoice,
    site: Site,
) -> Column:
    """Slope of gravity with depth at each row, (n,), s-2.

    Parameters
    ----------
    gravity : (s,) array
        First-pass gravity of the stations, m/s2.
    where : Located
    top, base : (k,) int arrays
        Stations of the intervals, from the top down.
    reference : ReferenceLayers
    choice : FreeAirChoice
    site : Site
    """
    elevation = where.positions.elevation.values
    placed = where.placement
    at = elevation[np.maximum(placed.station, 0)] - np.nan_to_num(placed.off_station)
    if len(top):
        slopes = (gravity[base] - gravity[top]) / (elevation[top] - elevation[base])
        return constant_column("slope", "1/s2", slopes[_holding(at, placed.station, elevation, top, base)])
    layer = np.clip(np.searchsorted(-reference.tops, -at, side="right") - 1, 0, len(reference.tops) - 1)
    rock = np.where(at > site.ground_elevation, 0.0, reference.density[layer])
    return constant_column("slope", "1/s2", choice.gradient - FOUR_PI_G * rock)


def _holding(at: Array, station: Index, elevation: Array, top: Index, base: Index) -> Index:
    """The interval that holds each row's elevation, else the nearest; of the network part of the row's station
    where that has intervals, since those of parts that no station joins may overlap."""
    chain = np.full(len(elevation), -1)
    for one, other in zip(top.tolist(), base.tolist(), strict=True):
        if chain[one] < 0:
            chain[one] = chain.max() + 1
        chain[other] = chain[one]
    of_row = np.where(station >= 0, chain[np.maximum(station, 0)], -1)
    of_row[of_row < 0] = 0
    held = np.zeros(len(at), dtype=np.intp)
    for number in range(int(chain.max()) + 1):
        rows, own = np.flatnonzero(of_row == number), np.flatnonzero(chain[top] == number)
        # The first interval whose base lies below the row; rows beyond the ends take the nearest one.
        held[rows] = own[np.minimum(np.searchsorted(-elevation[base[own]], -at[rows], side="left"), len(own) - 1)]
    return held
