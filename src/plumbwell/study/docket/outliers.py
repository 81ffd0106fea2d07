"""Findings about single visits and readings: those that do not fit, and those that nothing checks.

Visits are tested by their means, readings against the other readings of their visit, all together at one
level: of a hundred clean surveys one shows a finding by chance (Baarda 1968; Pope 1976; Sidak 1967). A ratio
is told against the sd as the other visits or readings give it.
"""

from __future__ import annotations

from collections.abc import Iterator
from math import expm1, inf, log1p

import numpy as np

from plumbwell.reduction.calibration import instruments_used
from plumbwell.study.docket.ties import accused
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
from plumbwell.survey.instrument import Instrument

CHANCE = 0.01
"""Chance that a clean survey shows any outlier."""

LEAST_RATIO = 3.29
"""Two-sided 0.1 % of the normal distribution: the level of a single test (Baarda 1968)."""

UNCHECKED = 0.05
"""Redundancy under which nothing checks a reading."""

WORST = 5
"""Findings of one kind; the rest is counted in one more."""

LISTED_VISITS = 4

MEDIAN_SQUARE = 0.4549
"""Median of the square of a normal ratio (chi-square of one degree of freedom)."""

SWOLLEN = 0.25
"""Share of the variance under which the median says that a few large residuals make most of it."""

MANY = 100
"""Residuals from which on the median may say so."""


def critical_ratio(tests: int) -> float:
    """Ratio to sd that the largest of so many normal ones exceeds with a chance of 1 %, at least 3.29."""
    from statistics import NormalDist

    return max(LEAST_RATIO, -NormalDist().inv_cdf(-expm1(log1p(-CHANCE) / tests) / 2.0))


def as_normal(ratio: Array, freedom: float) -> Array:
    """The normal ratios of the same chance as Student's t of so many degrees of freedom, without sign.

    Notes
    -----
    (8 f + 1)/(8 f + 3) sqrt(f ln(1 + t2/f)); Wallace 1959, Ann. Math. Stat. 30, 1124-1130. Never above the
    exact one, and within 0.13 of it from 4 degrees of freedom on for ratios up to 5.
    """
    if freedom == inf:
        return np.abs(ratio)
    return (8.0 * freedom + 1.0) / (8.0 * freedom + 3.0) * np.sqrt(freedom * np.log1p(ratio**2 / freedom))


def beside_the_rest(ratio: Array, *, freedom: float, variance: Array, least: Array) -> Array:
    """Residuals over their sd as the others alone give it: a large one raises the sd that measures it.

    Parameters
    ----------
    ratio : (n,) array
        Residual over its sd, the variance of all in it; no larger than the root of the degrees of freedom.
    freedom : float
        Degrees of freedom from which the variance was estimated; infinity where it is stated.
    variance, least : (n,) arrays
        Variance of each observation, and the part of it that the estimate cannot lower.

    Notes
    -----
    t = w sqrt((f - 1)/(f - w2)) of f - 1 degrees of freedom (Pope 1976; Cook & Weisberg 1982); the variance
    without the residual is not taken below its least.
    """
    if freedom == inf:
        return ratio
    square = ratio**2
    without = (freedom - square) / (freedom - 1.0)
    few_large = 2 * np.count_nonzero(square < SWOLLEN * MEDIAN_SQUARE) > len(ratio) >= MANY
    if few_large:
        without = np.minimum(without, np.nanmedian(square) / MEDIAN_SQUARE)
    without = np.maximum(without, least / variance)
    return ratio / np.sqrt(np.minimum(without, 1.0))


def outliers(results: Results) -> Iterator[Finding]:
    """Visits that disagree with the rest of the network, readings that disagree with their visit.

    While ties contradict one another none is accused: they bend the network, and all would be.
    """
    if accused(results).size:
        return
    fit, visits = results.network.adjustment, results.network.visits
    one, noise, counts = fit.solution, fit.noise, np.diff(visits.start)
    redundancy = 1.0 - one.weight * one.variance_of_fit()
    checked = np.flatnonzero(redundancy > UNCHECKED)
    alike = np.flatnonzero(np.repeat(counts > 1, counts))
    alike = alike[fit.redundancy[visits.rows[alike]] > UNCHECKED]
    tests = checked.size + alike.size
    estimate = results.recipe.noise == "estimate"
    if checked.size:
        freedom = float(fit.reseating.t_freedom) if estimate else inf
        weight, free = one.weight[checked], redundancy[checked]
        ratio = beside_the_rest(
            one.residual[checked, 0] * np.sqrt(weight / free),
            freedom=freedom,
            variance=1.0 / weight,
            least=noise.variance[checked],
        )
        if np.any(np.abs(ratio) > LEAST_RATIO):
            bad = np.flatnonzero(as_normal(ratio, freedom - 1.0) > critical_ratio(tests))
            size = one.residual[checked[bad], 0] / free[bad]
            yield from _visits(results, checked[bad], ratio[bad], size)
    if alike.size and noise.freedom > 1:
        freedom = float(noise.freedom) if estimate else inf
        rows = visits.rows[alike]
        floors = [each.reading_floor for each in _instruments(results)]
        ratio = beside_the_rest(
            fit.standardised[rows],
            freedom=freedom,
            variance=noise.sd[alike] ** 2,
            least=np.array(floors)[results.survey.readings.instrument.code[rows]] ** 2,
        )
        if np.any(np.abs(ratio) > LEAST_RATIO):
            bad = np.flatnonzero(as_normal(ratio, freedom - 1.0) > critical_ratio(tests))
            yield from _readings(results, rows[bad], ratio[bad])


def _instruments(results: Results) -> tuple[Instrument, ...]:
    return instruments_used(results.survey.readings, results.survey.instruments)


def _visits(results: Results, bad: Index, ratio: Array, size: Array) -> Iterator[Finding]:
    """One finding a station, worst first; the rest in one, which stands by its deepest station."""
    visits = results.network.visits
    ratio_of = dict(zip(bad.tolist(), ratio.tolist(), strict=True))
    size_of = dict(zip(bad.tolist(), size.tolist(), strict=True))
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
        if others.size == 1 and abs(ratio_of.get(int(others[0]), 0.0)) > 0.98 * abs(ratio_of[visit]):
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


def _readings(results: Results, rows: Index, ratio: Array) -> Iterator[Finding]:
    """The worst readings one by one, the rest counted."""
    bad = np.argsort(-np.abs(ratio), kind="stable")
    placed = results.stations.located.placement.station
    residual = results.network.adjustment.residual
    for number in bad[:WORST].tolist():
        row = int(rows[number])
        where = int(placed[row])
        visit = int(results.network.visits.of_row[row])
        yield Finding(
            code="reading_disagrees",
            severity="look",
            place=f"{station(results, where)}; {lines(results, [row])}",
            text=f"The reading of row {line(results, row)} at {depth(results, where)} (visit "
            f"{visit + 1}) lies {gravity(float(residual[row]), signed=True)} "
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
