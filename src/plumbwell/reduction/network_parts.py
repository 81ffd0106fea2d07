"""Parts of the network that no station joins, and the constants that their datums make superfluous.

Two runs hang together when they share a station, or when both hold a tied station. A tare of unknown size
parts its run in two, which then hang together only through stations read on both sides of it.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from plumbwell.reduction.design import Design
from plumbwell.reduction.drift_basis import DriftBasis, DriftUnknown
from plumbwell.reduction.network import Rank, TieRows, held_and_open, own_size
from plumbwell.reduction.visits import Visits
from plumbwell.survey.column import Array, Index


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Parts:
    """Which part of the network each station belongs to.

    Parameters
    ----------
    of_station : (s,) int array
    count : int
    tied : (parts,) bool array
        True where a tie fixes the part's gravity.
    dropped : tuple of DriftUnknown
        One constant of each untied part, to be held at 0 while solving.
    of_run : (k,) int array by run code
        Part of the run's first used reading, -1 for runs without.
    of_tare : (m,) int array
        Part of the readings after each tare of the basis.
    """

    of_station: Index
    count: int
    tied: Array
    dropped: tuple[DriftUnknown, ...]
    of_run: Index
    of_tare: Index


def network_parts(basis: DriftBasis, visits: Visits, ties: TieRows, *, n_stations: int) -> Parts:
    """The parts of a network, numbered by their first visit."""
    n_runs = len(basis.start)
    free = [n for n, tare in enumerate(basis.tares) if tare.size is None]
    by_run: dict[int, list[int]] = {}
    for number in sorted(free, key=lambda one: basis.tares[one].time):
        by_run.setdefault(int(basis.tare_run[number]), []).append(number)
    # Nodes: stations, then for each run its stretch before the first free tare, then one a free tare, then the ties.
    all_ties = n_stations + n_runs + len(basis.tares)
    # A visit that a tare falls into hangs on both stretches.
    stretch, late = n_stations + visits.run, n_stations + visits.run
    for run, numbers in by_run.items():
        for number in numbers:
            mine, node = visits.run == run, n_stations + n_runs + number
            stretch = np.where(mine & (visits.first >= basis.tares[number].time), node, stretch)
            late = np.where(mine & (visits.last >= basis.tares[number].time), node, late)
    one = np.concatenate([visits.station, visits.station, ties.station])
    other = np.concatenate([stretch, late, np.full(len(ties.station), all_ties)])
    roots = _joined(one, other, all_ties + 1)
    order: dict[int, int] = {}
    for node in roots[one].tolist():
        order.setdefault(node, len(order))
    part = np.array([order.get(node, -1) for node in roots.tolist()])
    tied = np.zeros(len(order), dtype=bool)
    tied[part[ties.station]] = True
    of_run = np.where(np.isin(np.arange(n_runs), visits.run_order), part[n_stations : n_stations + n_runs], -1)
    of_tare = part[n_stations + n_runs : n_stations + n_runs + len(basis.tares)]
    for number, tare in enumerate(basis.tares):
        if tare.size is not None:
            of_tare[number] = of_run[basis.tare_run[number]]
    dropped = []
    for number in np.flatnonzero(~tied).tolist():
        runs = [run for run in visits.run_order.tolist() if of_run[run] == number]
        if runs:
            dropped.append(DriftUnknown(kind="bias", run=runs[0]))
            continue
        later = next(one for one in free if of_tare[one] == number)
        dropped.append(DriftUnknown(kind="tare", run=int(basis.tare_run[later]), tare=later))
    return Parts(
        of_station=part[:n_stations],
        count=len(order),
        tied=tied,
        dropped=tuple(dropped),
        of_run=of_run,
        of_tare=of_tare,
    )


def _joined(one: Index, other: Index, count: int) -> Index:
    """For each of `count` nodes the lowest of those that edges from `one` to `other` join it to."""
    lowest = np.arange(count)
    while True:
        before = lowest.copy()
        np.minimum.at(lowest, other, lowest[one])
        np.minimum.at(lowest, one, lowest[other])
        # What a node points to may itself point lower: long chains of runs settle in few rounds.
        lowest = lowest[lowest]
        if np.array_equal(lowest, before):
            return lowest


def undetermined(design: Design, ties: TieRows, rank: Rank) -> DriftUnknown | None:
    """A border unknown that visits, ties and priors together cannot determine, or None.

    `rank` is what the visits alone determine. Tares go first, then the highest power: what is held at 0 is the
    least that restores the rank.
    """
    if rank.lacking == 0:
        return None
    held, directions = held_and_open(design, ties, priors=True)
    if not len(held):
        return None
    share = np.abs(directions[:, 0]) * np.sqrt(own_size(design))
    among = np.flatnonzero(share > 0.1 * share.max())
    order = {"tare": 2, "drift": 1, "bias": 0, "gravity": 0}
    worst = max(among.tolist(), key=lambda n: (order[design.unknowns[n].kind], design.unknowns[n].power))
    return design.unknowns[worst]
