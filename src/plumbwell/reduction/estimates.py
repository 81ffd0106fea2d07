"""What the network estimates, as columns whose weighings come from the factorisation itself.

Every estimate is linear in the readings, the ties' and the priors' values once the noise is settled:
value = sum of weight times input. The weights of any one cell are made on demand.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from plumbwell.reduction.adjustment import Adjustment
from plumbwell.reduction.datums import StationGravity
from plumbwell.reduction.design import of_rows
from plumbwell.reduction.network import answer_of_stations, on_border
from plumbwell.reduction.network_parts import Parts
from plumbwell.survey.column import (
    Array,
    Column,
    Index,
    Input,
    Law,
    Weighing,
    computed,
    constant_column,
    frozen_index,
    weighed,
)

SOURCE = "weighted least squares, stations eliminated; Patterson & Thompson 1971 for the weights"

OBSERVED = Law(
    "reading with its corrections",
    "calibrated + tide + tilt - pressure effect + to station",
    "definition",
    lambda calibrated, tide, tilt, pressure_effect, to_station: calibrated + tide + tilt - pressure_effect + to_station,
)
FREED = Law("reading freed of known drift", "reading with its corrections - known drift", "definition",
            lambda observed, held: observed - held)
RESIDUAL = Law(
    "residual",
    "reading with its corrections - run bias - drift - visit effect - gravity of the station",
    "definition",
    lambda observed, run_bias, drift, visit_effect, gravity: (
        observed - run_bias - drift - np.where(np.isnan(visit_effect), 0.0, visit_effect) - gravity
    ),
)
TO_STATION = Law(
    "to the station's sensor depth",
    "(station depth - row depth, as TVD) x slope of gravity there",
    "definition",
    lambda drop, slope: drop * slope,
)


class Gain:
    """How the adjusted network answers to its inputs.

    Parameters
    ----------
    adjustment : Adjustment
    n_rows : int
    """

    def __init__(self, adjustment: Adjustment, n_rows: int) -> None:
        self.adjustment = adjustment
        self.n_rows = n_rows

    def weights(self, at_station: Array, at_border: Array) -> tuple[Array, Array, Array]:
        """Weights of rows, ties and priors in the estimate at_station . gravity + at_border . unknown."""
        one, visits = self.adjustment.solution, self.adjustment.visits
        design = one.design
        answer = one.factor.solve(at_border + on_border(design, one.border, at_station))
        eliminated = np.where(design.in_border >= 0, 0.0, at_station / one.border.total)
        station = eliminated + answer_of_stations(design, one.border, answer)
        level = np.append(np.where(design.in_border >= 0, 0.0, station), 0.0)
        of_visit = (level[design.local] + design.on_visits(answer)) * one.weight
        rows = np.zeros(self.n_rows)
        rows[visits.rows] = self.adjustment.noise.weight * np.repeat(of_visit, np.diff(visits.start))
        ties = station[one.ties.station] * one.ties.weight
        priors = design.priors.of(answer) / design.priors.sd**2
        return rows, ties, priors

    def border_row(self, row: int, *, bias: bool) -> Array:
        """The border's regressors at one row, with or without the bias of its run."""
        fit, at = self.adjustment, np.array([row], dtype=np.intp)
        numbers = fit.design.of_run[fit.basis.run[row]]
        found = np.zeros(fit.design.size)
        filled = numbers >= 0
        found[numbers[filled]] = of_rows(fit.basis, fit.design, at)[0, filled]
        if not bias:
            found[[n for n in numbers[filled].tolist() if fit.design.unknowns[n].kind == "bias"]] = 0.0
        return found


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Estimates:
    """Estimates of the network as columns.

    Parameters
    ----------
    gravity, gravity_sd : Column, (s,), m/s2
    run_bias, drift, visit_effect, residual : Column, (n,), m/s2
    standardised, redundancy : Column, (n,)
    """

    gravity: Column
    gravity_sd: Column
    run_bias: Column
    drift: Column
    visit_effect: Column
    residual: Column
    standardised: Column
    redundancy: Column


ROOT = Law(
    "standard deviation of gravity",
    "square root of the sum of variances by reading, drift, tare and tie",
    "independent errors add in variance",
    lambda reading, drift, tare, tie: np.sqrt(reading + drift + tare + tie),
)


def estimates(
    observed: Column, adjustment: Adjustment, station_gravity: StationGravity, parts: Parts, station: Index
) -> Estimates:
    """The columns of a network's estimates.

    Parameters
    ----------
    observed : Column, (n,)
        Readings with their corrections.
    adjustment : Adjustment
    station_gravity : StationGravity
    parts : Parts
    station : (n,) int array
        Station of each row, -1 for none.
    """
    basis, solution, n = adjustment.basis, adjustment.solution, len(observed)
    held = constant_column("known_drift", "m/s2", adjustment.held)
    freed = Input("readings", computed("freed", "m/s2", FREED, Input("observed", observed), Input("held", held)))
    ties = Input("ties", constant_column("ties", "m/s2", solution.ties.value))
    priors = Input("priors", constant_column("priors", "", adjustment.design.priors.value))
    gain = Gain(adjustment, n)
    datum, n_stations, size = station_gravity.datum, len(station_gravity.gravity), adjustment.design.size
    level = station_levels(parts, datum)

    def of_station(row: int) -> tuple[Array, ...]:
        at = np.zeros(n_stations)
        at[row] += 1.0
        if datum[row] >= 0:
            at[datum[row]] -= 1.0
        return gain.weights(at, np.zeros(size))

    def of_bias(row: int) -> tuple[Array, ...]:
        at, border = np.zeros(n_stations), gain.border_row(row, bias=True) - gain.border_row(row, bias=False)
        first = level(int(parts.of_run[basis.run[row]]))
        if first >= 0:
            at[first] += 1.0
        return gain.weights(at, border)

    def of_drift(row: int) -> tuple[Array, ...]:
        at = np.zeros(n_stations)
        before = level(int(parts.of_run[basis.run[row]]))
        after = level(_part_at(adjustment, parts, row))
        if before != after:
            for one, sign in ((before, -1.0), (after, 1.0)):
                if one >= 0:
                    at[one] += sign
        own = np.zeros(n)
        own[row] = 1.0
        return *gain.weights(at, gain.border_row(row, bias=False)), own

    def of_visit(row: int) -> tuple[Array, ...]:
        visits = adjustment.visits
        visit = int(visits.of_row[row])
        rows = slice(int(visits.start[visit]), int(visits.start[visit + 1]))
        members, share = visits.rows[rows], adjustment.noise.weight[rows]
        at = np.zeros(n_stations)
        at[visits.station[visit]] = 1.0
        border = sum(
            weight * gain.border_row(int(member), bias=True)
            for member, weight in zip(members.tolist(), share.tolist(), strict=True)
        )
        of_rows, of_ties, of_priors = gain.weights(at, np.asarray(border, dtype=float).reshape(size))
        seat = float(adjustment.reseating.variance[visit])
        kept = seat / (seat + float(adjustment.noise.variance[visit]))
        own = np.zeros(n)
        own[members] = share
        return kept * (own - of_rows), -kept * of_ties, -kept * of_priors

    shift = np.zeros(n)
    for number in range(len(basis.tares)):
        if station_gravity.tare_shift[number] != 0.0:
            shift += station_gravity.tare_shift[number] * basis.jumps(np.arange(n), number)
    gravity = weighed(
        "gravity", "m/s2", station_gravity.gravity,
        Weighing("gravity of the station", "weighted mean of readings freed of bias and drift", SOURCE, of_station),
        freed, ties, priors,
    )
    read = np.zeros(len(basis.start), dtype=bool)
    read[adjustment.visits.run_order] = True
    present = read[basis.run]
    run_bias = weighed(
        "run_bias", "m/s2", np.where(present, station_gravity.bias[basis.run], np.nan),
        Weighing("bias of the run", "least-squares constant of the run", SOURCE, of_bias), freed, ties, priors,
    )
    drift = weighed(
        "drift", "m/s2", np.where(present, adjustment.border_drift + adjustment.held + shift, np.nan),
        Weighing(
            "drift and tares", "polynomial of the run at the reading's time, and tares before it", SOURCE, of_drift
        ),
        freed, ties, priors, Input("known_drift", held),
    )
    visit_effect = weighed(
        "visit_effect", "m/s2", adjustment.visit_effect,
        Weighing("visit effect", "u2/(u2 + e2) x (mean of the visit - its estimate)", SOURCE, of_visit),
        freed, ties, priors,
    )
    without = np.where(station >= 0, station, 0)
    at_row = computed(
        "gravity_of_station", "m/s2", AT_ROW, Input("gravity", gravity, frozen_index(without)),
        Input("placed", constant_column("placed", "", station >= 0)),
    )
    variance = (station_gravity.reading, station_gravity.drift, station_gravity.tare)
    sd = computed(
        "gravity_sd", "m/s2", ROOT,
        *(
            Input(name, constant_column(f"variance_{name}", "m2/s4", one.variance()))
            for name, one in zip(("reading", "drift", "tare"), variance, strict=True)
        ),
        Input("tie", constant_column("variance_tie", "m2/s4", np.sum(station_gravity.ties**2, axis=1))),
    )
    return Estimates(
        gravity=gravity,
        gravity_sd=sd,
        run_bias=run_bias,
        drift=drift,
        visit_effect=visit_effect,
        residual=computed(
            "residual", "m/s2", RESIDUAL, Input("observed", observed), Input("run_bias", run_bias),
            Input("drift", drift), Input("visit_effect", visit_effect), Input("gravity", at_row),
        ),
        standardised=constant_column("standardised_residual", "", adjustment.standardised),
        redundancy=constant_column("redundancy", "", adjustment.redundancy),
    )


AT_ROW = Law(
    "gravity of the reading's station",
    "that of its station; none where it belongs to none",
    "definition",
    lambda gravity, placed: np.where(np.asarray(placed) > 0.0, gravity, np.nan),
)


def station_levels(parts: Parts, datum: Index):  # type: ignore[no-untyped-def]
    """A function that gives the datum station of a part, -1 where it is tied or there is none."""
    of_part = np.full(parts.count, -1)
    for station, part in enumerate(parts.of_station.tolist()):
        if part >= 0:
            of_part[part] = datum[station]
    return lambda part: int(of_part[part]) if part >= 0 else -1


def _part_at(adjustment: Adjustment, parts: Parts, row: int) -> int:
    """The network part on which a row hangs: that after the last free tare before it, else its run's first."""
    basis = adjustment.basis
    part, latest = int(parts.of_run[basis.run[row]]), -np.inf
    for number, tare in enumerate(basis.tares):
        if tare.size is None and basis.tare_run[number] == basis.run[row] and latest < tare.time <= basis.utc[row]:
            part, latest = int(parts.of_tare[number]), tare.time
    return part
