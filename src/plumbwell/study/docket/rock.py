"""Findings about rock: densities that no rock has, what a log does not cover, what the reference rests on."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from plumbwell.reduction.reference_rock import END_THICKNESS
from plumbwell.study.docket.wording import amount, counted, density, interval, interval_names, listed, numbers
from plumbwell.study.finding import Finding
from plumbwell.study.results import Results
from plumbwell.survey.errors import shown

LIGHTEST, HEAVIEST = 500.0, 6000.0
"""kg/m3; what lies outside is no rock as it stands in the ground."""

BEYOND_DOUBT = 3.0
"""Standard deviations by which a density must lie outside."""

LEAST_COMPARED = 4
LOG_APART = 300.0
"""kg/m3; by so much, and so many standard deviations, most densities differ from a log that is wrong."""
LOG_RATIO = 10.0

WORST = 5


def density_outside(results: Results) -> Iterator[Finding]:
    """Densities below 0.5 or above 6 g/cm3 by more than three sd."""
    one = results.intervals
    value = one.density.values
    outside = np.maximum(LIGHTEST - value, value - HEAVIEST)
    if not np.any(outside > 0.0):
        return
    sd = np.hypot(one.density_sd.values, one.density_common_sd.values)
    bad = np.flatnonzero(outside > BEYOND_DOUBT * sd)
    worst = bad[np.argsort(-outside[bad], kind="stable")]
    for number in worst[:WORST].tolist():
        yield Finding(
            code="density_outside",
            severity="look",
            place=interval(results, number),
            text=f"The density is {density(float(value[number]), 2)} ± {density(float(sd[number]), 2)}: no "
            f"rock lies outside {density(LIGHTEST, 1)} to {density(HEAVIEST, 1)}.",
            mend="See whether a depth, a unit or a label is wrong, or a tare is not listed; a void or a mass "
            "near the hole does this too.",
            intervals=(number,),
        )
    if worst.size > WORST:
        left = np.sort(worst[WORST:])
        yield Finding(
            code="density_outside",
            severity="look",
            place=interval(results, int(left[0])),
            text=f"{counted(left.size, 'more interval has', 'more intervals have')} a density outside "
            f"{density(LIGHTEST, 1)} to {density(HEAVIEST, 1)}.",
            mend="Where so many are outside, the unit of depth or reading is the first thing to see.",
            intervals=numbers(left),
        )


def density_unsure(results: Results) -> Iterator[Finding]:
    """Densities outside 0.5 to 6 g/cm3 by no more than three sd: their error is too large to tell of rock."""
    one = results.intervals
    value = one.density.values
    outside = np.maximum(LIGHTEST - value, value - HEAVIEST)
    sd = np.hypot(one.density_sd.values, one.density_common_sd.values)
    unsure = np.flatnonzero((outside > 0.0) & (outside <= BEYOND_DOUBT * sd))
    if unsure.size:
        worst = int(unsure[np.argmax(sd[unsure])])
        yield Finding(
            code="density_unsure",
            severity="note",
            place=interval(results, worst),
            text=f"{counted(unsure.size, 'interval has', 'intervals have')} a density outside "
            f"{density(LIGHTEST, 1)} to {density(HEAVIEST, 1)} within its error, up to "
            f"{density(float(value[worst]), 2)} ± {density(float(sd[worst]), 2)}: that says nothing of the rock.",
            mend="Take it for what its sd says; join thin intervals by a larger min_thickness.",
            intervals=numbers(unsure),
        )


def no_density(results: Results) -> Iterator[Finding]:
    """Intervals, and none of them with a density: nothing could be computed."""
    value = results.intervals.density.values
    if not value.size or not np.isnan(value).all():
        return
    text = f"None of the {value.size} intervals has a density"
    if value.size == 1:
        text = "The one interval has no density"
    if not results.intervals.densities.pairs.joined.any():
        text += ": the stations stand side by side, not under one another"
    yield Finding(
        code="no_density",
        severity="error",
        place="intervals",
        text=f"{text}. Nothing is told of the rock.",
        mend="See the positions in places.csv and the roles; densities need stations at different heights, one "
        "below the other.",
        intervals=tuple(range(value.size)),
    )


def log_disagrees(results: Results) -> Iterator[Finding]:
    """Most densities differ from the log by far more than their error: something is wrong for all of them."""
    if not results.survey.logs:
        return
    one = results.intervals
    apart = one.density_less_log.values
    compared = np.flatnonzero(np.isfinite(apart))
    if compared.size < LEAST_COMPARED:
        return
    sd = np.hypot(one.density_sd.values, one.density_common_sd.values)[compared]
    apart = apart[compared]
    far = np.abs(apart) > np.maximum(LOG_APART, LOG_RATIO * sd)
    if 2 * np.count_nonzero(far) <= compared.size:
        return
    yield Finding(
        code="log_disagrees",
        severity="look",
        place="log",
        text=f"{np.count_nonzero(far)} of {compared.size} intervals differ from the log by more than "
        f"{density(LOG_APART, 1)} and {LOG_RATIO:g} sd, in the median by {density(float(np.median(apart)), 2)} "
        "(density less log).",
        mend="See the unit and the curve of the log, its datum_height and depth_shift, and the units of depth and "
        "reading; a mass near the hole does this too.",
        intervals=numbers(compared[far]),
    )


def log_uncovered(results: Results) -> Iterator[Finding]:
    """Intervals for which the logs give no mean density."""
    one = results.intervals
    if not results.survey.logs or not len(one):
        return
    bare = np.flatnonzero(np.isnan(one.log_density.values))
    if not bare.size:
        return
    thickness = one.densities.thickness.values[bare]
    open_part = (thickness * (1.0 - np.nan_to_num(one.log_coverage.values[bare]))).tolist()
    words = [
        f"{interval_names(results, n)} ({amount(metres, 1)} m)"
        for n, metres in zip(bare[:WORST].tolist(), open_part[:WORST], strict=True)
    ] + [""] * (bare.size - WORST)
    yield Finding(
        code="log_uncovered",
        severity="note",
        place=f"{shown(one.from_station[bare[0]])} to {shown(one.to_station[bare[-1]])}",
        text=f"{counted(bare.size, 'interval has', 'intervals have')} no log density, since the log leaves "
        f"{amount(sum(open_part), 1)} m of them uncovered: {listed(words, WORST)}.",
        mend="Nothing; or bring in a log that covers them, or lower minimum_coverage.",
        intervals=numbers(bare),
    )


def reference_from_log(results: Results) -> Iterator[Finding]:
    """What stands in the reference density where the log says nothing."""
    facts = results.reference.facts
    if facts is None:
        return
    elevation = results.stations.located.positions.elevation.values
    lowest, ground = float(np.min(elevation)), results.survey.site.ground_elevation
    ends = []
    if facts.top < ground:
        ends.append(f"{density(facts.above)} above it ({amount(ground - facts.top, 1)} m up to the ground)")
    if lowest < facts.base:
        deeper = amount(facts.base - lowest, 1)
        ends.append(f"{density(facts.below)} below it ({deeper} m down to the lowest station)")
    if ends:
        yield Finding(
            code="reference_beyond_log",
            severity="note",
            place="reference density",
            text="The log ends, and the reference density goes on with its mean over the nearest "
            f"{END_THICKNESS:g} m: {' and '.join(ends)}.",
            mend="Nothing; the reference changes anomalies, not interval densities.",
        )
    if facts.gaps:
        widest = max(top - base for top, base in facts.gaps)
        yield Finding(
            code="reference_gaps",
            severity="note",
            place="reference density",
            text=f"{counted(len(facts.gaps), 'gap')} of the log {'is' if len(facts.gaps) == 1 else 'are'} "
            f"bridged straight in the reference density, the widest of {amount(widest, 1)} m.",
            mend="Nothing; the reference changes anomalies, not interval densities.",
        )
    if facts.dropped:
        yield Finding(
            code="reference_samples_left_out",
            severity="note",
            place="reference density",
            text=f"{counted(facts.dropped, 'density', 'densities')} of the log "
            f"{'is' if facts.dropped == 1 else 'are'} left out of the reference density, since the hole "
            "climbs there.",
            mend="Nothing, if the hole climbs.",
        )


def layers_untold(results: Results) -> Iterator[Finding]:
    """Layers that the intervals reach and cannot tell from one another."""
    layers = results.layers
    if layers is None:
        return
    untold = int(np.count_nonzero(np.isnan(layers.density) & (layers.resolution > 0.0)))
    if untold:
        yield Finding(
            code="layers_untold",
            severity="note",
            place="recipe, layer_boundaries",
            text=f"{untold} of {len(layers.density)} layers have no density: two or more boundaries lie within one "
            "interval, and the stations cannot tell the layers between them apart.",
            mend="Choose fewer boundaries, or boundaries at stations.",
        )
