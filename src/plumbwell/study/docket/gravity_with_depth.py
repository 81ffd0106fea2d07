"""Findings about how gravity changes with depth: not at all, the wrong way, or as in no such rock.

These are the marks of a dead meter, a lost sign, a wrong unit of depth or reading. The gravest is told.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray

from plumbwell.earth.constants import FOUR_PI_G
from plumbwell.study.docket.depths import mostly_above_ground
from plumbwell.study.docket.rock import HEAVIEST, LIGHTEST
from plumbwell.study.docket.ties import far_ties
from plumbwell.study.docket.wording import GRAM_PER_CM3, amount, counted, density, gravity, numbers
from plumbwell.study.finding import Finding
from plumbwell.study.results import Results
from plumbwell.survey.column import Array, Index
from plumbwell.survey.units import FOOT

NO_CHANGE = 50.0
"""kg/m3; a density so near to F/(4 pi G) is gravity that does not change with depth."""

SPAN = 5.0
"""Standard deviations of gravity under which its span is noise."""

USUAL_ROCK = 2670.0
"""kg/m3; whose gravity would have to show over the column, by twice that span."""

BEYOND_DOUBT = 3.0
"""Standard deviations by which gravity must fall downward in an interval."""

FAR_FROM_NUMBER, FAR_FROM_MARKERS = 750.0, 600.0
"""kg/m3; a stated reference is often a convention, so that rock may differ more from it than from markers."""

EXPLAINED = 300.0
"""kg/m3; another unit of depth explains densities that it brings so near to what is expected."""

HEAVY = 3150.0
"""kg/m3; rock of 2.0 to 3.0 g/cm3 is heavier than this, where its depths are feet written as metres."""

LIGHT_AS_FEET, HEAVY_AS_FEET = 2000.0, 3000.0
"""kg/m3; what most rocks lie between."""


def gravity_with_depth(results: Results) -> Iterator[Finding]:
    """Gravity that does not change with depth, falls downward, or changes as in no such rock."""
    density_of = results.intervals.density.values
    known = np.flatnonzero(density_of == density_of)
    if not known.size:
        return
    value, turning = density_of[known], results.choice.gradient / FOUR_PI_G
    if _constant(results, known, turning):
        yield _no_change(results, known, turning)
        return
    if value.max() > turning + NO_CHANGE:
        falls = value - BEYOND_DOUBT * results.intervals.density_sd.values[known] > turning + NO_CHANGE
        thickness = results.intervals.densities.thickness.values[known]
        most = 2.0 * float(thickness[falls].sum()) > float(thickness.sum())
        if most and 2 * np.count_nonzero(falls) > known.size:
            if not mostly_above_ground(results):
                yield _falling(results, known, falls, turning)
            return
    yield from _far_from_expected(results, known, turning)


def _span(results: Results, known: Index) -> float:
    """Span of gravity over the stations of some intervals, m/s2."""
    pairs, at = results.intervals.densities.pairs, results.stations.gravity.values
    both = at[np.concatenate((pairs.top[known], pairs.base[known]))]
    return float(both.max() - both.min())


def _usual(results: Results, known: Index, turning: float) -> float:
    """What the usual rock would change gravity by over some intervals, m/s2."""
    thickness = results.intervals.densities.thickness.values[known]
    return float(thickness.sum()) * abs(turning - USUAL_ROCK) * FOUR_PI_G


def _constant(results: Results, known: Index, turning: float) -> bool:
    """True when gravity does not change with depth, within its error or to the eye."""
    value = results.intervals.density.values[known]
    if value.max() <= turning + NO_CHANGE and value.min() >= turning - NO_CHANGE:
        return True
    noise = SPAN * float(results.stations.gravity_sd.values[results.intervals.densities.pairs.base[known]].max())
    return _span(results, known) < noise and _usual(results, known, turning) > 2.0 * noise


def _no_change(results: Results, known: Index, turning: float) -> Finding:
    thickness = float(results.intervals.densities.thickness.values[known].sum())
    return Finding(
        code="gravity_constant",
        severity="look",
        place="readings",
        text=f"Gravity does not change with depth: it spans {gravity(_span(results, known))} over "
        f"{amount(thickness, 1)} m, and rock of {density(USUAL_ROCK, 2)} would change it by "
        f"{gravity(_usual(results, known, turning))}. Densities near {density(turning, 2)} then say nothing.",
        mend="See that the meter was free and read anew at each stop, and the unit, scale and calibration of the "
        "readings.",
        intervals=numbers(known),
    )


def _falling(results: Results, known: Index, falls: NDArray[np.bool_], turning: float) -> Finding:
    pairs, at = results.intervals.densities.pairs, results.stations.gravity.values
    falling = known[falls]
    lost = float(np.sum(at[pairs.top[falling]] - at[pairs.base[falling]]))
    return Finding(
        code="gravity_falls",
        severity="look",
        place="readings",
        text=f"Gravity falls downward in {falling.size} of {counted(known.size, 'interval')}, by {gravity(lost)} "
        f"together: that needs rock of more than {density(turning, 2)} all along.",
        mend="See the sign of the readings and of scale, and whether depths grow downward and belong to their "
        "stations.",
        intervals=numbers(falling),
    )


def _far_from_expected(results: Results, known: Index, turning: float) -> Iterator[Finding]:
    if far_ties(results).size:
        return
    expected = _expected(results)
    median = _median(results.intervals.density.values[known])
    # The gradient of gravity is that of the stated depths times what a stated metre should be.
    as_feet, as_metres = (turning - (turning - median) * factor for factor in (1.0 / FOOT, FOOT))
    if expected is None or abs(median - expected[1]) <= expected[2]:
        heavy_is_expected = expected is not None and abs(median - expected[1]) <= EXPLAINED
        if not heavy_is_expected and median > HEAVY and LIGHT_AS_FEET <= as_feet <= HEAVY_AS_FEET:
            yield _as_of_feet(known, median, as_feet)
        return
    what, rock, _far = expected
    if abs(as_feet - rock) <= EXPLAINED:
        explains = f"If the depths are feet, written as metres, it is {density(as_feet, 2)}, which fits."
    elif abs(as_metres - rock) <= EXPLAINED:
        explains = f"If the depths are metres, written as feet, it is {density(as_metres, 2)}, which fits."
    elif (told := _like_rock(median, as_feet, rock)) or _like_rock(median, as_metres, rock):
        # What is expected is taken at the stated depths, and moves with them when they are wrong.
        units, as_rock = ("feet, written as metres", as_feet) if told else ("metres, written as feet", as_metres)
        explains = (
            f"If the depths are {units}, it is {density(as_rock, 2)}, a density of rock: other rock is then expected "
            "there."
        )
    else:
        explains = (
            f"Depths in feet written as metres, or the other way round, do not explain it ({density(as_feet, 2)}, "
            f"{density(as_metres, 2)})."
        )
    yield Finding(
        code="density_far_from_expected",
        severity="look",
        place="intervals",
        text=f"The median density of the {counted(known.size, 'interval')} is {density(median, 2)}, "
        f"{amount(abs(median - rock) / GRAM_PER_CM3, 2)} g/cm³ {'above' if median > rock else 'below'} {what}, "
        f"{density(rock, 2)}. {explains}",
        mend="See the units of depth and reading, scale and calibration; or state the density of the rock that is "
        "there.",
        intervals=numbers(known),
    )


def _like_rock(median: float, other: float, expected: float) -> bool:
    """True where other units of depth make of a density that no rock has one that rock has, nearer the expected."""
    no_rock = not LIGHTEST <= median <= HEAVIEST
    return no_rock and LIGHT_AS_FEET <= other <= HEAVY_AS_FEET and abs(other - expected) < abs(median - expected)


def _as_of_feet(known: Index, median: float, as_feet: float) -> Finding:
    """A note only: ore is as heavy, and nothing stated speaks against it."""
    return Finding(
        code="density_as_of_feet",
        severity="note",
        place="intervals",
        text=f"The median density of the {counted(known.size, 'interval')} is {density(median, 2)}, and little rock "
        f"but ore is so heavy. If the depths are feet, written as metres, it is {density(as_feet, 2)}.",
        mend="See that the depths or elevations are in the unit that the heading of their column names.",
        intervals=numbers(known),
    )


def _median(values: Array) -> float:
    """The median by one sort: of few values several times as fast as the general one."""
    ordered, n = np.sort(values), len(values)
    return float(0.5 * (ordered[(n - 1) // 2] + ordered[n // 2]))


def _expected(results: Results) -> tuple[str, float, float] | None:
    """What is written of the rock: its name, median density kg/m3, how far off wants a look; None: nothing."""
    survey, stated = results.survey, results.recipe.reference_density
    if survey.markers is not None:
        marked, at = survey.markers.density.values, survey.markers.depth.values
        pairs, mark = results.intervals.densities.pairs, results.stations.located.mark_depth.values
        middle = 0.5 * (mark[pairs.top] + mark[pairs.base])
        there = marked[np.maximum(at.searchsorted(middle, side="right") - 1, 0)]
        there = there[(there == there) & (middle == middle)]
        if there.size:
            return "that of the markers", _median(there), FAR_FROM_MARKERS
    if isinstance(stated, float) and (
        "reference_density" in survey.recipe_given or stated != survey.recipe.reference_density
    ):
        return "the stated reference_density", stated, FAR_FROM_NUMBER
    return None
