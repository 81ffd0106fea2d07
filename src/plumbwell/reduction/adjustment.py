"""The adjusted network: what it rests on, what it found, and what it leaves at every reading."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from plumbwell.reduction.checked import Checked
from plumbwell.reduction.design import Design
from plumbwell.reduction.drift_basis import DriftBasis, DriftUnknown
from plumbwell.reduction.drift_order import OrderTest
from plumbwell.reduction.network import Rank, Solution
from plumbwell.reduction.variances import ReadingNoise, Reseating
from plumbwell.reduction.visits import Visits
from plumbwell.reduction.walk import WalkFit
from plumbwell.survey.column import Array


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class NoiseTerms:
    """What the instruments state about noise, one a row of the readings, m/s2.

    Parameters
    ----------
    reading_sd : (n,) array
        NaN where none is stated.
    reading_floor, reseating_sd, station_floor : (n,) arrays
    estimate : bool
        False: as given.
    """

    reading_sd: Array
    reading_floor: Array
    reseating_sd: Array
    station_floor: Array
    estimate: bool


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Adjustment:
    """The adjusted network before its datum is set.

    Parameters
    ----------
    basis, visits, design, solution, noise, reseating
        What the fit rests on.
    rank : Rank
        What the visits alone determine.
    tests : tuple of OrderTest
    walk : WalkFit or None
    walk_tried : bool
        False where the walk was not asked for, or the degrees of freedom are too few for it.
    likelihood : float
        Logarithm of the restricted likelihood of the visits.
    held : (n,) array
        Known drift of each row, m/s2.
    visit_mean : (v,) array
        Visit means of the observations less known drift.
    station_floor : (s,) array
        m/s2.
    border_drift : (n,) array
        Drift and tares of each row from the border unknowns, run bias left out, m/s2.
    checked : Checked
    """

    basis: DriftBasis
    visits: Visits
    design: Design
    solution: Solution
    noise: ReadingNoise
    reseating: Reseating
    rank: Rank
    tests: tuple[OrderTest, ...]
    walk: WalkFit | None
    walk_tried: bool
    likelihood: float
    held: Array
    visit_mean: Array
    station_floor: Array
    border_drift: Array
    checked: Checked

    @property
    def orders(self) -> tuple[int, ...]:
        """Drift order by run code."""
        return self.design.orders

    @property
    def visit_effect(self) -> Array:
        """See `Checked`."""
        return self.checked.visit_effect

    @property
    def residual(self) -> Array:
        """See `Checked`."""
        return self.checked.residual

    @property
    def standardised(self) -> Array:
        """See `Checked`."""
        return self.checked.standardised

    @property
    def redundancy(self) -> Array:
        """See `Checked`."""
        return self.checked.redundancy

    @property
    def misfit(self) -> float:
        """Weighted sum of squares of the visits' residuals, and of what a walk of the drift had to move."""
        priors = self.solution.design.priors
        moved = (priors.of(self.solution.unknown[:, 0]) - priors.value) / priors.sd
        of_walk = np.array([name.startswith("walk ") for name in priors.name], dtype=bool)
        return self.solution.sum_of_squares() + float(np.sum(moved[of_walk] ** 2))

    def unknown(self, wanted: DriftUnknown) -> tuple[float, float]:
        """Estimate and sd of a border unknown (drift per power of scaled time); 0, 0 when it is held at 0."""
        number = self.design.position.get(wanted)
        if number is None:
            return 0.0, 0.0
        variance = self.solution.unknown_variance(np.array([number]))
        return float(self.solution.unknown[number, 0]), float(np.sqrt(variance[0]))


def run_bias(basis: DriftBasis, one: Design, unknown: Array) -> Array:
    """Bias by run code, m/s2; 0 where it is held."""
    bias = np.zeros(len(basis.start))
    for number, what in enumerate(one.unknowns):
        if what.kind == "bias":
            bias[what.run] = unknown[number]
    return bias
