"""Findings about ties: those that contradict one another, and those in another unit."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from plumbwell.study.docket.wording import MILLIGAL, amount, gravity, label, listed, numbers
from plumbwell.study.finding import Finding
from plumbwell.study.results import Results
from plumbwell.survey.column import Array, Index
from plumbwell.survey.errors import shown

CONTRADICTION = 4.0
"""Standard deviations by which a tie must differ from what the others and the network give."""

CHECKED = 1e-9
"""Share of a tie's variance that the others must leave, else nothing checks it."""

FAR_FROM_NORMAL = 1000.0 * MILLIGAL
"""m/s2; no rock makes gravity differ so much from normal gravity."""


def misclosures(results: Results) -> tuple[Array, Array]:
    """What each tie has more than the other ties and the network give, m/s2, and over its sd; NaN unchecked.

    Notes
    -----
    With r the residual of a tie of weight w and c the variance of gravity there, all ties counted: the
    misclosure without that tie is r/(1 - w c), its sd is 1/sqrt(w (1 - w c)) (Cook & Weisberg 1982).
    """
    ties, gravity_of = results.network.ties, results.network.gravity
    residual = ties.value - gravity_of.gravity[ties.station]
    leverage = gravity_of.ties[ties.station, np.arange(len(ties.station))] * np.sqrt(ties.weight)
    left = np.where(1.0 - leverage > CHECKED, 1.0 - leverage, np.nan)
    return residual / left, residual * np.sqrt(ties.weight / left)


def accused(results: Results) -> Index:
    """Ties that contradict the others, by row of the network's ties, the worst first."""
    if len(results.network.ties.station) < 2:
        return np.zeros(0, dtype=np.intp)
    ratio = np.abs(misclosures(results)[1])
    bad = np.flatnonzero(ratio > CONTRADICTION)
    return bad[np.argsort(-ratio[bad], kind="stable")]


def scale_estimated(results: Results) -> Iterator[Finding]:
    """Scales that were estimated from ties, and those that no ties bound."""
    if results.recipe.scale_factor != "estimate":
        return
    if not results.network.scales:
        yield _scale_untold("There is no tie")
    for one in results.network.scales:
        if not one.told:
            yield _scale_untold(f"Fewer than two ties bound the readings of instrument {shown(one.instrument)}")
            continue
        yield Finding(
            code="scale_estimated",
            severity="note",
            place=f"instrument {shown(one.instrument)}",
            text=f"The scale factor of instrument {shown(one.instrument)} is {one.scale:.6f} ± {one.sd:.6f}, estimated "
            "from the ties; its error is common to all densities.",
            mend="Compare it with the calibration; ties farther apart in gravity tell it better.",
        )


def _scale_untold(why: str) -> Finding:
    return Finding(
        code="scale_untold",
        severity="look",
        place="recipe, scale_factor",
        text=f'{why}, so that the scale factor cannot be estimated: the given one holds, scale_factor = "estimate" has '
        "no effect.",
        mend='Name two ties or more at stations that were read, or write scale_factor = "given".',
    )


def ties_disagree(results: Results) -> Iterator[Finding]:
    """Ties that contradict one another over the gravity difference that was measured between them."""
    bad = accused(results)
    if not bad.size:
        return
    size, ratio = misclosures(results)
    station = results.network.ties.station
    worst = int(bad[0])
    apart = f"{gravity(abs(float(size[worst])))} ({amount(abs(float(ratio[worst])), 1)} sd)"
    if len(station) == 2:
        names = listed([label(results, int(one)) for one in station])
        text = f"The two ties, {names}, disagree by {apart} with the difference that the readings give between them"
    else:
        way = "more" if size[worst] > 0.0 else "less"
        text = (
            f"The tie at {label(results, int(station[worst]))} has {apart} {way} than the other ties and the "
            "readings give there"
        )
        if bad.size > 1:
            others = listed([label(results, int(station[one])) for one in bad[1:].tolist()])
            text += f"; so do not fit either: {others}"
    yield Finding(
        code="ties_disagree",
        severity="look",
        place="ties.csv",
        text=f"{text}. This bends the whole network, so visits and readings are not tested until the ties agree.",
        mend="See values, labels, units and epochs of the ties; remove the wrong one, or give it an honest gravity_sd.",
        stations=numbers(np.unique(station[bad])),
    )


def far_ties(results: Results) -> Index:
    """Ties that differ by more than 1 Gal from normal gravity at their stations, by row of the network's ties."""
    ties = results.network.ties
    if not len(ties.station):
        return np.zeros(0, dtype=np.intp)
    return np.flatnonzero(np.abs(ties.value - _normal(results)) > FAR_FROM_NORMAL)


def _normal(results: Results) -> Array:
    """Normal gravity with the shells of reference rock at the station of each tie, m/s2."""
    parts = results.stations.parts
    return (parts.normal_gravity.values + parts.free_air.values + parts.shell.values)[results.network.ties.station]


def tie_far(results: Results) -> Iterator[Finding]:
    """Ties that differ by more than 1 Gal from normal gravity at their stations: another unit."""
    ties = results.network.ties
    for row in far_ties(results).tolist():
        name, station = label(results, int(ties.station[row])), int(ties.station[row])
        yield Finding(
            code="tie_far_from_normal",
            severity="look",
            place=f"ties.csv, {name}",
            text=f"The tie at {name} is {amount(float(ties.value[row]) / MILLIGAL, 3)} mGal, and normal gravity there "
            f"{amount(float(_normal(results)[row]) / MILLIGAL, 0)} mGal: a wrong unit, or a difference in place of "
            "gravity?",
            mend="Write the full gravity at the station with its unit: 9.81 m/s2 is 981 000 mGal; without it leave the "
            "tie out, and gravity stays relative.",
            stations=(station,),
        )
