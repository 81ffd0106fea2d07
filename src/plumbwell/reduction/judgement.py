"""A survey's readings judged: what does not fit it, and what robust weights follow from that."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from plumbwell.reduction.adjusted_network import adjusted
from plumbwell.reduction.adjustment import Adjustment, NoiseTerms
from plumbwell.reduction.drift_basis import DriftBasis, drift_basis
from plumbwell.reduction.found_errors import OUT, ProposedTare
from plumbwell.reduction.judged import Judgement, judged
from plumbwell.reduction.network import TieRows
from plumbwell.reduction.network_parts import Parts
from plumbwell.reduction.visits import Visits
from plumbwell.survey.column import Array, Index, frozen
from plumbwell.survey.instrument import Instrument, Tare

REACH = 6.0
"""Ratio of a residual to its sd from which on Tukey's weight is none; normal errors lose 2 % by it."""

LEAST_TRUST = 1e-6
SOFT = 1e-6
"""Share of the weight of ties that joins parts of the network and bends nothing."""

PASSES = 10
SETTLED = 0.01


def with_found(
    basis: DriftBasis,
    visits: Visits,
    run_names: tuple[str, ...],
    tares: tuple[Tare, ...],
    found: tuple[Tare, ...],
    run_instrument: tuple[Instrument, ...],
) -> DriftBasis:
    """The drift basis with further tares, which name their run by its code."""
    if not found:
        return basis
    named = tuple(replace(one, run=run_names[int(one.run)]) for one in found)
    return drift_basis(basis.utc, basis.run, run_names, visits, (*tares, *named), run_instrument)


def judgement(
    base: Adjustment,
    observed: Array,
    ties: TieRows,
    parts: Parts,
    terms: NoiseTerms,
    *,
    n_stations: int,
    start_orders: tuple[int, ...],
    automatic: tuple[int, ...],
    station: Index,
    run_names: tuple[str, ...],
    tares: tuple[Tare, ...],
    run_instrument: tuple[Instrument, ...],
) -> Judgement:
    """Jumps and readings in error, by a network without a walk.

    Parameters
    ----------
    base : Adjustment
        The network as adjusted.
    observed, ties, parts, terms, n_stations, start_orders, automatic, station
        As `adjusted` takes them.
    run_names : tuple of str
    tares : tuple of Tare
        Those listed.
    run_instrument : tuple of Instrument
        By run code.
    """

    # Ties that contradict one another bend the network, and readings would be accused of it: here they only join it.
    soft = replace(ties, weight=ties.weight * SOFT)

    def refit(found: tuple[Tare, ...], trust: Array, orders: tuple[int, ...], near: Adjustment) -> Adjustment:
        return adjusted(
            observed, with_found(base.basis, base.visits, run_names, tares, found, run_instrument), base.visits, soft,
            parts, terms, n_stations=n_stations, start_orders=orders, automatic=(), station=station,
            trust=None if trust.min(initial=1.0) == 1.0 else trust, near=near,
        )

    lowest = tuple(1 if run in automatic else order for run, order in enumerate(start_orders))
    lowest = tuple(min(one, other) for one, other in zip(lowest, base.orders, strict=True))
    if base.walk is None and base.orders == lowest and len(ties.station) < 2:
        start = base
    else:
        start = refit((), np.ones(len(observed)), lowest, base)
    return judged(start, refit, automatic=automatic, estimate=terms.estimate, n_rows=len(observed))


def as_tares(proposed: tuple[ProposedTare, ...], run_names: tuple[str, ...]) -> tuple[Tare, ...]:
    """Proposed tares as listed ones of unknown size; each counts from the end of its gap."""
    return tuple(Tare(run=run_names[one.run], time=one.time) for one in proposed)


def alike_weights(found: Judgement, n_rows: int) -> Array:
    """Robust weight of every row, (n,): less than 1 for those that stand alike, whose sd becomes their difference."""
    trust = np.ones(n_rows)
    trust[found.rows[found.alike]] = 1.0 / (1.0 + found.doubt[found.alike])
    return frozen(trust)


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Robust:
    """Robust weights of all rows, (n,), 0 to 1, and the network without the readings in error, whose noise holds."""

    trust: Array
    known: Adjustment


def robust_weights(
    observed: Array,
    basis: DriftBasis,
    visits: Visits,
    ties: TieRows,
    parts: Parts,
    terms: NoiseTerms,
    found: Judgement,
    *,
    n_stations: int,
    start_orders: tuple[int, ...],
    automatic: tuple[int, ...],
    station: Index,
) -> Robust:
    """Robust weight of every row: Tukey's, from residuals by all that is trusted.

    Parameters
    ----------
    observed, basis, visits, ties, parts, terms, n_stations, start_orders, automatic, station
        As `adjusted` takes them.
    found : Judgement
        Readings in error, with which the passes begin.

    Notes
    -----
    (1 - (t/6)^2)^2 within 6 sd (Beaton & Tukey 1974), t the ratio of a residual to the sd that it has when it is
    trusted; a visit and each of its readings are weighed apart, and the smaller of both holds. Noise and drift orders
    are those without the readings in error: estimated from weighted residuals the noise would be a tenth too small.
    """
    alike = alike_weights(found, len(observed))
    trust = alike.copy()
    trust[found.rows[~found.alike]] = OUT
    known = fit = adjusted(
        observed, basis, visits, ties, parts, terms, n_stations=n_stations, start_orders=start_orders,
        automatic=automatic, station=station, trust=frozen(trust),
    )
    for _ in range(PASSES):
        new = _weights(fit, trust, found.rows, alike)
        moved = float(np.max(np.abs(new - trust), initial=0.0))
        trust = new
        if moved < SETTLED:
            break
        fit = adjusted(
            observed, basis, visits, ties, parts, terms, n_stations=n_stations, start_orders=fit.orders,
            automatic=(), station=station, trust=frozen(trust), near=fit, known=known,
        )
    return Robust(trust=frozen(trust), known=known)


def _weights(fit: Adjustment, trust: Array, named: Index, alike: Array) -> Array:
    visits, noise, seat = fit.visits, fit.noise, fit.reseating
    rows, start = visits.rows, visits.start
    plain = noise.sd**2 * trust[rows]
    counts = np.diff(start)
    # Of single readings: off the rest of their visit, with the visit effect out.
    reading = np.nan_to_num(fit.checked.residual[rows]) / np.sqrt(plain)
    # Of whole visits: off what the network predicts for them.
    variance = 1.0 / np.add.reduceat(1.0 / plain, start[:-1]) + seat.variance
    visit = fit.solution.residual[:, 0] / np.sqrt(variance)
    of_visit = np.clip(1.0 - (visit / REACH) ** 2, 0.0, 1.0) ** 2
    of_reading = np.where(np.repeat(counts, counts) > 1, np.clip(1.0 - (reading / REACH) ** 2, 0.0, 1.0) ** 2, 1.0)
    # A weight of the visit as a whole is put on its readings such that the visit's whole variance grows by it.
    by_reading = variance - seat.variance
    share = by_reading / np.maximum(variance / np.maximum(of_visit, LEAST_TRUST) - seat.variance, by_reading)
    new = np.ones(len(trust))
    new[rows] = np.maximum(np.minimum(np.repeat(share, counts), of_reading), LEAST_TRUST)
    # Named ones stay without weight, and those that stand alike hold each other: their residuals tell nothing.
    new[named] = np.where(alike[named] < 1.0, alike[named], OUT)
    return new


def used_rows(use: NDArray[np.bool_], found: Judgement) -> NDArray[np.bool_]:
    """Which rows are in use when those in error are left out, (n,) bool; of those that stand alike none is."""
    kept = np.array(use, dtype=bool)
    kept[found.rows[~found.alike]] = False
    kept.flags.writeable = False
    return kept
