"""Interval densities between neighbouring stations: which stations make an interval, and the laws.

Intervals join consecutive column stations of one network part by elevation, from the top down. Stations
nearer than the least thickness make none: the one with more visits stands for both.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from plumbwell.earth.shells import interval_density, slab_density
from plumbwell.reduction.effects import Anomalies, FreeAirChoice, KnownParts
from plumbwell.reduction.positions import Positions
from plumbwell.survey.column import Column, Index, Input, Law, Setting, computed, constant_column, frozen_index

SIDEWAYS = 5.0  # times the height difference: farther apart, the rock between is not under one another


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Pairs:
    """The stations that make intervals, from the top down.

    Parameters
    ----------
    top, base : (k,) int arrays
        Rows of the stations.
    joined : (k,) bool array
        False where they are farther apart sideways than five times their height difference.
    close : tuple of (int, int)
        Stations too near to one another: (the one that stands for both, the other).
    """

    top: Index
    base: Index
    joined: NDArray[np.bool_]
    close: tuple[tuple[int, int], ...]


def interval_pairs(
    positions: Positions, role: tuple[str, ...], part: Index, visits: Index, *, min_thickness: float
) -> Pairs:
    """The intervals of a survey.

    Parameters
    ----------
    positions : Positions
    role : tuple of str
    part : (s,) int array
        Network part of each station.
    visits : (s,) int array
        Number of visits of each station.
    min_thickness : float
        m; a whole nanometre is allowed for the rounding of depths.
    """
    elevation = positions.elevation.values
    column = np.flatnonzero(np.array([one == "column" for one in role]) & np.isfinite(elevation))
    arranged = column[np.argsort(-elevation[column], kind="stable")]
    kept: dict[int, list[int]] = {}
    close: list[tuple[int, int]] = []
    heights, parts, counts = elevation.tolist(), part.tolist(), visits.tolist()
    for station in arranged.tolist():
        chain = kept.setdefault(parts[station], [])
        if chain and heights[chain[-1]] - heights[station] < min_thickness - 1e-9:
            if counts[station] > counts[chain[-1]]:
                close.append((station, chain[-1]))
                chain[-1] = station
            else:
                close.append((chain[-1], station))
        else:
            chain.append(station)
    pairs = [pair for chain in kept.values() for pair in zip(chain[:-1], chain[1:], strict=True)]
    pairs.sort(key=lambda pair: -heights[pair[0]])
    top = np.array([pair[0] for pair in pairs], dtype=np.intp)
    base = np.array([pair[1] for pair in pairs], dtype=np.intp)
    east, north = positions.east.values, positions.north.values
    apart = np.hypot(east[base] - east[top], north[base] - north[top])
    return Pairs(
        top=frozen_index(top),
        base=frozen_index(base),
        joined=apart <= SIDEWAYS * (elevation[top] - elevation[base]),
        close=tuple(close),
    )


def _where_joined(joined: Any, value: Any) -> Any:
    return np.where(np.asarray(joined) > 0.0, value, np.nan)


THICKNESS = Law(
    "vertical thickness",
    "elevation of the top less elevation of the base",
    "definition",
    lambda top_elevation, base_elevation: top_elevation - base_elevation,
)
GRADIENT = Law(
    "gradient",
    "change of gravity, less that of normal gravity on the ellipsoid, over thickness",
    "definition",
    lambda top_gravity, base_gravity, top_normal, base_normal, thickness: (
        (base_gravity - base_normal) - (top_gravity - top_normal)
    )
    / thickness,
)
DENSITY = Law(
    "interval density",
    "3 (delta_t r_t2 - delta_b r_b2)/[4 pi G (r_t3 - r_b3)]; none where the stations stand far apart sideways",
    "shell theorem: d(delta r2)/dr = 4 pi G rho r2",
    lambda top_disturbance, base_disturbance, top_radius, base_radius, joined: _where_joined(
        joined,
        interval_density(
            top_anomaly=top_disturbance, base_anomaly=base_disturbance, top_radius=top_radius, base_radius=base_radius
        ),
    ),
)
SLAB_DENSITY = Law(
    "slab density",
    "(F - gradient)/(4 pi G)",
    "Hammer 1950, Geophysics 15, 637-652; Smith 1950, Geophysics 15, 605-636",
    lambda gradient, free_air_gradient, joined: _where_joined(
        joined, slab_density(gradient=gradient, free_air_gradient=free_air_gradient)
    ),
)
LESS_LOG = Law(
    "density less log",
    "interval density - log density",
    "definition",
    lambda density, log_density: density - log_density,
)


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class IntervalDensities:
    """Densities of all intervals, (k,) each.

    Parameters
    ----------
    pairs : Pairs
    thickness : Column, m
    gradient : Column, s-2
    density, slab : Column, kg/m3
    """

    pairs: Pairs
    thickness: Column
    gradient: Column
    density: Column
    slab: Column


def interval_densities(
    pairs: Pairs,
    gravity: Column,
    positions: Positions,
    parts: KnownParts,
    left: Anomalies,
    choice: FreeAirChoice,
) -> IntervalDensities:
    """Shell and slab densities of the intervals.

    Parameters
    ----------
    pairs : Pairs
    gravity : Column, (s,), m/s2
    positions : Positions
    parts : KnownParts
    left : Anomalies
    choice : FreeAirChoice
    """
    top, base = pairs.top, pairs.base

    def ends(name: str, of: Column) -> tuple[Input, Input]:
        return Input(f"top_{name}", of, top), Input(f"base_{name}", of, base)

    joined = Input("joined", constant_column("joined", "", pairs.joined))
    thickness = computed("thickness", "m", THICKNESS, *ends("elevation", positions.elevation))
    gradient = computed(
        "gradient", "1/s2", GRADIENT, *ends("gravity", gravity), *ends("normal", parts.normal_gravity),
        Input("thickness", thickness),
    )
    free_air = Setting(key="free_air_gradient", value=choice.gradient, unit="1/s2", origin="at the collar")
    return IntervalDensities(
        pairs=pairs,
        thickness=thickness,
        gradient=gradient,
        density=computed(
            "density", "kg/m3", DENSITY, *ends("disturbance", left.disturbance), *ends("radius", parts.radius), joined
        ),
        slab=computed(
            "density_slab", "kg/m3", SLAB_DENSITY, Input("gradient", gradient),
            Input("free_air_gradient", free_air), joined,
        ),
    )
