"""Reading noise and re-seating noise of a survey, by restricted maximum likelihood.

Reading noise comes from readings within visits, re-seating from the visits themselves; where less than five degrees
of freedom within visits tell it, from both together (`noise_of_few`). Where few degrees of freedom tie visits
together, the stated re-seating noise counts as four of them: restricted likelihood alone gives none at all in a third
of surveys with one degree of freedom.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from plumbwell.reduction.design import Design
from plumbwell.reduction.network import Rank
from plumbwell.reduction.noise_of_few import reading_variance_of_few
from plumbwell.reduction.restricted_likelihood import restricted_variance
from plumbwell.reduction.visits import Visits
from plumbwell.survey.column import Array, Index

ENOUGH_FREEDOM = 5
STATED_FREEDOM = 4
DOUBTED = 0.5
"""Robust weight under which a visit says nothing of the noise of the others."""


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class ReadingNoise:
    """Reading noise of the used rows, in the order of `visits.rows`.

    Parameters
    ----------
    sd : (u,) array
        Sd of each reading, m/s2, floors applied, grown where it is trusted less.
    plain : (u,) array
        The same of full trust.
    floor : (u,) array
        No reading is believed better, m/s2.
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
    plain: Array
    floor: Array
    weight: Array
    variance: Array
    scale: float
    repeated: bool
    freedom: int


def reading_noise(
    visits: Visits,
    deviation: Array,
    *,
    unbroken: Index,
    stated: Array,
    floor: Array,
    estimate: bool,
    trust: Array | None = None,
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
    trust : (u,) array or None
        Robust weight of each reading, 0 to 1: its variance is divided by it. None: 1 for all.
    """
    kept = np.ones(len(deviation)) if trust is None else trust
    freedom = int(np.sum(np.maximum(np.add.reduceat(kept, unbroken[:-1]) - 1.0, 0.0)) + 1e-9)
    known = stated[~np.isnan(stated)]
    relative = np.where(np.isnan(stated), np.median(known) if known.size else np.nan, stated)
    scale = np.nan
    if not estimate:
        sd = np.fmax(floor, relative)
    elif freedom == 0:
        sd = floor
    else:
        shape = relative if known.size else np.ones(len(deviation))
        weight = kept / shape**2
        begin = unbroken[:-1]
        mean = np.add.reduceat(weight * deviation, begin) / np.add.reduceat(weight, begin)
        off = deviation - np.repeat(mean, np.diff(unbroken))
        found = float(np.sqrt(np.sum(weight * off**2) / freedom))
        if freedom < ENOUGH_FREEDOM:
            found = _of_few(found, freedom, visits, deviation, weight, kept)
        sd = np.maximum(floor, found * shape)
        if known.size and found > 0.0:
            scale = found
    plain = ReadingNoise(
        sd=sd, plain=sd, floor=floor, weight=sd, variance=sd, scale=scale, repeated=freedom > 0, freedom=freedom
    )
    return trusted_noise(plain, visits, kept)


def trusted_noise(noise: ReadingNoise, visits: Visits, trust: Array) -> ReadingNoise:
    """The same noise of readings that are trusted so far, (u,) each."""
    sd = noise.plain / np.sqrt(trust)
    weight = 1.0 / sd**2
    summed = np.add.reduceat(weight, visits.start[:-1])
    return replace(
        noise, sd=sd, weight=weight / np.repeat(summed, np.diff(visits.start)), variance=1.0 / summed
    )


def _of_few(
    found: float, freedom: int, visits: Visits, deviation: Array, weight: Array, kept: Array
) -> float:
    """Sd of a reading of weight 1 by few degrees of freedom within visits and by what the visits scatter."""
    first = visits.start[:-1]
    total = np.add.reduceat(weight, first)
    trusted = np.flatnonzero(np.maximum.reduceat(kept, first) >= DOUBTED)
    moving = np.count_nonzero(visits.run_length[visits.run_order] > 0.0)
    # A bias and a rate for each run that has one; the level of the whole is the stations' own.
    lost = len(visits.run_order) + int(moving) - 1
    variance = reading_variance_of_few(
        found**2,
        freedom,
        residual=(np.add.reduceat(weight * deviation, first) / total)[trusted],
        station=visits.station[trusted],
        share=1.0 / total[trusted],
        lost=lost,
    )
    return float(np.sqrt(variance))


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
    doubtful: int = 0,
    start: float | None = None,
    walk: Array | None = None,
    nearly: bool = False,
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
    doubtful : int
        Visits that robust weights have as good as taken out: they tie nothing together.
    start : float or None
        A variance near which the estimate is looked for.
    walk : array or None
        What a random walk adds to the flat border matrix.
    nearly : bool
        True: the estimate serves a search alone.
    """
    freedom = max(len(observed) - rank.rank - doubtful, 0)
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
    found = restricted_variance(design, observed, noise.variance, rank=rank, start=start, walk=walk, nearly=nearly)
    if freedom >= ENOUGH_FREEDOM:
        return Reseating(
            variance=np.full(len(observed), found), estimate=found, freedom=freedom, few=False, t_freedom=freedom
        )
    blend = (freedom * found + STATED_FREEDOM * stated_variance) / (freedom + STATED_FREEDOM)
    return Reseating(
        variance=blend, estimate=found, freedom=freedom, few=True, t_freedom=freedom + STATED_FREEDOM
    )
