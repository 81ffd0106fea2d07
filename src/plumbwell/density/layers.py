"""Layered density from interval densities by generalised least squares, on boundaries that may lie anywhere.

Elevations are positive upward, lists run from the top down. An interval's density in the shell form is
the mean of the rock it crosses, weighted by volume, exactly: so layers and intervals are bound by linear
equations, and the sd of a layer follows from the covariance of the intervals. It holds the boundaries
fixed: a layer with a boundary that is no station is named conditional.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from plumbwell.earth.shells import difference_of_cubes
from plumbwell.survey.column import Array, Column, Index, Input, Weighing, frozen, weighed
from plumbwell.survey.errors import NumericalError

SLIVER = 1e-6
"""m; boundaries nearer to each other, or to a station, than this are one."""

MOST_TOGETHER = 3000
"""Up to this many intervals are solved together with their whole covariance."""

ESTIMABLE = 1.0 - 1e-12
"""Resolution from which a layer is told apart from all others; below it no density is given."""

RIDGES = (0.0, 1e-12, 1e-9, 1e-6)
"""Shares of its own variance added to each interval, until the covariance is regular, in finding weights."""


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Layers:
    """A layered density profile, (m,) each, from the top down.

    Parameters
    ----------
    top, base : (m,), m
        Elevations of the boundaries.
    density, sd : (m,), kg/m3
        NaN where no data reach, or where the data cannot tell the layer from its neighbours.
    covariance : callable
        Makes the (m, m) covariance, (kg/m3)2; NaN in the rows and columns of such layers.
    resolution : (m,)
        Diagonal of the resolution matrix of the solution of least norm: 1 for every layer with a density,
        less where layers cannot be told apart, 0 where no data reach.
    conditional : (m,) bool array
        True where a boundary is no end of an interval, so that the sd rests on a boundary held fixed.
    residual : (n,), kg/m3
        Interval density less what the layers give; NaN for intervals without a density.
    misfit : float
        Weighted sum of squares of the residuals.
    dof : int
        Intervals with a density less the rank of their equations.
    weights : callable
        `weights(layer)` returns the (n,) weights of the interval densities in that layer's density.
    """

    top: Array
    base: Array
    density: Array
    sd: Array
    covariance: Callable[[], Array]
    resolution: Array
    conditional: NDArray[np.bool_]
    residual: Array
    misfit: float
    dof: int
    weights: Callable[[int], Array]


def volume_shares(*, tops: Array, bases: Array, boundaries: Array, radius: float) -> Array:
    """Share of each interval's volume that each layer holds, (n, m).

    Parameters
    ----------
    tops, bases : (n,), m
        Elevations of the ends of the intervals.
    boundaries : (m + 1,), m
        Elevations, descending.
    radius : float, m
        R0, the radius at elevation 0.

    Notes
    -----
    share = (r_u^3 - r_l^3)/(r_t^3 - r_b^3), u and l the ends of the overlap, r = R0 + elevation. Where an
    interval reaches beyond the outermost boundaries its shares sum to less than one.
    """
    upper = np.minimum(tops[:, None], boundaries[None, :-1])
    lower = np.maximum(bases[:, None], boundaries[None, 1:])
    thickness = upper - lower
    volume = np.where(thickness > SLIVER, difference_of_cubes(radius + upper, radius + lower), 0.0)
    return volume / difference_of_cubes(radius + tops, radius + bases)[:, None]


def plain_layers(
    *,
    tops: Array,
    bases: Array,
    density: Array,
    variance: Array,
    covariance: Callable[[], Array],
    boundaries: Array,
    radius: float,
) -> Layers:
    """Densities of layers by generalised least squares of interval densities.

    Parameters
    ----------
    tops, bases : (n,), m
        Elevations of the ends of the intervals, in any order; they may overlap and leave gaps.
    density : (n,), kg/m3
        NaN: an interval without one.
    variance : (n,), (kg/m3)2
        Diagonal of the covariance.
    covariance : callable
        Makes the (n, n) covariance, (kg/m3)2; not called where the layers are the intervals.
        Of the independent errors; it may be singular, or zero (then all intervals count alike).
    boundaries : (m + 1,), m
        Elevations, descending.
    radius : float, m
        R0, the radius at elevation 0.

    Raises
    ------
    ValueError
        Boundaries that do not descend, or fewer than two.

    Notes
    -----
    x = (W^T C^-1 W)^-1 W^T C^-1 rho, W the volume shares. Where the layers are the intervals nothing is
    solved. Layers that the data cannot tell apart (two boundaries within one interval) get no density; the
    others keep theirs, for what can be told does not depend on what cannot. Intervals that reach beyond
    the outermost boundaries say nothing about the layers and are passed over. Beyond 3000 intervals each
    group that shares layers is weighted by its variances alone; the sd is that of the weights used all
    the same.
    """
    if len(boundaries) < 2 or np.any(np.diff(boundaries) >= 0.0):
        raise ValueError("layers need two or more boundaries, descending")
    tops, bases, density = (np.asarray(one, dtype=np.float64) for one in (tops, bases, density))
    boundaries = np.asarray(boundaries, dtype=np.float64)
    inside = (tops <= boundaries[0] + SLIVER) & (bases >= boundaries[-1] - SLIVER)
    given = np.flatnonzero(np.isfinite(density) & np.isfinite(variance) & inside)
    number = len(boundaries) - 1
    # Layers that each interval crosses: the first and the last, by the boundaries within it.
    first = np.searchsorted(-boundaries, -tops[given] + SLIVER, side="right") - 1
    last = np.searchsorted(-boundaries, -bases[given] - SLIVER, side="left") - 1
    if np.array_equal(first, last) and bool((np.diff(np.sort(first)) > 0).all()):
        return _alike(given, first, tops, bases, density, variance, covariance, boundaries)
    whole_covariance = covariance()
    resolution, groups = np.zeros(number), []
    for rows in _groups(first, last):
        layers = np.arange(first[rows].min(), last[rows].max() + 1)
        shares = volume_shares(
            tops=tops[given[rows]],
            bases=bases[given[rows]],
            boundaries=boundaries[layers[0] : layers[-1] + 2],
            radius=radius,
        )
        basis, resolution[layers] = _row_space(shares)
        groups.append(_Group(rows=given[rows], layers=layers, basis=basis, equations=shares @ basis))
    dof = len(given) - sum(group.basis.shape[1] for group in groups)
    whole = len(given) <= MOST_TOGETHER
    if whole:
        groups = [_together(groups, number)]
    residual, values, misfit = np.full(len(density), np.nan), np.zeros(number), 0.0
    weight = np.zeros((number, len(density)))
    for group in groups:
        rows = group.rows
        noise = whole_covariance[np.ix_(rows, rows)] if whole else variance[rows]
        estimator, whiten = _estimator(group.equations, noise)
        told = estimator @ density[rows]
        values[group.layers] = group.basis @ told
        weight[np.ix_(group.layers, rows)] = group.basis @ estimator
        residual[rows] = density[rows] - group.equations @ told
        misfit += float(np.sum(whiten(residual[rows]) ** 2))
    spread = weight[:, given] @ whole_covariance[np.ix_(given, given)] @ weight[:, given].T
    unknown = resolution < ESTIMABLE
    resolution[~unknown] = 1.0
    values[unknown], spread[unknown, :], spread[:, unknown], weight[unknown] = (np.nan,) * 4
    return _layers(
        boundaries,
        values,
        np.diagonal(spread),
        lambda: spread,
        resolution,
        _ends(tops, bases, boundaries),
        residual,
        misfit=misfit,
        dof=dof,
        weights=lambda layer: weight[layer],
    )


def _alike(
    given: Index,
    layer: Index,
    tops: Array,
    bases: Array,
    density: Array,
    variance: Array,
    covariance: Callable[[], Array],
    boundaries: Array,
) -> Layers:
    """Layers that hold one interval each: they take its density, and nothing is solved."""
    number = len(boundaries) - 1
    values, resolution, source = np.full(number, np.nan), np.zeros(number), np.full(number, -1, dtype=np.intp)
    values[layer], resolution[layer], source[layer] = density[given], 1.0, given
    of_layer = np.full(number, np.nan)
    of_layer[layer] = variance[given]

    def spread() -> Array:
        whole = np.full((number, number), np.nan)
        whole[np.ix_(layer, layer)] = covariance()[np.ix_(given, given)]
        return whole

    residual = np.full(len(density), np.nan)
    residual[given] = 0.0

    def weights(one: int) -> Array:
        if source[one] < 0:
            return np.full(len(density), np.nan)
        row = np.zeros(len(density))
        row[source[one]] = 1.0
        return row

    conditional = _ends(tops, bases, boundaries)
    return _layers(
        boundaries, values, of_layer, spread, resolution, conditional, residual, misfit=0.0, dof=0, weights=weights
    )


def _layers(
    boundaries: Array,
    values: Array,
    variance: Array,
    covariance: Callable[[], Array],
    resolution: Array,
    conditional: NDArray[np.bool_],
    residual: Array,
    *,
    misfit: float,
    dof: int,
    weights: Callable[[int], Array],
) -> Layers:
    conditional.flags.writeable = False
    return Layers(
        top=frozen(boundaries[:-1]),
        base=frozen(boundaries[1:]),
        density=frozen(values),
        sd=frozen(np.sqrt(np.maximum(variance, 0.0))),
        covariance=covariance,
        resolution=frozen(resolution),
        conditional=conditional,
        residual=frozen(residual),
        misfit=misfit,
        dof=dof,
        weights=weights,
    )


def _ends(tops: Array, bases: Array, boundaries: Array) -> NDArray[np.bool_]:
    """True for each layer that has a boundary at which no interval ends."""
    ends = np.sort(np.concatenate([tops, bases]))
    at = np.searchsorted(ends, boundaries)
    near = np.minimum(
        np.abs(ends[np.minimum(at, len(ends) - 1)] - boundaries),
        np.abs(ends[np.maximum(at - 1, 0)] - boundaries),
    )
    free = near > SLIVER
    return free[:-1] | free[1:]


def _groups(first: Index, last: Index) -> list[Index]:
    """Runs of intervals that share layers, as row numbers; neighbours in a run are bound to each other."""
    order = np.argsort(first, kind="stable")
    reached = np.maximum.accumulate(last[order])
    cut = np.flatnonzero(first[order][1:] > reached[:-1]) + 1
    return np.split(order, cut)


def _row_space(shares: Array) -> tuple[Array, Array]:
    """Orthonormal basis of the layer densities that data can tell, and the resolution of each layer."""
    _, size, across = np.linalg.svd(shares, full_matrices=False)
    told = across[size > size[0] * 1e-11].T
    return told, np.sum(told * told, axis=1)


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class _Group:
    """Intervals that share layers: their rows, the layers (k), what can be told (k, r), and its equations."""

    rows: Index
    layers: Index
    basis: Array
    equations: Array


def _together(groups: list[_Group], number: int) -> _Group:
    """All groups as one, with all layers."""
    rows = np.concatenate([group.rows for group in groups])
    rank = sum(group.basis.shape[1] for group in groups)
    basis, equations = np.zeros((number, rank)), np.zeros((len(rows), rank))
    row = column = 0
    for group in groups:
        lower, right = row + len(group.rows), column + group.basis.shape[1]
        basis[group.layers, column:right] = group.basis
        equations[row:lower, column:right] = group.equations
        row, column = lower, right
    return _Group(rows=rows, layers=np.arange(number), basis=basis, equations=equations)


def _estimator(equations: Array, noise: Array) -> tuple[Array, Callable[[Array], Array]]:
    """Best linear unbiased estimator (r, n) for equations (n, r) of full rank, and what whitens errors.

    Parameters
    ----------
    equations : (n, r)
    noise : (n, n) or (n,)
        Covariance, or variances of independent errors. Where it is zero throughout all errors are alike.
    """
    variances = noise if noise.ndim == 1 else np.diagonal(noise)
    size = np.sqrt(np.maximum(variances, 0.0))
    size = np.maximum(size, 1e-6 * size.max()) if size.any() else np.ones(len(size))
    scaled = equations / size[:, None]
    if noise.ndim == 1 or not variances.any():
        basis, triangle = np.linalg.qr(scaled)
        return np.linalg.solve(triangle, basis.T) / size, lambda errors: errors / size
    root = _root(noise / np.outer(size, size))
    basis, triangle = np.linalg.qr(np.linalg.solve(root, scaled))
    # (L^-T Q)^T needs only r right-hand sides, where Q^T L^-1 would need n.
    estimator = np.linalg.solve(triangle, np.linalg.solve(root.T, basis).T) / size
    return estimator, lambda errors: np.linalg.solve(root, errors / size)


def _root(correlation: Array) -> Array:
    """Triangular root of a matrix of correlations, made regular by a trace of independent noise."""
    for ridge in RIDGES:
        try:
            return np.asarray(np.linalg.cholesky(correlation + ridge * np.eye(len(correlation))))
        except np.linalg.LinAlgError:
            continue
    raise NumericalError(
        "the covariance of the interval densities is none: some sum of them has a negative variance"
    )


def layer_density(layers: Layers, interval_density: Column) -> Column:
    """The layers' densities as a column that is weighed from the interval densities.

    Parameters
    ----------
    layers : Layers
    interval_density : Column, (n,), kg/m3
        The densities that the layers were estimated from.
    """
    weighing = Weighing(
        "layer density",
        "(W^T C^-1 W)^-1 W^T C^-1 rho, W the share of each interval's volume in each layer",
        "generalised least squares; Aitken 1935",
        lambda row: (layers.weights(row),),
    )
    return weighed("layer_density", "kg/m3", layers.density, weighing, Input("density", interval_density))
