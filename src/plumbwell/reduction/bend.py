"""How well the stops of a survey would tell a bent drift from gravity where the drift is taken as straight.

The adjusted network is asked what it would know of the quadratic term of every such run if all of them were free at
once. Nothing is estimated: times, stations and noise alone answer it. A pattern that cannot tell a bend keeps a
straight drift whatever the readings say, and no error of gravity counts the bend.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from plumbwell.reduction.adjustment import Adjustment
from plumbwell.reduction.banded import Factor, factored
from plumbwell.reduction.broken_visits import contrasts, unbroken_stretches
from plumbwell.reduction.checked import visit_means
from plumbwell.reduction.design import Design, Priors, at_times, design, with_priors
from plumbwell.reduction.drift_basis import DriftUnknown
from plumbwell.reduction.network import Border, normal_equations, on_border, solve
from plumbwell.survey.column import Array, Index, frozen, frozen_index

MOST_UNKNOWNS = 3000
"""Border unknowns with the quadratic terms, beyond which the question is not asked."""

OF_BEND = 6.0
"""Quadratic coefficient over the greatest departure from the best straight line: c (t2 - t + 1/6) from 0 to 1."""

LOOSE = 1000.0
"""Sd of a bend beforehand, in sds of a visit: what nothing tells at all stays within numbers."""


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Bends:
    """Bends of straight drifts, one a run, (k,) each; the bend is the greatest departure from the best straight line.

    Parameters
    ----------
    run : (k,) int array
        Run codes.
    sd : (k,) array
        Sd of the bend when all are free at once, m/s2; at most `LOOSE` sds of a visit.
    visit_sd : float
        Sd of a typical visit, m/s2.
    worst : int
        Place in `run` of the bend that is told worst.
    fit : Adjustment
        What was asked.
    design, border, factor
        Of the network with the bends among its unknowns.
    number : (k,) int array
        Their numbers among the border unknowns.
    """

    run: Index
    sd: Array
    visit_sd: float
    worst: int
    fit: Adjustment
    design: Design
    border: Border
    factor: Factor
    number: Index

    def moved(self, runs: Index) -> Array:
        """What bends of 1 m/s2 in some runs put into the gravity of each station while drift is straight, (s,), m/s2.

        Parameters
        ----------
        runs : int array
            Codes of the runs that are bent, all alike.
        """
        fit, basis = self.fit, self.fit.basis
        rows = fit.visits.rows
        time = basis.time(rows)
        bent = np.where(np.isin(basis.run[rows], runs), OF_BEND * (time**2 - time) + 1.0, 0.0)
        seen = visit_means(fit.noise.weight, bent, fit.visits.start)
        both = np.column_stack([np.zeros(len(seen)), seen])
        answer: Array = solve(fit.design, fit.solution.weight, both, fit.solution.ties).gravity[:, 1]
        return answer

    def with_return(self, run: int, station: int, utc: float) -> Array:
        """Sds of the bends, (k,), m/s2, were the station visited once more in that run at that time.

        Parameters
        ----------
        run, station : int
            Code of the run, number of the station; the station has been visited.
        utc : float
            s since 2000-01-01.
        """
        one, here = self.design, np.zeros(self.design.n_stations)
        here[station] = 1.0
        touched = on_border(one, self.border, here)
        own = one.of_run[run]
        value = at_times(self.fit.basis, one, np.array([run]), np.array([utc]))[0]
        touched[own[own >= 0]] += value[own >= 0]
        answer = self.factor.solve(touched)
        variance = self.visit_sd**2 + float(touched @ answer)
        if one.in_border[station] < 0:
            variance += 1.0 / float(self.border.total[station])
        told = (answer[self.number] / OF_BEND) ** 2 / variance
        left: Array = np.sqrt(np.maximum(self.sd**2 - told, 0.0))
        return left


def bends(fit: Adjustment, runs: tuple[int, ...]) -> Bends | None:
    """What the stops would tell of the bends of some runs; None where none can be asked for.

    Parameters
    ----------
    fit : Adjustment
        Without a walk.
    runs : tuple of int
        Codes of runs; those of another order than 1, or whose drift is held, are passed over.

    Notes
    -----
    With the quadratic term of each run among the border unknowns and M the border's normal matrix, the variance of each
    is its diagonal element of M^-1.
    """
    held = {one.run for one in (*fit.design.lost, *fit.design.dropped) if one.kind == "drift"}
    runs = tuple(run for run in runs if fit.orders[run] == 1 and run not in held)
    if not runs or fit.design.size + len(runs) > MOST_UNKNOWNS:
        return None
    orders = tuple(2 if run in set(runs) else order for run, order in enumerate(fit.orders))
    basis, visits, solution = fit.basis, fit.visits, fit.solution
    one = design(
        basis, visits, fit.noise.weight, n_stations=fit.design.n_stations, orders=orders, dropped=fit.design.dropped,
        lost=fit.design.lost,
    )
    unbroken = unbroken_stretches(basis, visits)
    if len(unbroken) > len(visits.start):
        zero = np.zeros(len(visits.rows))
        one = with_priors(one, contrasts(one, basis, visits, unbroken, zero, 1.0 / fit.noise.sd**2))
    number = np.array([one.position[DriftUnknown(kind="drift", run=run, power=2)] for run in runs])
    visit_sd = float(1.0 / np.sqrt(np.median(solution.weight)))
    one = with_priors(one, _loose(number, visit_sd))
    border = normal_equations(one, solution.weight, solution.ties)
    try:
        factor = factored(one.layout, border.matrix)
    except np.linalg.LinAlgError:
        return None  # weights too far apart for one unknown more: other findings tell of those
    variance = factor.inverse[one.layout.place(number, number)]
    return Bends(
        run=frozen_index(runs),
        sd=frozen(np.sqrt(variance) / OF_BEND),
        visit_sd=visit_sd,
        worst=int(np.argmax(variance)),
        fit=fit,
        design=one,
        border=border,
        factor=factor,
        number=number,
    )


def _loose(number: Index, visit_sd: float) -> Priors:
    count = len(number)
    return Priors(
        name=tuple(f"bend {n}" for n in range(count)),
        value=np.zeros(count),
        sd=np.full(count, LOOSE * OF_BEND * visit_sd),
        row=np.arange(count),
        unknown=number,
        factor=np.ones(count),
        run=np.full(count, -1),
    )
