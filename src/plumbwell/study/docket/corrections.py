"""Findings about corrections: whose tide, which air pressure, and what a reading holds already."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from plumbwell.earth.tide import permanent_part
from plumbwell.reduction.calibration import instruments_used
from plumbwell.reduction.tide_effect import TideComparison
from plumbwell.reduction.tilt_pressure import LARGEST_DEPARTURE, STEEPEST_RISE
from plumbwell.study.docket.wording import (
    HECTOPASCAL,
    HOUR,
    MICROGAL,
    amount,
    counted,
    gravity,
    line,
    lines,
    listed,
    numbers,
)
from plumbwell.study.finding import Finding
from plumbwell.study.results import Results
from plumbwell.survey.column import Array
from plumbwell.survey.errors import shown

ALLOWED = 1.0 * MICROGAL
"""Rms by which two tides of one kind may differ: ephemerides, heights, times to the minute."""

ALLOWED_SHARE = 0.05
"""Share of the tide by which they may differ more: gravimetric factors of instruments go from 1.14 to 1.2."""

CLEARLY = 0.5
"""Another hour fits clearly better when it leaves less than this of the difference."""

ROUNDINGS = (1e-6, 1e-7, 1e-8, 1e-9)
"""m/s2: 0.1 to 0.0001 mGal, the last digits in which instruments give a tide."""


def rounding_of(values: Array) -> float:
    """The last digit of a column of tides, m/s2; 0 where it is finer than 0.0001 mGal or all are 0."""
    if not np.any(values):
        return 0.0
    for step in ROUNDINGS:
        scaled = values / step
        if np.all(np.abs(scaled - np.round(scaled)) < 1e-3):
            return step
    return 0.0


def tide_disagrees(results: Results) -> Iterator[Finding]:
    """The instrument's own tide beside ours: an hour wrong, or another tide."""
    told, column = results.tide_comparison, results.survey.readings.tide_in_reading
    if told is None or column is None:
        return
    rms = told.rms[told.shifts.index(0.0)]
    if rms <= ALLOWED:
        return
    held = column.values[results.survey.readings.use]
    held = held[np.isfinite(held)]
    size = float(np.sqrt(np.mean(held**2)))
    allowed = ALLOWED + ALLOWED_SHARE * size
    if rms <= allowed:
        return
    allowed += rounding_of(held) / np.sqrt(12.0)
    if rms <= allowed:
        return
    best = told.rms[told.shifts.index(told.best_shift)]
    hour_wrong = told.best_shift != 0.0 and best < CLEARLY * rms and best <= allowed
    yield _wrong_hour(results, told, rms, best) if hour_wrong else _other_tide(results, told, rms, size)


def _wrong_hour(results: Results, told: TideComparison, rms: float, best: float) -> Finding:
    late = told.best_shift < 0.0
    hours = abs(told.best_shift) / HOUR
    span = "one hour" if hours == 1.0 else f"{hours:g} hours"
    words = f"{span} {'late' if late else 'early'}"
    ours = "its tide is replaced by ours"
    if results.recipe.tide == "none":
        ours = 'its tide is wrong in the readings: write tide = "ephemeris"'
    return Finding(
        code="tide_hour",
        severity="look",
        place=f"{results.survey.readings.raw.file}, tide_in_reading",
        text=f"The times look {words}: the instrument's own tide and ours differ by {gravity(rms)} (rms of "
        f"{counted(told.rows, 'reading')}), and by {gravity(best)} when ours is taken "
        f"{span} {'earlier' if late else 'later'}.",
        mend=f"Compare the times with the field notes. If they are {words}, correct time_zone or write "
        f"clock_ahead = {-told.best_shift:.0f} (s, added to what stands there) for the instrument; if only "
        f"the instrument's tide was set to the wrong hour, {ours}.",
    )


def _other_tide(results: Results, told: TideComparison, rms: float, size: float) -> Finding:
    middle = told.shifts.index(0.0)
    steady = abs(results.recipe.tide_factor * float(permanent_part(results.survey.site.latitude)))
    turned = ""
    if 1.7 * size < rms < 2.3 * size:
        turned = ", about twice the tide itself: its sign may be turned"
    return Finding(
        code="tide_disagrees",
        severity="look",
        place=f"{results.survey.readings.raw.file}, tide_in_reading",
        text=f"The instrument's own tide and ours differ by {gravity(rms)} (rms of "
        f"{counted(told.rows, 'reading')}; largest {gravity(told.largest[middle])}){turned}. No other hour "
        "within 2 h explains it.",
        mend="See that the column is the correction as it was added, and that position, date and time zone "
        f"of site and instrument are right. A steady {gravity(steady)} would be the permanent tide, which "
        "some instruments leave in.",
    )


def _applying(results: Results, what: str) -> Array:
    """1 for each instrument of the readings that has applied a correction itself, else 0."""
    used = instruments_used(results.survey.readings, results.survey.instruments)
    return np.array([1.0 if what in one.applied else 0.0 for one in used])


def instruments_tide(results: Results) -> Iterator[Finding]:
    """Readings that hold a tide which their instrument does not tell."""
    readings, applied = results.survey.readings, _applying(results, "tide")
    if not applied.any():
        return
    mine = readings.use & (applied[readings.instrument.code] > 0.0)
    untold = mine if readings.tide_in_reading is None else mine & np.isnan(readings.tide_in_reading.values)
    number = int(np.count_nonzero(untold))
    if not number:
        return
    partly = number < np.count_nonzero(mine)
    names = listed([shown(readings.instrument.names[one]) for one in np.flatnonzero(applied).tolist()])
    text = (
        f"{counted(number, 'reading holds', 'readings hold')} the tide correction of the "
        f"instrument ({names}) itself, which is not given: ours is not added there"
    )
    yield Finding(
        code="tide_partly_given" if partly else "tide_of_instrument",
        severity="look" if partly else "note",
        place=f"instrument {names}",
        text=text + (", while the other readings get ours." if partly else "."),
        mend="Give the instrument's correction as tide_in_reading [mGal], so that it can be compared and replaced.",
        rows=numbers(np.flatnonzero(untold)) if partly else (),
    )


def no_tide(results: Results) -> Iterator[Finding]:
    """The recipe takes no tide out."""
    if results.recipe.tide != "none":
        return
    readings = results.survey.readings
    bare = readings.use & (_applying(results, "tide")[readings.instrument.code] == 0.0)
    if readings.tide_in_reading is not None:
        bare = bare & np.isnan(readings.tide_in_reading.values)
    number = int(np.count_nonzero(bare))
    if number:
        yield Finding(
            code="no_tide",
            severity="look",
            place="recipe, tide",
            text=f'tide = "none", and {counted(number, "reading holds", "readings hold")} no correction of '
            "the instrument: the tide, up to 300 µGal, stays in gravity and drift.",
            mend='Write tide = "ephemeris"; or name "tide" in applied, if the instrument has taken it out.',
        )


def permanent_tide(results: Results) -> Iterator[Finding]:
    """The part of the tide that never changes and is taken out with the rest."""
    if results.recipe.tide in ("ephemeris", "longman") and np.any(results.readings.tide.values):
        size = results.recipe.tide_factor * float(permanent_part(results.survey.site.latitude))
        yield Finding(
            code="permanent_tide",
            severity="note",
            place="recipe, tide",
            text="The tide correction takes the permanent tide out with the rest: "
            f"{gravity(size, signed=True)} on every reading that gets it. It changes no density.",
            mend="Nothing; give it back when gravity is compared with values that keep the permanent tide.",
        )


def loading_unused(results: Results) -> Iterator[Finding]:
    """A loading table that is named and not added, since no reading gets a tide of ours."""
    if results.survey.loading is None:
        return
    if results.recipe.tide != "none" and np.any(results.readings.tide.values):
        return
    why = 'tide = "none"' if results.recipe.tide == "none" else "every reading holds its instrument's own tide"
    yield Finding(
        code="loading_unused",
        severity="look",
        place="survey.toml, [data] ocean_loading",
        text=f"The loading table is not added to any reading, since {why}: it goes with a tide of ours.",
        mend="Choose a tide in the recipe, or bring in the tide_in_reading column; else take the table out of [data].",
    )


def pressure_refused(results: Results) -> Iterator[Finding]:
    """Pressures that cannot be the free air's and were not applied."""
    for fact in results.pressure.facts:
        if fact.reason not in ("far", "rises"):
            continue
        where = f"The pressures of instrument {shown(fact.instrument)} in run {shown(fact.run)}"
        if fact.reason == "far":
            text = (
                f"{where} are up to {amount(fact.largest / HECTOPASCAL, 1, signed=True)} hPa from the "
                f"standard of that height (row {line(results, fact.largest_row)}), more than "
                f"{LARGEST_DEPARTURE / HECTOPASCAL:g} hPa"
            )
        else:
            text = (
                f"{where} rise by {amount(fact.rise / HECTOPASCAL, 3)} hPa per m of depth beside the "
                f"standard, more than {STEEPEST_RISE / HECTOPASCAL:g}"
            )
        yield Finding(
            code="pressure_not_air",
            severity="error",
            place=f"run {shown(fact.run)}, instrument {shown(fact.instrument)}",
            text=f"{text}: this is not the pressure of the free air, and no effect of it was taken out.",
            mend="Give the pressure of a barometer in the open air and its barometer_elevation, or remove the column.",
            rows=(fact.largest_row,),
        )


def pressure_partly(results: Results) -> Iterator[Finding]:
    """Runs in which some readings have a pressure and some have none."""
    readings = results.survey.readings
    for fact in results.pressure.facts:
        if fact.reason:
            continue
        mine = readings.use & (readings.run.code == readings.run.names.index(fact.run))
        mine &= readings.instrument.code == readings.instrument.names.index(fact.instrument)
        if fact.rows == np.count_nonzero(mine) or readings.pressure is None:
            continue
        rows = np.flatnonzero(mine & np.isnan(readings.pressure.values))
        if rows.size == 0:
            continue
        step = abs(results.recipe.pressure_admittance * fact.largest)
        yield Finding(
            code="pressure_partly_given",
            severity="look",
            place=f"run {shown(fact.run)}; {lines(results, rows)}",
            text=f"{counted(rows.size, 'reading')} of run {shown(fact.run)} {'has' if rows.size == 1 else 'have'} "
            f"no pressure and get no correction, while those beside them get up to {gravity(step)}.",
            mend="Fill in the missing pressures, or remove them all.",
            rows=numbers(rows),
        )


def tilt_partly(results: Results) -> Iterator[Finding]:
    """Readings without a tilt among readings that have one: they count as level."""
    readings = results.survey.readings
    given = [one.values for one in (readings.tilt_x, readings.tilt_y) if one is not None]
    if not given:
        return
    missing = np.isnan(given[0]) if len(given) == 1 else np.isnan(given[0]) | np.isnan(given[1])
    if not missing.any():
        return
    free = _applying(results, "tilt")[readings.instrument.code] == 0.0
    rows = np.flatnonzero(missing & readings.use & free)
    if rows.size:
        yield Finding(
            code="tilt_partly_given",
            severity="look",
            place=lines(results, rows),
            text=f"{counted(rows.size, 'reading lacks', 'readings lack')} a tilt and "
            f"{'counts' if rows.size == 1 else 'count'} as level there, while others are corrected by up to "
            f"{gravity(float(results.readings.tilt.values.max()))}.",
            mend="Fill in the missing tilts, or take these readings out of use.",
            rows=numbers(rows),
        )


def applied_before(results: Results) -> Iterator[Finding]:
    """Drift or temperature that the instrument has taken out itself."""
    for one in instruments_used(results.survey.readings, results.survey.instruments):
        held = [what for what in ("drift", "temperature") if what in one.applied]
        if held:
            both = len(held) > 1
            yield Finding(
                code="applied_by_instrument",
                severity="note",
                place=f"instrument {shown(one.name)}",
                text=f"The readings of instrument {shown(one.name)} hold its own correction{'s' if both else ''} "
                f"for {' and '.join(held)}; what {'they leave' if both else 'it leaves'} is estimated as "
                "drift like any other.",
                mend="Nothing; drift_rate and drift_rate_sd are then those of what is left.",
            )
