"""Findings about the network: what hangs together, what the visits determine, and on what gravity counts."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray

from plumbwell.reduction.chance import student_limit
from plumbwell.reduction.drift_basis import DriftUnknown
from plumbwell.reduction.drift_order import EVERY_RUN
from plumbwell.reduction.network import own_size
from plumbwell.reduction.visits import Visits
from plumbwell.study.docket.wording import (
    GRAM_PER_CM3,
    MILLIGAL,
    amount,
    counted,
    gravity,
    lines,
    listed,
    moment,
    numbers,
    rate,
    run,
    station,
    stations,
)
from plumbwell.study.finding import Finding
from plumbwell.study.results import Results
from plumbwell.survey.column import Index
from plumbwell.survey.errors import shown

UNTOUCHED = 1e-6
"""Share of a mean drift that lies where no visit looks; less is rounding."""


def single_station(results: Results) -> Iterator[Finding]:
    """No interval at all: one station, all of the column within the least thickness, or none in the column."""
    if len(results.intervals) or results.network.parts.count > 1:
        return
    column = [n for n, role in enumerate(results.stations.role) if role == "column"]
    if len(column) > 1:
        least = amount(results.recipe.min_thickness, 2)
        text = f"All {len(column)} stations of the column lie within {least} m of height: no density."
    elif column:
        text = "There is one station only in the column: gravity is given, a density needs two depths."
    else:
        text = "No station has the role column, so no interval can be made: there is no density."
    yield Finding(
        code="single_station",
        severity="error",
        place=station(results, column[0] if column else 0),
        text=text,
        mend="Bring in readings at a second depth, or correct depths and roles of the stations.",
        stations=tuple(column) or (0,),
    )


def undetermined_runs(results: Results) -> list[int]:
    """Codes of the runs of order 1 or more whose mean drift the visits alone leave open."""
    fit = results.network.adjustment
    one = fit.design
    if not fit.rank.lacking:
        return []
    size = np.sqrt(own_size(one))
    open_ = fit.rank.open / np.linalg.norm(fit.rank.open * size[:, None], axis=0)
    drifts: dict[int, list[int]] = {}
    for number, unknown in enumerate(one.unknowns):
        if unknown.kind == "drift":
            drifts.setdefault(unknown.run, []).append(number)
    # The mean drift of a run is the sum of its powers, since time is scaled by the run's length.
    return [
        code
        for code, members in drifts.items()
        if np.linalg.norm(open_[members].sum(axis=0)) > UNTOUCHED * np.linalg.norm(1.0 / size[members])
    ]


def _comes_back(visits: Visits, code: int) -> bool:
    """True for a run that reads some station again after another one."""
    stations = visits.station[visits.run == code]
    stops = stations[np.concatenate([[True], stations[1:] != stations[:-1]])] if len(stations) else stations
    return len(np.unique(stops)) < len(stops)


def no_repeat(results: Results) -> Iterator[Finding]:
    """Runs without a repeat separated in time: their drift rests on what the instrument states."""
    basis, visits = results.network.adjustment.basis, results.network.visits
    for code in undetermined_runs(results):
        if _comes_back(visits, code):
            continue  # what is open then is a higher order, and `rank_lost` names it
        stated = f"{rate(float(basis.rate[code]))} ± {rate(float(basis.rate_sd[code]))} mGal/h"
        yield Finding(
            code="no_repeat",
            severity="error",
            place=f"run {run(results, code)}",
            text=f"Run {run(results, code)} has no repeat separated in time that tells its drift from "
            f"gravity: the drift is the stated one, {stated} (drift_rate, drift_rate_sd), and its error is "
            "in the densities.",
            mend="Bring in a second visit of a station of this run, or of one that a well-tied run shares "
            "with it; else see that drift_rate_sd of the instrument is honest.",
            stations=numbers(np.unique(visits.station[visits.run == code])),
        )


def _unknown(results: Results, one: DriftUnknown) -> str:
    if one.kind == "tare":
        return f"the tare at {moment(results.network.adjustment.basis.tares[one.tare].time)}"
    return f"the drift term of order {one.power}" if one.kind == "drift" else "the bias"


def rank_lost(results: Results) -> Iterator[Finding]:
    """Unknowns that readings and priors cannot determine, and the gravity that is not known for it."""
    found, names = results.network.open, results.survey.readings.run.names
    for one in results.network.adjustment.design.lost:
        name = shown(names[one.run])
        lost = np.flatnonzero(found.undetermined(results.network.gravity.datum, held=one))
        others = [
            _unknown(results, other) + ("" if other.run == one.run else f" of run {shown(names[other.run])}")
            for other in found.partners(one)
        ]
        if lost.size:
            others.append(f"gravity at {stations(results, lost)}")
        then = "none of them is known, and gravity rests on none of them"
        if lost.size:
            then = f"{counted(lost.size, 'station has', 'stations have')} no gravity, and no density rests on it"
        mend = {
            "tare": "Remove this tare, state size and size_sd of it, or read a station before and after it.",
            "drift": "Lower drift_order of the run, or bring in more returns to a station.",
        }.get(one.kind, "Bring in a station that this run shares with another.")
        pairs = results.intervals.densities.pairs
        yield Finding(
            code="rank_lost",
            severity="error",
            place=f"run {name}",
            text=f"The readings cannot tell {_unknown(results, one)} of run {name} from "
            f"{listed(others) if others else 'the other unknowns'}: {then}.",
            mend=mend,
            stations=numbers(lost),
            intervals=numbers(np.flatnonzero(np.isin(pairs.top, lost) | np.isin(pairs.base, lost))),
        )


def network_parts(results: Results) -> Iterator[Finding]:
    """Stations that no chain of runs joins: no interval leads from one part to the other."""
    parts = results.network.parts
    if parts.count < 2:
        return
    visited = results.stations.visits > 0
    present, sizes = np.unique(parts.of_station[visited], return_counts=True)
    if present.size < 2:
        return
    members = [np.flatnonzero(visited & (parts.of_station == one)) for one in present[:4].tolist()]
    groups = [stations(results, one, 4) for one in members] + [""] * (present.size - 4)
    smaller = visited & (parts.of_station != present[np.argmax(sizes)])
    yield Finding(
        code="network_parts",
        severity="error",
        place="network",
        text=f"The stations fall into {present.size} parts that no shared station joins "
        f"({'; '.join(groups[:4])}"
        + (f"; {present.size - 4} more" if present.size > 4 else "")
        + "): each has a level of its own, and there is no interval and no density between them.",
        mend="Bring in a reading of a station of one part in a run of the other, a tie in each, or the size "
        "of a tare that parts a run.",
        stations=numbers(np.flatnonzero(smaller)),
    )


def tie_unvisited(results: Results) -> Iterator[Finding]:
    """Ties that fix nothing, since no used reading stands at their stations."""
    parts, ties = results.network.parts, results.network.ties
    if not ties.station.size:
        return
    visited = results.stations.visits > 0
    if np.any(parts.tied[parts.of_station[visited]]):
        return
    tied = np.unique(ties.station)
    yield Finding(
        code="tie_unvisited",
        severity="look",
        place="ties.csv",
        text=f"No used reading stands at {stations(results, tied)}, which the ties name: gravity stays relative.",
        mend="Compare the labels in ties.csv with those of the readings, or bring in a reading there.",
        stations=numbers(tied),
    )


def order_chosen(results: Results) -> Iterator[Finding]:
    """Runs whose drift order the F test raised."""
    for test in results.network.adjustment.tests:
        if not test.taken:
            continue
        steps, freedom = test.freedom
        told = f"F = {test.f:.1f} with {steps} and {freedom} degrees of freedom, p = {test.p:.1g}."
        if test.run == EVERY_RUN:
            yield Finding(
                code="drift_order_chosen",
                severity="note",
                place=f"{counted(steps, 'run')} together",
                text=f"The drifts of {counted(steps, 'run')}, raised together to order {test.higher}, are bent: over "
                f"order {test.lower} {told} Runs whose own bend is no more than chance were lowered again.",
                mend="Nothing; or set drift_order, if the bend stands for something else.",
            )
            continue
        name = run(results, test.run)
        yield Finding(
            code="drift_order_chosen",
            severity="note",
            place=f"run {name}",
            text=f"The drift of run {name} is of order {test.higher}: over order {test.lower} {told}",
            mend="Nothing; or set drift_order of the run, if a tare or an outlier bends it.",
        )


def drift_held(results: Results) -> Iterator[Finding]:
    """Runs of order 0, as asked for: their drift is held without error."""
    fit = results.network.adjustment
    if all(fit.orders):
        return
    for code in fit.visits.run_order.tolist():
        if fit.orders[code] == 0 and fit.visits.run_length[code] > 0.0:
            yield Finding(
                code="drift_held",
                severity="note",
                place=f"run {run(results, code)}",
                text=f"The drift of run {run(results, code)} is held at "
                f"{rate(float(fit.basis.rate[code]))} mGal/h without error, since drift_order is 0.",
                mend='Write drift_order = 1 or "auto", if the drift is not known for certain.',
            )


def single_visits(results: Results) -> Iterator[Finding]:
    """Stations that stand on one visit: nothing repeats them."""
    if len(results.stations) < 2:
        return
    alone = np.flatnonzero(results.stations.visits == 1)
    if alone.size:
        yield Finding(
            code="single_visit",
            severity="note",
            place=stations(results, alone, 3),
            text=f"{amount(alone.size, 0)} of {counted(len(results.stations), 'station')} "
            f"{'stands' if alone.size == 1 else 'stand'} on a single visit ({stations(results, alone)}): "
            "nothing would show a bad stop there.",
            mend="Visit them again, if time allows; their errors count this.",
            stations=numbers(alone),
        )


def relative(results: Results) -> Iterator[Finding]:
    """Without a tie gravity is a difference from the datum station."""
    datum = results.network.gravity.datum
    if datum.max() < 0:
        return
    own = sorted({one for one in datum.tolist() if one >= 0})
    factor, share = results.intervals.errors.factors.get("datum"), ""
    if factor is not None and np.any(np.isfinite(factor)):
        most = amount(float(np.nanmax(np.abs(factor))) / GRAM_PER_CM3, 4)
        share = f", which adds {most} g/cm³ or less to density_common_sd"
    sd = amount(results.recipe.datum_sd / MILLIGAL, 0)
    yield Finding(
        code="relative_gravity",
        severity="note",
        place=stations(results, own, 3),
        text=f"No tie fixes gravity: it is the difference from {stations(results, own)}, where the anomaly "
        f"is taken as 0 ± {sd} mGal (datum_sd){share}.",
        mend="Name a tie in ties.csv, if the gravity of a station is known.",
        stations=numbers(own),
    )


def datum_station(results: Results) -> Iterator[Finding]:
    """A datum station that is asked for and does not serve."""
    wanted = results.recipe.datum_station
    if wanted is None:
        return
    datum = results.network.gravity.datum
    if wanted not in results.stations.label:
        own = np.unique(datum[datum >= 0])
        instead = f"gravity counts from {stations(results, own)}" if own.size else "a tie fixes gravity"
        yield Finding(
            code="datum_station_unknown",
            severity="look",
            place="recipe, datum_station",
            text=f'datum_station is "{shown(wanted)}", which is no station of this survey: {instead}.',
            mend="Write the label of a station as it stands in the readings.",
        )
    elif datum[results.stations.label.index(wanted)] < 0:
        yield Finding(
            code="datum_station_unused",
            severity="note",
            place="recipe, datum_station",
            text=f'datum_station "{shown(wanted)}" has no effect: a tie fixes gravity there.',
            mend="Nothing; or remove the ties, if gravity is to count from it.",
        )


def tares_outside(results: Results) -> Iterator[Finding]:
    """Listed tares that lie outside the used readings of their run."""
    inside, every = results.network.adjustment.basis.tares, results.survey.tares
    if len(inside) == len(every):
        return
    visits, names = results.network.visits, results.survey.readings.run.names
    for tare in every:
        if tare in inside:
            continue
        span = "the run has no used reading"
        if tare.run in names and np.isfinite(visits.run_start[names.index(tare.run)]):
            code = names.index(tare.run)
            start, length = float(visits.run_start[code]), float(visits.run_length[code])
            span = f"the used readings of the run go from {moment(start)} to {moment(start + length)}"
        yield Finding(
            code="tare_outside",
            severity="look",
            place=f"run {shown(tare.run)}",
            text=f"The tare of run {shown(tare.run)} at {moment(tare.time)} has no effect: {span}.",
            mend="Correct its time or its run, or remove it.",
        )


def equal_times(results: Results) -> Iterator[Finding]:
    """Used readings with the time of the one before them in their run: copies of a row, and others."""
    rows = results.network.visits.equal_times
    if not rows.size:
        return
    copies = _copies(results, rows)
    twice = rows[copies]
    if twice.size:
        yield Finding(
            code="rows_twice",
            severity="look",
            place=lines(results, twice),
            text=f"{counted(twice.size, 'reading stands', 'readings stand')} twice, with the time, station, depth and "
            "reading of another row: copied, or exported twice? Each counts as a reading of its own and makes "
            "the noise look smaller.",
            mend="Remove the copies, or take them out of use.",
            rows=numbers(twice),
        )
    left = rows[~copies]
    if left.size:
        yield Finding(
            code="equal_times",
            severity="look",
            place=lines(results, left),
            text=f"{counted(left.size, 'reading bears', 'readings bear')} the same time as the one before in "
            "the same run: their order, and the drift between them, is not known.",
            mend="Correct the times, or take the doubles out of use.",
            rows=numbers(left),
        )


def _copies(results: Results, rows: Index) -> NDArray[np.bool_]:
    """True for the rows whose run, time, station, depth and reading a used row before them has too."""
    readings = results.survey.readings
    used = np.flatnonzero(readings.use & np.isin(readings.time.values, readings.time.values[rows]))
    depth = np.nan_to_num(readings.depth.values[used], nan=np.inf)
    columns = (readings.run.code, readings.time.values, readings.station.code, readings.reading.values)
    keys = zip(*(one[used].tolist() for one in columns), depth.tolist(), strict=True)
    first: dict[object, int] = {}
    copied = {row for row, key in zip(used.tolist(), keys, strict=True) if first.setdefault(key, row) != row}
    return np.array([row in copied for row in rows.tolist()], dtype=bool)


def unplaced_ties(results: Results) -> Iterator[Finding]:
    """Ties at stations that nothing puts anywhere."""
    names = results.stations.located.placement.unplaced_ties
    if names:
        yield Finding(
            code="tie_unknown_station",
            severity="look",
            place="ties.csv",
            text=f"{listed([shown(one) for one in names])}: no used reading and no place says where that is, so "
            "the tie is not used.",
            mend="Compare the label with the readings, or give the station a row in places.csv.",
        )


def noise_untold(results: Results) -> Iterator[Finding]:
    """No degree of freedom ties visits together: the re-seating noise is the stated one."""
    seat = results.network.adjustment.reseating
    if seat.freedom > 0 or results.recipe.noise != "estimate":
        return
    low, high = (float(np.sqrt(one)) for one in (seat.variance.min(), seat.variance.max()))
    sd = gravity(low) if high - low < 1e-3 * high else f"{gravity(low)} to {gravity(high)}"
    yield Finding(
        code="noise_untold",
        severity="error",
        place="network",
        text="The survey cannot tell its own noise: there are as many unknowns as visits. The re-seating sd "
        f"is the stated one, {sd} a visit (reseating_sd), and every error rests on it.",
        mend="Bring in repeat visits, or see that reseating_sd of the instrument is honest.",
    )


def few_freedom(results: Results) -> Iterator[Finding]:
    """Fewer than five degrees of freedom: the noise rests in part on what is stated."""
    seat = results.network.adjustment.reseating
    estimate = results.recipe.noise == "estimate"
    if seat.freedom >= 5 or (estimate and seat.freedom == 0):
        return
    has = counted(seat.freedom, "degree of freedom ties", "degrees of freedom tie")
    text = f"Only {has} visits together, so the stated reseating_sd counts as four more in the noise"
    if not estimate:
        text = f"Only {has} visits together: little checks the stated noise"
    yield Finding(
        code="few_degrees_of_freedom",
        severity="look",
        place="network",
        text=f"{text}; 95 % lie within "
        f"{amount(student_limit(0.05, freedom=seat.t_freedom), 2)} sd (Student's t, {seat.t_freedom} degrees of "
        "freedom), not within two.",
        mend="Bring in repeat visits; each adds a degree of freedom.",
    )
