"""The design of the network: which unknowns each reading touches.

A reading touches one station, the bias of its run, the drift polynomial of its run at its time
(0 at the run's first used reading, scaled by the run's length) and the tares before it. Visit means are
the observations; a visit's row of the design is the weighted mean of its readings' rows.
"""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from typing import Any

import numpy as np

from plumbwell.reduction.visits import Visits
from plumbwell.survey.column import Array, Index, frozen, frozen_index
from plumbwell.survey.instrument import Instrument, Tare

HIGHEST_ORDER = 3


@dataclass(frozen=True, slots=True, kw_only=True)
class DriftUnknown:
    """One unknown of the border: kind "bias", "drift" or "tare", its run code, power or number of the tare."""

    kind: str
    run: int
    power: int = 0
    tare: int = -1


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

    def table(self, rows: Index) -> Array:
        """Every regressor that any order could use at the given rows, (4 + m, n): powers 0 to 3 of time, m jumps."""
        time = self.time(rows)
        powers = [np.ones(len(rows)), time, time * time, time * time * time]
        return np.array(powers + [self.jumps(rows, one) for one in range(len(self.tares))])

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
    rows = visits.rows
    inside = []
    for tare in tares:
        code = run_names.index(tare.run) if tare.run in run_names else -1
        times = utc[rows][run[rows] == code]
        if times.size and times.min() < tare.time <= times.max():
            inside.append((code, tare))
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


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Prior:
    """A pseudo-observation of border unknowns: sum of factor times unknown = value +- sd."""

    name: str
    unknowns: Index
    factors: Array
    value: float
    sd: float


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Design:
    """The design of one choice of drift orders, in coordinate form.

    Parameters
    ----------
    unknowns : tuple of DriftUnknown
        The border unknowns that are solved for.
    orders : tuple of int by run code
    n_stations : int
    station : (v,) int array
        Station of each visit.
    of_run : (runs, k) int array by run code
        Border unknowns of each run, filled up with -1.
    table_row : (q + 1,) int array
        Row of `DriftBasis.table` that each unknown multiplies; the last stands for none.
    entry_visit, entry_unknown, entry_value : (e,) arrays
        Non-zero elements of the visits' rows in the border.
    pair_visit, pair_flat, pair_value : (p,) arrays
        Products of two elements of one visit, and where they add in the flattened border matrix.
    entry_flat : (e,) int array
        Where each element adds in the flattened (station, border) matrix.
    priors : tuple of Prior
    prior_matrix, prior_side : (q, q), (q,) arrays
        What the priors add to the border's normal matrix and right-hand side.
    dropped : tuple of DriftUnknown
        Constants that the datum of a network part makes superfluous: held at 0.
    lost : tuple of DriftUnknown
        Unknowns that the visits and priors cannot determine: held at 0.
    """

    unknowns: tuple[DriftUnknown, ...]
    orders: tuple[int, ...]
    n_stations: int
    station: Index
    of_run: Index
    table_row: Index
    entry_visit: Index
    entry_unknown: Index
    entry_value: Array
    entry_flat: Index
    pair_visit: Index
    pair_flat: Index
    pair_value: Array
    priors: tuple[Prior, ...]
    prior_matrix: Array
    prior_side: Array
    dropped: tuple[DriftUnknown, ...]
    lost: tuple[DriftUnknown, ...]

    @property
    def size(self) -> int:
        """Number of border unknowns."""
        return len(self.unknowns)


def regressor(basis: DriftBasis, unknown: DriftUnknown, rows: Index) -> Array:
    """Value of one border unknown's regressor at the given rows."""
    if unknown.kind == "tare":
        return basis.jumps(rows, unknown.tare)
    mine = basis.run[rows] == unknown.run
    if unknown.kind == "bias":
        return np.where(mine, 1.0, 0.0)
    return np.where(mine, basis.time(rows) ** unknown.power, 0.0)


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class VisitRegressors:
    """Weighted visit means of every regressor that any order could use.

    Parameters
    ----------
    table : (4 + m, v) array
        Ones, means of time, its square and cube within the run, and the share of each visit's weight at or
        after each of m tares.
    """

    table: Array


def visit_regressors(basis: DriftBasis, visits: Visits, row_weight: Array) -> VisitRegressors:
    """Visit means of the regressors; `row_weight` (u,) sums to 1 within each visit, in the order of `visits.rows`."""
    means = np.add.reduceat(row_weight * basis.table(visits.rows), visits.start[:-1], axis=1)
    means[0] = 1.0
    return VisitRegressors(table=frozen(means))


def design(
    basis: DriftBasis,
    visits: Visits,
    regressors: VisitRegressors,
    *,
    n_stations: int,
    orders: tuple[int, ...],
    dropped: tuple[DriftUnknown, ...],
    lost: tuple[DriftUnknown, ...] = (),
) -> Design:
    """The design for given drift orders.

    Parameters
    ----------
    basis, visits, regressors
        From `drift_basis`, `visits.visits`, `visit_regressors`.
    n_stations : int
    orders : tuple of int by run code
        Runs without used readings are ignored.
    dropped, lost : tuples of DriftUnknown
        Constants and undetermined unknowns that are held at 0.
    """
    away = {*dropped, *lost}
    unknowns = tuple(one for one in _all_unknowns(basis, visits, orders) if one not in away)
    size = len(unknowns)
    by_run: dict[int, list[int]] = {}
    for number, one in enumerate(unknowns):
        by_run.setdefault(one.run, []).append(number)
    # For each run its unknowns and their rows in the table of regressors, filled up with none.
    most = max((len(numbers) for numbers in by_run.values()), default=0)
    number_of = np.full((len(basis.start), most), -1, dtype=np.intp)
    for run, numbers in by_run.items():
        number_of[run, : len(numbers)] = numbers
    tare_rows = HIGHEST_ORDER + 1
    row_of = np.array([tare_rows + one.tare if one.kind == "tare" else one.power for one in unknowns] + [0])
    unknown = number_of[visits.run]
    value = regressors.table[row_of[unknown], np.arange(len(visits))[:, None]]
    present = unknown >= 0
    visit = np.nonzero(present)[0]
    first, second = unknown[:, :, None], unknown[:, None, :]
    both = (first >= 0) & (second >= 0)
    pair_visit = np.nonzero(both)[0]
    pair_flat = (first * size + second)[both]
    pair_value = (value[:, :, None] * value[:, None, :])[both]
    unknown, value = unknown[present], value[present]
    none = Design(
        unknowns=unknowns,
        orders=orders,
        n_stations=n_stations,
        station=visits.station,
        of_run=number_of,
        table_row=row_of,
        entry_visit=visit,
        entry_unknown=unknown,
        entry_value=value,
        entry_flat=visits.station[visit] * size + unknown,
        pair_visit=pair_visit,
        pair_flat=pair_flat,
        pair_value=pair_value,
        priors=(),
        prior_matrix=np.zeros((size, size)),
        prior_side=np.zeros(size),
        dropped=dropped,
        lost=lost,
    )
    return with_priors(none, _priors(basis, unknowns))


def with_priors(one: Design, priors: tuple[Prior, ...]) -> Design:
    """The design with more pseudo-observations of its border unknowns."""
    matrix, side = one.prior_matrix.copy(), one.prior_side.copy()
    for prior in priors:
        factors = prior.factors / prior.sd
        matrix[prior.unknowns[:, None], prior.unknowns] += factors[:, None] * factors
        side[prior.unknowns] += factors * (prior.value / prior.sd)
    return replace(one, priors=one.priors + priors, prior_matrix=matrix, prior_side=side)


def _all_unknowns(basis: DriftBasis, visits: Visits, orders: tuple[int, ...]) -> list[DriftUnknown]:
    everything: list[DriftUnknown] = []
    for run in visits.run_order.tolist():
        everything.append(DriftUnknown(kind="bias", run=run))
        everything.extend(DriftUnknown(kind="drift", run=run, power=p) for p in range(1, orders[run] + 1))
    for number, tare in enumerate(basis.tares):
        if tare.size is None or tare.size_sd is not None:
            everything.append(DriftUnknown(kind="tare", run=int(basis.tare_run[number]), tare=number))
    return everything


def _priors(basis: DriftBasis, unknowns: tuple[DriftUnknown, ...]) -> tuple[Prior, ...]:
    """Mean drift rate of each run of order 1 or more, and the tares whose size is stated with an sd."""
    priors = []
    drifts: dict[int, list[int]] = {}
    for number, one in enumerate(unknowns):
        if one.kind == "drift":
            drifts.setdefault(one.run, []).append(number)
        elif one.kind == "tare" and basis.tares[one.tare].size is not None:
            tare = basis.tares[one.tare]
            priors.append(
                Prior(
                    name=f"tare {one.tare}",
                    unknowns=frozen_index([number]),
                    factors=frozen([1.0]),
                    value=float(tare.size),  # type: ignore[arg-type]
                    sd=float(tare.size_sd),  # type: ignore[arg-type]
                )
            )
    for run, numbers in drifts.items():
        if basis.rate_sd[run] < np.inf:
            # The mean rate is the drift at the run's last used reading (scaled time 1) over its length.
            priors.append(
                Prior(
                    name=f"drift rate of run {run}",
                    unknowns=frozen_index(numbers),
                    factors=frozen(np.full(len(numbers), 1.0 / basis.length[run])),
                    value=float(basis.rate[run]),
                    sd=float(basis.rate_sd[run]),
                )
            )
    return tuple(priors)
