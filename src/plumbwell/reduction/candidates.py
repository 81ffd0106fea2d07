"""What one more term would explain in a solved network, without solving it anew: a higher drift order, a jump.

The weights stay those of the solution. With h the regressor of the term over the visits, z = h^T W r its gradient and
N = h^T (W - W A C A^T W) h what the other unknowns leave of it, the term is z/N and the weighted sum of squares falls
by z^2/N (Searle, Casella & McCulloch 1992). A term of one run meets only stations and unknowns of that run and of those
that share a station with it, so that all runs are tested in the time of few solutions.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from plumbwell.reduction.banded import summed
from plumbwell.reduction.checked import visit_means
from plumbwell.reduction.drift_basis import HIGHEST_ORDER, DriftBasis
from plumbwell.reduction.network import Solution
from plumbwell.reduction.visits import Visits
from plumbwell.survey.column import Array, Index

TOLD = 1e-8
"""Share of a term that the other unknowns have to leave for it to be told from them."""


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Jumps:
    """Jumps between neighbouring visits of one run, in time order, (g,) each.

    Parameters
    ----------
    run : int
    visit : int array
        The visit after the gap.
    size, sd : arrays, m/s2
        NaN where nothing tells the jump.
    gain : array
        Fall of the weighted sum of squares; 0 where nothing tells the jump.
    """

    run: int
    visit: Index
    size: Array
    sd: Array
    gain: Array


class RunTerms:
    """The visits of each run with what they put on the border, the stations following.

    Parameters
    ----------
    solution : Solution
    """

    def __init__(self, solution: Solution) -> None:
        self.solution = solution
        one = solution.design
        count = np.bincount(one.touched_station, minlength=one.n_stations)
        self._begin = np.cumsum(count) - count
        self._count = count
        self._edges = np.flatnonzero(np.diff(one.run, prepend=-1, append=-1)).tolist()
        self._inverse = solution.factor.inverse
        self._found: dict[int, tuple[Index, Array, Array]] = {}

    def runs(self) -> list[tuple[int, Index]]:
        """Code of each run and its visits, in time order."""
        one = self.solution.design
        return [
            (int(one.run[start]), np.arange(start, end))
            for start, end in zip(self._edges[:-1], self._edges[1:], strict=True)
        ]

    def rows(self, visits: Index) -> tuple[Index, Array, Array]:
        """Border unknowns that the visits of one run and their stations touch, (u,), the visits' rows less their
        stations' mean, (m, u), and the inverse there, (u, u)."""
        key = int(visits[0])
        if key not in self._found:
            self._found[key] = self._rows(visits)
        return self._found[key]

    def _rows(self, visits: Index) -> tuple[Index, Array, Array]:
        one, solution = self.solution.design, self.solution
        stations = one.station[visits]
        mine = np.unique(stations[one.in_border[stations] < 0])
        many = self._count[mine]
        at = np.repeat(self._begin[mine] - (np.cumsum(many) - many), many) + np.arange(int(many.sum()))
        own = one.of_run[one.run[visits[0]]]
        own = own[own >= 0]
        based = one.in_border[stations]
        unknowns = np.unique(np.concatenate([own, one.touched_unknown[at], based[based >= 0]]))
        place_of = np.searchsorted(unknowns, one.touched_unknown[at])
        mean = np.zeros((len(mine) + 1, len(unknowns)))
        mean[np.repeat(np.arange(len(mine)), many), place_of] = solution.border.mean[at]
        of_station = np.where(based >= 0, len(mine), np.searchsorted(mine, stations))
        rows = -mean[of_station]
        slots = one.of_run[one.run[visits[0]]]
        filled = np.flatnonzero(slots >= 0)
        rows[:, np.searchsorted(unknowns, slots[filled])] += one.slot_value[visits][:, filled]
        at_base = np.flatnonzero(based >= 0)
        rows[at_base, np.searchsorted(unknowns, based[at_base])] += 1.0
        place = one.layout.place(unknowns[:, None], unknowns[None, :])
        if (place >= 0).all():
            return unknowns, rows, self._inverse[place]
        picked = np.zeros((one.size, len(unknowns)))
        picked[unknowns, np.arange(len(unknowns))] = 1.0
        return unknowns, rows, solution.factor.solve(picked)[unknowns]


def more_drift(
    terms: RunTerms, basis: DriftBasis, visits: Visits, weight: Array
) -> dict[int, tuple[float, float]]:
    """What the next drift order of each run would explain, and the third: falls of the weighted sum of squares.

    Parameters
    ----------
    terms : RunTerms
        Of the solution.
    basis, visits
    weight : (u,) array
        Share of each reading in its visit's mean.

    Returns
    -------
    dict of run code to (float, float)
        0 where the order cannot be told or is the highest.
    """
    solution, one = terms.solution, terms.solution.design
    time = basis.time(visits.rows)
    powers = visit_means(weight, np.column_stack([time**2, time**3]), visits.start)
    found = {}
    for run, members in terms.runs():
        order = one.orders[run]
        if not 0 < order < HIGHEST_ORDER:
            found[run] = (0.0, 0.0)
            continue
        columns = powers[members][:, order - 1 :]
        gradient, left, own = normal(
            solution, terms, members, columns, held_by=f"drift rate of run {run}", length=float(basis.length[run])
        )
        next_one = float(gradient[0] ** 2 / left[0, 0]) if left[0, 0] > TOLD * own[0] else 0.0
        scale = 1.0 / np.sqrt(own)
        told = np.linalg.eigvalsh(left * scale[:, None] * scale)[0] > TOLD
        found[run] = (next_one, float(gradient @ np.linalg.solve(left, gradient)) if told else 0.0)
    return found


def normal(
    solution: Solution, terms: RunTerms, members: Index, columns: Array, *, held_by: str = "", length: float = 1.0
) -> tuple[Array, Array, Array]:
    """Gradient (k,), what the other unknowns leave (k, k), and the columns' own squares (k,).

    `held_by` names a prior of the run's mean rate that holds the new terms too, powers of time over its length.
    """
    one = solution.design
    weight = solution.weight[members]
    weighted = weight[:, None] * columns
    unknowns, rows, inverse = terms.rows(members)
    at, where = np.unique(one.local[members], return_inverse=True)
    at_station = np.column_stack([summed(where, column, len(at)) for column in weighted.T])
    total = np.append(solution.border.total, np.inf)[at]
    own = weighted.T @ columns
    on_border = rows.T @ weighted
    left = own - (at_station / total[:, None]).T @ at_station
    gradient = weighted.T @ solution.residual[members, 0]
    prior = one.priors.row_of(held_by)
    if prior >= 0:
        its = one.priors.row == prior
        factor = one.priors.factor[its] / one.priors.sd[prior]
        new = np.full(columns.shape[1], 1.0 / (length * one.priors.sd[prior]))
        off = one.priors.value[prior] / one.priors.sd[prior] - factor @ solution.unknown[one.priors.unknown[its], 0]
        on_border[np.searchsorted(unknowns, one.priors.unknown[its])] += factor[:, None] * new
        left = left + new[:, None] * new
        gradient = gradient + new * off
    return gradient, left - on_border.T @ inverse @ on_border, np.diagonal(own)


def jumps(terms: RunTerms, visits: Visits) -> list[Jumps]:
    """Jumps of unknown size in every gap between neighbouring visits of a run."""
    solution, one = terms.solution, terms.solution.design
    total = np.append(solution.border.total, np.inf)
    found = []
    for run, members in terms.runs():
        if len(members) < 2:
            continue
        weight = solution.weight[members]
        _, rows, inverse = terms.rows(members)
        weighted = weight[:, None] * rows
        # From the end of the run: what all visits after the gap have together.
        after = np.cumsum(weighted[::-1], axis=0)[::-1][1:]
        gradient = np.cumsum((weight * solution.residual[members, 0])[::-1])[::-1][1:]
        own = np.cumsum(weight[::-1])[::-1][1:]
        station = one.local[members]
        later = _later_of_group(station, weight)
        step = (2.0 * later * weight + weight**2) / total[station]
        at_stations = np.cumsum(step[::-1])[::-1][1:]
        left = own - at_stations - np.einsum("gu,uv,gv->g", after, inverse, after)
        # A gap without length is none: which of the readings came first is not known.
        gap = visits.first[members[1:]] > np.maximum.accumulate(visits.last[members])[:-1]
        told = (left > TOLD * own) & gap
        safe = np.where(told, left, 1.0)
        found.append(
            Jumps(
                run=run,
                visit=members[1:],
                size=np.where(told, gradient / safe, np.nan),
                sd=np.where(told, 1.0 / np.sqrt(safe), np.nan),
                gain=np.where(told, gradient**2 / safe, 0.0),
            )
        )
    return found


def _later_of_group(group: Index, weight: Array) -> Array:
    """Summed weight of the later elements of each element's group, (n,)."""
    order = np.argsort(group, kind="stable")[::-1]
    sorted_weight, sorted_group = weight[order], group[order]
    running = np.cumsum(sorted_weight)
    first = np.concatenate([[True], sorted_group[1:] != sorted_group[:-1]])
    start = np.maximum.accumulate(np.where(first, np.arange(len(group)), 0))
    before = running - sorted_weight - (running[start] - sorted_weight[start])
    later = np.empty(len(group))
    later[order] = before
    return later
