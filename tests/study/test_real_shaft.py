"""The open gravity survey in the shaft Reiche Zeche, Freiberg, February 2026 (tests/data/reiche_zeche_shaft).

The source prints no densities. What is expected here is worked out in this file from its readings by the plainest
method: drift linear in time between successive readings at the base P0, means over loops and groups, then
(F - gradient)/(4 pi G) with the source's F of 0.3086 mGal/m. The program's network differs in method, not in data.
"""

import csv
import shutil
from datetime import datetime
from pathlib import Path

import numpy as np
import pytest

from plumbwell.files.folder import read_survey
from plumbwell.study.case import Case
from plumbwell.study.reduce import reduce
from plumbwell.survey.recipe import with_written

FOLDER = Path(__file__).resolve().parents[1] / "data" / "reiche_zeche_shaft"
MGAL, FOUR_PI_G = 1e-5, 4.0 * np.pi * 6.67430e-11
DEPTH = {"P3": 0.0, "P2": 66.52, "P1": 100.93, "P0": 147.51}
PAIRS = [("P3", "P2"), ("P2", "P1"), ("P1", "P0")]


@pytest.fixture(scope="module")
def survey():
    """The survey as its folder states it."""
    return read_survey(FOLDER)


@pytest.fixture(scope="module")
def alone(tmp_path_factory):
    """The survey reduced group by group: the rows of the other groups are out of use."""
    found = {}
    for group in ("1", "2", "3"):
        folder = tmp_path_factory.mktemp("groups") / group
        shutil.copytree(FOLDER, folder)
        lines = (folder / "readings.csv").read_text("utf-8").splitlines()
        lines = [
            line if line.startswith("#") else f"{line},use" if line.startswith("time,")
            else f"{line},{'yes' if line.split(',')[1] == group else 'no'}"
            for line in lines
        ]  # fmt: skip
        (folder / "readings.csv").write_text("\n".join(lines) + "\n", "utf-8")
        found[group] = reduce(Case(survey=read_survey(folder)))
    return found


@pytest.fixture(scope="module")
def results(survey):
    """The survey reduced."""
    return reduce(Case(survey=survey))


def rows():
    """The rows of readings.csv."""
    lines = [line for line in (FOLDER / "readings.csv").read_text("utf-8").splitlines() if not line.startswith("#")]
    return list(csv.DictReader(lines))


def by_hand():
    """Gravity of P1, P2 and P3 from P0, by group, mGal: drift straight between readings at P0."""
    groups: dict[str, dict[str, list[float]]] = {}
    for group in ("1", "2", "3"):
        mine = [row for row in rows() if row["run"] == group]
        time = np.array([datetime.fromisoformat(row["time"]).timestamp() for row in mine])
        value = np.array([float(row["reading [mGal]"]) for row in mine])
        base = np.array([row["station"] == "P0" for row in mine])
        drifted = value - np.interp(time, time[base], value[base])
        groups[group] = {
            name: [v for v, row in zip(drifted, mine, strict=True) if row["station"] == name] for name in DEPTH
        }
    return {name: [float(np.mean(groups[group][name])) for group in groups] for name in DEPTH}


def test_plain_method_gives_what_is_known_of_this_survey():
    gravity = {name: np.mean(values) for name, values in by_hand().items()}
    # The drift-corrected values that the source's own notebook prints for its first group, mGal.
    first = [row for row in rows() if row["run"] == "1"]
    time = np.array([datetime.fromisoformat(row["time"]).timestamp() for row in first])
    value = np.array([float(row["reading [mGal]"]) for row in first])
    base = np.array([row["station"] == "P0" for row in first])
    printed = [-4.327814, -7.705385, -15.253310, -4.344609, -7.729270, -15.272064]
    np.testing.assert_allclose((value - np.interp(time, time[base], value[base]))[~base], printed, atol=1e-6)
    density = [
        (0.3086 - (gravity[b] - gravity[a]) / (DEPTH[b] - DEPTH[a])) * MGAL / FOUR_PI_G for a, b in PAIRS
    ]
    np.testing.assert_allclose(density, [2327.2, 2505.9, 2570.1], atol=0.1)


def test_densities_agree_with_the_plain_method(results):
    hand = by_hand()
    scatter = {name: np.std(values, ddof=1) / np.sqrt(3.0) for name, values in hand.items()}
    intervals = results.intervals
    assert [intervals.label(n) for n in range(3)] == ["P3~P2", "P2~P1", "P1~P0"]
    reading = intervals.errors.parts
    for n, ((a, b), plain) in enumerate(zip(PAIRS, [2327.2, 2505.9, 2570.1], strict=True)):
        thickness = DEPTH[b] - DEPTH[a]
        # Errors of the two methods, those of depth left out: they are the same in both.
        own = reading["reading"].variance()[n] + reading["drift"].variance()[n]
        other = (scatter[a] ** 2 + scatter[b] ** 2) * (MGAL / FOUR_PI_G / thickness) ** 2
        assert abs(intervals.density_slab.values[n] - plain) < np.sqrt(own + other)
    gravity = results.stations.gravity.values / MGAL
    plain = np.array([np.mean(hand[name]) for name in ("P3", "P2", "P1", "P0")])
    np.testing.assert_allclose(gravity - gravity[-1], plain - plain[-1], atol=0.004)


def test_drift_is_that_of_the_base_readings(results):
    # Straight line through the readings at P0 with their tide: 0.157, 0.162, 0.147 mGal/h for groups 1, 2, 3.
    assert set(results.network.adjustment.orders) == {1}
    for group, rate in (("1", 0.157), ("2", 0.162), ("3", 0.147)):
        value, sd = rate_of(results, group)
        assert value == pytest.approx(rate, abs=max(0.005, 2.0 * sd))


def test_the_normal_gradient_lowers_the_slab_density(survey, results):
    normal = reduce(Case(survey=survey, recipe=with_written(survey.recipe, "free_air", "normal")))
    change = normal.intervals.density_slab.values - results.intervals.density_slab.values
    np.testing.assert_allclose(change, -1.7, atol=0.05)
    np.testing.assert_allclose(change, (normal.choice.gradient - 0.3086 * MGAL) / FOUR_PI_G, rtol=1e-6)


def shifted(hours, folder):
    """Tide of the program less that in the readings, mGal, with all times moved."""
    shutil.copytree(FOLDER, folder)
    lines = (folder / "readings.csv").read_text("utf-8").splitlines()
    head = next(n for n, line in enumerate(lines) if line.startswith("time,"))
    for n in range(head + 1, len(lines)):
        time, rest = lines[n].split(",", 1)
        zone = f"{'+' if hours <= 0 else '-'}{abs(hours):02d}:00"
        lines[n] = time.replace("Z", zone) + "," + rest
    (folder / "readings.csv").write_text("\n".join(lines) + "\n", "utf-8")
    moved = reduce(Case(survey=read_survey(folder)))
    return (moved.readings.tide.values - moved.survey.readings.tide_in_reading.values) / MGAL


def test_the_tide_in_the_readings_is_reproduced_and_a_wrong_hour_is_not(tmp_path):
    right = shifted(0, tmp_path / "right")
    assert np.abs(right).max() < 0.0015
    assert np.sqrt(np.mean(right**2)) < 0.001
    for hours in (-2, -1, 1, 2):
        assert np.abs(shifted(hours, tmp_path / f"moved{hours}")).max() > 0.01


def rate_of(results, group):
    """Drift rate of a run and its sd, mGal/h."""
    fit, code = results.network.adjustment, results.survey.readings.run.names.index(group)
    (slope,) = (one for one in fit.design.unknowns if one.kind == "drift" and one.run == code)
    return tuple(part / MGAL / (fit.basis.length[code] / 3600.0) for part in fit.unknown(slope))


@pytest.mark.parametrize(("group", "place"), [("1", 0), ("2", 1), ("3", 2)])
def test_each_group_alone_agrees_with_the_plain_method_on_its_own_readings(alone, group, place):
    results, hand = alone[group], by_hand()
    assert results.stations.visits.sum() == sum(row["run"] == group for row in rows())
    density = np.array([
        (0.3086 - (hand[b][place] - hand[a][place]) / (DEPTH[b] - DEPTH[a])) * MGAL / FOUR_PI_G for a, b in PAIRS
    ])  # fmt: skip
    parts = results.intervals.errors.parts
    own = np.sqrt(parts["reading"].variance() + parts["drift"].variance())
    # The same readings, weighed otherwise: they part by less than the error of one of the two.
    assert np.all(np.abs(results.intervals.density_slab.values - density) < own)
    # Straight line through the group's readings at the base: 0.157, 0.162, 0.147 mGal/h.
    rate, sd = rate_of(results, group)
    assert rate == pytest.approx((0.157, 0.162, 0.147)[place], abs=max(0.005, 2.0 * sd))
    # Each visit holds one reading, so nothing says whether it had settled.
    assert np.all(results.network.settling.leave_out == -1)
    assert not any(one.code == "visit_settling" for one in results.findings)


def test_the_groups_agree_one_by_one_and_together(results, alone):
    densities, sds = [], []
    for one in alone.values():
        parts = one.intervals.errors.parts
        sds.append(np.sqrt(parts["reading"].variance() + parts["drift"].variance()))
        densities.append(one.intervals.density.values)
    densities, sds = np.array(densities), np.array(sds)
    together = results.intervals.density.values
    np.testing.assert_allclose(
        together, np.average(densities, axis=0, weights=sds**-2), atol=1.5 * results.intervals.density_sd.values.max()
    )
    # Nine independent comparisons: a sum of squares near nine, three of which the mean takes.
    apart = np.sum(((densities - together) / sds) ** 2)
    assert 0.5 < apart < 17.0
    assert np.all(results.intervals.density_sd.values < sds.max(axis=0) / 3.0)
