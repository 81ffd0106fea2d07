"""Findings about visits that had not settled: those that creep one by one, and a little creep that all share."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from plumbwell.reduction.chance import student_limit
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

ALIKE_CHANCE = 0.001
"""Chance that settled visits show a creep that they share."""


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


def visits_creep_alike(results: Results) -> Iterator[Finding]:
    """A creep that the visits share, each too little to be named alone."""
    settle = results.network.settling
    if not settle.freedom > 0.0 or not settle.common_sd > 0.0:
        return
    if abs(settle.common) <= settle.common_sd * student_limit(ALIKE_CHANCE, freedom=settle.freedom):
        return
    visits = results.network.visits
    own = np.flatnonzero(settle.leave_out == 0)
    counts = np.diff(visits.start)
    fewest, most = int(counts.min()), int(counts.max())
    even = fewest == most
    size = f"{gravity(abs(settle.common))} ± {gravity(settle.common_sd)} (1 sd)"
    way = "above" if settle.common > 0.0 else "below"
    yield Finding(
        code="visits_creep_alike",
        severity="note" if even else "look",
        place="visits",
        text=f"In {counted(own.size, 'visit')} none of which creeps beyond its own noise the first reading lies on "
        f"average {size} {way} the level of the later half: the instrument had not quite settled. "
        + (
            "All visits have equally many readings, so differences of gravity hardly feel it."
            if even
            else f"Visits have {fewest} to {most} readings, so the mean of a short one holds more of it than that of a "
            "long one."
        ),
        mend="Wait longer before the first reading of a stop; or take the first reading of every visit out of use.",
    )
