"""The finding about runs that hang on the rest of the network by one station: how many visits carry the join."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from plumbwell.study.docket.outliers import UNCHECKED
from plumbwell.study.docket.wording import counted, gravity, label, listed, numbers, run, station
from plumbwell.study.finding import Finding
from plumbwell.study.results import Results
from plumbwell.study.visit_table import visit_redundancy
from plumbwell.survey.column import Array

LISTED_RUNS = 4


def run_hangs_by_one(results: Results) -> Iterator[Finding]:
    """Runs, or groups of runs, that one station alone joins to the rest; grave where nothing checks its visits there.

    Ties join all tied stations. Of the groups that a station holds together the tied one counts as the rest, else the
    one with the most visits. A base that each run reads often is the usual practice and is told as a note.
    """
    visits = results.network.visits
    if len(visits.run_order) < 2:
        return
    joins = _neighbours(results)
    redundancy: Array | None = None
    for where in _cut_stations(joins, len(results.stations)):
        groups = [_runs_of(joins, start, where, len(results.stations)) for start in joins[where]]
        tied = {group for group, start in zip(groups, joins[where], strict=True) if start == len(joins) - 1}
        sizes = {group: (group in tied, _visits_of(results, group)) for group in groups if group}
        rest = max(sizes, key=lambda group: sizes[group])
        for group in sorted(set(sizes) - {rest}):
            own = np.isin(results.network.visits.run, group)
            if np.all(results.network.visits.station[own] == where):
                continue  # with no station of its own the group has nothing that could be shifted
            redundancy = visit_redundancy(results) if redundancy is None else redundancy
            yield _finding(results, where, group, redundancy)


def _neighbours(results: Results) -> list[list[int]]:
    """The graph of stations, then runs by code, then all ties as one: what each is joined with, by number."""
    visits, tied = results.network.visits, np.unique(results.network.ties.station)
    n_stations, n_runs = len(results.stations), len(results.survey.readings.run.names)
    pairs = np.unique(np.column_stack([visits.station, n_stations + visits.run]), axis=0)
    ties = np.column_stack([tied, np.full(len(tied), n_stations + n_runs)])
    joins: list[list[int]] = [[] for _ in range(n_stations + n_runs + 1)]
    for one, other in np.concatenate([pairs, ties]).tolist():
        joins[one].append(other)
        joins[other].append(one)
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
    """Codes of the runs that hang together with a node when a station is lost."""
    seen, waiting = {start, without}, [start]
    while waiting:
        for other in joins[waiting.pop()]:
            if other not in seen:
                seen.add(other)
                waiting.append(other)
    return tuple(sorted(node - n_stations for node in seen if n_stations <= node < len(joins) - 1))


def _visits_of(results: Results, group: tuple[int, ...]) -> int:
    return int(np.count_nonzero(np.isin(results.network.visits.run, group)))


def _finding(results: Results, where: int, group: tuple[int, ...], redundancy: Array) -> Finding:
    visits = results.network.visits
    weight = results.network.adjustment.solution.weight
    here = visits.station == where
    own = here & np.isin(visits.run, group)
    others = here & ~own
    names = [run(results, code) for code in visits.run_order.tolist() if code in group]
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
