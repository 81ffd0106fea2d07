"""The finding about runs that hang on the rest of the network by one station: how many visits carry the join."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from plumbwell.study.docket.outliers import UNCHECKED
from plumbwell.study.docket.wording import counted, gravity, label, listed, moment, numbers, run, station
from plumbwell.study.finding import Finding
from plumbwell.study.results import Results
from plumbwell.study.visit_table import visit_redundancy
from plumbwell.survey.column import Array, Index

LISTED_RUNS = 4


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class _Stretches:
    """Runs, cut at their tares of unknown size: what lies between two of them stands at a level of its own.

    Parameters
    ----------
    first, last : (v,) int arrays
        Stretch of each visit's first and last reading: the run's code before its first tare, further numbers after.
    name : tuple of str
        Of each stretch, fit for a message.
    """

    first: Index
    last: Index
    name: tuple[str, ...]

    def of(self, group: tuple[int, ...]) -> NDArray[np.bool_]:
        """True for the visits of some stretches."""
        return np.isin(self.first, group) | np.isin(self.last, group)


def _stretches(results: Results) -> _Stretches:
    visits, basis = results.network.visits, results.network.adjustment.basis
    first, last = visits.run.copy(), visits.run.copy()
    names = [run(results, code) for code in range(len(results.survey.readings.run.names))]
    cuts: dict[int, list[float]] = {}
    for tare, code in zip(basis.tares, basis.tare_run.tolist(), strict=True):
        if tare.size is None:
            cuts.setdefault(code, []).append(tare.time)
    for code, times in cuts.items():
        times, mine = sorted(times), visits.run == code
        whole = names[code]
        names[code] = f"{whole} before {moment(times[0])}"
        for number, time in enumerate(times):
            first[mine & (visits.first >= time)] = len(names)
            last[mine & (visits.last >= time)] = len(names)
            until = f" to {moment(times[number + 1])}" if number + 1 < len(times) else " on"
            names.append(f"{whole} from {moment(time)}{until}")
    return _Stretches(first=first, last=last, name=tuple(names))


def run_hangs_by_one(results: Results) -> Iterator[Finding]:
    """Runs, or groups of runs, that one station alone joins to the rest; grave where nothing checks its visits there.

    Ties join all tied stations. Of the groups that a station holds together the tied one counts as the rest, else the
    one with the most visits. A base that each run reads often is the usual practice and is told as a note. A tare of
    unknown size parts its run into two.
    """
    visits = results.network.visits
    stretches = _stretches(results)
    if np.ptp(stretches.last) == 0 and np.ptp(stretches.first) == 0:
        return
    n_stations = len(results.stations)
    joins = _neighbours(results, stretches)
    redundancy: Array | None = None
    for where in _cut_stations(joins, n_stations):
        groups = [_runs_of(joins, start, where, n_stations) for start in joins[where]]
        tied = {group for group, start in zip(groups, joins[where], strict=True) if start == len(joins) - 1}
        sizes = {group: (group in tied, int(np.count_nonzero(stretches.of(group)))) for group in groups if group}
        rest = max(sizes, key=lambda group: sizes[group])
        for group in sorted(set(sizes) - {rest}):
            if np.all(visits.station[stretches.of(group)] == where):
                continue  # with no station of its own the group has nothing that could be shifted
            redundancy = visit_redundancy(results) if redundancy is None else redundancy
            yield _finding(results, where, group, redundancy, stretches)


def _neighbours(results: Results, stretches: _Stretches) -> list[list[int]]:
    """The graph of stations, then stretches of runs, then all ties as one: what each is joined with, by number."""
    visits, tied = results.network.visits, np.unique(results.network.ties.station)
    n_stations, n_stretches = len(results.stations), len(stretches.name)
    size = n_stations + n_stretches + 1
    one = np.concatenate([visits.station, visits.station, tied])
    other = np.concatenate([stretches.first, stretches.last, np.full(len(tied), n_stretches)]) + n_stations
    pairs = np.unique(one * size + other)
    joins: list[list[int]] = [[] for _ in range(size)]
    for left, right in zip((pairs // size).tolist(), (pairs % size).tolist(), strict=True):
        joins[left].append(right)
        joins[right].append(left)
    return joins


def _cut_stations(joins: list[list[int]], n_stations: int) -> list[int]:
    """Stations whose loss would part what hangs together, from the top down.

    Notes
    -----
    Depth-first search with the lowest number that each branch reaches back to (Hopcroft & Tarjan 1973, Commun. ACM
    16, 372-378), without recursion.
    """
    found: set[int] = set()
    number = [-1] * len(joins)
    lowest = [0] * len(joins)
    count = 0
    for root in range(len(joins)):
        if number[root] >= 0 or not joins[root]:
            continue
        number[root] = lowest[root] = count
        count, branches = count + 1, 0
        path = [(root, -1, iter(joins[root]))]
        while path:
            node, parent, left = path[-1]
            other = next(left, None)
            if other is None:
                path.pop()
                if parent >= 0:
                    lowest[parent] = min(lowest[parent], lowest[node])
                    if parent != root and lowest[node] >= number[parent]:
                        found.add(parent)
            elif number[other] < 0:
                number[other] = lowest[other] = count
                count += 1
                branches += node == root
                path.append((other, node, iter(joins[other])))
            elif other != parent:
                lowest[node] = min(lowest[node], number[other])
        if branches > 1:
            found.add(root)
    return sorted(node for node in found if node < n_stations)


def _runs_of(joins: list[list[int]], start: int, without: int, n_stations: int) -> tuple[int, ...]:
    """The stretches of runs that hang together with a node when a station is lost."""
    seen, waiting = {start, without}, [start]
    while waiting:
        for other in joins[waiting.pop()]:
            if other not in seen:
                seen.add(other)
                waiting.append(other)
    return tuple(sorted(node - n_stations for node in seen if n_stations <= node < len(joins) - 1))


def _finding(
    results: Results, where: int, group: tuple[int, ...], redundancy: Array, stretches: _Stretches
) -> Finding:
    visits = results.network.visits
    weight = results.network.adjustment.solution.weight
    here = visits.station == where
    own = here & stretches.of(group)
    # A visit that a tare falls into stands on both sides.
    others = here & ~(np.isin(stretches.first, group) & np.isin(stretches.last, group))
    present = dict.fromkeys(stretches.first.tolist()) | dict.fromkeys(stretches.last.tolist())
    names = [stretches.name[one] for one in present if one in group]
    runs = f"run {names[0]}" if len(names) == 1 else f"runs {listed(names, LISTED_RUNS)}"
    many = len(names) > 1
    variance = 1.0 / float(weight[own].sum())
    beyond = f"{counted(int(others.sum()), 'visit')} in the others"
    if others.any():
        variance += 1.0 / float(weight[others].sum())
    else:
        ties = results.network.ties
        variance += 1.0 / float(ties.weight[ties.station == where].sum())
        beyond = "its tie"
    # A visit that nothing checks shifts all that hangs on it unseen; two at the ends of a run may only bend its drift.
    unseen = redundancy[own].max() <= UNCHECKED or (others.any() and redundancy[others].max() <= UNCHECKED)
    means = (
        f"A bad visit there shifts everything of {runs} and nothing would show it."
        if unseen
        else f"A bad visit among them would show; what those of {runs} share, another mark say, would shift everything "
        f"of {'them' if many else 'it'} unseen."
    )
    return Finding(
        code="run_hangs_by_one",
        severity="look" if unseen else "note",
        place=f"{station(results, where)}; {runs}",
        text=f"R{runs[1:]} {'are' if many else 'is'} joined to the rest of the network through "
        f"{label(results, where)} alone, by {counted(int(own.sum()), 'visit')} in {'them' if many else 'it'} and "
        f"{beyond}: ± {gravity(variance**0.5)} (1 sd of those visits). {means}",
        mend=f"Read a second station of the others in {runs}, well apart in time or depth; until then see the visits "
        f"at {label(results, where)} one by one.",
        stations=(where,),
        rows=numbers(np.flatnonzero(np.isin(visits.of_row, np.flatnonzero(own)))),
    )
