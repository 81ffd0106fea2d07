"""The part of the chain from corrected readings to station gravity: visits, drift, noise, jumps, outliers, datum.

What is found and what is applied are kept apart: jumps that nobody listed and readings in error are taken out only when
the recipe says so.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from plumbwell.reduction.adjusted_network import adjusted
from plumbwell.reduction.adjustment import Adjustment, NoiseTerms
from plumbwell.reduction.calibration import instruments_used
from plumbwell.reduction.datums import StationGravity, datum_stations, referred_gravity
from plumbwell.reduction.drift_basis import DriftUnknown, drift_basis
from plumbwell.reduction.found_errors import OUT, ProposedTare, gaps_of, is_told
from plumbwell.reduction.judged import Judgement
from plumbwell.reduction.judgement import alike_weights, as_tares, judgement, robust_weights, used_rows
from plumbwell.reduction.located import Located
from plumbwell.reduction.network import TieRows
from plumbwell.reduction.network_parts import Parts, network_parts
from plumbwell.reduction.scale_factor import ScaleEstimate, ScaleTold
from plumbwell.reduction.visits import Visits, visits
from plumbwell.study.kept import Kept
from plumbwell.survey.column import Array, Index, frozen, frozen_index
from plumbwell.survey.errors import NumericalError
from plumbwell.survey.instrument import Instrument, Run, Tare
from plumbwell.survey.readings import Readings
from plumbwell.survey.recipe import Recipe

AUTOMATIC = "auto"


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class NetworkInputs:
    """What the network asks of the chain: found again as one object when nothing of it has changed.

    Parameters
    ----------
    readings : Readings
        With the uses in force.
    utc : (n,) array
    station : (n,) int array
    where : Located
    ties : TieRows
    instruments : tuple of Instrument
    runs : tuple of Run
    tares : tuple of Tare
        Those listed.
    """

    readings: Readings
    utc: Array
    station: Index
    where: Located
    ties: TieRows
    instruments: tuple[Instrument, ...]
    runs: tuple[Run, ...]
    tares: tuple[Tare, ...]


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class NetworkWork:
    """The adjusted network, and what was found on the way.

    Parameters
    ----------
    visits, parts, adjustment, gravity
        As in force.
    counts : (s,) int array
        Visits of each station.
    judgement : Judgement
        What does not fit: by a network of all readings in use and all listed tares.
    proposed_applied : bool
        True where found jumps are taken out.
    trust : (n,) array or None
        Robust weight of each row; None: 1 for all.
    walk_not_needed : bool
        True where a walk of the drift would explain more than chance, but no more once the found jumps are out.
    """

    visits: Visits
    parts: Parts
    adjustment: Adjustment
    gravity: StationGravity
    counts: Index
    judgement: Judgement
    proposed_applied: bool
    trust: Array | None
    walk_not_needed: bool


def network_work(
    keep: Kept, asked: NetworkInputs, observed: Array, responses: tuple[Array, ...], noise: NoiseTerms, recipe: Recipe
) -> NetworkWork:
    """Station gravity from corrected readings.

    Parameters
    ----------
    keep : Kept
    asked : NetworkInputs
    observed : (n,) array
        Readings with all corrections, m/s2.
    responses : tuple of (n,) arrays
        Further right-hand sides.
    noise : NoiseTerms
    recipe : Recipe
    """
    readings, utc, where = asked.readings, asked.utc, asked.where
    n_stations = len(where.placement.label)
    names = readings.run.names
    meters = _run_instruments(readings, asked.instruments)
    stays = keep.settled(visits, readings, asked.station, utc=utc, visit_gap=recipe.visit_gap)
    basis = keep(drift_basis, utc, readings.run.code, names, stays, asked.tares, meters)
    parts = keep(network_parts, basis, stays, asked.ties, n_stations=n_stations)
    start, automatic = keep(_orders, readings, asked.runs, stays, recipe.drift_order)
    fixed = {
        "n_stations": n_stations, "start_orders": start, "automatic": automatic, "station": asked.station,
    }
    plain = keep(
        adjusted, observed, basis, stays, asked.ties, parts, noise, **fixed, walk="off", responses=responses
    )
    found = keep(
        judgement, plain, observed, asked.ties, parts, noise, **fixed, run_names=names, tares=asked.tares,
        run_instrument=meters,
    )
    # Readings in error would be taken for a wander: whether there is one is asked of the others.
    fit, walk, walk_not_needed = plain, _Walk(asked=recipe.drift_walk), False
    if recipe.drift_walk != "off":
        clean = keep(_without_named, found, len(readings)) if len(found.rows) else None
        try:
            wandering = keep(
                adjusted, observed, basis, stays, asked.ties, parts, noise, **fixed | _held(plain),
                walk=recipe.drift_walk, responses=responses, trust=clean,
            )
        except NumericalError:  # without the readings in error nothing joins the rest
            clean = None
            wandering = keep(
                adjusted, observed, basis, stays, asked.ties, parts, noise, **fixed | _held(plain),
                walk=recipe.drift_walk, responses=responses,
            )
        tried = wandering.walk_tried
        if wandering.walk is not None and any(not one.one_visit for one in found.proposed):
            found, needed = keep(
                _beside_walk, wandering, found, observed, asked, noise, start, automatic, clean
            )
            walk_not_needed = recipe.drift_walk == "auto" and not needed
        if wandering.walk is not None and not walk_not_needed:
            walk = _Walk(asked=recipe.drift_walk, strength=wandering.walk.strength)
            if clean is not None:
                wandering = keep(
                    adjusted, observed, basis, stays, asked.ties, parts, noise, **fixed | _held(plain),
                    walk=walk.in_force, responses=responses,
                )
            fit = keep(_with_tests, wandering, plain, True)
        else:
            fit = keep(_with_trial, plain, tried)
    jumps = applicable(found, recipe)
    apply = recipe.tares == "proposed" and bool(jumps)
    trust = None
    if recipe.outliers == "exclude" and len(found.rows):
        readings = keep(_in_use, readings, found)
        stays = keep.settled(visits, readings, asked.station, utc=utc, visit_gap=recipe.visit_gap)
        trust = keep(alike_weights, found, len(readings)) if found.alike.any() else None
    tares = asked.tares + as_tares(jumps, names) if apply else asked.tares
    if apply or stays is not fit.visits:
        basis = keep(drift_basis, utc, readings.run.code, names, stays, tares, meters)
        parts = keep(network_parts, basis, stays, asked.ties, n_stations=n_stations)
    if recipe.outliers == "downweight":
        robust = keep(robust_weights, observed, basis, stays, asked.ties, parts, noise, found, **fixed)
        trust = robust.trust
        weighed = keep(
            adjusted, observed, basis, stays, asked.ties, parts, noise, **fixed | _held(robust.known),
            walk=walk.in_force, responses=responses, trust=trust, known=robust.known,
        )
        fit = keep(_with_tests, weighed, robust.known, fit.walk_tried)
    elif apply or stays is not fit.visits or trust is not None:
        fit = keep(
            adjusted, observed, basis, stays, asked.ties, parts, noise, **fixed, walk=walk.in_force,
            responses=responses, trust=trust,
        )
    counts = keep(_visit_counts, stays, n_stations)
    return NetworkWork(
        visits=stays,
        parts=parts,
        adjustment=fit,
        gravity=keep(_referred, fit, parts, asked.ties, where, counts, recipe.datum_station),
        counts=counts,
        judgement=found,
        proposed_applied=apply,
        trust=trust,
        walk_not_needed=walk_not_needed,
    )


def applicable(found: Judgement, recipe: Recipe) -> tuple[ProposedTare, ...]:
    """The found jumps that are taken out where the recipe asks for it.

    A bad visit at the end of its run is a jump as well: out of use it needs none.
    """
    return tuple(one for one in found.proposed if not one.one_visit or recipe.outliers == "flag")


@dataclass(frozen=True, slots=True, kw_only=True)
class _Walk:
    """The walk that was asked for, and the strength of the one that is kept; None for none."""

    asked: str | float
    strength: float | None = None

    @property
    def in_force(self) -> str | float:
        """What an adjustment is asked for."""
        return "off" if self.strength is None else self.strength


def _held(plain: Adjustment) -> dict[str, tuple[int, ...]]:
    """The drift orders that were chosen, to be kept."""
    return {"start_orders": plain.orders, "automatic": ()}


def _with_tests(last: Adjustment, plain: Adjustment, tried: bool) -> Adjustment:
    return replace(last, tests=plain.tests, walk_tried=tried)


def _with_trial(plain: Adjustment, tried: bool) -> Adjustment:
    return replace(plain, walk_tried=tried)


def _without_named(found: Judgement, n_rows: int) -> Array:
    trust = np.ones(n_rows)
    trust[found.rows] = OUT
    return frozen(trust)


def _beside_walk(
    fit: Adjustment,
    found: Judgement,
    observed: Array,
    asked: NetworkInputs,
    noise: NoiseTerms,
    start: tuple[int, ...],
    automatic: tuple[int, ...],
    trust: Array | None,
) -> tuple[Judgement, bool]:
    """The found jumps that stand beside a walk of the drift, and whether a walk is needed beside them."""
    names, n_stations = asked.readings.run.names, len(asked.where.placement.label)
    meters = _run_instruments(asked.readings, asked.instruments)
    # What a bad visit at an end may be too says nothing against a walk, and it is out here.
    at_ends = [one for one in found.proposed if one.one_visit]
    proposed = [one for one in found.proposed if not one.one_visit]
    while True:
        basis = drift_basis(
            asked.utc, asked.readings.run.code, names, fit.visits,
            asked.tares + as_tares(tuple(proposed), names), meters,
        )
        parts = network_parts(basis, fit.visits, asked.ties, n_stations=n_stations)
        # An unlisted jump raises the order of its run: beside it the orders are chosen anew.
        both = adjusted(
            observed, basis, fit.visits, asked.ties, parts, noise, n_stations=n_stations, start_orders=start,
            automatic=automatic, station=asked.station, walk="auto", trust=trust,
        )
        first = len(basis.tares) - len(proposed)
        told = []
        for number, one in enumerate(proposed):
            size, sd = both.unknown(DriftUnknown(kind="tare", run=one.run, tare=first + number))
            if is_told(size, sd, both.reseating.freedom, noise.estimate, gaps=gaps_of(fit.visits)):
                told.append(one)
        if len(told) == len(proposed):
            kept = sorted(proposed + at_ends, key=lambda one: one.time)
            return replace(found, proposed=tuple(kept)), both.walk is not None
        proposed = told
        if not proposed:
            return replace(found, proposed=tuple(at_ends)), True


def _in_use(readings: Readings, found: Judgement) -> Readings:
    return replace(readings, use=used_rows(readings.use, found))


def _run_instruments(readings: Readings, instruments: tuple[Instrument, ...]) -> tuple[Instrument, ...]:
    """The instrument of each run, by run code: that of its first row."""
    used = instruments_used(readings, instruments)
    _, first = np.unique(readings.run.code, return_index=True)
    return tuple(used[code] for code in readings.instrument.code[first].tolist())


def _orders(
    readings: Readings, runs: tuple[Run, ...], stays: Visits, of_recipe: str | int
) -> tuple[tuple[int, ...], tuple[int, ...]]:
    """Starting order of each run by code, and the codes of those whose order is chosen, in time order."""
    stated = {run.name: run.drift_order for run in runs if run.drift_order is not None}
    wanted = [stated.get(name, of_recipe) for name in readings.run.names]
    start = tuple(1 if isinstance(one, str) else one for one in wanted)
    return start, tuple(code for code in stays.run_order.tolist() if wanted[code] == AUTOMATIC)


def _visit_counts(stays: Visits, n_stations: int) -> Index:
    return frozen_index(np.bincount(stays.station, minlength=n_stations))


def _referred(
    fit: Adjustment, parts: Parts, ties: TieRows, where: Located, counts: Index, wanted: str | None
) -> StationGravity:
    labels = where.placement.label
    datum = datum_stations(
        parts,
        where.placement.role,
        where.positions.elevation.values,
        counts > 0,
        wanted=labels.index(wanted) if wanted in labels else None,
    )
    return referred_gravity(fit, parts, ties, datum)


def noise_terms(readings: Readings, instruments: tuple[Instrument, ...], *, estimate: bool) -> NoiseTerms:
    """What the instruments and the readings state about noise."""
    used = instruments_used(readings, instruments)

    def of_row(name: str) -> Array:
        return np.array([getattr(one, name) for one in used])[readings.instrument.code]

    stated = readings.reading_sd
    return NoiseTerms(
        reading_sd=np.full(len(readings), np.nan) if stated is None else stated.values,
        reading_floor=of_row("reading_floor"),
        reseating_sd=of_row("reseating_sd"),
        station_floor=of_row("station_floor"),
        estimate=estimate,
    )


def doubtful_scales(
    readings: Readings, instruments: tuple[Instrument, ...], values: Array
) -> tuple[tuple[tuple[str, float], ...], tuple[Array, ...]]:
    """Relative sd of each doubtful scale, and the calibrated readings that answer to it."""
    doubtful = [
        (code, one) for code, one in enumerate(instruments_used(readings, instruments)) if one.scale_sd > 0.0
    ]
    return (
        tuple((one.name, one.scale_sd / one.scale) for _, one in doubtful),
        tuple(frozen(np.where(readings.instrument.code == code, values, 0.0)) for code, _ in doubtful),
    )


def rescaled(
    instruments: tuple[Instrument, ...], readings: Readings, estimated: tuple[ScaleEstimate, ...]
) -> tuple[Instrument, ...]:
    """The instruments with their estimated scales and the sds of these."""
    used = instruments_used(readings, instruments)
    factors = {used[one.instrument].name: one for one in estimated if one.told}
    return tuple(
        replace(
            one,
            scale=one.scale * factors[one.name].factor,
            scale_sd=one.scale * factors[one.name].factor * factors[one.name].sd,
        )
        if one.name in factors
        else one
        for one in instruments
    )


def scales_told(
    instruments: tuple[Instrument, ...], readings: Readings, estimated: tuple[ScaleEstimate, ...]
) -> tuple[ScaleTold, ...]:
    """The scales in force where they were asked to be estimated; none where they were not."""
    used = instruments_used(readings, instruments)
    return tuple(
        ScaleTold(
            instrument=used[one.instrument].name,
            scale=used[one.instrument].scale,
            sd=used[one.instrument].scale_sd,
            told=one.told,
        )
        for one in estimated
    )
