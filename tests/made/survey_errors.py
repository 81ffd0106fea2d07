"""What reductions of simulated surveys miss the truth by, against what they say and against the best estimate."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from plumbwell.study.reduce import reduce
from plumbwell.study.results import Results
from simulated_surveys import Scheme, Simulated, best_estimate, simulated


@dataclass(frozen=True, eq=False, kw_only=True)
class Missed:
    """One reduced survey: errors of its interval densities and the errors of the best estimate, kg/m3.

    Parameters
    ----------
    one : Simulated
    results : Results
    error, sd : (k,) arrays
        Density less truth; what the results say of it.
    best_error, best_sd : (k,) arrays
        The same of the best estimate.
    """

    one: Simulated
    results: Results
    error: NDArray[np.float64]
    sd: NDArray[np.float64]
    best_error: NDArray[np.float64]
    best_sd: NDArray[np.float64]

    @property
    def scaled(self) -> NDArray[np.float64]:
        """Errors over their sds, (k,)."""
        return self.error / self.sd


def missed(one: Simulated) -> Missed:
    """A simulated survey reduced with its own recipe."""
    results = reduce(one.case)
    best = best_estimate(one)
    intervals = results.intervals
    assert len(intervals) == len(one.density), "each pair of neighbours makes one interval"
    return Missed(
        one=one,
        results=results,
        error=intervals.density.values - one.density,
        sd=intervals.density_sd.values,
        best_error=best.density - one.density,
        best_sd=np.sqrt(np.diag(best.covariance)),
    )


def all_missed(scheme: Scheme, seeds: Iterable[int], **more: Any) -> list[Missed]:
    """Surveys of one scheme, one a seed; `more` goes to `simulated`."""
    return [missed(simulated(scheme, seed, **more)) for seed in seeds]


def scaled_rms(found: Sequence[Missed]) -> float:
    """Root mean square of errors over their sds, all intervals of all surveys: 1 where errors are honest."""
    return float(np.sqrt(np.mean(np.concatenate([one.scaled for one in found]) ** 2)))


def whole_chi_square(found: Sequence[Missed]) -> float:
    """Mean over surveys of e^T C^-1 e/k times (nu - 2)/nu: 1 on average where C is the covariance up to a factor
    that nu degrees of freedom tell (the mean of F with k and nu is nu/(nu - 2))."""
    values = []
    for one in found:
        nu = one.results.intervals.dof
        covariance = one.results.intervals.errors.independent.matrix()
        square = one.error @ np.linalg.solve(covariance, one.error)
        values.append(square / len(one.error) * (nu - 2.0) / nu)
    return float(np.mean(values))


def covered(found: Sequence[Missed], *, level: float = 0.95) -> float:
    """Share of all intervals whose truth lies within Student's limits of their own degrees of freedom."""
    from scipy.special import stdtrit

    inside = [np.abs(one.scaled) <= stdtrit(one.results.intervals.dof, (1.0 + level) / 2.0) for one in found]
    return float(np.mean(np.concatenate(inside)))


def over_best(found: Sequence[Missed]) -> float:
    """Root mean square error over that of the best estimate, each interval in units of its best sd.

    The unit lets thin intervals, whose densities err most, count no more than thick ones.
    """
    ours = np.concatenate([one.error / one.best_sd for one in found])
    best = np.concatenate([one.best_error / one.best_sd for one in found])
    return float(np.sqrt(np.sum(ours**2) / np.sum(best**2)))


def over_other(found: Sequence[Missed], other: Sequence[Missed]) -> float:
    """Root mean square error over that of other reductions with the same noise, in units of their best sds."""
    ours = np.concatenate([one.error / two.best_sd for one, two in zip(found, other, strict=True)])
    theirs = np.concatenate([one.error / one.best_sd for one in other])
    return float(np.sqrt(np.sum(ours**2) / np.sum(theirs**2)))


def orders_too_high(found: Sequence[Missed], order: int) -> float:
    """Share of all runs whose drift order is above the true one."""
    return float(np.mean([one > order for survey in found for one in survey.results.network.adjustment.orders]))
