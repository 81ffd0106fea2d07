"""The finding about stops that cannot tell a bend of the drift from gravity, before anything is wrong."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from plumbwell.earth.constants import FOUR_PI_G
from plumbwell.reduction.bend import LOOSE, Bends, bends
from plumbwell.study.docket.network import undetermined_runs
from plumbwell.study.docket.wording import (
    amount,
    counted,
    density,
    gravity,
    interval_names,
    label,
    listed,
    moment,
    numbers,
    run,
)
from plumbwell.study.finding import Finding
from plumbwell.study.network_steps import AUTOMATIC
from plumbwell.study.results import Results
from plumbwell.survey.column import Array

UNTOLD = 2.0
"""Times the sd of a visit from which on a bend is not told: sound patterns tell it to 0.3 to 1."""

UNBOUND = 0.1
"""Share of the sd given beforehand from which on nothing at all tells a bend."""

SUPPOSED = 10.0
"""Sds of a visit: size of the bend that is spoken of where nothing tells it."""

LISTED_RUNS = 4


def bend_untold(results: Results) -> Iterator[Finding]:
    """Runs whose drift is taken as straight though their stops could not tell if it were bent.

    Asked of runs whose order is chosen: an order that a person set, a walk that was found or stated, and a drift that
    nothing tells at all (`no_repeat`) need no such word.
    """
    fit = results.network.adjustment
    if fit.walk is not None:
        return
    given = {one.name: one.drift_order for one in results.survey.runs if one.drift_order is not None}
    names = results.survey.readings.run.names
    open_ = set(undetermined_runs(results))
    runs = tuple(
        code
        for code in fit.visits.run_order.tolist()
        if given.get(names[code], results.recipe.drift_order) == AUTOMATIC and code not in open_
    )
    found = bends(fit, runs)
    if found is None or not found.sd[found.worst] > UNTOLD * found.visit_sd:
        return
    yield _finding(results, found)


def _finding(results: Results, found: Bends) -> Finding:
    untold = found.run[found.sd > UNTOLD * found.visit_sd]
    labels = [run(results, code) for code in untold[:LISTED_RUNS].tolist()] + [""] * (untold.size - LISTED_RUNS)
    names = listed(labels, LISTED_RUNS)
    worst, sd = int(found.run[found.worst]), float(found.sd[found.worst])
    runs = f"run {names}" if untold.size == 1 else f"runs {names}"
    known, size = f"be known only to ± {gravity(sd)}, {amount(sd / found.visit_sd, 1)} times the noise of a visit", sd
    in_each = " in each" if untold.size > 1 else ""
    supposed = f"one of that size{in_each}"
    if sd > UNBOUND * LOOSE * found.visit_sd:
        known, size = "not be known at all", SUPPOSED * found.visit_sd
        supposed = f"one of {gravity(size)}{in_each}, {SUPPOSED:g} times the noise of a visit,"
    of_worst = "" if untold.size == 1 else f", worst in run {run(results, worst)}"
    return Finding(
        code="bend_untold",
        severity="look",
        place=runs,
        text=f"The stops of {runs} cannot tell a bend of the drift from gravity: were it free, the bend (its greatest "
        f"departure from the best straight line) would {known}{of_worst}. The drift is taken as straight; "
        f"{supposed} would move {_moved(results, found.moved(untold) * size)}, and no error counts it.",
        mend=_mend(results, found, worst)
        + " Else state drift_walk as the instrument is known to wander, so that the errors count it.",
        stations=numbers(np.unique(results.network.visits.station[np.isin(results.network.visits.run, untold)])),
    )


def _moved(results: Results, moved: Array) -> str:
    """What a change of gravity, (s,), does to the densities; to gravity itself where there is none."""
    pairs, thickness = results.intervals.densities.pairs, results.intervals.densities.thickness.values
    off = np.abs(moved[pairs.base] - moved[pairs.top]) / (FOUR_PI_G * thickness)
    off = np.where(np.isfinite(results.intervals.density.values), off, -1.0)
    if off.size and off.max() > 0.0:
        most = int(np.argmax(off))
        sd = density(float(results.intervals.density_sd.values[most]))
        return f"densities by up to {density(float(off[most]))} ({interval_names(results, most)}, sd {sd})"
    return f"gravity by up to {gravity(float(np.ptp(moved[results.stations.visits > 0])))}"


def _mend(results: Results, found: Bends, worst: int) -> str:
    """The return that would tell the bend: to the station at either end of the run, in its middle."""
    visits, basis = results.network.visits, results.network.adjustment.basis
    own = visits.station[visits.run == worst]
    middle = float(basis.start[worst] + 0.5 * basis.length[worst])
    tried = {where: found.with_return(worst, where, middle) for where in (int(own[0]), int(own[-1]))}
    place = int(np.flatnonzero(found.run == worst)[0])
    where = min(tried, key=lambda one: float(tried[one][place]))
    after = tried[where]
    told = f"Read {label(results, where)} once more near {moment(middle)}, the middle of run {run(results, worst)}"
    left = int(np.count_nonzero(after > UNTOLD * found.visit_sd))
    if not left:
        return f"{told}: that would tell the bend to ± {gravity(float(after.max()))}."
    if after[place] <= UNTOLD * found.visit_sd:
        own = f"that would tell its bend to ± {gravity(float(after[place]))}"
        return f"{told}: {own}; the same is wanted in {counted(left, 'other run')}."
    return "Come back more often: a station has to be read at the start, in the middle and at the end of a run."
