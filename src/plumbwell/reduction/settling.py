"""How each visit settles: creep at its start against the plateau of its later half.

A visit of three readings or more is cut in the middle; its plateau is the later half. The first reading is tested
against it, and the readings after it say how many first ones the creep has spoiled. Inputs are plain arrays; what the
run drifts within a visit has been taken out of them.
"""

from __future__ import annotations

from dataclasses import dataclass
from math import inf

import numpy as np
from numpy.typing import NDArray

from plumbwell.reduction.adjustment import Adjustment
from plumbwell.reduction.chance import student_limit
from plumbwell.reduction.drift_rates import rate_sd
from plumbwell.survey.column import Array, Column, Index, frozen, frozen_index

CHANCE = 0.01
"""Chance that a survey of clean visits has any of them named."""

SPOILED = 0.05
"""In a visit that creeps, a reading after the first is left out too when chance alone would put it as far off the
plateau with less than this."""

LEAST_READINGS = 3
GROSS = 2.0
"""Times the ratio that chance allows: late halves with a reading so far off tell nothing of the reading noise."""
ENOUGH_FREEDOM = 20
MEDIAN_RATIO = 0.6745
"""Median size of a normal ratio."""
CANNOT_TELL = -1


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Settling:
    """How the visits of a survey settled, (v,) arrays each.

    Parameters
    ----------
    creep, sd : array, m/s2
        First reading less plateau, and its sd; NaN where the visit cannot tell.
    leave_out : int array
        How many first readings creep; 0 for none, -1 where the visit cannot tell. Never more than half of a visit,
        so that a visit with its whole first half named may not have settled even then.
    plateau : array, m/s2
        Mean of the readings that are not left out, by their weights, in the level of the values given.
    moved : array, m/s2
        What the readings to be left out do to the mean of the visit; 0 where none is.
    reading_factor : float
        Reading noise as the plateaus give it, over the sds that were given; 1 where these hold, NaN where no
        plateau tells it.
    freedom : float
        Degrees of freedom of that noise; infinity where the given sds hold.
    limit : float
        Ratio of creep to sd from which a visit is named; infinity where none can be.
    common, common_sd : float
        Creep that the visits share of which none is to be left out, m/s2, and its sd; NaN where there is none.
    """

    creep: Array
    sd: Array
    leave_out: Index
    plateau: Array
    moved: Array
    reading_factor: float
    freedom: float
    limit: float
    common: float
    common_sd: float


def settling(
    values: Array, *, start: Index, time: Array, sd: Array, floor: Array, rate_sd: Array, estimate: bool
) -> Settling:
    """Creep of each visit against its plateau.

    Parameters
    ----------
    values : (u,) array
        Used readings freed of drift, visit by visit, by time within a visit, m/s2.
    start : (v + 1,) int array
        Where each visit starts in `values`.
    time : (u,) array
        Time of each reading, s; only differences within a visit count.
    sd : (u,) array
        Reading noise, m/s2; where it is estimated only the ratios between readings count.
    floor : (u,) array
        Least noise of each reading, m/s2.
    rate_sd : (v,) array
        Sd of the drift rate that was taken out of each visit, m/s3.
    estimate : bool
        True: the noise is taken from the plateaus; False: it is `sd`.

    Returns
    -------
    Settling

    Notes
    -----
    The plateau of n readings is their last n - n // 2. With sds s, weights w = 1/s2 and P the weighted mean of the
    plateau, creep = y_1 - P with the variance s_1^2 + 1/sum(w) + (rate_sd (t_1 - t_P))^2. The noise comes from the
    scatter within plateaus alone, which creep at the start does not touch, and which is independent of both y_1 and P:
    creep over sd is Student's t under no creep. A visit is named when it passes the limit of CHANCE shared evenly by
    the visits tested (Bonferroni) and, with any one reading of the plateau left out, still that of a single visit: one
    bad reading there cannot make a creep. One bad reading between start and plateau takes no part. Of a named visit
    those readings are to be left out that from the first on, without a gap, lie off the plateau to the same side by
    more than chance allows one in twenty.

    The creep that visits share is the mean of theirs, weighted by their variances. Errors of drift rates are taken to
    be the same in all visits, which is the worst that they can do.
    """
    counts = np.diff(start)
    first, visit = start[:-1], np.repeat(np.arange(len(counts)), counts)
    place = np.arange(len(values)) - first[visit]
    enough = counts >= LEAST_READINGS
    late = (place >= (counts // 2)[visit]) & enough[visit]
    centred = values - values[first][visit]
    weight = 1.0 / sd**2
    factor, freedom = 1.0, inf
    if estimate:
        factor, freedom = _noise_of_plateaus(centred, weight, time - time[first][visit], visit, late)
    told = enough & (freedom > 0)
    if not told.any():
        return _untold(values, weight, first, counts)
    noise = np.maximum(floor, factor * sd) if estimate else sd
    weight = 1.0 / noise**2
    total = _sums(weight * late, first)
    level = _ratio(_sums(weight * centred * late, first), total)
    since = time - time[first][visit]
    middle = _ratio(_sums(weight * since * late, first), total)
    limit = student_limit(CHANCE / int(np.count_nonzero(told)), freedom=freedom)
    off = centred - level[visit]
    # Variance of each reading of the first half less the plateau.
    apart = noise**2 + _ratio(np.ones(len(total)), total)[visit] + (rate_sd[visit] * (since - middle[visit])) ** 2
    ratio = off / np.sqrt(apart)
    creep, creep_sd = off[first], np.sqrt(apart[first])
    side = np.sign(creep)
    # The first reading against the plateau without each of its readings in turn.
    left = total[visit] - weight
    without = _ratio(total[visit] * level[visit] - weight * centred, left)
    shorter = _ratio(total[visit] * middle[visit] - weight * since, left)
    least = (
        (centred[first][visit] - without)
        * side[visit]
        / np.sqrt(noise[first][visit] ** 2 + _ratio(np.ones(len(left)), left) + (rate_sd[visit] * shorter) ** 2)
    )
    worst = np.minimum.reduceat(np.where(late, least, inf), first)
    named = told & (np.abs(ratio[first]) > limit) & (worst > student_limit(CHANCE, freedom=freedom))
    spoiled = ~late & (ratio * side[visit] > student_limit(SPOILED, freedom=freedom))
    spoiled[first] = True
    # The first reading that is not spoiled ends the creep.
    cut = np.minimum.reduceat(np.where(spoiled, len(values), place), first)
    leave_out = np.where(told, np.where(named, cut, 0), CANNOT_TELL)
    settled = told & ~named
    bent = np.abs(rate_sd * middle)
    common, common_sd = _mean_creep(creep[settled], creep_sd[settled], bent[settled])
    whole = _sums(weight * centred, first) / _sums(weight, first)
    kept = weight * (place >= np.maximum(leave_out, 0)[visit])
    plateau = _sums(kept * centred, first) / _sums(kept, first)
    return Settling(
        creep=frozen(np.where(told, creep, np.nan)),
        sd=frozen(np.where(told, creep_sd, np.nan)),
        leave_out=frozen_index(leave_out),
        plateau=frozen(plateau + values[first]),
        moved=frozen(np.where(leave_out > 0, whole - plateau, 0.0)),
        reading_factor=factor,
        freedom=freedom,
        limit=limit,
        common=common,
        common_sd=common_sd,
    )


def network_settling(observed: Column, drift: Column, fit: Adjustment, floor: Array, estimate: bool) -> Settling:
    """How the visits of an adjusted network settled.

    Parameters
    ----------
    observed, drift : Column
        Readings with all corrections made, and their drift and tares, (n,), m/s2.
    fit : Adjustment
    floor : (n,) array
        `reading_floor` of each row's instrument, m/s2.
    estimate : bool
        False: the noise as given holds.
    """
    rows, visits = fit.visits.rows, fit.visits
    return settling(
        observed.values[rows] - drift.values[rows],
        start=visits.start,
        time=fit.basis.utc[rows],
        sd=fit.noise.sd,
        floor=floor[rows],
        rate_sd=rate_sd(fit),
        estimate=estimate,
    )


def _noise_of_plateaus(
    centred: Array, weight: Array, since: Array, visit: Index, late: NDArray[np.bool_]
) -> tuple[float, float]:
    """Root mean square of the scatter within plateaus over the sds given, and its degrees of freedom.

    What all plateaus of the survey rise or fall with time is taken out: where every visit creeps slowly, the end of
    the creep is no noise.
    """
    rows = np.flatnonzero(late)
    _, of = np.unique(visit[rows], return_inverse=True)
    n_plateaus = int(of.max(initial=-1)) + 1
    freedom = rows.size - n_plateaus - 1
    if freedom < 1:
        return np.nan, 0.0
    own, values, past = weight[rows], centred[rows], since[rows]
    total = np.bincount(of, own)
    off = values - (np.bincount(of, own * values) / total)[of]
    past = past - (np.bincount(of, own * past) / total)[of]
    good = np.ones(rows.size, dtype=bool)
    if freedom >= ENOUGH_FREEDOM:
        ratio = np.abs(off) * np.sqrt(own / (1.0 - own / total[of]))
        allowed = GROSS * student_limit(CHANCE / rows.size, freedom=inf) * float(np.median(ratio)) / MEDIAN_RATIO
        gross = np.unique(of[ratio > allowed])
        # Readings written so coarsely that most plateaus show no scatter at all tell no gross one from the rest.
        good = ~np.isin(of, gross) if allowed > 0.0 else good
        freedom -= int(np.count_nonzero(~good)) - (0 if good.all() else gross.size)
    spread = float(np.sum(own[good] * past[good] ** 2))
    slope = float(np.sum(own[good] * past[good] * off[good])) / spread if spread > 0.0 else 0.0
    return float(np.sqrt(np.sum(own[good] * (off - slope * past)[good] ** 2) / freedom)), float(freedom)


def _mean_creep(creep: Array, sd: Array, bent: Array) -> tuple[float, float]:
    """Weighted mean of creeps and its sd; `bent` is the part of each sd by drift rates, which err all alike."""
    if not creep.size:
        return np.nan, np.nan
    share = 1.0 / sd**2
    share = share / share.sum()
    own = float(np.sum(share**2 * (sd**2 - bent**2)))
    return float(share @ creep), float(np.sqrt(own + float(share @ bent) ** 2))


def _untold(values: Array, weight: Array, first: Index, counts: Index) -> Settling:
    unknown = frozen(np.full(len(counts), np.nan))
    return Settling(
        creep=unknown,
        sd=unknown,
        leave_out=frozen_index(np.full(len(counts), CANNOT_TELL)),
        plateau=frozen(_sums(weight * values, first) / _sums(weight, first)),
        moved=frozen(np.zeros(len(counts))),
        reading_factor=np.nan,
        freedom=0.0,
        limit=inf,
        common=np.nan,
        common_sd=np.nan,
    )


def _sums(values: Array, first: Index) -> Array:
    return np.add.reduceat(values, first)


def _ratio(one: Array, other: Array) -> Array:
    """One over the other; 0 where the other is 0, as for visits too short to have a plateau."""
    return np.where(other > 0.0, one, 0.0) / np.where(other > 0.0, other, 1.0)
