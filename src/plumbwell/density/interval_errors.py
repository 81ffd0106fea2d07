"""Errors of interval densities: the independent ones by origin with their full covariance, the common ones by factor.

Two neighbouring intervals share a station, whose error moves them in opposite ways: their correlation is near
-1/2. What all intervals share (gradient, scale, depth scale, datum or ties) is one number a survey and one vector of
derivatives each, and is kept apart.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from plumbwell.density.chain_spread import ChainSpread
from plumbwell.density.interval import IntervalDensities
from plumbwell.earth.shells import interval_density_derivatives
from plumbwell.reduction.datums import StationGravity
from plumbwell.reduction.effects import Anomalies, KnownParts
from plumbwell.reduction.spread import Spread
from plumbwell.reduction.wide_spread import Sums
from plumbwell.survey.column import Array, Column, Index, Input, Law, computed, constant_column


def _followers(top: Index, base: Index) -> Index:
    at = {station: number for number, station in enumerate(top.tolist())}
    return np.array([at.get(station, -1) for station in base.tolist()], dtype=np.intp)


def through(spread: Spread, pairs: Sums, follower: Index) -> ChainSpread:
    """The covariance of quantities that answer so to errors of their two stations."""
    return ChainSpread(terms=((spread, pairs),), follower=follower)


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class AlongHole:
    """What an error of a station's depth moves, (s,) each.

    Parameters
    ----------
    sd : array
        Of the station's own depth, m along the hole; of its elevation where that is stated.
    depth : array
        Measured depth of the sensor, m: how far a change of the depth scale by 1 moves it; 0 at surveyed places.
    cosine : array
        Drop per m of it.
    pull : array
        Increase of normal gravity by the change of latitude, per m of it, s-2.
    """

    sd: Array
    depth: Array
    cosine: Array
    pull: Array


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class CommonTerms:
    """Sds of what all intervals share.

    Parameters
    ----------
    gradient_sd : float
        Of the free-air gradient, s-2.
    scale_sd : tuple of (str, float)
        Instrument and relative sd of its scale, in the order of `StationGravity.responses`.
    depth_scale_sd : float
        Relative sd of the depth scale.
    datum_sd : float
        Of the absolute level of parts without a tie, m/s2.
    """

    gradient_sd: float
    scale_sd: tuple[tuple[str, float], ...]
    depth_scale_sd: float
    datum_sd: float


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class IntervalErrors:
    """Errors of interval densities.

    Parameters
    ----------
    parts : dict of str to ChainSpread
        Independent errors by origin: "reading", "drift", "tare", "depth"; (kg/m3)2.
    independent : ChainSpread
        Their sum.
    factors : dict of str to (k,) array
        Answer of each density to one sd of each common factor, kg/m3.
    part_sd : dict of str to Column
    density_sd, common_sd : Column, kg/m3
    """

    parts: dict[str, ChainSpread]
    independent: ChainSpread
    factors: dict[str, Array]
    part_sd: dict[str, Column]
    density_sd: Column
    common_sd: Column

    def common_covariance(self) -> Array:
        """Covariance of the common part, (k, k), (kg/m3)2."""
        columns = np.column_stack(list(self.factors.values()))
        return columns @ columns.T


ROOT_OF_SQUARES = Law(
    "standard deviation",
    "square root of the sum of the squares of its parts",
    "independent errors add in variance",
    lambda **parts: np.sqrt(sum(np.square(part) for part in parts.values())),
)


def interval_errors(
    densities: IntervalDensities,
    gravity: StationGravity,
    parts: KnownParts,
    left: Anomalies,
    *,
    elevation: Array,
    collar_elevation: float,
    along: AlongHole,
    common: CommonTerms,
) -> IntervalErrors:
    """Errors of the interval densities by origin.

    Parameters
    ----------
    densities : IntervalDensities
    gravity : StationGravity
    parts : KnownParts
    left : Anomalies
    elevation : (s,) array
        m above sea level.
    collar_elevation : float
    along : AlongHole
    common : CommonTerms
    """
    pairs = densities.pairs
    top, base = pairs.top, pairs.base
    by_top, by_base, by_top_height, by_base_height = interval_density_derivatives(
        top_anomaly=left.disturbance.values[top],
        base_anomaly=left.disturbance.values[base],
        top_radius=parts.radius.values[top],
        base_radius=parts.radius.values[base],
        top_gradient=parts.free_air_gradient.values[top],
        base_gradient=parts.free_air_gradient.values[base],
    )
    follower = _followers(top, base)

    answers = Sums(first=top, second=base, by_first=by_top, by_second=by_base)

    # Down the hole a station goes lower, and in a deviated one to another latitude; its gravity stays.
    top_down = by_top_height * along.cosine[top] + by_top * along.pull[top]
    base_down = by_base_height * along.cosine[base] + by_base * along.pull[base]
    depths = Spread(diagonal=along.sd**2, columns=np.zeros((len(elevation), 0)), signs=np.zeros(0))
    spreads = {
        "reading": through(gravity.reading, answers, follower),
        "drift": through(gravity.drift, answers, follower),
        "tare": through(gravity.tare, answers, follower),
        "depth": through(depths, replace(answers, by_first=top_down, by_second=base_down), follower),
    }

    def shared(change: Array) -> Array:
        return by_top * change[top] + by_base * change[base]

    tied = gravity.datum < 0
    above_collar = elevation - collar_elevation
    datum_height = np.where(tied, 0.0, above_collar[np.maximum(gravity.datum, 0)])
    factors = {"gradient": common.gradient_sd * shared(above_collar - datum_height)}
    for number, (name, sd) in enumerate(common.scale_sd):
        factors[f"scale {name}"] = sd * shared(gravity.responses[:, number])
    if common.depth_scale_sd > 0.0:
        moved = top_down * along.depth[top] + base_down * along.depth[base]
        factors["depth scale"] = -common.depth_scale_sd * moved
    if not tied.all():
        factors["datum"] = common.datum_sd * shared(np.where(tied, 0.0, 1.0))
    for number in range(gravity.ties.shape[1]):
        factors[f"tie {number + 1}"] = shared(gravity.ties[:, number])
    known = np.where(np.isnan(densities.density.values), np.nan, 1.0)
    part_sd = {
        name: constant_column(f"density_sd_{name}", "kg/m3", known * np.sqrt(spread.variance()))
        for name, spread in spreads.items()
    }
    common_columns = [constant_column(name, "kg/m3", known * np.abs(one)) for name, one in factors.items()]
    independent = spreads["reading"] + spreads["drift"] + spreads["tare"] + spreads["depth"]
    return IntervalErrors(
        parts=spreads,
        independent=independent,
        factors=factors,
        part_sd=part_sd,
        density_sd=computed(
            "density_sd", "kg/m3", ROOT_OF_SQUARES, *(Input(name, one) for name, one in part_sd.items())
        ),
        common_sd=computed(
            "density_common_sd", "kg/m3", ROOT_OF_SQUARES,
            *(Input(name, one) for name, one in zip(factors, common_columns, strict=True)),
        ),
    )
