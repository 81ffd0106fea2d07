"""Readings brought to gravity: calibration table, scale factor, and the tide that a reading already holds.

A table is linear between its points and goes on with its end slopes; whether a counter may lie beyond
it was settled when the readings were read. Calibrated readings are relative: only their differences
mean gravity.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from plumbwell.survey.column import Array, Column, Input, Law, Setting, computed, constant_column
from plumbwell.survey.errors import SurveyError
from plumbwell.survey.instrument import Instrument
from plumbwell.survey.readings import Readings

Scaling = tuple[float, Array | None, Array | None]
"""Scale factor, counter values and gravity values of one instrument's table; None without a table."""


def instruments_used(readings: Readings, instruments: tuple[Instrument, ...]) -> tuple[Instrument, ...]:
    """The instruments in the order of `readings.instrument.names`.

    Raises
    ------
    SurveyError
        When a reading names an instrument that the survey does not describe.
    """
    named = {one.name: one for one in instruments}
    missing = [name for name in readings.instrument.names if name not in named]
    if missing:
        raise SurveyError(
            f"no [instrument.{missing[0]}] in survey.toml describes the instrument of some readings"
        )
    return tuple(named[name] for name in readings.instrument.names)


def instrument_column(readings: Readings) -> Column:
    """The number of each row's instrument in `readings.instrument.names`, as an input of laws."""
    return constant_column("instrument", "", readings.instrument.code)


def of_instrument(values: tuple[float, ...], instrument: Any) -> Any:
    """The value that belongs to each row's instrument, from one value an instrument."""
    return np.asarray(values, dtype=np.float64)[np.asarray(instrument, dtype=np.intp)]


def in_table(counter: Any, *, counters: Array, gravity: Array) -> Any:
    """Gravity at counter values, m/s2: linear between the table's points, end slopes beyond them.

    Parameters
    ----------
    counter : float or (n,), counts
    counters : (m,), counts, strictly rising, m of 2 or more
    gravity : (m,), m/s2
    """
    cell = np.clip(np.searchsorted(counters, counter, side="right") - 1, 0, len(counters) - 2)
    slope = (gravity[cell + 1] - gravity[cell]) / (counters[cell + 1] - counters[cell])
    return gravity[cell] + (counter - counters[cell]) * slope


def _calibrated(
    reading: Any, instrument: Any, calibrations: tuple[Scaling, ...], tide_in_reading: Any = np.nan
) -> Any:
    reading, instrument = np.asarray(reading, dtype=np.float64), np.asarray(instrument)
    values = np.full(reading.shape, np.nan)
    for number, (scale, counters, gravity) in enumerate(calibrations):
        rows = instrument == number
        plain = reading[rows]
        if counters is not None and gravity is not None:
            plain = in_table(plain, counters=counters, gravity=gravity)
        held = np.broadcast_to(tide_in_reading, reading.shape)[rows]
        values[rows] = scale * (plain - np.where(np.isnan(held), 0.0, held))
    return values


CALIBRATED = Law(
    "calibrated reading",
    "scale x (table(counter) or reading, less the tide correction it holds)",
    "definition",
    _calibrated,
)


def calibrated(readings: Readings, instruments: tuple[Instrument, ...], *, remove_tide: bool) -> Column:
    """Calibrated readings, m/s2, one a row of the readings.

    Parameters
    ----------
    readings : Readings
    instruments : tuple of Instrument
        Found by name.
    remove_tide : bool
        True: the tide correction given beside a reading is taken out of it.

    Raises
    ------
    SurveyError
        When counter values have no table of two or more points.
    """
    scalings: list[Scaling] = []
    for one in instruments_used(readings, instruments):
        if not readings.in_counts:
            scalings.append((one.scale, None, None))
        elif one.calibration is None or len(one.calibration.counter) < 2:
            raise SurveyError(
                f"instrument {one.name}: its readings are counts and it has no calibration table of two or"
                " more points"
            )
        else:
            scalings.append((one.scale, one.calibration.counter.values, one.calibration.gravity.values))
    inputs = [
        Input("reading", readings.reading),
        Input("instrument", instrument_column(readings)),
        Input(
            "calibrations",
            Setting(key="calibrations", value=tuple(scalings), origin="survey.toml, [instrument]"),
        ),
    ]
    if remove_tide and readings.tide_in_reading is not None:
        inputs.append(Input("tide_in_reading", readings.tide_in_reading))
    return computed("calibrated", "m/s2", CALIBRATED, *inputs)


def outside_table(readings: Readings, instruments: tuple[Instrument, ...]) -> NDArray[np.bool_]:
    """True for the rows whose counter lies beyond the calibration table of their instrument.

    Parameters
    ----------
    readings : Readings
    instruments : tuple of Instrument

    Returns
    -------
    (n,) bool array
        All False when the readings are not counter values; an instrument without a table has none outside.
    """
    outside = np.zeros(len(readings), dtype=bool)
    if readings.in_counts:
        for number, one in enumerate(instruments_used(readings, instruments)):
            if one.calibration is not None and len(one.calibration.counter):
                counters, reading = one.calibration.counter.values, readings.reading.values
                beyond = (reading < counters[0]) | (reading > counters[-1])
                outside |= beyond & (readings.instrument.code == number)
    return outside
