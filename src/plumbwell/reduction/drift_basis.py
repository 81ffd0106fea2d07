"""Drift of the instrument over time: what a reading may hold of it, whatever order is chosen.

Time counts from the run's first used reading and is scaled by the run's length. A tare counts from the first reading at
or after its time.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np

from plumbwell.reduction.visits import Visits
from plumbwell.survey.column import Array, Index, frozen, frozen_index
from plumbwell.survey.instrument import Instrument, Tare

HIGHEST_ORDER = 3


@dataclass(frozen=True, slots=True, kw_only=True)
class DriftUnknown:
    """One unknown of the border.

    Parameters
    ----------
    kind : str
        "bias", "drift", "tare", "walk", or "gravity" of a station of very many runs.
    run : int
        Code of its run, -1 for gravity.
    power : int
        Of drift; number of the mode of a walk, from 1.
    tare, station : int
        Number of the tare, of the station.
    """

    kind: str
    run: int
    power: int = 0
    tare: int = -1
    station: int = -1


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class DriftBasis:
    """The regressors of drift and tares at every row, whatever order is chosen.

    Parameters
    ----------
    run : (n,) int array
        Run code of each row.
    utc : (n,) array
        s since 2000-01-01.
    start, length : arrays by run code
        First used reading of each run and time to its last, s; length 1 where it is 0 or unknown.
    tares : tuple of Tare
        Those that lie inside their run, others are left out.
    tare_run : (m,) int array
    rate, rate_sd : arrays by run code
        Expected drift rate and its sd, m/s3, of the run's instrument.
    made : dict
        What was derived from this basis before, by all that it was derived with: designs ask for no reading, so
        that a change of the readings' values finds them again.
    """

    run: Index
    utc: Array
    start: Array
    length: Array
    tares: tuple[Tare, ...]
    tare_run: Index
    rate: Array
    rate_sd: Array
    made: dict[Any, Any] = field(default_factory=dict, repr=False)

    def time(self, rows: Index) -> Array:
        """Time since the run's first used reading over the run's length, one a row."""
        run = self.run[rows]
        return (self.utc[rows] - self.start[run]) / self.length[run]

    def jumps(self, rows: Index, tare: int) -> Array:
        """1 for rows of the tare's run at or after it, else 0."""
        after = self.utc[rows] >= self.tares[tare].time
        return np.where(after & (self.run[rows] == self.tare_run[tare]), 1.0, 0.0)

    def held(self, rows: Index, orders: tuple[int, ...]) -> Array:
        """Drift that is known: the expected rate of runs of order 0, and tares of stated size, m/s2."""
        zero = np.array([order == 0 for order in orders])
        run = self.run[rows]
        drift = np.where(zero[run], self.rate[run] * (self.utc[rows] - self.start[run]), 0.0)
        for number, tare in enumerate(self.tares):
            if tare.size is not None and tare.size_sd is None:
                drift = drift + tare.size * self.jumps(rows, number)
        return drift


def drift_basis(
    utc: Array,
    run: Index,
    run_names: tuple[str, ...],
    visits: Visits,
    tares: tuple[Tare, ...],
    run_instrument: tuple[Instrument, ...],
) -> DriftBasis:
    """The drift basis of a survey; tares outside the used readings of their run are left out."""
    codes = {name: code for code, name in enumerate(run_names)}
    start, end = visits.run_start, visits.run_start + visits.run_length
    inside = [
        (codes[tare.run], tare)
        for tare in tares
        if tare.run in codes and start[codes[tare.run]] < tare.time <= end[codes[tare.run]]
    ]
    length = np.where(visits.run_length > 0.0, visits.run_length, 1.0)
    return DriftBasis(
        run=run,
        utc=utc,
        start=frozen(np.nan_to_num(visits.run_start)),
        length=frozen(np.nan_to_num(length, nan=1.0)),
        tares=tuple(tare for _, tare in inside),
        tare_run=frozen_index([code for code, _ in inside]),
        rate=frozen([one.drift_rate for one in run_instrument]),
        rate_sd=frozen([one.drift_rate_sd for one in run_instrument]),
    )


def regressor(basis: DriftBasis, unknown: DriftUnknown, rows: Index) -> Array:
    """Value of the regressor of a bias, a power of drift or a tare at the given rows, (n,)."""
    if unknown.kind == "tare":
        return basis.jumps(rows, unknown.tare)
    mine = basis.run[rows] == unknown.run
    return np.where(mine, 1.0 if unknown.kind == "bias" else basis.time(rows) ** unknown.power, 0.0)
