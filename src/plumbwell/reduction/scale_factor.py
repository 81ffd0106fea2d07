"""The instrument's scale factor, estimated from ties: through the stations whose gravity is known, and nothing else.

Were the readings themselves multiplied in the adjustment, their misfit would be least at a scale of nothing. So the
gravity found at the stations takes their place: within one instrument any scale of it is a change of the stations, and
only ties tell it, and other instruments that read the same stations.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from plumbwell.reduction.adjustment import Adjustment
from plumbwell.reduction.checked import visit_means
from plumbwell.reduction.network import solve
from plumbwell.survey.column import Array, Index

TOLD = 1e-6
"""Relative sd over which a scale is not told: no calibration is as poor as a thousand of it."""

WORST = 0.1


@dataclass(frozen=True, slots=True, kw_only=True)
class ScaleEstimate:
    """Factor on what an instrument's scale is stated to be, and its sd; `told` False where no ties bound it."""

    instrument: int
    factor: float
    sd: float
    told: bool


@dataclass(frozen=True, slots=True, kw_only=True)
class ScaleTold:
    """Scale of an instrument that was asked to be estimated, and its sd; `told` False where no ties bound it."""

    instrument: str
    scale: float
    sd: float
    told: bool


def scale_estimates(
    fit: Adjustment, gravity: Array, *, instrument: Index, station: Index, n_instruments: int
) -> tuple[ScaleEstimate, ...]:
    """Correction of each instrument's scale, one step of it.

    Parameters
    ----------
    fit : Adjustment
        With ties.
    gravity : (s,) array
        Of the stations, m/s2.
    instrument, station : (n,) int arrays
        Of each row; station -1 for none.
    n_instruments : int

    Notes
    -----
    With c the gravity of each visit's station where the instrument read it, P what the network and the ties leave of
    the weights, the correction is -c^T P y / c^T P c, several instruments together; it is taken again until it is none,
    for c follows it.
    """
    visits, solution = fit.visits, fit.solution
    rows = visits.rows
    level = gravity - np.mean(gravity[np.unique(visits.station)])
    used = np.unique(instrument[rows])
    columns = np.column_stack(
        [
            visit_means(
                fit.noise.weight, np.where(instrument[rows] == one, level[station[rows]], 0.0), visits.start
            )
            for one in used.tolist()
        ]
    )
    answers = solve(
        solution.design, solution.weight, np.column_stack([np.zeros(len(visits)), columns]), solution.ties
    ).residual[:, 1:]
    normal = columns.T @ (solution.weight[:, None] * answers)
    side = (solution.weight * solution.residual[:, 0]) @ columns
    values, vectors = np.linalg.eigh(normal)
    bounded = values > 1.0 / WORST**2
    spread = vectors[:, bounded] / values[bounded] @ vectors[:, bounded].T
    step, open_ = -(spread @ side), (vectors[:, ~bounded] ** 2).sum(axis=1)
    found = {}
    for number, one in enumerate(used.tolist()):
        told = bool(open_[number] < TOLD)
        found[one] = ScaleEstimate(
            instrument=one,
            factor=1.0 + float(step[number]) if told else 1.0,
            sd=float(np.sqrt(spread[number, number])) if told else 0.0,
            told=told,
        )
    nothing = (ScaleEstimate(instrument=one, factor=1.0, sd=0.0, told=False) for one in range(n_instruments))
    return tuple(found.get(one.instrument, one) for one in nothing)
