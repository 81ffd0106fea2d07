"""Readings and visits in error, found in invented surveys: which rows are named, by how much, and what is not."""

from dataclasses import replace

import numpy as np
import pytest
from scipy.stats import binom

from made_surveys import HOUR, MICROGAL, MILLIGAL, STILL, loop, made_case
from plumbwell.study.reduce import reduce
from plumbwell.survey.instrument import Instrument
from simulated_surveys import QUIET, Scheme, loops, simulated

METER = Instrument(
    name="A", reading_floor=2 * MICROGAL, reseating_sd=3 * MICROGAL, drift_rate_sd=0.05 * MILLIGAL / HOUR
)
LABELS = "ABCDEFGH"
MAKE = {
    "depth": {name: 40.0 * n for n, name in enumerate(LABELS)},
    "gravity": {name: 3.6 * MILLIGAL * n for n, name in enumerate(LABELS)},
    "reading_noise": 2 * MICROGAL,
    "reseating": 2 * MICROGAL,
}
GAL = 1e-2 / MICROGAL
ONCE = "ABCDEFGABCDEFGHABCDEFG"
"""Visit 14 is the only one of station H."""


def rows_of(changes, *, stops=LABELS * 4, count=1, seed=2):
    """Rows of one run, changed by so many uGal: row -> change."""
    rows = loop(np.random.default_rng(seed), stops, counts=(count,), **MAKE)
    return [replace(row, reading=row.reading + changes.get(n, 0.0) * MICROGAL) for n, row in enumerate(rows)]


def judged(rows, **changed):
    """What was found; the orders of drift are lines unless asked otherwise."""
    recipe = replace(STILL, **{"drift_order": 1, "drift_walk": "off", **changed})
    return reduce(made_case(rows, instruments=(METER,), recipe=recipe)).network.judgement


def by_the_rest(rows, row, *, noise):
    """Error of one reading as the survey without it predicts it."""
    rest = [replace(one, use=n != row) for n, one in enumerate(rows)]
    recipe = replace(STILL, drift_order=1, drift_walk="off", noise=noise)
    return reduce(made_case(rest, instruments=(METER,), recipe=recipe)).readings.estimates.residual.values[row]


def test_the_invented_surveys_are_clean_before_they_are_changed():
    for rows in (rows_of({}), rows_of({}, count=2), rows_of({}, count=3), rows_of({}, stops=ONCE, count=3),
                 rows_of({}, stops=ONCE, count=2)):  # fmt: skip
        found = judged(rows)
        assert found.rows.size == 0 and found.proposed == ()


@pytest.mark.parametrize("noise", ["estimate", "as_given"])
@pytest.mark.parametrize("size", [60.0, -45.0, 300.0 * GAL / 1e3, 5.0 * GAL], ids=["60", "-45", "0.3 Gal", "5 Gal"])
def test_a_bad_visit_is_named_with_its_error(size, noise):
    rows = rows_of({13: size})
    found = judged(rows, noise=noise)
    assert found.rows.tolist() == [13] and found.proposed == () and not found.alike.any()
    # What the survey without it says; readings of Gals are rounded to 1e-16 of themselves.
    wanted = by_the_rest(rows, 13, noise=noise)
    assert found.error[0] == pytest.approx(wanted, abs=2e-5 * MICROGAL + 1e-13 * abs(size) * MICROGAL)
    assert found.error[0] == pytest.approx(size * MICROGAL, abs=15 * MICROGAL)
    own = found.error[0] / found.ratio[0]
    # One visit of 2.8 uGal by truth, 3.6 as stated, against three others of its station and all else.
    assert 2.0 * MICROGAL < own < (6.0 if noise == "estimate" else 4.5) * MICROGAL


def test_two_bad_visits_in_one_run():
    found = judged(rows_of({5: 70.0, 19: -55.0}))
    assert found.rows.tolist() == [5, 19]
    np.testing.assert_allclose(found.error / MICROGAL, [70.0, -55.0], atol=12.0)


@pytest.mark.parametrize("size", [40.0, 5.0 * GAL], ids=["40", "5 Gal"])
def test_one_of_three_readings_of_a_visit(size):
    rows = rows_of({13 * 3 + 1: size}, count=3)
    found = judged(rows)
    assert found.rows.tolist() == [40] and not found.alike.any()
    others = 0.5 * (rows[39].reading + rows[41].reading)
    # Noise within visits of 2 uGal is a little wider than how far its two mates are off it, drift of a minute apart.
    assert found.error[0] == pytest.approx(rows[40].reading - others, abs=2.0 * MICROGAL)
    assert found.ratio[0] > 8.0


def test_two_of_three_readings_that_differ():
    found = judged(rows_of({40: 40.0, 41: 90.0}, count=3))
    assert found.rows.tolist() == [40, 41] and not found.alike.any()
    np.testing.assert_allclose(found.error / MICROGAL, [40.0, 90.0], atol=8.0)


def test_two_of_three_readings_that_agree_make_a_visit_that_the_others_deny():
    rows = rows_of({40: 60.0, 41: 60.0}, count=3)
    found = judged(rows)
    assert {40, 41} <= set(found.rows.tolist()) <= {39, 40, 41}


def test_one_of_two_readings_is_told_by_the_other_visits():
    found = judged(rows_of({27: 60.0}, count=2))
    assert found.rows.tolist() == [27] and not found.alike.any()
    assert found.error[0] == pytest.approx(60 * MICROGAL, abs=12 * MICROGAL)


@pytest.mark.parametrize("size", [60.0, 1.0 * GAL], ids=["60", "1 Gal"])
def test_two_readings_of_a_station_read_once_stand_alike(size):
    found = judged(rows_of({29: size}, stops=ONCE, count=2))
    assert found.rows.tolist() == [28, 29] and found.alike.all()
    # Off their mean, each to its side by half of what is between them.
    np.testing.assert_allclose(found.error / MICROGAL, [-size / 2, size / 2], rtol=1e-6, atol=6.0)
    assert (np.abs(found.ratio) > 6.0).all()


def test_two_of_three_readings_of_a_station_read_once_stand_alike():
    found = judged(rows_of({43: 40.0, 44: 90.0}, stops=ONCE, count=3))
    assert found.rows.tolist() == [42, 43, 44] and found.alike.all()
    # Off their median.
    np.testing.assert_allclose(found.error / MICROGAL, [-40.0, 0.0, 50.0], atol=8.0)
    assert (np.abs(found.ratio) > 5.0).all()


@pytest.mark.parametrize("size", [80.0, 2.0 * GAL], ids=["80", "2 Gal"])
def test_two_visits_of_a_station_that_disagree_stand_alike(size):
    found = judged(rows_of({2: size}, stops="ABCDEFGHABCDEFGHA"))
    assert found.rows.tolist() == [2, 10] and found.alike.all() and found.proposed == ()
    np.testing.assert_allclose(found.error / MICROGAL, [size, -size], rtol=1e-6, atol=12.0)
    np.testing.assert_allclose(found.ratio[0], -found.ratio[1], rtol=1e-6)


def test_what_nothing_checks_is_not_named():
    # The only visit of H, off by a Gal: gravity there is wrong, and no reading says so.
    found = judged(rows_of({14: GAL}, stops=ONCE))
    assert found.rows.size == 0 and found.proposed == ()


def test_a_listed_bad_row_is_out_of_use_and_no_longer_named():
    rows = [replace(row, use=n != 13) for n, row in enumerate(rows_of({13: 60.0}))]
    assert judged(rows).rows.size == 0


@pytest.mark.parametrize("seed", [0, 1, 2, 5])
def test_an_eighth_of_all_visits_bad_do_not_hide_one_another(seed):
    """Eight of 64: the root mean square is swollen a hundredfold, the median tells what most visits scatter."""
    chance = np.random.default_rng(seed)
    rows = np.sort(chance.choice(64, 8, replace=False))
    size = chance.uniform(100.0, 300.0, 8) * chance.choice([-1.0, 1.0], 8)
    found = judged(rows_of(dict(zip(rows.tolist(), size.tolist(), strict=True)), stops=LABELS * 8))
    assert found.rows.tolist() == rows.tolist() and found.proposed == ()
    np.testing.assert_allclose(found.error / MICROGAL, size, atol=15.0)


def test_ties_that_contradict_one_another_accuse_no_reading():
    rows = rows_of({})
    ties = {name: (9.8 + MAKE["gravity"][name] + off * MICROGAL, 2 * MICROGAL)
            for name, off in (("A", 0.0), ("D", 300.0), ("H", -200.0))}  # fmt: skip
    recipe = replace(STILL, drift_order=1, drift_walk="off")
    network = reduce(made_case(rows, instruments=(METER,), ties=ties, recipe=recipe)).network
    assert network.outlier_rows.size == 0 and network.proposed == ()
    bad = reduce(made_case(rows_of({13: 60.0}), instruments=(METER,), ties=ties, recipe=recipe)).network
    assert bad.outlier_rows.tolist() == [13]


def test_large_residuals_do_not_hide_one_another():
    """Three bad visits of 32 swell the noise by far; each is named for all that."""
    found = judged(rows_of({3: 200.0, 12: -150.0, 22: 90.0}))
    assert found.rows.tolist() == [3, 12, 22]
    np.testing.assert_allclose(found.error / MICROGAL, [200.0, -150.0, 90.0], atol=15.0)


@pytest.mark.parametrize("gross", [{40: 5.0 * GAL}, dict.fromkeys((18, 19, 20), 5.0 * GAL)], ids=["reading", "visit"])
@pytest.mark.parametrize("small", [{62: 30.0}, {60: 30.0, 61: 30.0, 62: 30.0}], ids=["reading", "visit"])
def test_an_error_of_gals_does_not_hide_a_small_one(gross, small):
    """While what is out of trust still bends the first look at the drift, readings minutes apart seem to scatter."""
    found = judged(rows_of({**gross, **small}, count=3))
    assert found.rows.tolist() == sorted({**gross, **small})
    np.testing.assert_allclose(found.error[-1], 30 * MICROGAL, atol=10 * MICROGAL)


def test_quiet_surveys_have_nothing_named_but_by_chance():
    """A chance of 1 % a survey each for visits and jumps, and for readings where there are several a visit."""
    surveys = 100
    one_reading, jumps, three_readings = 0, 0, 0
    for seed in range(surveys):
        network = reduce(simulated(QUIET, seed, drift_walk="off", drift_order=1).case).network
        one_reading += network.outlier_rows.size > 0
        jumps += len(network.proposed) > 0
        if seed < surveys // 2:
            scheme = Scheme(stops=loops(8, 3), readings=3)
            three_readings += reduce(simulated(scheme, seed, drift_order=1).case).network.outlier_rows.size > 0
    limit = binom.ppf(0.998, surveys, 0.01)
    assert one_reading <= limit and jumps <= limit
    assert three_readings <= binom.ppf(0.998, surveys // 2, 0.02)


def test_readings_off_to_one_side_do_not_stand_against_each_other():
    """Two of four readings too large by as much: the station's other visits side with the other two."""
    found = judged(rows_of({40: 900.0, 41: 900.0}, count=4))
    assert found.rows.tolist() == [40, 41] and not found.alike.any()
    assert found.error == pytest.approx(np.full(2, 900.0 * MICROGAL), abs=12.0 * MICROGAL)
