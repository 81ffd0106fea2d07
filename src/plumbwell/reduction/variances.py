"""Reading noise and re-seating noise of a survey, by restricted maximum likelihood.

Reading noise comes from readings within visits, re-seating from the visits themselves. Where few degrees
of freedom tie visits together, the stated re-seating noise counts as four of them: restricted likelihood
alone gives none at all in a third of surveys with one degree of freedom.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from plumbwell.reduction.design import Design
from plumbwell.reduction.network import NO_TIES, Rank, solve
from plumbwell.reduction.visits import Visits
from plumbwell.survey.column import Array, Index

ENOUGH_FREEDOM = 5
STATED_FREEDOM = 4
PASSES = 60
SETTLED = 1e-6  # of the re-seating variance: a millionth of it moves no density


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class ReadingNoise:
    """Reading noise of the used rows, in the order of `visits.rows`.

    Parameters
    ----------
    sd : (u,) array
        Sd of each reading, m/s2, floors applied.
    weight : (u,) array
        Share of each reading in its visit's mean; sums to 1 within a visit.
    variance : (v,) array
        Variance of each visit mean by reading noise alone, m2/s4.
    scale : float
        Factor on the stated sds; NaN where none is stated or none can be estimated.
    repeated : bool
        True when some visit has two readings or more.
    freedom : int
        Degrees of freedom within visits.
    """

    sd: Array
    weight: Array
    variance: Array
    scale: float
    repeated: bool
    freedom: int


def reading_noise(
    visits: Visits, deviation: Array, *, unbroken: Index, stated: Array, floor: Array, estimate: bool
) -> ReadingNoise:
    """Reading noise from the scatter within visits, or as stated.

    Parameters
    ----------
    visits : Visits
    deviation : (u,) array
        Used readings freed of drift, m/s2, in the order of `visits.rows`.
    unbroken : (g + 1,) int array
        Where each stretch of a visit that no tare breaks starts in `visits.rows`.
    stated : (u,) array
        Stated sd of each reading, NaN where there is none, m/s2.
    floor : (u,) array
        `reading_floor` of each reading's instrument.
    estimate : bool
        True: sd = max(floor, s x stated); False: sd = max(floor, stated).
    """
    first = visits.start[:-1]
    counts = np.diff(visits.start)
    freedom = int(np.sum(np.diff(unbroken) - 1))
    known = stated[~np.isnan(stated)]
    relative = np.where(np.isnan(stated), np.median(known) if known.size else np.nan, stated)
    scale = np.nan
    if not estimate:
        sd = np.fmax(floor, relative)
    elif freedom == 0:
        sd = floor
    else:
        shape = relative if known.size else np.ones(len(deviation))
        weight = 1.0 / shape**2
        begin = unbroken[:-1]
        mean = np.add.reduceat(weight * deviation, begin) / np.add.reduceat(weight, begin)
        off = deviation - np.repeat(mean, np.diff(unbroken))
        found = float(np.sqrt(np.sum(weight * off**2) / freedom))
        sd = np.maximum(floor, found * shape)
        if known.size:
            scale = found
    weight = 1.0 / sd**2
    summed = np.add.reduceat(weight, first)
    return ReadingNoise(
        sd=sd,
        weight=weight / np.repeat(summed, counts),
        variance=1.0 / summed,
        scale=scale,
        repeated=freedom > 0,
        freedom=freedom,
    )


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Reseating:
    """Re-seating noise of the visits.

    Parameters
    ----------
    variance : (v,) array
        Of each visit, m2/s4.
    estimate : float
        Restricted-likelihood estimate of the variance, NaN where there is no degree of freedom.
    freedom : int
        Degrees of freedom that tie visits together: used visits less the rank of their design.
    few : bool
        True when the rule for few degrees of freedom was used.
    t_freedom : int
        Degrees of freedom of Student's t for intervals of confidence.
    """

    variance: Array
    estimate: float
    freedom: int
    few: bool
    t_freedom: int


def stated_reseating(noise: ReadingNoise, *, reseating_sd: Array, stated: Array, estimate: bool) -> Array:
    """u0^2 of each visit: the stated re-seating variance, and the median stated reading sd where e is its floor."""
    variance = reseating_sd**2
    if estimate and not noise.repeated:
        known = stated[~np.isnan(stated)]
        variance = variance + (float(np.median(known)) ** 2 if known.size else 0.0)
    return variance


def reseating(
    design: Design,
    observed: Array,
    noise: ReadingNoise,
    *,
    rank: Rank,
    stated_variance: Array,
    estimate: bool,
) -> Reseating:
    """Re-seating noise under the rules for many, few and no degrees of freedom.

    Parameters
    ----------
    design : Design
    observed : (v,) array
        Visit means, m/s2.
    noise : ReadingNoise
    rank : Rank
        Of the visits' design.
    stated_variance : (v,) array
        u0^2 of each visit.
    estimate : bool
        False: the stated variance holds.
    """
    freedom = len(observed) - rank.rank
    if not estimate:
        return Reseating(
            variance=stated_variance,
            estimate=np.nan,
            freedom=freedom,
            few=freedom < ENOUGH_FREEDOM,
            t_freedom=freedom if freedom > 0 else STATED_FREEDOM,
        )
    if freedom == 0:
        return Reseating(
            variance=stated_variance, estimate=np.nan, freedom=0, few=True, t_freedom=STATED_FREEDOM
        )
    found = restricted_variance(design, observed, noise.variance, rank=rank)
    if freedom >= ENOUGH_FREEDOM:
        return Reseating(
            variance=np.full(len(observed), found), estimate=found, freedom=freedom, few=False, t_freedom=freedom
        )
    blend = (freedom * found + STATED_FREEDOM * stated_variance) / (freedom + STATED_FREEDOM)
    return Reseating(
        variance=blend, estimate=found, freedom=freedom, few=True, t_freedom=freedom + STATED_FREEDOM
    )


def restricted_variance(design: Design, observed: Array, reading_variance: Array, *, rank: Rank) -> float:
    """The re-seating variance that maximises the restricted likelihood of the visits; 0 where it grows towards 0.

    Ties and priors do not count: where they contradict the visits, that is not re-seating noise. The maximum lies
    where sum (r_v / v_v)^2 = sum (1 - h_v / v_v) / v_v, r the residual of a visit, v its
    variance, h the variance of its estimate (Patterson & Thompson 1971). The logarithm of the ratio of the two sides
    falls by nearly 1 for each unit of log(v), exactly so when all visits have one reading noise; a secant in that
    variable, kept within its bracket, closes in on the root.

    Parameters
    ----------
    design : Design
    observed, reading_variance : (v,) arrays
        Visit means m/s2, and their variance by reading noise.
    rank : Rank
        Of the visits' design; at least one degree of freedom is left.
    """
    values = observed[:, None]
    typical = float(np.mean(reading_variance))
    alone = replace(design, priors=(), prior_matrix=rank.pins, prior_side=np.zeros(design.size))

    def excess(variance: float) -> float:
        weight = typical / (reading_variance + variance)
        solution = solve(alone, weight, values, NO_TIES)
        left = float(np.sum((weight * solution.residual[:, 0]) ** 2)) / typical
        right = float(np.sum(weight * (1.0 - weight * solution.variance_of_fit())))
        return float(np.log(left / right)) if left > 0.0 and right > 0.0 else -np.inf

    even = solve(alone, np.ones(len(observed)), values, NO_TIES).sum_of_squares() / (len(observed) - rank.rank)
    x = float(np.log(max(even, typical)))
    least = float(np.log(typical))
    low, high = least, np.inf
    before: tuple[float, float] | None = None
    at_least: float | None = None
    for _ in range(PASSES):
        x = max(x, least)
        at = excess(float(np.exp(x)) - typical if x > least else 0.0)
        if x == least:
            at_least = at
            if at <= 0.0:
                return 0.0
        if abs(at) < SETTLED:
            break
        low, high = (x, high) if at > 0.0 else (low, x)
        slope = -1.0 if before is None or before[0] == x else (at - before[1]) / (x - before[0])
        before = (x, at)
        step = at if not slope < -0.05 else -at / slope
        x = x + step
        if not low < x < high:
            x = least if low == least and at_least is None else 0.5 * (low + min(high, low + 4.0))
    return max(float(np.exp(x)) - typical, 0.0)
