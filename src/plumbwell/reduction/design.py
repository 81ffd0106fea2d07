"""The design of the network: which unknowns each reading touches.

A reading touches one station, the bias of its run, the drift polynomial of its run at its time
(0 at the run's first used reading, scaled by the run's length), the tares before it, and the modes of its random walk.
Visit means are the observations; a visit's row of the design is the weighted mean of its readings' rows.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from plumbwell.reduction.banded import ONE_BLOCK, Layout, layout, summed
from plumbwell.reduction.drift_basis import DriftBasis, DriftUnknown
from plumbwell.reduction.priors import NO_PRIORS, Priors
from plumbwell.reduction.visits import Visits
from plumbwell.reduction.walk_modes import mode_sds, walk_modes
from plumbwell.survey.column import Array, Index

NEAR = 12
"""Runs between two that share a station up to which no better order than that in time is looked for."""

MOST_RUNS = 30
"""Runs of a station beyond which its gravity stands in the border: eliminated it would join them all."""


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Pairs:
    """Products of two elements of one row, once for each place of the border matrix that they add to.

    Parameters
    ----------
    first, second : (p,) int arrays
        The elements.
    place : (p,) int array
        Where in the flat matrix.
    times : (p,) array
        2 where the product stands for both orders of its elements.
    """

    first: Index
    second: Index
    place: Index
    times: Array


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Design:
    """The design of one choice of drift orders, in coordinate form.

    Parameters
    ----------
    unknowns : tuple of DriftUnknown
        The border unknowns that are solved for: run by run, then the gravity of stations of very many runs.
    position : dict
        Number of each unknown.
    orders : tuple of int by run code
    modes : int
        Modes of the random walk in each run; 0 for none.
    n_stations : int
    station, run, readings : (v,) int arrays
        Station, run and number of used readings of each visit.
    local : (v,) int array
        The same, `n_stations` where the station's gravity stands in the border.
    in_border : (s,) int array
        Number of the unknown that is a station's gravity; -1 for the others, which are eliminated.
    of_run : (runs, k) int array by run code
        Border unknowns of each run, filled up with -1.
    layout : Layout
        Of the border matrix.
    entry_visit, entry_unknown, entry_value : (e,) arrays
        Non-zero elements of the visits' rows in the border.
    entry_at : (e,) int array
        Element of `touched_*` to which each adds; the number of those for visits at stations in the border.
    slot_at : (v, k) int array
        The same for each visit and place of `of_run`; the number of those where nothing is touched.
    slot_value : (v, k) array
        The visits' regressors in those places.
    row_value : (u, k) array
        The same of every used reading.
    pairs : Pairs
        Of the entries.
    pair_visit, pair_value : (p,) arrays
        Their visit and product.
    touched_station, touched_unknown : (t,) int arrays
        Which border unknowns the visits of each eliminated station touch, by station.
    touched_pairs : Pairs
    priors : Priors
    prior_matrix, prior_side : arrays
        What the priors add to the flat border matrix and to the right-hand side (q,).
    dropped : tuple of DriftUnknown
        Constants that the datum of a network part makes superfluous: held at 0.
    lost : tuple of DriftUnknown
        Unknowns that the visits and priors cannot determine: held at 0.
    kept_layouts : dict
        What else was derived from the same unknowns and visits, whatever the weights within visits.
    """

    unknowns: tuple[DriftUnknown, ...]
    position: dict[DriftUnknown, int]
    orders: tuple[int, ...]
    modes: int
    n_stations: int
    station: Index
    run: Index
    readings: Index
    local: Index
    in_border: Index
    of_run: Index
    layout: Layout
    entry_visit: Index
    entry_unknown: Index
    entry_value: Array
    entry_at: Index
    slot_at: Index
    slot_value: Array
    row_value: Array
    pairs: Pairs
    pair_visit: Index
    pair_value: Array
    touched_station: Index
    touched_unknown: Index
    touched_pairs: Pairs
    priors: Priors
    prior_matrix: Array
    prior_side: Array
    dropped: tuple[DriftUnknown, ...]
    lost: tuple[DriftUnknown, ...]
    kept_layouts: dict[str, Any]

    @property
    def size(self) -> int:
        """Number of border unknowns."""
        return len(self.unknowns)

    def rate_priors(self) -> Index:
        """Number of the prior of each run's mean drift rate, by run code; -1 where there is none."""
        found = np.full(len(self.of_run), -1)
        held = np.flatnonzero(self.priors.run >= 0)
        found[self.priors.run[held]] = held
        return found

    def run_of_unknown(self) -> Index:
        """Run code of each border unknown, (q,); -1 for gravity."""
        return np.array([one.run for one in self.unknowns], dtype=np.intp)

    def of_run_of_visit(self, visits: Index) -> Index:
        """Border unknowns of the runs of some visits, (m, k); -1 in places that none fills."""
        return self.of_run[self.run[visits]]

    def on_visits(self, unknown: Array) -> Array:
        """What border unknowns (q,) put on each visit, (v,)."""
        return summed(self.entry_visit, self.entry_value * unknown[self.entry_unknown], len(self.station))

    def prior_at_unit_weight(self, scale: Array) -> Array:
        """What the priors add to the flat border matrix when each counts as much as one visit."""
        one = self.priors
        norm = np.sqrt(summed(one.row, (one.factor * scale[one.unknown]) ** 2, len(one)))
        return _prior_matrix(self.layout, one, norm)


def at_times(basis: DriftBasis, one: Design, run: Index, utc: Array) -> Array:
    """Regressors of the border unknowns of some runs (n,) at some times (n,), (n, k), in the order of `of_run`."""
    return _regressors(basis, one.unknowns, one.of_run, run, utc)


def of_rows(basis: DriftBasis, one: Design, rows: Index) -> Array:
    """Regressors of the border unknowns of each row's own run, (n, k), in the order of `Design.of_run`."""
    return at_times(basis, one, basis.run[rows], basis.utc[rows])


def drift_of(basis: DriftBasis, one: Design, unknown: Array, rows: Index | None, *, bias: bool) -> Array:
    """What the border unknowns put on the given rows, with or without the bias of their run, m/s2.

    None: on the used rows, visit by visit.
    """
    kept = unknown if bias else np.where([what.kind == "bias" for what in one.unknowns], 0.0, unknown)
    of_run = np.where(one.of_run >= 0, np.append(kept, 0.0)[one.of_run], 0.0)
    if rows is None:
        visit_run = np.repeat(one.run, one.readings)
        return np.einsum("nk,nk->n", one.row_value, of_run[visit_run])
    return np.einsum("nk,nk->n", of_rows(basis, one, rows), of_run[basis.run[rows]])


def _regressors(
    basis: DriftBasis, unknowns: tuple[DriftUnknown, ...], of_run: Index, run: Index, utc: Array
) -> Array:
    """Values of the unknowns of each row's run at the row's time, (n, k); 0 in places that no unknown fills."""
    power = np.array([what.power if what.kind == "drift" else 0 for what in unknowns] + [0])
    jump = np.array([basis.tares[what.tare].time if what.kind == "tare" else np.nan for what in unknowns] + [np.nan])
    mode = np.array([what.power if what.kind == "walk" else 0 for what in unknowns] + [0])
    time = (utc - basis.start[run]) / basis.length[run]
    numbers = of_run[run]
    value = np.zeros(numbers.shape)
    shapes = walk_modes(time, int(mode.max())) * basis.length[run][:, None] ** 1.5 if mode.any() else None
    for slot in range(numbers.shape[1]):
        number, any_run = numbers[:, slot], of_run[:, slot]
        grown = np.ones(len(run))
        if power[any_run].any():
            grown = time ** power[number]
        if not np.isnan(jump[any_run]).all():
            grown = np.where(np.isnan(jump[number]), grown, utc >= jump[number])
        if shapes is not None and mode[any_run].any():
            wave = shapes[np.arange(len(run)), np.maximum(mode[number] - 1, 0)]
            grown = np.where(mode[number] > 0, wave, grown)
        value[:, slot] = np.where(number >= 0, grown, 0.0)
    return value


def design(
    basis: DriftBasis,
    visits: Visits,
    weight: Array,
    *,
    n_stations: int,
    orders: tuple[int, ...],
    dropped: tuple[DriftUnknown, ...],
    lost: tuple[DriftUnknown, ...] = (),
    modes: int = 0,
) -> Design:
    """The design for given drift orders.

    Parameters
    ----------
    basis, visits
        From `drift_basis`, `visits.visits`.
    weight : (u,) array
        Share of each reading in its visit's mean; sums to 1 within a visit.
    n_stations : int
    orders : tuple of int by run code
        Runs without used readings are ignored.
    dropped, lost : tuples of DriftUnknown
        Constants and undetermined unknowns that are held at 0.
    modes : int
        Modes of the random walk in every run that has a drift.
    """
    away = {*dropped, *lost}
    everything = _unknowns_of_runs(basis, visits, orders, modes)
    by_run = {run: [one for one in own if one not in away] for run, own in everything.items()}
    banded = sum(len(own) for own in by_run.values())
    bases = _stations_of_many_runs(visits, n_stations) if banded > ONE_BLOCK else np.zeros(0, dtype=np.intp)
    in_border = np.full(n_stations, -1)
    in_border[bases] = banded + np.arange(len(bases))
    local = np.where(in_border[visits.station] >= 0, n_stations, visits.station)
    order = list(by_run) if banded <= ONE_BLOCK else _run_order(visits, local, n_stations, by_run)
    unknowns = tuple(one for run in order for one in by_run[run]) + tuple(
        DriftUnknown(kind="gravity", run=-1, station=int(one)) for one in bases.tolist()
    )
    position = {one: number for number, one in enumerate(unknowns)}
    most = max((len(own) for own in by_run.values()), default=0)
    of_run = np.full((len(basis.start), most), -1, dtype=np.intp)
    for run, own in by_run.items():
        of_run[run, : len(own)] = [position[one] for one in own]
    row_value = _regressors(basis, unknowns, of_run, basis.run[visits.rows], basis.utc[visits.rows])
    numbers = of_run[visits.run]
    present = numbers >= 0
    entry_visit, entry_unknown = np.nonzero(present)[0], numbers[present]
    at_base = np.flatnonzero(local == n_stations)
    if at_base.size:
        entry_visit = np.concatenate([entry_visit, at_base])
        entry_unknown = np.concatenate([entry_unknown, in_border[visits.station[at_base]]])
    size = len(unknowns)
    key = local[entry_visit] * max(size, 1) + entry_unknown
    eliminated = local[entry_visit] < n_stations
    touched, entry_at = np.unique(key[eliminated], return_inverse=True)
    at = np.full(len(key), len(touched))
    at[eliminated] = entry_at
    touched_station, touched_unknown = np.divmod(touched, max(size, 1))
    slot_at = np.full(numbers.shape, len(touched))
    slot_at[present] = at[: np.count_nonzero(present)]
    sorting = np.argsort(entry_visit, kind="stable")
    first, second = _within(entry_visit[sorting])
    first, second = sorting[first], sorting[second]
    near_first, near_second = _within(touched_station)
    apart = np.abs(touched_unknown[near_first] - touched_unknown[near_second])
    shape = layout(size, len(bases), int(max(apart.max(initial=0), most)))
    pairs = _pairs(shape, entry_unknown, first, second)
    none = Design(
        unknowns=unknowns,
        position=position,
        orders=orders,
        modes=modes,
        n_stations=n_stations,
        station=visits.station,
        run=visits.run,
        readings=np.diff(visits.start),
        local=local,
        in_border=in_border,
        of_run=of_run,
        layout=shape,
        entry_visit=entry_visit,
        entry_unknown=entry_unknown,
        entry_value=np.zeros(0),
        entry_at=at,
        slot_at=slot_at,
        slot_value=np.zeros(0),
        row_value=row_value,
        pairs=pairs,
        pair_visit=entry_visit[pairs.first],
        pair_value=np.zeros(0),
        touched_station=touched_station,
        touched_unknown=touched_unknown,
        touched_pairs=_pairs(shape, touched_unknown, near_first, near_second),
        priors=NO_PRIORS,
        prior_matrix=np.zeros(shape.starts[3]),
        prior_side=np.zeros(size),
        dropped=dropped,
        lost=lost,
        kept_layouts={},
    )
    return reweighted(with_priors(none, _priors(basis, none)), visits, weight)


def reweighted(one: Design, visits: Visits, weight: Array) -> Design:
    """The design with other weights within visits: `weight` (u,) sums to 1 within each."""
    value = np.add.reduceat(weight[:, None] * one.row_value, visits.start[:-1], axis=0)
    numbers = one.of_run[visits.run]
    is_bias = np.array([what.kind == "bias" for what in one.unknowns] + [False])
    value[is_bias[numbers]] = 1.0
    present = numbers >= 0
    entries = np.concatenate([value[present], np.ones(np.count_nonzero(one.local == one.n_stations))])
    return replace(
        one,
        entry_value=entries,
        slot_value=np.where(present, value, 0.0),
        pair_value=entries[one.pairs.first] * entries[one.pairs.second],
    )


def _within(group: Index) -> tuple[Index, Index]:
    """All ordered pairs of elements of one group; the groups stand together."""
    if not len(group):
        return group, group
    start = np.flatnonzero(np.diff(group, prepend=group[0] - 1))
    count = np.diff(np.append(start, len(group)))
    of_element = np.repeat(count, count)
    first = np.repeat(np.arange(len(group)), of_element)
    begin = np.repeat(np.repeat(start, count), of_element)
    inside = np.arange(len(first)) - np.repeat(np.cumsum(of_element) - of_element, of_element)
    return first, begin + inside


def _pairs(shape: Layout, unknown: Index, first: Index, second: Index) -> Pairs:
    once = shape.once(unknown[first], unknown[second])
    first, second = first[once], second[once]
    one, other = unknown[first], unknown[second]
    return Pairs(first=first, second=second, place=shape.place(one, other), times=np.where(one == other, 1.0, 2.0))


def _stations_of_many_runs(visits: Visits, n_stations: int) -> Index:
    """Stations of more runs than may be eliminated without filling the border."""
    pairs = np.unique(visits.station * (int(visits.run.max(initial=0)) + 1) + visits.run)
    runs = np.bincount(pairs // (int(visits.run.max(initial=0)) + 1), minlength=n_stations)
    return np.flatnonzero(runs > MOST_RUNS)


def crossings(visits: Visits) -> int:
    """Visits, and for each station that is eliminated the square of its runs: products of two unknowns go with it."""
    runs = int(visits.run.max(initial=0)) + 1
    of_station = np.bincount(np.unique(visits.station * runs + visits.run) // runs)
    return len(visits) + int(np.sum(of_station[of_station <= MOST_RUNS] ** 2))


def _run_order(visits: Visits, local: Index, n_stations: int, by_run: dict[int, list[DriftUnknown]]) -> list[int]:
    """The order of runs in which those that share a station stand nearest to one another.

    Time order mostly does; else the one of Cuthill & McKee (1969).
    """
    runs = list(by_run)
    rank = np.full(max(runs) + 1, -1)
    rank[runs] = np.arange(len(runs))
    here = local < n_stations
    touched = np.unique(local[here] * len(runs) + rank[visits.run[here]])
    station, run = np.divmod(touched, len(runs))
    first, second = _within(station)
    one, other = run[first], run[second]
    if np.abs(one - other).max(initial=0) <= NEAR:
        return runs
    from scipy.sparse import coo_array
    from scipy.sparse.csgraph import reverse_cuthill_mckee

    graph = coo_array((np.ones(len(one)), (one, other)), shape=(len(runs), len(runs))).tocsr()
    better = reverse_cuthill_mckee(graph, symmetric_mode=True)
    moved = np.empty(len(runs), dtype=np.intp)
    moved[better] = np.arange(len(runs))
    if np.abs(moved[one] - moved[other]).max(initial=0) < np.abs(one - other).max(initial=0):
        return [runs[number] for number in better.tolist()]
    return runs


def with_priors(one: Design, priors: Priors) -> Design:
    """The design with more pseudo-observations of its border unknowns."""
    pull = priors.factor * (priors.value / priors.sd**2)[priors.row]
    return replace(
        one,
        priors=one.priors.joined(priors),
        prior_matrix=one.prior_matrix + _prior_matrix(one.layout, priors, priors.sd),
        prior_side=one.prior_side + summed(priors.unknown, pull, one.size),
    )


def matrix_of(one: Design, priors: Priors) -> Array:
    """What some priors alone add to the flat border matrix."""
    return _prior_matrix(one.layout, priors, priors.sd)


def _prior_matrix(shape: Layout, priors: Priors, sd: Array) -> Array:
    """What priors of these sds add to the flat border matrix."""
    scaled = priors.factor / sd[priors.row]
    first, second = _within(priors.row)
    once = shape.once(priors.unknown[first], priors.unknown[second])
    first, second = first[once], second[once]
    place = shape.place(priors.unknown[first], priors.unknown[second])
    return shape.mirrored(summed(place, scaled[first] * scaled[second], shape.starts[3]))


def _unknowns_of_runs(
    basis: DriftBasis, visits: Visits, orders: tuple[int, ...], modes: int
) -> dict[int, list[DriftUnknown]]:
    tares: dict[int, list[DriftUnknown]] = {}
    for number, tare in enumerate(basis.tares):
        if tare.size is None or tare.size_sd is not None:
            run = int(basis.tare_run[number])
            tares.setdefault(run, []).append(DriftUnknown(kind="tare", run=run, tare=number))
    found = {}
    for run in visits.run_order.tolist():
        drift = [DriftUnknown(kind="drift", run=run, power=power) for power in range(1, orders[run] + 1)]
        walk = [DriftUnknown(kind="walk", run=run, power=mode) for mode in range(1, modes + 1)] if orders[run] else []
        found[run] = [DriftUnknown(kind="bias", run=run), *drift, *tares.get(run, []), *walk]
    return found


def _priors(basis: DriftBasis, one: Design) -> Priors:
    """Mean drift rate of each run of order 1 or more, and the tares whose size is stated with an sd."""
    name: list[str] = []
    value: list[float] = []
    sd: list[float] = []
    runs: list[int] = []
    row: list[int] = []
    unknown: list[int] = []
    factor: list[float] = []
    drifts: dict[int, list[int]] = {}
    for number, what in enumerate(one.unknowns):
        if what.kind == "drift":
            drifts.setdefault(what.run, []).append(number)
        elif what.kind == "tare":
            size, size_sd = basis.tares[what.tare].size, basis.tares[what.tare].size_sd
            if size is None or size_sd is None:
                continue
            row.append(len(name))
            unknown.append(number)
            factor.append(1.0)
            name.append(f"tare {what.tare}")
            value.append(size)
            sd.append(size_sd)
            runs.append(-1)
    for run, numbers in drifts.items():
        if basis.rate_sd[run] < np.inf:
            # The mean rate is the drift at the run's last used reading (scaled time 1) over its length.
            row += [len(name)] * len(numbers)
            unknown += numbers
            factor += [1.0 / float(basis.length[run])] * len(numbers)
            name.append(f"drift rate of run {run}")
            value.append(float(basis.rate[run]))
            sd.append(float(basis.rate_sd[run]))
            runs.append(run)
    return Priors(
        name=tuple(name),
        value=np.array(value, dtype=float),
        sd=np.array(sd, dtype=float),
        row=np.array(row, dtype=np.intp),
        unknown=np.array(unknown, dtype=np.intp),
        factor=np.array(factor, dtype=float),
        run=np.array(runs, dtype=np.intp),
    )


def walk_priors(basis: DriftBasis, one: Design, strength: float) -> Priors:
    """The modes of a random walk of given strength, m/s2/s^1.5, each +- its own sd."""
    numbers = np.array([n for n, what in enumerate(one.unknowns) if what.kind == "walk"], dtype=np.intp)
    mode = np.array([one.unknowns[n].power for n in numbers.tolist()], dtype=np.intp)
    return Priors(
        name=tuple(f"walk of run {one.unknowns[n].run}, mode {one.unknowns[n].power}" for n in numbers.tolist()),
        value=np.zeros(len(numbers)),
        sd=strength * mode_sds(int(mode.max(initial=0)))[mode - 1] if len(mode) else np.zeros(0),
        row=np.arange(len(numbers)),
        unknown=numbers,
        factor=np.ones(len(numbers)),
        run=np.full(len(numbers), -1),
    )
