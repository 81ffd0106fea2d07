"""The visits of every run beside the border unknowns that they and their stations touch, all runs at once.

A term of one run (a jump, a power of time) meets nothing else. Runs of like size are held in one array each, filled up
with nothing, so that a thousand of them are tested in the time of few.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from plumbwell.reduction.banded import summed
from plumbwell.reduction.design import Design
from plumbwell.reduction.network import Solution
from plumbwell.survey.column import Array, Index

MOST_HELD = 1 << 24
"""Numbers in one array of a group of runs; more are worked through part by part."""


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class RunGroup:
    """Runs of like size.

    Parameters
    ----------
    runs : (g,) int array
        Their places in `RunLayout.runs`.
    visits : (g, n) int array
        Their visits in time order; the number of all visits where there is none.
    unknowns : (g, m) int array
        Border unknowns; -1 where there is none.
    place : (g, m, m) int array
        Elements of the inverse; -1 off the pattern or where there is none.
    mean_at, mean_of : (e,) int arrays
        Where, in the flattened (g, n, m) rows, which mean of a station is to be taken off.
    slot_at, slot_of : (f,) int arrays
        Where which regressor of a visit, flattened (v, k), is to be added.
    base_at : (b,) int array
        Where gravity itself stands in the border: 1 is to be added.
    """

    runs: Index
    visits: Index
    unknowns: Index
    place: Index
    mean_at: Index
    mean_of: Index
    slot_at: Index
    slot_of: Index
    base_at: Index


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class RunLayout:
    """All runs of a design.

    Parameters
    ----------
    runs : (r,) int array
        Code of each run, in the order of its visits.
    run_of : (v,) int array
        Place of each visit's run in `runs`.
    pair_of : (v,) int array
        Number of each visit's run and station together.
    pair_run, pair_station : (p,) int arrays
        Of each such pair: place of the run, and station; the number of stations where it stands in the border.
    groups : tuple of RunGroup
    """

    runs: Index
    run_of: Index
    pair_of: Index
    pair_run: Index
    pair_station: Index
    groups: tuple[RunGroup, ...]


def run_layout(one: Design) -> RunLayout:
    """The runs of a design, in groups of like size."""
    starts = np.flatnonzero(np.diff(one.run, prepend=-1))
    runs, visits_of = one.run[starts], np.diff(np.append(starts, len(one.run)))
    run_of = np.repeat(np.arange(len(runs)), visits_of)
    width = one.n_stations + 1
    keys, pair_of = np.unique(run_of * width + one.local, return_inverse=True)
    pair_run, pair_station = np.divmod(keys, width)
    count = np.append(np.bincount(one.touched_station, minlength=one.n_stations), 0)
    begin = np.cumsum(count) - count
    size = max(one.size, 1)
    # Unknowns of each run: what its stations touch, its own, and gravity that stands in the border.
    many = count[pair_station]
    touched = np.repeat(begin[pair_station] - (np.cumsum(many) - many), many) + np.arange(int(many.sum()))
    own = one.of_run[runs]
    own_run, own_slot = np.nonzero(own >= 0)
    based = np.flatnonzero(one.local == one.n_stations)
    of_base = one.in_border[one.station[based]]
    near = np.unique(
        np.concatenate(
            [
                np.repeat(pair_run, many) * size + one.touched_unknown[touched],
                own_run * size + own[own_run, own_slot],
                run_of[based] * size + of_base,
            ]
        )
    )
    near_run, near_unknown = np.divmod(near, size)
    unknowns_of = np.bincount(near_run, minlength=len(runs))
    near_begin = np.cumsum(unknowns_of) - unknowns_of
    classes = np.ceil(np.log2(np.maximum(visits_of, 1))) * 64 + np.ceil(np.log2(np.maximum(unknowns_of, 1)))
    groups = []
    for each in np.unique(classes).tolist():
        members = np.flatnonzero(classes == each)
        n, m = int(visits_of[members].max()), int(unknowns_of[members].max(initial=1))
        step = max(MOST_HELD // (n * m + m * m), 1)
        for start in range(0, len(members), step):
            part = members[start : start + step]
            groups.append(_group(one, part, starts, visits_of, near, near_unknown, unknowns_of, near_begin, n, m))
    return RunLayout(
        runs=runs, run_of=run_of, pair_of=pair_of, pair_run=pair_run, pair_station=pair_station, groups=tuple(groups)
    )


def _group(
    one: Design,
    part: Index,
    starts: Index,
    visits_of: Index,
    near: Index,
    near_unknown: Index,
    unknowns_of: Index,
    near_begin: Index,
    n: int,
    m: int,
) -> RunGroup:
    size, v = max(one.size, 1), len(one.run)
    line = np.arange(n)
    visits = np.where(line < visits_of[part][:, None], starts[part][:, None] + line, v)
    column = np.arange(m)
    inside = column < unknowns_of[part][:, None]
    at = np.minimum(near_begin[part][:, None] + column, max(len(near) - 1, 0))
    unknowns = np.where(inside, near_unknown[at] if len(near) else -1, -1)
    both = inside[:, :, None] & inside[:, None, :]
    safe = np.maximum(unknowns, 0)
    place = np.where(both, one.layout.place(safe[:, :, None], safe[:, None, :]), -1)
    # Each visit of the group with the elements that its station touches.
    group, turn = np.nonzero(visits < v)
    visit = visits[group, turn]
    row = (group * n + turn) * m
    run = part[group]

    def column_of(which: Index, unknown: Index) -> Index:
        return np.searchsorted(near, run[which] * size + unknown) - near_begin[run[which]]

    count = np.append(np.bincount(one.touched_station, minlength=one.n_stations), 0)
    begin = np.cumsum(count) - count
    many = count[one.local[visit]]
    which = np.repeat(np.arange(len(visit)), many)
    element = begin[one.local[visit]][which] + np.arange(len(which)) - np.repeat(np.cumsum(many) - many, many)
    slots = one.of_run[one.run[visit]]
    filled, slot = np.nonzero(slots >= 0)
    based = np.flatnonzero(one.local[visit] == one.n_stations)
    return RunGroup(
        runs=part,
        visits=visits,
        unknowns=unknowns,
        place=place,
        mean_at=row[which] + column_of(which, one.touched_unknown[element]),
        mean_of=element,
        slot_at=row[filled] + column_of(filled, slots[filled, slot]),
        slot_of=visit[filled] * one.of_run.shape[1] + slot,
        base_at=row[based] + column_of(based, one.in_border[one.station[visit[based]]]),
    )


class RunTerms:
    """What terms of single runs meet in one solution.

    Parameters
    ----------
    solution : Solution
    """

    def __init__(self, solution: Solution) -> None:
        self.solution = solution
        one = solution.design
        kept = one.kept_layouts
        if "runs" not in kept:
            kept["runs"] = run_layout(one)
        self.layout: RunLayout = kept["runs"]
        self._rows: dict[int, tuple[Array, Array]] = {}

    def rows(self, number: int) -> tuple[Array, Array]:
        """Border rows of a group's visits less their stations' mean, (g, n, m), and the inverse there, (g, m, m)."""
        if number in self._rows:
            return self._rows[number]
        group, one = self.layout.groups[number], self.solution.design
        rows = np.zeros((*group.visits.shape, group.unknowns.shape[1]))
        flat = rows.reshape(-1)
        flat[group.mean_at] = -self.solution.border.mean[group.mean_of]
        flat[group.slot_at] += one.slot_value.reshape(-1)[group.slot_of]
        flat[group.base_at] += 1.0
        inverse = np.where(group.place >= 0, self.solution.factor.inverse[group.place], 0.0)
        inside = (group.unknowns >= 0)[:, :, None] & (group.unknowns >= 0)[:, None, :]
        for lacking in np.flatnonzero(np.any((group.place < 0) & inside, axis=(1, 2))).tolist():
            numbers = group.unknowns[lacking][group.unknowns[lacking] >= 0]
            picked = np.zeros((one.size, len(numbers)))
            picked[numbers, np.arange(len(numbers))] = 1.0
            inverse[lacking, : len(numbers), : len(numbers)] = self.solution.factor.solve(picked)[numbers]
        self._rows[number] = rows, inverse
        return self._rows[number]

    def of_visits(self, values: Array, number: int) -> Array:
        """Values of visits (v,) or (v, k) in the shape of a group, (g, n) or (g, n, k); 0 where there is no visit."""
        padded = np.concatenate([values, np.zeros((1, *values.shape[1:]))])
        return padded[self.layout.groups[number].visits]

    def normal(self, columns: Array, prior: Array | None = None) -> tuple[Array, Array, Array]:
        """Gradient (r, k), what the other unknowns leave (r, k, k), and the columns' own squares (r, k), by run.

        Parameters
        ----------
        columns : (v, k) array
            The same terms in every run, each run with unknowns of its own.
        prior : (r, 2) array or None
            One over the sd of the mean drift rate of each run times its length, and what its prior still asks for, in
            sds: it holds the new terms too, each of which is 1 at the run's end. 0 where there is none.
        """
        solution, layout = self.solution, self.layout
        runs, k = len(layout.runs), columns.shape[1]
        weighted = solution.weight[:, None] * columns
        at_pair = np.column_stack([summed(layout.pair_of, one, len(layout.pair_run)) for one in weighted.T])
        total = np.append(solution.border.total, np.inf)[layout.pair_station]
        gradient = np.column_stack(
            [summed(layout.run_of, one * solution.residual[:, 0], runs) for one in weighted.T]
        )
        left, own = np.empty((runs, k, k)), np.empty((runs, k))
        for one in range(k):
            for other in range(k):
                squares = summed(layout.run_of, weighted[:, one] * columns[:, other], runs)
                if one == other:
                    own[:, one] = squares
                on_stations = at_pair[:, one] * at_pair[:, other] / total
                left[:, one, other] = squares - summed(layout.pair_run, on_stations, runs)
        for number, group in enumerate(layout.groups):
            rows, inverse = self.rows(number)
            on_border = np.einsum("gnm,gnk->gmk", rows, self.of_visits(weighted, number))
            if prior is not None:
                on_border += self._prior_rows(number)[:, :, None] * prior[group.runs][:, None, :1]
            left[group.runs] -= np.einsum("gmk,gmn,gnl->gkl", on_border, inverse, on_border)
        if prior is not None:
            left += (prior[:, 0] ** 2)[:, None, None]
            gradient += (prior[:, 0] * prior[:, 1])[:, None]
        return gradient, left, own

    def _prior_rows(self, number: int) -> Array:
        """Factors over sd of the prior of each run's mean rate, at the group's unknowns, (g, m)."""
        group, one = self.layout.groups[number], self.solution.design
        row_of = one.rate_priors()
        scaled = np.zeros(one.size + 1)
        scaled[one.priors.unknown] = one.priors.factor / one.priors.sd[one.priors.row]
        runs = np.full(one.size + 1, -1)
        for_rate = np.isin(one.priors.row, row_of[row_of >= 0])
        runs[one.priors.unknown[for_rate]] = one.run_of_unknown()[one.priors.unknown[for_rate]]
        mine = runs[group.unknowns] == self.layout.runs[group.runs][:, None]
        return np.where(mine & (group.unknowns >= 0), scaled[group.unknowns], 0.0)

    def rate_prior(self, length: Array) -> Array:
        """What `normal` takes as `prior` for terms in powers of scaled time; `length` (r,) of the runs, s."""
        one = self.solution.design
        found = np.zeros((len(self.layout.runs), 2))
        rows = one.rate_priors()[self.layout.runs]
        held = rows >= 0
        sd = one.priors.sd[rows[held]]
        found[held, 0] = 1.0 / (length[held] * sd)
        found[held, 1] = (one.priors.value - one.priors.of(self.solution.unknown[:, 0]))[rows[held]] / sd
        return found
