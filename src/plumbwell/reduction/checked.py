"""What the adjusted network leaves at every reading: visit effect, residual, its ratio to its sd, redundancy."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from plumbwell.reduction.drift_basis import DriftBasis
from plumbwell.reduction.network import Solution
from plumbwell.reduction.variances import ReadingNoise, Reseating
from plumbwell.reduction.visits import Visits
from plumbwell.survey.column import Array, Index

FEW_RUNS, FEW_UNKNOWNS = 12, 8
"""Runs beyond which, unknowns of a run up to which, all rows are worked through at once."""


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Checked:
    """Every row, (n,) each; NaN where it has no meaning.

    Parameters
    ----------
    visit_effect : array, m/s2
        NaN for unused rows.
    residual : array, m/s2
        Of unused rows the observation less its prediction.
    standardised : array
        Residual over its own sd, the variance components held; NaN for unused rows and where nothing checks.
    redundancy : array
        1 - d(A x)/dl of the whole estimate without visit effects; NaN for unused rows.
    error : array, m/s2
        What a gross error of the reading would be by all others, and NaN where nothing checks it.
    predicted : array, m2/s4
        Variance of what all others say of the reading, its own noise left out.
    """

    visit_effect: Array
    residual: Array
    standardised: Array
    redundancy: Array
    error: Array
    predicted: Array


def visit_means(weight: Array, values: Array, start: Index) -> Array:
    """Weighted means over visits of used rows' values, (u,) or (u, m).

    `weight` (u,) sums to 1 within a visit; `start` (v + 1,) marks where each visit starts.
    """
    shaped = weight if values.ndim == 1 else weight[:, None]
    return np.add.reduceat(shaped * values, start[:-1], axis=0)


def checked(
    level: Array,
    visits: Visits,
    solution: Solution,
    noise: ReadingNoise,
    seat: Reseating,
    basis: DriftBasis,
    station: Index,
) -> Checked:
    """What the network leaves at every row; `level` (n,) is the observation free of bias and drift.

    Notes
    -----
    With V the covariance of the readings, v their residuals before visit effects and Q that of v, the residual here is
    e^2 (V^-1 v), its variance e^4 (V^-1 Q V^-1), and an error of one reading is estimated by (V^-1 v) over the same
    element of V^-1 Q V^-1 (Baarda 1968; Teunissen 2000, for correlated observations).
    """
    n = len(level)
    effect, standardised, redundancy, error, predicted_variance = (np.full(n, np.nan) for _ in range(5))
    one, gravity = solution.design, solution.gravity[:, 0]
    predicted = np.where(station >= 0, gravity[np.maximum(station, 0)], np.nan)
    read = np.zeros(len(basis.start), dtype=bool)
    read[visits.run_order] = True
    residual = np.where(read[basis.run], level - predicted, np.nan)
    rows = visits.rows
    visit = np.repeat(np.arange(len(visits)), np.diff(visits.start))
    share = noise.weight
    # Regressors of the unknowns of each row's own run, z; their means over its visit; and what the border's
    # covariance makes of both.
    z = one.row_value
    z_mean = visit_means(share, z, visits.start)
    turned, turned_mean = np.empty_like(z), np.empty_like(z_mean)
    inverse, run = solution.factor.inverse, basis.run[rows]
    numbers = one.of_run
    both = (numbers >= 0)[:, :, None] & (numbers >= 0)[:, None, :]
    known = np.maximum(numbers, 0)
    place = one.layout.place(known[:, :, None], known[:, None, :])
    blocks = np.where(both, inverse[place] if one.size else 0.0, 0.0)
    if len(blocks) > FEW_RUNS and z.shape[1] <= FEW_UNKNOWNS:
        turned, turned_mean = (np.einsum("nk,nkl->nl", of, blocks[at]) for of, at in ((z, run), (z_mean, visits.run)))
    else:
        edges = np.flatnonzero(np.diff(run, prepend=-1, append=-1)).tolist()
        visit_edges = np.flatnonzero(np.diff(visits.run, prepend=-1, append=-1)).tolist()
        for turn, (start, end) in enumerate(zip(edges[:-1], edges[1:], strict=True)):
            mine = slice(visit_edges[turn], visit_edges[turn + 1])
            block = blocks[run[start]]
            turned[start:end], turned_mean[mine] = z[start:end] @ block, z_mean[mine] @ block
    base, cross = _with_station(solution)
    of_mean = np.einsum("vm,vm->v", z_mean, cross)
    own_fit = (
        np.einsum("rm,rm->r", turned_mean[visit], z)
        + np.einsum("rm,rm->r", z, cross[visit])
        + (of_mean + base)[visit]
    )
    fit = np.einsum("vm,vm->v", turned_mean, z_mean) + 2.0 * of_mean + base
    tilt = np.einsum("rm,rm->r", turned - turned_mean[visit], z - z_mean[visit])
    variance = noise.variance + seat.variance
    kept = seat.variance / variance
    effect[rows] = (kept * visit_means(share, residual[rows], visits.start))[visit]
    residual[rows] -= effect[rows]
    free = np.maximum(1.0 - fit / variance, 0.0)
    own = noise.sd**2
    fitted = (noise.variance - (1.0 - kept) ** 2 * variance * free)[visit] - tilt
    sd2 = own - fitted
    enough = sd2 > 1e-9 * noise.sd**2
    safe = np.where(enough, sd2, 1.0)
    standardised[rows] = np.where(enough, residual[rows] / np.sqrt(safe), np.nan)
    redundancy[rows] = 1.0 - own_fit * share / variance[visit]
    error[rows] = np.where(enough, residual[rows] * noise.sd**2 / safe, np.nan)
    predicted_variance[rows] = np.where(enough, own * fitted / safe, np.nan)
    return Checked(
        visit_effect=effect,
        residual=residual,
        standardised=standardised,
        redundancy=redundancy,
        error=error,
        predicted=predicted_variance,
    )


def _with_station(solution: Solution) -> tuple[Array, Array]:
    """Variance of each visit's station, (v,), and its covariance with the unknowns of the visit's run, (v, k)."""
    one = solution.design
    carried = solution.carried()
    base = solution.station_variance(carried)[one.station]
    cross = -np.append(carried[:-1], 0.0)[one.slot_at]
    based = np.flatnonzero(one.local == one.n_stations)
    if based.size:
        numbers = one.of_run_of_visit(based)
        place = one.layout.place(np.maximum(numbers, 0), one.in_border[one.station[based]][:, None])
        cross[based] = np.where(numbers >= 0, solution.factor.inverse[place], 0.0)
    return base, cross
