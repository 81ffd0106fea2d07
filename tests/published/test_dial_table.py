"""Calibration table of a land gravimeter: L. Uieda, course material, file gravimeter-scaling.csv, CC BY 4.0.

The source prints, every 100 counter units, the value in mGal to 0.01 (0.1 on some rows) and the
factor of the interval that begins there to five decimals. Summing 100 x factor gives back every
printed value to half its last digit, 0.005 mGal; the rounding of 70 factors adds at most
70 x 100 x 0.000005 = 0.035 mGal, of which the table shows none beyond the printed digit.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np

from plumbwell.files.collected import Collected
from plumbwell.files.number_cells import numbers_of
from plumbwell.files.side_tables import read_calibration
from plumbwell.files.text_table import TextTable, read_table

MILLIGAL = 1e-5


def _table(checkout: Path) -> TextTable:
    data = (checkout / "tests" / "data" / "dial_table" / "calibration.csv").read_bytes()
    collected = Collected()
    table = read_table(data, file="calibration.csv", rows_are="calibration values", collected=collected)
    assert table is not None and not collected.problems
    return table


def test_the_printed_table_is_read_whole(checkout: Path) -> None:
    collected = Collected()
    calibration = read_calibration(_table(checkout), collected)
    assert calibration is not None and not collected.problems
    assert len(calibration.counter) == 71
    assert (calibration.counter.values[0], calibration.counter.values[-1]) == (0.0, 7000.0)
    assert calibration.counter.unit == "counts" and calibration.gravity.unit == "m/s2"
    printed = {100: 100.64, 500: 503.05, 800: 804.76}
    for counter, milligal in printed.items():
        row = int(np.flatnonzero(calibration.counter.values == counter)[0])
        assert abs(calibration.gravity.values[row] / MILLIGAL - milligal) < 1e-9


def test_the_printed_factors_sum_to_the_printed_values(checkout: Path) -> None:
    table = _table(checkout)
    calibration = read_calibration(table, Collected())
    assert calibration is not None
    factors, bad, _ = numbers_of(table.raw.cells[2])
    assert not bad
    summed = np.concatenate(([0.0], np.cumsum(100.0 * factors[:-1])))
    assert np.abs(calibration.gravity.values / MILLIGAL - summed).max() <= 0.005 + 1e-9
