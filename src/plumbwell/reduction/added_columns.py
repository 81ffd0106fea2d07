"""What a few more border unknowns would leave of a solved network, without solving it anew.

The weights stay those of the solution. With many degrees of freedom one column more moves them by less than the
rounding of an F test, and a survey of hundreds of runs is tested in the time of one solution.
"""

from __future__ import annotations

import numpy as np

from plumbwell.reduction.design import Prior
from plumbwell.reduction.network import RANK_TOLERANCE, Solution
from plumbwell.survey.column import Array, Index


def sum_of_squares_with(
    solution: Solution, members: Index, columns: Array, *, prior: Prior | None, factors: Array
) -> float | None:
    """Weighted sum of squares of the visits when columns are added to the border; None where they add no rank.

    Parameters
    ----------
    solution : Solution
    members : (m,) int array
        The visits at which the columns are not 0.
    columns : (m, k) array
        The new regressors there.
    prior : Prior or None
        The prior of the run's mean rate, in which the new unknowns take part too.
    factors : (k,) array
        With these factors.

    Notes
    -----
    With R what the new columns put on the old unknowns, N on themselves and z their gradient at the solution,
    G = N - R^T M^-1 R and the new unknowns are G^-1 z; the old ones follow by -M^-1 R.
    """
    one = solution.design
    count, size = columns.shape[1], one.size
    weight, station = solution.weight[members], one.station[members]
    weighted = weight[:, None] * columns
    at_station = np.zeros((one.n_stations, count))
    np.add.at(at_station, station, weighted)
    mean = at_station / solution.total[:, None]
    dense = np.zeros((len(solution.weight), count))
    dense[members] = columns
    on_border = np.zeros((size, count))
    products = (solution.weight[one.entry_visit] * one.entry_value)[:, None] * dense[one.entry_visit]
    np.add.at(on_border, one.entry_unknown, products)
    on_border -= solution.mean.T @ at_station
    own = weighted.T @ columns
    plain = own - at_station.T @ mean
    normal = plain.copy()
    gradient = weighted.T @ solution.residual[members, 0]
    if prior is not None:
        left = prior.value - float(prior.factors @ solution.unknown[prior.unknowns, 0])
        on_border[prior.unknowns] += prior.factors[:, None] * factors[None, :] / prior.sd**2
        normal += factors[:, None] * factors[None, :] / prior.sd**2
        gradient = gradient + factors * (left / prior.sd**2)
    carried = solution.border @ on_border
    normal -= on_border.T @ carried
    scale = 1.0 / np.sqrt(np.diagonal(own))
    if np.linalg.eigvalsh(normal * scale[:, None] * scale[None, :])[0] < RANK_TOLERANCE:
        return None
    new = np.linalg.solve(normal, gradient)
    old = -carried @ new
    border = np.bincount(one.entry_visit, one.entry_value * old[one.entry_unknown], minlength=len(solution.weight))
    moved = -mean @ new - solution.mean @ old
    residual = solution.residual[:, 0] - dense @ new - border - moved[one.station]
    return float(solution.weight @ residual**2)

