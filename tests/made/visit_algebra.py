"""The visits of a survey by dense algebra: their design, their covariance, and the restricted likelihood.

Designs and covariances are built anew from plain rows; which rows make a visit is taken from the result under test.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from made_surveys import Row
from plumbwell.reduction.adjustment import Adjustment

Array = NDArray[np.float64]


@dataclass
class VisitAlgebra:
    """Visits by dense algebra.

    Parameters
    ----------
    mean : (v, n) array
        Takes weighted means of the rows over each visit.
    design : (v, u) array
        Stations, biases and drift.
    values : (v,) array
        Visit means, m/s2.
    past, run : (n,) arrays
        Time since the run's first row, s; number of the run.
    """

    mean: Array
    design: Array
    values: Array
    past: Array
    run: Array

    def kernel(self) -> Array:
        """Covariance of the visits by an integrated random walk of strength 1 in each run."""
        first, second = np.meshgrid(self.past, self.past, indexing="ij")
        least, most = np.minimum(first, second), np.maximum(first, second)
        whole = least**2 * (3.0 * most - least) / 6.0 * (self.run[:, None] == self.run)
        return self.mean @ whole @ self.mean.T

    def log_likelihood(self, covariance: Array) -> float:
        """-1/2 (log det V + log det X^T V^-1 X + y^T P y), X replaced by an orthonormal basis of its columns.

        In units of 1e-8 m/s2.
        """
        columns = self.design / np.linalg.norm(self.design, axis=0)
        vectors, size, _ = np.linalg.svd(columns, full_matrices=False)
        basis = vectors[:, size > 1e-9 * size[0]]
        covariance, values = covariance * 1e16, self.values * 1e8
        solved = np.linalg.solve(covariance, np.column_stack([basis, values]))
        normal = basis.T @ solved[:, :-1]
        off = values - basis @ np.linalg.solve(normal, basis.T @ solved[:, -1])
        return -0.5 * float(
            np.linalg.slogdet(covariance)[1] + np.linalg.slogdet(normal)[1] + off @ np.linalg.solve(covariance, off)
        )


def visit_algebra(rows: list[Row], adjustment: Adjustment, *, orders: dict[str, int]) -> VisitAlgebra:
    """The visits of used rows; tares and rows out of use are not meant."""
    visits = adjustment.visits
    mean = np.zeros((len(visits), len(rows)))
    mean[visits.of_row[visits.rows], visits.rows] = 1.0 / adjustment.noise.sd**2
    mean /= mean.sum(axis=1)[:, None]
    names = list(dict.fromkeys(row.run for row in rows))
    run = np.array([names.index(row.run) for row in rows])
    time = np.array([row.time for row in rows])
    start = np.array([time[run == number].min() for number in range(len(names))])
    length = np.array([np.ptp(time[run == number]) for number in range(len(names))])
    past = time - start[run]
    columns = [[row.station == name for row in rows] for name in dict.fromkeys(row.station for row in rows)]
    for number, name in enumerate(names):
        columns += [(run == number) * (past / length[number]) ** power for power in range(orders[name] + 1)]
    return VisitAlgebra(
        mean=mean,
        design=mean @ np.array(columns, dtype=float).T,
        values=mean @ np.array([row.reading for row in rows]),
        past=past,
        run=run.astype(float),
    )


def walk_of(past: Array, strength: float, chance: np.random.Generator) -> Array:
    """One integrated random walk at the given times, by a root of its covariance."""
    unit = past.max()
    first, second = np.meshgrid(past / unit, past / unit, indexing="ij")
    least, most = np.minimum(first, second), np.maximum(first, second)
    values, vectors = np.linalg.eigh(least**2 * (3.0 * most - least) / 6.0)
    drawn = vectors @ (np.sqrt(np.maximum(values, 0.0)) * chance.standard_normal(len(past)))
    return strength * unit**1.5 * drawn
