"""What one more term would explain in a solved network, without solving it anew: a higher drift order, a jump.

The weights stay those of the solution. With h the regressor of the term over the visits, z = h^T W r its gradient and
N = h^T (W - W A C A^T W) h what the other unknowns leave of it, the term is z/N and the weighted sum of squares falls
by z^2/N (Searle, Casella & McCulloch 1992). A term of one run meets only stations and unknowns of that run and of those
that share a station with it, so that all runs are tested in the time of few solutions.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from plumbwell.reduction.checked import visit_means
from plumbwell.reduction.drift_basis import HIGHEST_ORDER, DriftBasis
from plumbwell.reduction.run_terms import RunTerms
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
    one, runs = terms.solution.design, terms.layout.runs
    time = basis.time(visits.rows)
    powers = visit_means(weight, np.column_stack([time**2, time**3]), visits.start)
    gradient, left, own = terms.normal(powers, terms.rate_prior(basis.length[runs]))
    orders = np.array(one.orders)[runs]
    found = {}
    scale = 1.0 / np.sqrt(np.where(own > 0.0, own, 1.0))
    both = left * scale[:, :, None] * scale[:, None, :]
    smallest = np.linalg.eigvalsh(both)[:, 0]
    for number, run in enumerate(runs.tolist()):
        next_one = third = 0.0
        if orders[number] == 1:
            if both[number, 0, 0] > TOLD:
                next_one = float(gradient[number, 0] ** 2 / left[number, 0, 0])
            if smallest[number] > TOLD:
                third = float(gradient[number] @ np.linalg.solve(left[number], gradient[number]))
        elif orders[number] == HIGHEST_ORDER - 1 and both[number, 1, 1] > TOLD:
            next_one = third = float(gradient[number, 1] ** 2 / left[number, 1, 1])
        found[run] = (next_one, third)
    return found


def jumps(terms: RunTerms, visits: Visits) -> list[Jumps]:
    """Jumps of unknown size in every gap between neighbouring visits of a run."""
    solution, layout = terms.solution, terms.layout
    total = np.append(solution.border.total, np.inf)
    weight = solution.weight
    later = _later_of_group(layout.pair_of, weight)
    step = (2.0 * later * weight + weight**2) / total[solution.design.local]
    # A gap without length is none: which of the readings came first is not known.
    latest = np.full(len(visits), -np.inf)
    found = []
    for number, group in enumerate(layout.groups):
        rows, inverse = terms.rows(number)
        of_visits = terms.of_visits(np.column_stack([weight, weight * solution.residual[:, 0], step]), number)
        # From the end of the run: what all visits after the gap have together.
        after = np.cumsum((of_visits[:, :, :1] * rows)[:, ::-1], axis=1)[:, ::-1]
        sums = np.cumsum(of_visits[:, ::-1], axis=1)[:, ::-1]
        own, gradient, at_stations = sums[:, :, 0], sums[:, :, 1], sums[:, :, 2]
        left = own - at_stations - np.einsum("gnu,guv,gnv->gn", after, inverse, after, optimize=True)
        for place, run in enumerate(layout.runs[group.runs].tolist()):
            members = group.visits[place][group.visits[place] < len(visits)]
            if len(members) < 2:
                continue
            latest[members] = np.maximum.accumulate(visits.last[members])
            gap = visits.first[members[1:]] > latest[members[:-1]]
            gaps = slice(1, len(members))
            told = (left[place, gaps] > TOLD * own[place, gaps]) & gap
            safe = np.where(told, left[place, gaps], 1.0)
            z = gradient[place, gaps]
            found.append(
                Jumps(
                    run=run,
                    visit=members[1:],
                    size=np.where(told, z / safe, np.nan),
                    sd=np.where(told, 1.0 / np.sqrt(safe), np.nan),
                    gain=np.where(told, z**2 / safe, 0.0),
                )
            )
    return sorted(found, key=lambda each: int(each.visit[0]))


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
