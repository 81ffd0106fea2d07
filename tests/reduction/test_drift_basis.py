"""The regressors of drift at the rows of invented surveys: which rows a term touches, and by how much."""

import numpy as np
import pytest

from made_surveys import HOUR, MICROGAL, MILLIGAL, Row, made_case
from plumbwell.reduction.drift_basis import DriftUnknown, regressor
from plumbwell.study.reduce import reduce
from plumbwell.survey.instrument import Instrument, Run, Tare

METER = Instrument(name="A", drift_rate=0.02 * MILLIGAL / HOUR, drift_rate_sd=0.01 * MILLIGAL / HOUR)
TIMES = [0.0, 600.0, 1800.0, 3600.0, 9000.0]
"""Of the first run, s; the first reading, a quarter before the run, is out of use."""


def basis_of(*, tares=(), order=1, second_order=1):
    """Basis of two runs of two instruments; rows in a wild order."""
    rows = [Row(time=-900.0, reading=0.0, depth=0.0, station="X", use=False)]
    for at, name in zip(TIMES, "XYXYX", strict=True):
        rows.append(Row(time=at, reading=0.0, depth=10.0 * (name == "Y"), station=name))
    for at, name in zip((40000.0, 41000.0, 42000.0), "XYX", strict=True):
        rows.append(Row(time=at, reading=0.0, depth=10.0 * (name == "Y"), station=name, run="2", instrument="B"))
    rows = rows[::-1]
    other = Instrument(name="B", drift_rate=-0.01 * MILLIGAL / HOUR, drift_rate_sd=0.03 * MILLIGAL / HOUR)
    runs = (Run(name="1", drift_order=order), Run(name="2", drift_order=second_order))
    case = made_case(rows, instruments=(METER, other), runs=runs, tares=tares, drift_walk="off")
    return rows, reduce(case).network.adjustment.basis


def test_time_counts_from_the_first_used_reading_over_the_runs_length():
    rows, basis = basis_of()
    got = basis.time(np.arange(len(rows)))
    for row, at in zip(rows, got.tolist(), strict=True):
        assert at == pytest.approx(row.time / 9000.0 if row.run == "1" else (row.time - 40000.0) / 2000.0)
    assert got.min() == pytest.approx(-0.1), "a row before the run's first used one has a time before it"


def test_bias_and_powers_touch_their_run_alone():
    rows, basis = basis_of()
    every = np.arange(len(rows))
    code = {row.run: int(one) for row, one in zip(rows, basis.run, strict=True)}
    for run in ("1", "2"):
        mine = np.array([row.run == run for row in rows])
        bias = regressor(basis, DriftUnknown(kind="bias", run=code[run]), every)
        np.testing.assert_array_equal(bias, mine)
        for power in (1, 2, 3):
            got = regressor(basis, DriftUnknown(kind="drift", run=code[run], power=power), every)
            np.testing.assert_allclose(got, np.where(mine, basis.time(every) ** power, 0.0))


def test_a_tare_counts_from_the_first_reading_at_or_after_its_time():
    # Amid a gap; at a reading itself; at the last reading. Before all, at the first one and after the run: left out.
    at = (1000.0, 3600.0, 9000.0, -5.0, 0.0, 9000.1)
    tares = tuple(Tare(run="1", time=one) for one in at) + (Tare(run="unheard of", time=1000.0),)
    rows, basis = basis_of(tares=tares)
    assert sorted(one.time for one in basis.tares) == [1000.0, 3600.0, 9000.0]
    for number, tare in enumerate(basis.tares):
        wanted = [float(row.run == "1" and row.time >= tare.time) for row in rows]
        np.testing.assert_array_equal(basis.jumps(np.arange(len(rows)), number), wanted)
        unknown = DriftUnknown(kind="tare", run=int(basis.tare_run[number]), tare=number)
        np.testing.assert_array_equal(regressor(basis, unknown, np.arange(len(rows))), wanted)


def test_what_is_known_of_drift_is_the_rate_of_runs_held_to_it_and_tares_of_known_size():
    known = Tare(run="1", time=1000.0, size=30 * MICROGAL)
    doubtful = Tare(run="1", time=3600.0, size=50 * MICROGAL, size_sd=5 * MICROGAL)
    rows, basis = basis_of(tares=(known, doubtful, Tare(run="2", time=40500.0)), order=0)
    code = {row.run: int(one) for row, one in zip(rows, basis.run, strict=True)}
    orders = tuple(0 if run == code["1"] else 1 for run in range(2))
    got = basis.held(np.arange(len(rows)), orders)
    for row, value in zip(rows, got.tolist(), strict=True):
        wanted = 0.0
        if row.run == "1":
            wanted = 0.02 * MILLIGAL / HOUR * row.time + (30 * MICROGAL if row.time >= 1000.0 else 0.0)
        assert value == pytest.approx(wanted, abs=1e-20)
    np.testing.assert_allclose(
        basis.held(np.arange(len(rows)), (1, 1)), [30 * MICROGAL * (r.run == "1" and r.time >= 1000.0) for r in rows]
    )
    assert basis.rate[code["2"]] == -0.01 * MILLIGAL / HOUR and basis.rate_sd[code["2"]] == 0.03 * MILLIGAL / HOUR


def test_a_run_at_one_instant_has_a_length_of_one():
    rows = [Row(time=float(n), reading=n * MICROGAL, depth=0.0, station="X") for n in (0, 600)]
    rows += [Row(time=5000.0, reading=0.0, depth=10.0, station="Y", run="2")]
    rows += [Row(time=6000.0, reading=0.0, depth=10.0, station="Y", run="3", use=False)]
    basis = reduce(made_case(rows, instruments=(METER,))).network.adjustment.basis
    assert basis.length.tolist() == [600.0, 1.0, 1.0] and np.isfinite(basis.start).all()
