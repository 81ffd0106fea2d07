"""Findings about what the drift does beside its polynomial: jumps that nobody listed, and slow wander."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from plumbwell.reduction.found_errors import ProposedTare
from plumbwell.reduction.walk import LEAST_FREEDOM
from plumbwell.study.docket.wording import amount, counted, gravity, listed, moment, numbers, run, stations
from plumbwell.study.finding import Finding
from plumbwell.study.results import Results
from plumbwell.survey.column import Index


def tares_proposed(results: Results) -> Iterator[Finding]:
    """Jumps of the instrument that the readings show and nobody has listed."""
    applied = results.network.proposed_applied
    for one in results.network.proposed:
        between, where = _between(results, one), ""
        if between.size:
            where = (
                f" It lies somewhere between two returns: {counted(between.size, 'stop')} between them "
                f"({stations(results, np.unique(results.network.visits.station[between]))}) "
                f"{'is' if between.size == 1 else 'are'} read on one side only, and nothing tells on which; their "
                "gravity may be off by the whole jump."
            )
        if one.one_visit:
            where = " Only one visit lies beyond it, at the end of the run: a bad visit would look the same."
        done = "It is taken out, as tares = \"proposed\" asks." if applied else "It is not taken out."
        yield Finding(
            code="tare_applied" if applied else "tare_proposed",
            severity="look",
            place=f"run {run(results, one.run)}, {moment(one.time)}",
            text=f"Run {run(results, one.run)} jumps by {gravity(one.size, signed=True)} ± {gravity(one.sd)} between "
            f"{moment(one.gap_from)} and {moment(one.gap_to)} (p = {one.p:.1g} over all gaps, the log likelihood gains "
            f"{amount(one.gain, 1)}). {done}{where}",
            mend="Look at the field notes for a knock or a lift; list it as [[tare]] of the run at that time"
            + (", or read the stops between again." if between.size else "."),
            stations=numbers(np.unique(results.network.visits.station[_around(results, one)])),
            rows=numbers(_rows_after(results, one)),
        )


def _members(results: Results, one: ProposedTare) -> Index:
    return np.flatnonzero(results.network.visits.run == one.run)


def _between(results: Results, one: ProposedTare) -> Index:
    visits, members = results.network.visits, _members(results, one)
    return members[(visits.first[members] > one.gap_from) & (visits.last[members] < one.gap_to)]


def _around(results: Results, one: ProposedTare) -> Index:
    """The visits next to the gap, and those in it."""
    visits, members = results.network.visits, _members(results, one)
    return members[(visits.last[members] >= one.gap_from) & (visits.first[members] <= one.gap_to)]


def _rows_after(results: Results, one: ProposedTare) -> Index:
    """Rows of the first visit that is surely after the jump."""
    visits, members = results.network.visits, _members(results, one)
    later = members[visits.first[members] >= one.gap_to]
    if not later.size:
        return later
    return visits.rows[visits.start[later[0]] : visits.start[later[0] + 1]]


def walk_kept(results: Results) -> Iterator[Finding]:
    """A slow wander of the drift beside its polynomial."""
    fit = results.network.adjustment
    walk = fit.walk
    if walk is None:
        return
    given = not isinstance(results.recipe.drift_walk, str)
    longest = max(float(fit.basis.length[code]) for code in fit.visits.run_order.tolist() if fit.orders[code] > 0)
    end = walk.strength * np.sqrt(longest**3 / 3.0)
    yield Finding(
        code="drift_walk",
        severity="note",
        place="network",
        text=f"The drift wanders beside its polynomial: {'as stated' if given else 'estimated at'} "
        f"{amount(walk.strength / 1e-5 * 3600.0**1.5, 4)} mGal/h^1.5, {gravity(end)} by the end of the longest run. "
        "The errors of the densities count it.",
        mend='Nothing; or write drift_walk = "off", if a tare or an outlier bends the drift.',
    )


def walk_untested(results: Results) -> Iterator[Finding]:
    """The degrees of freedom are too few to tell a wander of the drift from noise."""
    fit = results.network.adjustment
    tried = fit.walk_tried or results.network.walk_not_needed
    if results.recipe.drift_walk != "auto" or tried or not any(fit.orders):
        return
    yield Finding(
        code="drift_walk_untested",
        severity="note",
        place="network",
        text=f"{counted(fit.reseating.freedom, 'degree of freedom is', 'degrees of freedom are')} too few to tell slow "
        f"drift beyond the polynomial from noise (it takes {LEAST_FREEDOM}): it is untested.",
        mend="Bring in repeat visits; each adds a degree of freedom.",
    )


def walk_left_out(results: Results) -> Iterator[Finding]:
    """A walk would explain what the found jumps explain better."""
    if not results.network.walk_not_needed:
        return
    times = listed([moment(one.time) for one in results.network.proposed])
    yield Finding(
        code="drift_walk_left_out",
        severity="note",
        place="network",
        text=f"A wander of the drift would explain more than chance, but none is needed once the found jumps ({times}) "
        "are out: it is left out, so that it does not swallow them.",
        mend='Judge the jumps first; write drift_walk = "on" if it is a wander after all.',
    )
