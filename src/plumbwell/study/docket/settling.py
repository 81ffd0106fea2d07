"""The finding about visits that had not settled: by how much they creep, and which first readings to leave out."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from plumbwell.reduction.settling import Settling
from plumbwell.study.docket.wording import (
    amount,
    counted,
    depth,
    gravity,
    lines,
    listed,
    moment,
    numbers,
    run,
    station,
    stations,
)
from plumbwell.study.finding import Finding
from plumbwell.study.results import Results
from plumbwell.survey.column import Index

WORST = 5
"""Visits that are named one by one; the rest is counted in one more."""

LISTED_VISITS = 12


def visit_settling(results: Results) -> Iterator[Finding]:
    """Visits whose first readings creep towards the level of the later ones, the largest creep first.

    Of a hundred surveys of settled visits one shows a finding by chance. Its rows are the readings to leave out.
    """
    settle = results.network.settling
    named = np.flatnonzero(settle.leave_out > 0)
    named = named[np.argsort(-np.abs(settle.creep[named]), kind="stable")]
    for visit in named[:WORST].tolist():
        yield _of_visit(results, settle, visit)
    if named.size > WORST:
        yield _of_rest(results, settle, named)


def _of_visit(results: Results, settle: Settling, visit: int) -> Finding:
    visits = results.network.visits
    where, size, leave = int(visits.station[visit]), float(settle.creep[visit]), int(settle.leave_out[visit])
    begin, end = int(visits.start[visit]), int(visits.start[visit + 1])
    rows = visits.rows[begin : begin + leave]
    what = "the first reading" if leave == 1 else f"the first {leave} readings"
    if leave > 1 and leave == (end - begin) // 2:  # no more could be named, for the plateau is the other half
        what = f"at least {what}"
    way = "above" if size > 0.0 else "below"
    return Finding(
        code="visit_settling",
        severity="look",
        place=f"{station(results, where)}; {lines(results, rows)}",
        text=f"Visit {visit + 1} at {depth(results, where)} ({moment(float(visits.first[visit]))}, run "
        f"{run(results, int(visits.run[visit]))}) creeps: its first reading lies {gravity(abs(size))} ± "
        f"{gravity(float(settle.sd[visit]))} (1 sd) {way} the level of its later half. {what.capitalize()} of "
        f"{end - begin} had not settled, which moves the mean of the visit by "
        f"{gravity(float(settle.moved[visit]), signed=True)}.",
        mend=f"Take {lines(results, rows)} out of use, if the field notes do not speak against it; wait longer before "
        "the first reading of a stop.",
        stations=(where,),
        rows=numbers(rows),
    )


def _of_rest(results: Results, settle: Settling, named: Index) -> Finding:
    visits = results.network.visits
    left = np.sort(named[WORST:])
    leave = settle.leave_out[left]
    rows = np.concatenate(
        [visits.rows[begin : begin + n] for begin, n in zip(visits.start[left].tolist(), leave.tolist(), strict=True)]
    )
    sizes = np.abs(settle.creep[left])
    told = int(np.count_nonzero(settle.leave_out >= 0))
    first = [f"{visit + 1} ({n})" for visit, n in zip(left[:LISTED_VISITS].tolist(), leave.tolist(), strict=False)]
    names = listed(first + [""] * (left.size - LISTED_VISITS), LISTED_VISITS)
    where = np.unique(visits.station[left])
    return Finding(
        code="visit_settling",
        severity="look",
        place=stations(results, where, 3),
        text=f"{counted(left.size, 'more visit creeps', 'more visits creep')}, by {gravity(float(sizes.min()))} to "
        f"{gravity(float(sizes.max()))}, {amount(named.size, 0)} of the {amount(told, 0)} visits that can tell in all: "
        f"{'visit' if left.size == 1 else 'visits'} {names}, first readings to leave out in brackets.",
        mend="Take the first readings of these visits out of use; where most visits creep, wait longer at each stop.",
        stations=numbers(where),
        rows=numbers(rows),
    )
