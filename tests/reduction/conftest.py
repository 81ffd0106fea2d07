"""Readings made by hand for the tests of the corrections."""

from collections.abc import Callable

import numpy as np
import pytest

from plumbwell.survey.column import constant_column, frozen_index, labels
from plumbwell.survey.readings import RawTable, Readings


@pytest.fixture
def made_readings() -> Callable[..., Readings]:
    """Maker of readings from lists: `reading` in m/s2 (or counts with `unit`), all else by name, SI."""

    def make(reading, *, unit="m/s2", time=None, instrument=None, run=None, use=None, **columns) -> Readings:
        number = len(reading)

        def column(key, unit, values):
            return constant_column(key, unit, np.asarray(values, dtype=float))

        units = {"tide_in_reading": "m/s2", "pressure": "Pa", "tilt_x": "rad", "tilt_y": "rad"}
        used = np.ones(number, dtype=bool) if use is None else np.asarray(use, dtype=bool)
        used.flags.writeable = False
        return Readings(
            raw=RawTable(
                file="readings.csv", headings=(), cells=(), lines=frozen_index(np.arange(2, number + 2))
            ),
            time=column("time", "s", np.arange(number) * 600.0 if time is None else time),
            run=labels(run or ["1"] * number),
            instrument=labels(instrument or ["A"] * number),
            station=labels([None] * number),
            visit=labels([None] * number),
            depth=column("depth", "m", np.zeros(number)),
            reading=column("reading", unit, reading),
            use=used,
            note=("",) * number,
            **{key: column(key, units[key], values) for key, values in columns.items()},
        )

    return make
