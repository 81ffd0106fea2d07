"""Findings about the size of drift, and about tares that nothing tells from gravity."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from plumbwell.study.docket.wording import (
    HOUR,
    MILLIGAL,
    amount,
    counted,
    gravity,
    listed,
    moment,
    numbers,
    rate,
    run,
    stations,
)
from plumbwell.study.finding import Finding
from plumbwell.study.results import Results
from plumbwell.survey.column import Array, Index

CONTRADICTION = 4.0
"""Standard deviations from which on a drift is not the stated one."""


def drift_large(results: Results) -> Iterator[Finding]:
    """Runs whose drift is larger than what gravity changes by between their stations."""
    visits, at = results.network.visits, results.stations.gravity.values
    part = results.network.parts.of_station
    for code, members in _moving(results):
        read = np.unique(visits.station[members])
        read = read[np.isfinite(at[read])]
        signal = max((float(np.ptp(at[read[part[read] == one]])) for one in np.unique(part[read])), default=0.0)
        span = _drift_span(results, code, members)
        if len(read) < 2 or not span > signal:
            continue
        times = f"{amount(span / signal, 1)} times" if signal > 0.0 else "beside nothing at all,"
        yield Finding(
            code="drift_large",
            severity="look",
            place=f"run {run(results, code)}",
            text=f"The drift of run {run(results, code)} spans {gravity(span)}, {times} what gravity changes by "
            f"between its stations, {gravity(signal)}: the densities rest on how well the drift is known.",
            mend="See that the instrument was warm and the times are right, whether a tare hides in the drift, and "
            "that returns to a base bound it.",
            stations=numbers(read),
        )


def drift_contradicts(results: Results) -> Iterator[Finding]:
    """Runs whose drift is not the stated one by far more than its sd: what is stated bends the drift.

    Notes
    -----
    With p the stated rate of sd s and d the estimate of sd t, the repeats alone would give d + (d - p) t2/(s2 - t2).
    """
    fit = results.network.adjustment
    basis = fit.basis
    numbers_of = [n for n, one in enumerate(fit.design.unknowns) if one.kind == "drift"]
    run_of = np.array([fit.design.unknowns[n].run for n in numbers_of], dtype=np.intp)
    # Scaled time ends at 1, so that the powers add up to the drift over the whole run.
    whole = np.bincount(run_of, fit.solution.unknown[numbers_of, 0], minlength=len(basis.length))
    sds_off = np.where(basis.rate_sd < np.inf, np.abs(whole / basis.length - basis.rate) / basis.rate_sd, 0.0)
    for code in dict.fromkeys(run_of.tolist()):
        off = float(sds_off[code])
        if off <= CONTRADICTION:
            continue
        terms = [fit.design.unknowns[n] for n in numbers_of if fit.design.unknowns[n].run == code]
        stated, stated_sd = float(basis.rate[code]), float(basis.rate_sd[code])
        length = float(basis.length[code])
        found = float(whole[code]) / length
        severity, pull = "look", ""
        if len(terms) == 1:
            sd = fit.unknown(terms[0])[1] / length
            if sd < stated_sd:
                bent = abs(found - stated) * sd**2 / (stated_sd**2 - sd**2)
                pull = f", by {gravity(bent * length)} over the run (sd {gravity(sd * length)})"
                severity = "error" if bent > sd else "look"
        yield Finding(
            code="drift_not_as_stated",
            severity=severity,
            place=f"run {run(results, code)}",
            text=f"The mean drift of run {run(results, code)} is {_rate(found)} mGal/h, {amount(off, 0)} sd off the "
            f"stated {rate(stated)} ± {rate(stated_sd)} mGal/h (drift_rate, drift_rate_sd), which pulls it towards "
            f"itself{pull}.",
            mend="State a drift_rate and a drift_rate_sd that hold for this instrument; see the times of the readings, "
            "and whether a tare is not listed.",
            stations=numbers(np.unique(results.network.visits.station[results.network.visits.run == code])),
        )


def _rate(value: float) -> str:
    return f"{value / MILLIGAL * HOUR:.3g}".replace("-", "\u2212")


def _moving(results: Results) -> list[tuple[int, slice]]:
    """Each run with its visits, which stand together, but for those whose drift is plainly within their signal.

    Without a tare all stations of a run are of one part of the network, and its drift has no jumps.
    """
    visits, at = results.network.visits, results.stations.gravity.values[results.network.visits.station]
    drift = results.readings.estimates.drift.values[visits.rows]
    first = np.flatnonzero(np.diff(visits.run, prepend=-1))
    signal, span = _ranges(at, first), _ranges(drift, visits.start[first])
    listed_tare = np.isin(visits.run[first], results.network.adjustment.basis.tare_run)
    ends = [*first[1:].tolist(), len(visits)]
    return [
        (int(visits.run[first[n]]), slice(int(first[n]), ends[n]))
        for n in np.flatnonzero(listed_tare | (span > signal)).tolist()
    ]


def _ranges(values: Array, first: Index) -> Array:
    """Greatest less least known value of each group, minus infinity where none is known."""
    known = np.isfinite(values)
    most = np.maximum.reduceat(np.where(known, values, -np.inf), first)
    return most - np.minimum.reduceat(np.where(known, values, np.inf), first)


def _drift_span(results: Results, code: int, members: slice) -> float:
    """How far the drift of a run goes over its used readings, jumps at tares left out, m/s2."""
    visits, basis = results.network.visits, results.network.adjustment.basis
    rows = visits.rows[visits.start[members.start] : visits.start[members.stop]]
    utc, drift = basis.utc[rows], results.readings.estimates.drift.values[rows]
    edges = [tare.time for tare, of in zip(basis.tares, basis.tare_run.tolist(), strict=True) if of == code]
    stretch = np.searchsorted(np.sort(np.array(edges, dtype=np.float64)), utc, side="right")
    known = np.isfinite(drift)
    spans = [_reach(drift[known & (stretch == one)]) for one in range(len(edges) + 1)]
    return float(sum(spans))


def _reach(values: Array) -> float:
    return float(np.ptp(values)) if values.size else 0.0


def tares_part(results: Results) -> Iterator[Finding]:
    """Tares of unknown size with no station read on both sides: nothing tells them from gravity."""
    network = results.network
    parts, basis = network.parts, network.adjustment.basis
    if parts.count < 2:
        return
    before = parts.of_run.tolist()
    found: dict[int, list[tuple[int, int, int]]] = {}
    for number in sorted(range(len(basis.tares)), key=lambda one: (basis.tares[one].time, one)):
        code, after = int(basis.tare_run[number]), int(parts.of_tare[number])
        if basis.tares[number].size is not None or after < 0:
            continue
        if after != before[code]:
            found.setdefault(code, []).append((number, before[code], after))
        before[code] = after
    for code, members in found.items():
        yield _parting(results, code, members)


def _parting(results: Results, code: int, members: list[tuple[int, int, int]]) -> Finding:
    """The finding about the tares of one run: number of each, and the parts before and after it."""
    tares, name = results.network.adjustment.basis.tares, run(results, code)
    times = listed([moment(tares[number].time) for number, _, _ in members])
    sides = [np.concatenate([_of_part(results, before), _of_part(results, after)]) for _, before, after in members]
    joined, needed = {members[0][1]}, 0
    for _, _, after in members:
        needed += after not in joined
        joined.add(after)
    if len(members) == 1:
        upper, lower = (stations(results, _of_part(results, one), 3) for one in members[0][1:])
        what = f"The tare of run {name} at {times}"
        where = f"between what is read before it ({upper}) and after it ({lower})"
        which = "Remove it, if the field notes do not bear it out"
    else:
        what = f"The {counted(len(members), 'tare')} of run {name} at {times}"
        where = "between the stations before and after each"
        which = f"Remove those that the field notes do not bear out ({amount(needed, 0)} less would join the stations)"
    return Finding(
        code="tare_confounded",
        severity="error",
        place=f"run {name}",
        text=f"{what} cannot be told from the difference of gravity {where}: no station is read on both sides, so "
        "the network falls apart there.",
        mend=f"{which}; state size and size_sd; or bring in a station read on both sides.",
        stations=numbers(np.unique(np.concatenate(sides))),
    )


def _of_part(results: Results, part: int) -> Index:
    return np.flatnonzero((results.network.parts.of_station == part) & (results.stations.visits > 0))
