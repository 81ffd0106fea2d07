"""What Readings and Drift show against time: readings and residuals by run, visits against their drift."""

from __future__ import annotations

import numpy as np

from plumbwell.desk.shown import Shown
from plumbwell.plates.numbers import PLUS_MINUS, column_decimals, number
from plumbwell.plates.time_plot import (
    DriftLine,
    Flags,
    RepeatLink,
    RunPanel,
    TareMark,
    TimePlot,
    TimePoints,
    time_points,
)
from plumbwell.study.case import Case
from plumbwell.study.overlay import laid_over
from plumbwell.study.visit_table import TareInForce, drift_lines, tares_in_force
from plumbwell.survey.column import Array, Index

MICROGAL = 1e-8
MILLIGAL = 1e-5
HOUR = 3600.0


def run_name(name: str) -> str:
    """A run as it stands over its panel."""
    return name if name.lower().startswith("run") else f"run {name}"


def _order(case: Case) -> list[int]:
    """Codes of all runs by the time of their first reading."""
    readings = case.survey.readings
    first = np.full(len(readings.run.names), np.inf)
    np.minimum.at(first, readings.run.code, readings.time.values)
    return np.argsort(first, kind="stable").tolist()


def _panel_points(rows: Index, times: Array, values: Array, excluded: Flags, repeated: Flags) -> TimePoints:
    return time_points(
        times[rows], values[rows], rows=rows, repeated=repeated[rows], excluded=excluded[rows]
    )


def reading_plots(case: Case, shown: Shown | None) -> tuple[TimePlot, ...]:
    """The plots of the Readings stage: the readings as written, and, once reduced, their residuals."""
    survey = laid_over(case.survey, case.overlay) if shown is None else shown.results.survey
    readings = survey.readings
    out = ~readings.use
    unit, factor = ("counts", 1.0) if readings.in_counts else ("mGal", MILLIGAL)
    values = np.asarray(readings.reading.values) / factor
    everything = np.ones(len(readings), dtype=bool)
    codes = _order(case)
    rows_of = {code: np.flatnonzero(readings.run.code == code) for code in codes}
    times = np.asarray(readings.time.values)
    plots = [
        TimePlot(
            title="reading",
            unit=unit,
            signed=False,
            decimals=1,
            panels=tuple(
                RunPanel(
                    name=run_name(readings.run.names[code]),
                    run_index=place,
                    points=_panel_points(rows_of[code], times, values, out, everything),
                )
                for place, code in enumerate(codes)
            ),
        )
    ]
    if shown is not None:
        residual = shown.results.readings.estimates.residual.values / MICROGAL
        plots.append(
            TimePlot(
                title="residual",
                unit="µGal",
                zero_line=True,
                panels=tuple(
                    RunPanel(
                        name=run_name(readings.run.names[code]),
                        run_index=place,
                        points=_panel_points(rows_of[code], times, residual, out, everything),
                    )
                    for place, code in enumerate(codes)
                ),
            )
        )
    return tuple(plots)


def _tare_words(one: TareInForce) -> str:
    if not np.isfinite(one.size):
        return "tare of unknown size"
    if one.sd is None:
        return f"tare {number(one.size / MICROGAL, 1, signed=True)} µGal, as stated"
    decimals = column_decimals([one.sd / MICROGAL], default=0)
    return (
        f"tare {number(one.size / MICROGAL, decimals, signed=True)} {PLUS_MINUS} "
        f"{number(one.sd / MICROGAL, decimals)} µGal"
    )


def drift_plots(shown: Shown) -> tuple[TimePlot, ...]:
    """The plots of the Drift stage: visits less their station's gravity against drift, and residuals of repeats."""
    results = shown.results
    visits, network = shown.visits, results.network.visits
    names, codes = results.survey.readings.run.names, _order(shown.case)
    place_of = {code: place for place, code in enumerate(codes)}
    lines = {one.run: one for one in drift_lines(results, visits)}
    tares = list(enumerate(tares_in_force(results)))
    excluded = _excluded_visits(shown)
    main, left = [], []
    for code in codes:
        members = np.flatnonzero(network.run == code)
        line = lines.get(code)
        own_tares = [(key, one) for key, one in tares if one.run == code]
        points = time_points(
            np.concatenate([visits.time[members], excluded[code][0]]),
            np.concatenate([visits.level[members] / MICROGAL, excluded[code][1]]),
            sds=np.concatenate([visits.level_sd[members] / MICROGAL, np.full(len(excluded[code][0]), np.nan)]),
            rows=np.concatenate([members, np.full(len(excluded[code][0]), -1)]),
            repeated=np.concatenate([visits.repeated[members], np.ones(len(excluded[code][0]), dtype=bool)]),
            excluded=np.concatenate(
                [np.zeros(len(members), dtype=bool), np.ones(len(excluded[code][0]), dtype=bool)]
            ),
        )
        name = run_name(names[code])
        main.append(
            RunPanel(
                name=name,
                run_index=place_of[code],
                points=points,
                lines=() if line is None else _pieces(line.time, line.drift, line.sd, own_tares),
                rate_words="" if line is None else _rate_words(line.rate, line.rate_sd),
                tares=tuple(
                    TareMark(key=key, time=one.tare.time, words=_tare_words(one)) for key, one in own_tares
                ),
                links=_links(network.station, members, visits.time, own_tares),
            )
        )
        # What no other visit checks is 0 by construction and would look like a perfect repeat.
        again = members[visits.repeated[members] & np.isfinite(visits.residual_sd[members])]
        left.append(
            RunPanel(
                name=name,
                run_index=place_of[code],
                points=time_points(
                    visits.time[again],
                    visits.residual[again] / MICROGAL,
                    sds=visits.residual_sd[again] / MICROGAL,
                    rows=again,
                ),
            )
        )
    plots = [TimePlot(title="reading less tide, station gravity removed", unit="µGal", panels=tuple(main))]
    if any(len(panel.points) for panel in left):
        plots.append(
            TimePlot(title="residual of repeated stations", unit="µGal", panels=tuple(left), zero_line=True)
        )
    return tuple(plots)


def _pieces(
    time: Array, drift: Array, sd: Array, tares: list[tuple[int, TareInForce]]
) -> tuple[DriftLine, ...]:
    """The drift line of a run, cut at its tares and where nothing tells it."""
    edges = [-np.inf, *(one.tare.time for _, one in tares), np.inf]
    found = []
    for first, last in zip(edges, edges[1:], strict=False):
        inside = np.flatnonzero((time >= first) & (time < last))
        told = inside[np.isfinite(drift[inside])]
        for piece in np.split(told, np.flatnonzero(np.diff(told) > 1) + 1):
            # A single place amid what is not told is no line.
            if piece.size > 1 or piece.size == inside.size == 1:
                found.append(
                    DriftLine(
                        times=tuple(time[piece].tolist()),
                        values=tuple((drift[piece] / MICROGAL).tolist()),
                        band=tuple((sd[piece] / MICROGAL).tolist()),
                    )
                )
    return tuple(found)


def _rate_words(rate: float, sd: float) -> str:
    per_hour, error = rate / MICROGAL * HOUR, sd / MICROGAL * HOUR
    if not np.isfinite(error):
        return f"{number(per_hour, 1, signed=True)} µGal/h, held"
    decimals = column_decimals([error], default=1)
    return f"{number(per_hour, decimals, signed=True)} {PLUS_MINUS} {number(error, decimals)} µGal/h"


def _links(
    station: Index, members: Index, time: Array, tares: list[tuple[int, TareInForce]]
) -> tuple[RepeatLink, ...]:
    """Repeats within a run, joined one after the other."""
    before: dict[int, int] = {}
    found = []
    for place, visit in enumerate(members.tolist()):
        at = int(station[visit])
        if at in before:
            first = before[at]
            apart = any(time[members[first]] < one.tare.time <= time[visit] for _, one in tares)
            found.append(RepeatLink(first=first, second=place, dashed=apart))
        before[at] = place
    return tuple(found)


def _excluded_visits(shown: Shown) -> dict[int, tuple[Array, Array]]:
    """Times and levels (µGal) of the readings that are left out, by run: where they would lie among the visits."""
    results = shown.results
    readings = results.survey.readings
    one = results.readings.estimates
    level = (one.drift.values + one.residual.values) / MICROGAL
    out = np.flatnonzero(~readings.use & np.isfinite(level))
    return {
        code: (
            results.readings.utc.values[out[readings.run.code[out] == code]],
            level[out[readings.run.code[out] == code]],
        )
        for code in range(len(readings.run.names))
    }
