"""Findings about single visits and readings: those that do not fit, and those that nothing checks.

What is named was found by `reduction.judged`: of a hundred clean surveys one shows a finding by chance. Errors and
ratios are as all that is not named tells them.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray

from plumbwell.study.docket.wording import (
    amount,
    counted,
    depth,
    gravity,
    line,
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
from plumbwell.survey.column import Array, Index

UNCHECKED = 0.05
"""Redundancy under which nothing checks a reading."""

WORST = 5
"""Findings of one kind; the rest is counted in one more."""

LISTED_VISITS = 4


def outliers(results: Results) -> Iterator[Finding]:
    """Visits that disagree with the rest of the network, readings that disagree with their visit."""
    found, visits = results.network.judgement, results.network.visits
    named = np.zeros(len(results.survey.readings), dtype=bool)
    named[found.rows] = True
    whole = np.logical_and.reduceat(named[visits.rows], visits.start[:-1]) if len(visits) else np.zeros(0, dtype=bool)
    of_row = visits.of_row[found.rows]
    if (of_row < 0).any():  # left out by the recipe: told as they stood
        yield _left_out(results, found.rows[of_row < 0])
    in_use = of_row >= 0
    of_visit = in_use & whole[np.maximum(of_row, 0)]
    bad, first = np.unique(of_row[of_visit], return_index=True)
    if bad.size:
        at = np.flatnonzero(of_visit)[first]
        yield from _visits(results, bad, found.ratio[at], found.error[at], found.alike[at])
    single = np.flatnonzero(in_use & ~of_visit)
    if single.size:
        yield from _readings(results, found.rows[single], found.ratio[single], found.error[single])


def _left_out(results: Results, rows: Index) -> Finding:
    return Finding(
        code="outliers_left_out",
        severity="look",
        place=lines(results, rows),
        text=f"{counted(rows.size, 'reading does', 'readings do')} not fit and "
        f"{'is' if rows.size == 1 else 'are'} left out, since outliers is \"exclude\".",
        mend='Look at the field notes; write outliers = "flag" to keep them, or take them out of use with a reason.',
        rows=numbers(rows),
    )


def _visits(
    results: Results, bad: Index, ratio: Array, size: Array, alike: NDArray[np.bool_]
) -> Iterator[Finding]:
    """One finding a station, worst first; the rest in one, which stands by its deepest station."""
    visits = results.network.visits
    ratio_of = dict(zip(bad.tolist(), ratio.tolist(), strict=True))
    size_of = dict(zip(bad.tolist(), size.tolist(), strict=True))
    undecided = set(bad[alike].tolist())
    worst: dict[int, int] = {}
    for visit in bad[np.argsort(-np.abs(ratio), kind="stable")].tolist():
        worst.setdefault(int(visits.station[visit]), visit)
    named = list(worst.items())
    for where, visit in named[:WORST]:
        others = np.flatnonzero(visits.station == where)
        others = others[others != visit]
        apart = f"{gravity(abs(size_of[visit]))} ({amount(abs(ratio_of[visit]), 1)} sd)"
        members = _rows_of(results, visit)
        at = f"{moment(float(visits.first[visit]))}, run {run(results, int(visits.run[visit]))}"
        if others.size == 1 and visit in undecided:
            first, second = sorted((visit, int(others[0])))
            text = (
                f"Visits {first + 1} and {second + 1} at {depth(results, where)} disagree by {apart}; "
                "nothing here tells which of the two is off."
            )
            members = np.concatenate([_rows_of(results, first), _rows_of(results, second)])
        else:
            rest = "the rest of the network"
            if others.size:
                shown = [str(other + 1) for other in others[:LISTED_VISITS].tolist()]
                rest = f"visit{'s' if others.size > 1 else ''} " + listed(
                    shown + [""] * (others.size - LISTED_VISITS), LISTED_VISITS
                )
            way = "more" if size_of[visit] > 0.0 else "less"
            text = (
                f"Visit {visit + 1} at {depth(results, where)} ({at}) reads {apart} {way} than {rest} and "
                "the drift allow."
            )
        yield Finding(
            code="visit_disagrees",
            severity="look",
            place=station(results, where),
            text=text,
            mend="Look at the field notes: a tare between the visits would be listed as [[tare]]; take a bad "
            "stop out of use with a reason.",
            stations=(where,),
            rows=numbers(members),
        )
    if len(named) > WORST:
        left = [where for where, _ in named[WORST:]]
        least = min(abs(ratio_of[visit]) for _, visit in named[WORST:])
        rest_rows = np.concatenate([_rows_of(results, visit) for _, visit in named[WORST:]])
        yield Finding(
            code="visit_disagrees",
            severity="look",
            place=stations(results, left, 3),
            text=f"At {counted(len(left), 'more station')} a visit disagrees, by {amount(least, 1)} sd "
            f"or more: {stations(results, left)}.",
            mend="Mend the worst first: one bad visit or tare can bend many.",
            stations=tuple(sorted(left, reverse=True)),
            rows=numbers(rest_rows),
        )


def _rows_of(results: Results, visit: int) -> Index:
    visits = results.network.visits
    return visits.rows[visits.start[visit] : visits.start[visit + 1]]


def _readings(results: Results, rows: Index, ratio: Array, error: Array) -> Iterator[Finding]:
    """The worst readings one by one, the rest counted."""
    bad = np.argsort(-np.abs(ratio), kind="stable")
    placed = results.stations.located.placement.station
    for number in bad[:WORST].tolist():
        row = int(rows[number])
        where = int(placed[row])
        visit = int(results.network.visits.of_row[row])
        yield Finding(
            code="reading_disagrees",
            severity="look",
            place=f"{station(results, where)}; {lines(results, [row])}",
            text=f"The reading of row {line(results, row)} at {depth(results, where)} (visit "
            f"{visit + 1}) lies {gravity(float(error[number]), signed=True)} "
            f"({amount(abs(float(ratio[number])), 1)} sd) off the others of its visit.",
            mend="Look at its cell and its note; take it out of use with a reason, if the instrument had not settled.",
            stations=(where,),
            rows=(row,),
        )
    if bad.size > WORST:
        left, least = rows[bad[WORST:]], float(np.min(np.abs(ratio[bad[WORST:]])))
        yield Finding(
            code="reading_disagrees",
            severity="look",
            place=lines(results, left),
            text=f"{counted(left.size, 'more reading lies', 'more readings lie')} {amount(least, 1)} sd or "
            "more off the others of their visits.",
            mend="Mend the worst first; where many stand out, see whether visits hold more than one stop.",
            stations=numbers(np.unique(placed[left])[::-1]),
            rows=numbers(left),
        )


def unchecked(results: Results) -> Iterator[Finding]:
    """Used readings that nothing checks."""
    redundancy = results.network.adjustment.redundancy
    rows = np.flatnonzero(redundancy < UNCHECKED)
    if not rows.size:
        return
    where = np.unique(results.stations.located.placement.station[rows])
    yield Finding(
        code="unchecked_readings",
        severity="note",
        place=stations(results, where, 3),
        text=f"Nothing checks {counted(rows.size, 'reading')} at {stations(results, where)}: an error there "
        "goes into gravity whole and shows in no residual.",
        mend="Read each stop more than once, and visit stations again.",
        stations=numbers(where),
        rows=numbers(rows),
    )
