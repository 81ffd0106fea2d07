"""The stages in a line: the one figure of merit of each, and whether it is in order.

A stage is shown in order only when nothing in it wants a look and its result rests on five degrees of freedom or
more. Each kind of finding belongs to one stage: where it can be judged.
"""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np

from plumbwell.plates.numbers import PLUS_MINUS, counted, number, sd_decimals
from plumbwell.plates.stage_line import StageState
from plumbwell.study.finding import Finding
from plumbwell.study.results import Results
from plumbwell.survey.column import Array
from plumbwell.survey.survey import Survey

READINGS, DRIFT, REDUCTION, DENSITY, HANDOVER = "readings", "drift", "reduction", "density", "handover"
STAGES = (READINGS, DRIFT, REDUCTION, DENSITY, HANDOVER)
NAMES = {
    READINGS: "Readings", DRIFT: "Drift", REDUCTION: "Reduction", DENSITY: "Density", HANDOVER: "Handover",
}
NUMBERS = {READINGS: 2, DRIFT: 3, REDUCTION: 4, DENSITY: 5, HANDOVER: 7}
"""Ctrl and this number goes to a stage; 1 and 6 are kept for planning and masses."""

PHRASES = {
    READINGS: "the field log", DRIFT: "clock out", REDUCTION: "known masses out", DENSITY: "gravity to rock",
    HANDOVER: "what goes out",
}
ENOUGH_FREEDOM = 5

DRIFT_CODES = (
    "visit_disagrees", "reading_disagrees", "unchecked_readings", "drift_held", "drift_order_chosen",
    "drift_walk_untested", "equal_times", "few_degrees_of_freedom", "network_parts", "no_repeat", "noise_untold",
    "rank_lost", "relative_gravity", "single_station", "single_visit", "tare_outside", "tie_far_from_normal",
    "tie_unknown_station", "tie_unvisited", "ties_disagree", "datum_station_unknown", "datum_station_unused",
)  # fmt: skip
REDUCTION_CODES = (
    "above_ground", "close_stations", "depth_error_assumed", "gravity_constant", "gravity_falls", "label_twice",
    "measured_gradient", "path_assumed", "path_extrapolated", "place_far", "not_applied", "reference_beyond_log",
    "reference_gaps", "reference_samples_left_out",
)  # fmt: skip
DENSITY_CODES = (
    "crosses_ground", "density_as_of_feet", "density_far_from_expected", "density_outside", "far_apart",
    "interval_thick", "layers_untold", "log_disagrees", "log_uncovered", "no_density",
)  # fmt: skip
STAGE_OF_CODE = {
    code: stage
    for stage, codes in ((DRIFT, DRIFT_CODES), (REDUCTION, REDUCTION_CODES), (DENSITY, DENSITY_CODES))
    for code in codes
}


def stage_of(finding: Finding) -> str:
    """The stage where a finding is judged; what the files and corrections say belongs to Readings."""
    return STAGE_OF_CODE.get(finding.code, READINGS)


def _state(findings: Iterable[Finding], *, rests: bool) -> str:
    severities = {one.severity for one in findings}
    if "error" in severities:
        return "error"
    return "look" if "look" in severities else "resting" if rests else "in_order"


def nothing_open() -> list[StageState]:
    """The stages when no survey is open."""
    return [
        StageState(key=key, number=NUMBERS[key], name=NAMES[key], figure=PHRASES[key], state="not_started")
        for key in STAGES
    ]


def stage_states(
    survey: Survey, results: Results | None, *, current: str, working: bool, written: str
) -> list[StageState]:
    """The stages of an open survey.

    Parameters
    ----------
    survey : Survey
    results : Results or None
        None: nothing is reduced yet.
    current : str
        The stage in front.
    working : bool
        A result is on its way.
    written : str
        When the outputs were last written, "" for not yet.
    """
    figures = {key: "waiting" for key in STAGES}
    states = dict.fromkeys(STAGES, "waiting")
    hints = dict.fromkeys(STAGES, "")
    figures[READINGS], states[READINGS] = counted(len(survey.readings), "reading"), "in_order"
    if results is not None:
        of_stage: dict[str, list[Finding]] = {key: [] for key in STAGES}
        for finding in results.findings:
            of_stage[stage_of(finding)].append(finding)
        open_ones = [one for one in results.findings if one.severity != "note"]
        figures.update(_figures(results))
        freedom = results.network.adjustment.reseating.freedom
        rests = freedom < ENOUGH_FREEDOM
        for key in STAGES:
            states[key] = _state(of_stage[key], rests=rests and key in (DRIFT, REDUCTION, DENSITY))
            graver = [one for one in of_stage[key] if one.severity != "note"]
            if graver:
                figures[key] = f"{figures[key]}, {counted(len(graver), 'finding')}"
            hints[key] = "\n".join(one.text for one in graver)
            if states[key] == "resting":
                hints[key] = f"Rests on {counted(freedom, 'degree')} of freedom: the noise is hardly known."
        figures[HANDOVER] = written or (
            counted(len(open_ones), "open finding") if open_ones else "ready to write"
        )
        states[HANDOVER] = "in_order" if written else "look" if open_ones else "not_started"
        if states[HANDOVER] == "look" and any(one.severity == "error" for one in open_ones):
            states[HANDOVER] = "error"
    if working:
        later = STAGES[1:]
        for place, key in enumerate(later):
            states[key], figures[key] = ("computing", "computing") if place == 0 else ("waiting", "waiting")
    return [
        StageState(
            key=key, number=NUMBERS[key], name=NAMES[key], figure=figures[key], state=states[key],
            current=key == current, hint=hints[key],
        )
        for key in STAGES
    ]


def _figures(results: Results) -> dict[str, str]:
    """The figure of merit of each stage."""
    fit = results.network.adjustment
    freedom = fit.reseating.freedom
    readings, used = len(results.survey.readings), len(results.network.visits.rows)
    told = counted(readings, "reading")
    if readings > used:
        told = f"{told}, {number(float(readings - used), 0)} out"
    tares = len(fit.basis.tares)
    drift = "nothing checks it"
    if freedom:
        drift = f"χ² {number(fit.solution.sum_of_squares() / freedom, 2)}, {freedom} dof"
    if tares:
        drift = f"{drift}, {counted(tares, 'tare')}"
    return {
        READINGS: told,
        DRIFT: drift,
        REDUCTION: _typical(results.stations.gravity_sd.values * 1e8, " µGal") or "no datum",
        DENSITY: _typical(results.intervals.density_sd.values / 1000.0, "") or "no interval",
    }


def _typical(sds: Array, unit: str) -> str:
    """The median of the sds that are known, as a figure of merit; empty without any."""
    known = sds[np.isfinite(sds) & (sds > 0.0)]
    if not known.size:
        return ""
    median = float(np.median(known))
    return f"{PLUS_MINUS} {number(median, sd_decimals(median))}{unit}"
