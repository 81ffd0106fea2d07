"""The stages in a line: the one figure of merit of each, and whether it is in order.

A stage is shown in order only when nothing in it wants a look and its result rests on five degrees of freedom or
more. Each kind of finding belongs to one stage: where it can be judged.
"""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np

from plumbwell.plates.numbers import PLUS_MINUS, counted, number, sd_decimals
from plumbwell.plates.stage_line import StageState
from plumbwell.reduction.chance import student_limit
from plumbwell.study.finding import Finding
from plumbwell.study.results import Results
from plumbwell.study.visit_table import VisitTable, visit_table
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

READINGS_CODES = (
    "applied_by_instrument", "calibration_unused", "equal_times", "label_unprintable", "labels_alike",
    "loading_unused", "no_last_line_end", "no_tide", "permanent_tide", "pressure_not_air", "pressure_partly_given",
    "reading_disagrees", "rows_twice", "run_two_instruments", "run_without_readings", "table_not_named",
    "tide_disagrees", "tide_hour", "tide_of_instrument", "tide_partly_given", "tide_table_unused",
    "tilt_partly_given", "time_next_day", "time_offset_changes", "time_to_minutes", "times_run_back",
    "trailing_comma", "typographic_minus", "unknown_column", "unknown_key", "unused_row_unreadable",
    "visit_settling", "visits_creep_alike", "weights_far_apart",
)  # fmt: skip
"""What the files hold, the corrections, and single readings: only here can one of them be left out."""

DRIFT_CODES = (
    "visit_disagrees", "unchecked_readings", "drift_held", "drift_order_chosen", "drift_walk_untested",
    "few_degrees_of_freedom", "network_parts", "no_repeat", "noise_untold", "rank_lost", "recipe_not_applied",
    "relative_gravity", "single_visit", "tare_outside", "tie_far_from_normal", "tie_unknown_station",
    "tie_unvisited", "ties_disagree", "datum_station_unknown", "datum_station_unused", "drift_large",
    "drift_not_as_stated", "no_majority", "noise_at_floor", "noise_of_few", "one_station_repeated", "run_hangs_by_one",
    "bend_untold", "tare_confounded", "tare_proposed", "tare_applied", "drift_walk", "drift_walk_left_out",
    "outliers_left_out", "scale_estimated", "scale_untold",
)  # fmt: skip
"""The network: what ties visits together, and the datum they hang on."""

REDUCTION_CODES = (
    "above_ground", "azimuth_wrapped", "close_stations", "depth_error_assumed", "gravity_constant", "gravity_falls",
    "label_twice", "measured_gradient", "north_assumed", "north_correction_unused", "not_applied", "path_assumed",
    "path_climbs", "path_extrapolated", "path_one_point", "path_starts_below", "place_far", "position_differs",
    "reference_beyond_log", "reference_gaps", "reference_samples_left_out",
)  # fmt: skip
"""Where the stations lie, and what is taken out of their gravity."""

DENSITY_CODES = (
    "crosses_ground", "density_as_of_feet", "density_far_from_expected", "density_outside", "density_unsure",
    "far_apart", "interval_thick", "las_commas", "las_comment_in_data", "las_curve_twice", "las_end_mark", "las_null",
    "las_range", "las_section_unknown", "las_step", "las_unreadable", "las_version", "las_wrap", "layers_untold",
    "log_depth_twice", "log_disagrees", "log_several_densities", "log_turned", "log_uncovered", "log_unordered",
    "markers_ordered", "no_density", "single_station",
)  # fmt: skip
"""Intervals, layers, and the logs and markers that they are laid beside."""

HANDOVER_CODES = ("figure_not_drawn",)

STAGE_OF_CODE = {
    code: stage
    for stage, codes in (
        (READINGS, READINGS_CODES), (DRIFT, DRIFT_CODES), (REDUCTION, REDUCTION_CODES), (DENSITY, DENSITY_CODES),
        (HANDOVER, HANDOVER_CODES),
    )
    for code in codes
}  # fmt: skip

STATED_ONLY = ("drift_not_as_stated", "no_repeat", "noise_at_floor", "noise_untold")
"""Findings that say that a number rests on what is stated and on no reading."""

LAYER_KEYS = ("recipe, layers", "recipe, layer_boundaries")


def stage_of(finding: Finding) -> str:
    """The stage where a finding is judged."""
    if finding.code == "recipe_not_applied" and finding.place in LAYER_KEYS:
        return DENSITY
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
    survey: Survey, results: Results | None, *, visits: VisitTable | None = None, current: str, working: bool,
    written: str,
) -> list[StageState]:  # fmt: skip
    """The stages of an open survey.

    Parameters
    ----------
    survey : Survey
    results : Results or None
        None: nothing is reduced yet.
    visits : VisitTable or None
        Of these results; None: worked out.
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
        rests = _rests(results)
        for key in STAGES[:-1]:
            states[key] = _state(of_stage[key], rests=bool(rests) and key != READINGS)
            graver = [one for one in of_stage[key] if one.severity != "note"]
            if graver:
                figures[key] = f"{figures[key]}, {counted(len(graver), 'finding')}"
            hints[key] = "\n".join(one.text for one in graver)
            if states[key] == "resting":
                hints[key] = rests
        hints[DRIFT] = "\n".join(filter(None, (hints[DRIFT], _fit_words(results, visits))))
        figures[HANDOVER] = written or (
            counted(len(open_ones), "open finding") if open_ones else "ready to write"
        )
        states[HANDOVER] = "not_started"
        if written:
            states[HANDOVER] = _state(of_stage[HANDOVER], rests=bool(rests))
            hints[HANDOVER] = rests
        elif open_ones:
            states[HANDOVER] = _state(open_ones, rests=False)
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


def _rests(results: Results) -> str:
    """Why the numbers rest on little, in a sentence; empty where they do not."""
    freedom = results.network.adjustment.reseating.freedom
    if freedom < ENOUGH_FREEDOM:
        student = results.intervals.dof
        return (
            f"Rests on {counted(freedom, 'degree')} of freedom: the noise is hardly known, and 95 % lie within "
            f"{number(student_limit(0.05, freedom=student), 2)} sd, not within two (Student's t, {student} dof)."
        )
    if any(one.code in STATED_ONLY for one in results.findings):
        return "Rests in part on what is stated, not on readings: see the findings of Drift."
    return ""


def _fit_words(results: Results, visits: VisitTable | None) -> str:
    """What the chi-square of the Drift stage means, and the largest residual of a visit."""
    fit = results.network.adjustment
    if not fit.reseating.freedom:
        return ""
    told = "χ² is that of the visits, over its degrees of freedom."
    if results.recipe.noise == "estimate":
        told = f"{told} The noise is estimated from the same visits, so that it is near 1 by construction."
    table = visit_table(results) if visits is None else visits
    known = np.flatnonzero(np.isfinite(table.residual_sd))
    if not known.size:
        return told
    ratio = table.residual[known] / table.residual_sd[known]
    worst = int(np.argmax(np.abs(ratio)))
    largest = number(float(table.residual[known[worst]]) * 1e8, 1, signed=True)
    return (
        f"{told} The visit farthest off is {known[worst] + 1}: {largest} µGal, "
        f"{number(abs(float(ratio[worst])), 1)} sd."
    )


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
        drift = f"χ² {number(fit.misfit / freedom, 2)}, {freedom} dof"
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
