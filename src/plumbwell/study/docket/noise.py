"""Findings about noise: what the visits agree on, how well, and which of them tell it."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from plumbwell.reduction.calibration import instruments_used
from plumbwell.reduction.chance import chi_square_chance
from plumbwell.reduction.network import NO_TIES, solve
from plumbwell.reduction.noise_of_few import CHANCE, scatter_chance
from plumbwell.reduction.variances import ENOUGH_FREEDOM
from plumbwell.study.docket.wording import (
    MILLIGAL,
    amount,
    counted,
    depth,
    gravity,
    line,
    lines,
    numbers,
    station,
    stations,
)
from plumbwell.study.finding import Finding
from plumbwell.study.results import Results
from plumbwell.survey.column import Array

FAR_APART = 1e6
"""Ratio of two weights from which on the smaller one counts for nothing."""

TOO_WELL = 0.999
"""Chance of a larger misfit from which on the visits agree better than their noise allows."""

WIDE_VISITS, WIDE_READINGS = 10.0, 50.0
"""Times the stated noise: what lies farther off is no noise. Readings of a second scatter more than their floor."""

NORMAL_OF_MEDIAN = 1.4826
"""Sd of a normal distribution over the median of its absolute values."""

LEAST_CHECKS = 3
"""Degrees of freedom from which on a majority can be spoken of."""

MOST_VISITS = 10_000
"""Visits up to which a majority is looked for: of so many the readings in error are named one by one."""

PASSES = 30
STILL = 0.01
"""Share of the noise of a visit under which a fit by least absolute deviations no longer moves."""

LEAST_WEIGHT = 1e-6
"""Of a visit in that fit; less would be lost in rounding."""


def weights_far_apart(results: Results) -> Iterator[Finding]:
    """Stated sds of readings so far apart that some readings decide alone."""
    stated = results.survey.readings.reading_sd
    if stated is None:
        return
    rows = results.network.visits.rows
    known = rows[np.isfinite(stated.values[rows])]
    if not known.size:
        return
    sd = stated.values[known]
    low, high = int(known[np.argmin(sd)]), int(known[np.argmax(sd)])
    ratio = (float(sd.max()) / float(sd.min())) ** 2
    if ratio <= FAR_APART:
        return
    used = results.network.adjustment.noise.sd
    in_force = (float(used.max()) / float(used.min())) ** 2
    small = np.sort(known[sd**2 < float(sd.max()) ** 2 / FAR_APART])
    then = f"reading_floor brings that to {in_force:.1g}."
    if in_force > FAR_APART:
        then = f"with reading_floor still by {in_force:.1g}. Beside the best readings the others count for nothing."
    yield Finding(
        code="weights_far_apart",
        severity="look",
        place=lines(results, small),
        text=f"reading_sd goes from {_sd(float(sd.min()))} (row {line(results, low)}) to {_sd(float(sd.max()))} "
        f"(row {line(results, high)}): weights differ by a factor of {ratio:.1g}; {then}",
        mend="See the unit of reading_sd and what it means; leave the cell empty where it is not known.",
        rows=numbers(small),
    )


def _sd(value: float) -> str:
    return f"{value / MILLIGAL:.3g} mGal"


def noise_at_floor(results: Results) -> Iterator[Finding]:
    """Visits that agree better than their noise allows: every sd is then what is stated, or what few readings gave."""
    fit = results.network.adjustment
    freedom = fit.reseating.freedom
    if freedom < 1:
        return
    value = float(np.sum(_visit_residuals(results) ** 2 / (fit.noise.variance + fit.reseating.variance)))
    if chi_square_chance(value, freedom=freedom) < TOO_WELL:
        return
    better = (
        f"The visits agree better than their noise allows (chi-square {value:.2g} with "
        f"{counted(freedom, 'degree of freedom', 'degrees of freedom')}): "
    )
    instruments = instruments_used(results.survey.readings, results.survey.instruments)
    code = results.survey.readings.instrument.code[results.network.visits.rows]
    floor = np.array([one.reading_floor for one in instruments])[code]
    inside = fit.noise.freedom
    if results.recipe.noise == "estimate" and inside > 0 and np.median(fit.noise.sd / floor) > 1.0:
        yield Finding(
            code="noise_of_few",
            severity="look",
            place="network",
            text=better + f"the noise of a reading, {gravity(float(np.median(fit.noise.sd)))}, is what "
            f"{counted(inside, 'degree of freedom', 'degrees of freedom')} within visits "
            f"{'gives' if inside == 1 else 'give'}, and is too large for the whole.",
            mend="Look at the visits with several readings: an unsettled one among them, or two stops taken for one "
            "visit, makes every sd too large.",
        )
        return
    yield Finding(
        code="noise_at_floor",
        severity="look",
        place="network",
        text=better + "every sd rests on what is stated (reading_floor, reseating_sd), not on what the survey shows.",
        mend="See that the readings were not averaged, rounded or copied; lower the stated noise, if the instrument "
        "is so good.",
    )


def noise_of_few(results: Results) -> Iterator[Finding]:
    """Few readings within visits scatter more than what the visits allow: a bad one among them, and no noise."""
    fit, visits = results.network.adjustment, results.network.visits
    freedom, among_visits = fit.noise.freedom, fit.reseating.freedom
    if results.recipe.noise != "estimate" or not 0 < freedom < ENOUGH_FREEDOM or among_visits < 1:
        return
    first, sd = visits.start[:-1], fit.noise.sd
    # Readings off the mean of their visit, and visits off the network as if all their scatter were reading noise.
    left = fit.residual[visits.rows] + fit.visit_effect[visits.rows]
    mean = np.add.reduceat(fit.noise.weight * left, first)
    off = left - np.repeat(mean, np.diff(visits.start))
    within = float(np.sum((off / sd) ** 2)) / freedom
    checked = 1.0 - fit.solution.weight * fit.solution.variance_of_fit()
    among = float(np.sum(mean**2) / np.sum(checked * fit.noise.variance))
    chance = scatter_chance(within, freedom, among, among_visits)
    if chance >= CHANCE:
        return
    typical = float(np.median(sd))
    worst = int(visits.of_row[visits.rows[np.argmax(np.abs(off / sd))]])
    rows = visits.rows[visits.start[worst] : visits.start[worst + 1]]
    where = int(visits.station[worst])
    yield Finding(
        code="noise_of_few",
        severity="look",
        place=f"{station(results, where)}; {lines(results, rows)}",
        text=f"Readings within visits scatter by {gravity(within**0.5 * typical)} "
        f"({counted(freedom, 'degree of freedom', 'degrees of freedom')}), most in visit {worst + 1} at "
        f"{depth(results, where)}, where the visits themselves allow {gravity(among**0.5 * typical)} at the most "
        f"(p = {chance:.1g}): that is no noise, and the noise is taken from the visits alone. The mean of that visit "
        "holds whatever is wrong there.",
        mend="Look at the readings of that visit: an unsettled one among them, or two stops taken for one visit; take "
        "the bad one out of use with a reason.",
        stations=(where,),
        rows=numbers(rows),
    )


def one_station_repeated(results: Results) -> Iterator[Finding]:
    """One station alone is visited again: nothing shows the noise of the stops elsewhere."""
    visits = results.stations.visits
    again = np.flatnonzero(visits > 1)
    others = np.flatnonzero(visits == 1)
    estimated = results.recipe.noise == "estimate" and results.network.adjustment.reseating.freedom > 0
    if again.size != 1 or others.size < 2 or not estimated:
        return
    yield Finding(
        code="one_station_repeated",
        severity="look",
        place=station(results, int(again[0])),
        text=f"Only {stations(results, again)} is visited more than once: the noise of a stop is what that station "
        f"shows, and is taken for the {amount(others.size, 0)} others, where nothing tells it.",
        mend="Visit one or two of the others again; sondes seat worse at depth than at a base.",
        stations=numbers(others),
    )


def no_majority(results: Results) -> Iterator[Finding]:
    """Visits, or readings within visits, of which no majority agrees: nothing tells which of them are wrong."""
    fit = results.network.adjustment
    visits, freedom = results.network.visits, fit.reseating.freedom
    instruments = instruments_used(results.survey.readings, results.survey.instruments)
    code = results.survey.readings.instrument.code[visits.rows]
    floor = np.array([one.reading_floor for one in instruments])[code]
    counts_it = "Every sd counts this scatter."
    if results.recipe.noise == "as_given":
        counts_it = "No sd counts this scatter, since the noise is the stated one."
    if freedom >= LEAST_CHECKS:
        seat = np.array([one.reseating_sd for one in instruments])[code[visits.start[:-1]]]
        counts, residual, noise = np.diff(visits.start), _visit_residuals(results), floor[visits.start[:-1]]
        # Medians and the fit are made only where least squares already leaves much more than noise.
        wide = freedom * (0.5 * WIDE_VISITS) ** 2
        if np.sum(residual**2 / (seat**2 + noise**2 / counts)) > wide:
            # Half of the readings off would make the mean square of any noise large, and so hide themselves.
            off_median = np.abs(_off_the_median(results))[np.repeat(counts > 2, counts)]
            middle = NORMAL_OF_MEDIAN * float(np.median(off_median)) if off_median.size else 0.0
            noise = np.maximum(noise, middle)
        usual = np.sqrt(seat**2 + noise**2 / counts)
        if np.sum((residual / usual) ** 2) > wide and len(visits) <= MOST_VISITS:
            off = np.flatnonzero(np.abs(_least_deviations(results, residual, usual)) > WIDE_VISITS * usual)
            if 2 * off.size >= freedom:
                yield Finding(
                    code="no_majority",
                    severity="look",
                    place="network",
                    text=f"{counted(off.size, 'visit lies', 'visits lie')} more than {WIDE_VISITS:g} times the stated "
                    f"noise off the best fit, and only {counted(freedom, 'degree of freedom checks', _CHECK)} them: "
                    f"no consistent majority tells which are wrong. {counts_it}",
                    mend="See whether a tare, a wrong label or a wrong clock explains it; bring in more repeats.",
                    stations=numbers(np.unique(visits.station[off])),
                )
    inside = fit.noise.freedom
    if inside >= LEAST_CHECKS:
        stated = results.survey.readings.reading_sd
        if stated is not None and results.recipe.noise == "as_given":
            floor = np.fmax(floor, stated.values[visits.rows])
        left = fit.residual[visits.rows]
        if float(np.mean((left / floor) ** 2)) < (0.2 * WIDE_READINGS) ** 2:
            return
        odd = visits.rows[np.abs(_off_the_median(results)) > WIDE_READINGS * floor]
        if 2 * odd.size >= inside:
            yield Finding(
                code="no_majority",
                severity="look",
                place=lines(results, np.sort(odd)),
                text=f"{counted(odd.size, 'reading lies', 'readings lie')} more than {WIDE_READINGS:g} times "
                f"reading_floor off the middle reading of the visit, and only "
                f"{counted(inside, 'degree of freedom checks', _CHECK)} the readings within visits: no consistent "
                f"majority tells which are wrong. {counts_it}",
                mend="Take what was read before the instrument had settled out of use, with a reason; see the unit.",
                rows=numbers(np.sort(odd)),
            )


_CHECK = "degrees of freedom check"


def _visit_residuals(results: Results) -> Array:
    """What the means of the visits have more than the network gives them, (v,), m/s2."""
    fit, visits = results.network.adjustment, results.network.visits
    rows = visits.rows
    left = fit.noise.weight * (fit.residual[rows] + fit.visit_effect[rows])
    return np.add.reduceat(left, visits.start[:-1])


def _off_the_median(results: Results) -> Array:
    """Used readings less the median of their visit's, (u,), in the order of the visits' rows, m/s2."""
    fit, visits = results.network.adjustment, results.network.visits
    counts = np.diff(visits.start)
    visit = np.repeat(np.arange(len(visits)), counts)
    value = fit.residual[visits.rows]
    value = value[np.lexsort((value, visit))]
    first = visits.start[:-1]
    middle = 0.5 * (value[first + (counts - 1) // 2] + value[first + counts // 2])
    return fit.residual[visits.rows] - np.repeat(middle, counts)


def _least_deviations(results: Results, residual: Array, usual: Array) -> Array:
    """Residuals of the visits after a fit by least absolute deviations, which few wrong ones cannot bend.

    Notes
    -----
    Least squares with weights 1/|residual|, over and over (Schlossmacher 1973, J. Am. Stat. Assoc. 68, 857-859), of
    stations, biases, drift and tares; started from the residuals of the network, which hold all that a fit can take.
    """
    fit, typical = results.network.adjustment, float(np.median(usual))
    # The visits alone: what is stated of drift would bend a fit that trusts no visit much. Modes of a walk stay bound.
    pins = fit.rank.pins
    if fit.walk is not None:
        pins = pins + fit.design.prior_matrix * typical**2
    left = residual
    for _ in range(PASSES):
        weight = np.maximum(typical / np.maximum(np.abs(left), 0.1 * usual), LEAST_WEIGHT)
        try:
            solution = solve(fit.design, weight, residual[:, None], NO_TIES, pins=pins)
        except np.linalg.LinAlgError:
            break
        before, left = left, solution.residual[:, 0]
        if np.all(np.abs(left - before) < STILL * usual):
            break
    return left
