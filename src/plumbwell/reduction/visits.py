"""Visits: unbroken stays of the instrument at a station, made of used rows.

A row out of use never ends a visit and never is part of one.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from plumbwell.survey.column import Array, Index, frozen, frozen_index
from plumbwell.survey.readings import Readings


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Visits:
    """Visits in time order within runs, runs in the order of their first reading.

    Parameters
    ----------
    rows : (u,) int array
        Used rows that belong to a station, visit by visit, by time within a visit.
    of_row : (n,) int array
        Visit of each row; -1 for rows that are out of use or belong to no station.
    start : (v + 1,) int array
        Where each visit starts in `rows`.
    station, run : (v,) int arrays
    first, last : (v,) arrays
        UTC of the first and last reading, s since 2000-01-01.
    run_order : (k,) int array
        Codes of the runs that have used rows, by the time of their first used row.
    run_start, run_length : arrays by run code
        First used reading of each run, s; time from there to its last, s. NaN for runs without used rows.
    equal_times : (m,) int array
        Used rows whose time equals that of the row before them in their run.
    """

    rows: Index
    of_row: Index
    start: Index
    station: Index
    run: Index
    first: Array
    last: Array
    run_order: Index
    run_start: Array
    run_length: Array
    equal_times: Index

    def __len__(self) -> int:
        return len(self.station)


def visits(readings: Readings, station: Index, *, utc: Array, visit_gap: float) -> Visits:
    """The visits of a survey.

    Rows of one run, station and visit label are one visit. Without a label a visit ends when another
    station is read or after a pause over `visit_gap`; a row out of use at the same station bridges a pause.

    Parameters
    ----------
    readings : Readings
    station : (n,) int array
        Station of each row, -1 for none.
    utc : (n,) array
        s since 2000-01-01.
    visit_gap : float
        s.
    """
    run, named = readings.run.code, readings.visit.code
    n_runs = len(readings.run.names)
    everyone = np.lexsort((utc, run))
    placed = everyone[station[everyone] >= 0]
    active = placed[readings.use[placed]]
    # The pause before each used row, counted from the last row of any use at the same run and station.
    before = np.full(len(readings), -np.inf)
    if placed.size > 1:
        same = (run[placed[1:]] == run[placed[:-1]]) & (station[placed[1:]] == station[placed[:-1]])
        before[placed[1:]] = np.where(same, utc[placed[:-1]], -np.inf)
    here, there = active[1:], active[:-1]
    new = np.ones(active.size, dtype=bool)
    if active.size > 1:
        paused = utc[here] - np.maximum(before[here], utc[there]) > visit_gap
        unnamed = (named[here] < 0) & (named[there] < 0)
        new[1:] = (run[here] != run[there]) | (station[here] != station[there]) | ~unnamed | paused
    number = np.cumsum(new) - 1
    is_named = named[active] >= 0
    if is_named.any():
        keys = np.column_stack([run[active], station[active], named[active]])[is_named]
        _, first_at, inverse = np.unique(keys, axis=0, return_index=True, return_inverse=True)
        number[is_named] = number[is_named][first_at][inverse.ravel()]
        _, number = np.unique(number, return_inverse=True)
    grouped = np.argsort(number, kind="stable")
    rows, number = active[grouped], number[grouped]
    start = np.flatnonzero(np.diff(number, prepend=-1, append=number[-1] + 1 if number.size else 0))
    heads, tails = rows[start[:-1]], rows[start[1:] - 1]
    run_first, run_last = np.full(n_runs, np.inf), np.full(n_runs, -np.inf)
    np.minimum.at(run_first, run[active], utc[active])
    np.maximum.at(run_last, run[active], utc[active])
    present = np.isfinite(run_first)
    by_start = np.argsort(np.where(present, run_first, np.inf), kind="stable")
    rank = np.empty(n_runs, dtype=np.intp)
    rank[by_start] = np.arange(n_runs)
    # Visits by time of their first reading within runs, runs by their first reading.
    arranged = np.lexsort((utc[heads], rank[run[heads]]))
    sizes = np.diff(start)
    of_visit = np.repeat(np.arange(len(heads)), sizes)
    new_number = np.empty(len(heads), dtype=np.intp)
    new_number[arranged] = np.arange(len(heads))
    final = np.argsort(new_number[of_visit], kind="stable")
    rows = rows[final]
    of_row = np.full(len(readings), -1, dtype=np.intp)
    of_row[rows] = new_number[of_visit][final]
    repeated = here[(run[here] == run[there]) & (utc[here] == utc[there])]
    return Visits(
        rows=frozen_index(rows),
        of_row=frozen_index(of_row),
        start=frozen_index(np.concatenate([[0], np.cumsum(sizes[arranged])])),
        station=frozen_index(station[heads][arranged]),
        run=frozen_index(run[heads][arranged]),
        first=frozen(utc[heads][arranged]),
        last=frozen(utc[tails][arranged]),
        run_order=frozen_index(by_start[present[by_start]]),
        run_start=frozen(np.where(present, run_first, np.nan)),
        run_length=frozen(np.where(present, run_last - run_first, np.nan)),
        equal_times=frozen_index(repeated),
    )
