"""What one more term would explain, against dense algebra and against networks solved anew; invented surveys."""

from dataclasses import replace

import numpy as np
import pytest

from made_surveys import HOUR, MICROGAL, MILLIGAL, loop, made_case
from many_runs import METER as METER_OF_MANY
from many_runs import in_bands, many_runs
from plumbwell.reduction.candidates import jumps, more_drift
from plumbwell.reduction.run_terms import RunTerms
from plumbwell.study.reduce import reduce
from plumbwell.survey.instrument import Instrument, Run, Tare
from visit_algebra import visit_algebra

METER = Instrument(
    name="A", reading_floor=2 * MICROGAL, reseating_sd=4 * MICROGAL, drift_rate=0.01 * MILLIGAL / HOUR,
    drift_rate_sd=0.02 * MILLIGAL / HOUR,
)  # fmt: skip
LABELS = "ABCDEFG"
MAKE = {
    "depth": {name: 40.0 * n for n, name in enumerate(LABELS)},
    "gravity": {name: 3.6 * MILLIGAL * n for n, name in enumerate(LABELS)},
}
FIXED = {"noise": "as_given", "drift_walk": "off"}


def three_runs(seed=1):
    """Three runs that share stations; some stations are read once."""
    chance = np.random.default_rng(seed)
    rows = []
    for number, stops in enumerate(("ABCBA", "ACDEDCA", "CFGC")):
        rows += loop(
            chance, stops, run=str(number + 1), start=86400.0 * number, counts=(1, 3), bias=number * MILLIGAL,
            drift=(0.02 * MILLIGAL / HOUR, 3e-14), **MAKE,
        )  # fmt: skip
    return rows


def adjusted(rows, meter=METER, *, wide=False, **changed):
    """The adjusted network."""
    with pytest.MonkeyPatch.context() as patch:
        if wide:
            in_bands(patch)
        return reduce(made_case(rows, instruments=(meter,), **{**FIXED, **changed})).network.adjustment


class Whitened:
    """Visits and the priors on drift rates, each divided by its sd; what all unknowns leave of further columns."""

    def __init__(self, rows, fit, meter, orders):
        algebra = visit_algebra(rows, fit, orders=orders)
        root = np.sqrt(fit.solution.weight)
        names = list(orders)
        self.length = [float(np.ptp(algebra.past[algebra.run == n])) for n in range(len(names))]
        self.runs = np.round(algebra.mean @ algebra.run).astype(int)
        self.past = algebra.mean @ algebra.past
        self.algebra, self.root, self.meter = algebra, root, meter
        design, values = [algebra.design * root[:, None]], [algebra.values * root]
        at = algebra.design.shape[1] - sum(order + 1 for order in orders.values())
        self.priors = []
        for number, name in enumerate(names):
            if orders[name]:
                prior = np.zeros((1, algebra.design.shape[1]))
                prior[0, at + 1 : at + 1 + orders[name]] = 1.0 / (self.length[number] * meter.drift_rate_sd)
                design.append(prior)
                values.append(np.array([meter.drift_rate / meter.drift_rate_sd]))
                self.priors.append(number)
            at += orders[name] + 1
        whole = np.vstack(design)
        vectors, size, _ = np.linalg.svd(whole / np.linalg.norm(whole, axis=0), full_matrices=False)
        self.basis = vectors[:, size > 1e-10 * size[0]]
        self.left = self.rest(np.concatenate(values)[:, None])[:, 0]

    def rest(self, columns):
        return columns - self.basis @ (self.basis.T @ columns)

    def power(self, run, power):
        """Column of a power of the scaled time of one run, its share in the prior on the mean rate with it."""
        algebra = self.algebra
        mine = (algebra.run == run) * (algebra.past / self.length[run]) ** power
        prior = (np.array(self.priors) == run) / (self.length[run] * self.meter.drift_rate_sd)
        return np.concatenate([algebra.mean @ mine * self.root, prior])

    def jump(self, visit):
        """Column of a jump before a visit."""
        after = (self.runs == self.runs[visit]) & (np.arange(len(self.runs)) >= visit)
        return np.concatenate([after * self.root, np.zeros(len(self.priors))])

    def explained(self, columns):
        """Fall of the sum of squares, and how much of the columns is left."""
        rest = self.rest(columns)
        answer, *_ = np.linalg.lstsq(rest, self.left, rcond=1e-9)
        return float(self.left @ self.left - np.sum((self.left - rest @ answer) ** 2)), rest


SURVEYS = {
    "three runs": (lambda: three_runs(), METER, False),
    "chain of runs, one block": (lambda: many_runs("chain", runs=9).rows, METER_OF_MANY, False),
    "chain of runs, bands": (lambda: many_runs("chain", runs=16).rows, METER_OF_MANY, True),
    "base of many runs, bands": (lambda: many_runs("base", runs=34).rows, METER_OF_MANY, True),
    "parts, bands": (lambda: many_runs("two parts", runs=20).rows, METER_OF_MANY, True),
}


@pytest.fixture(params=SURVEYS, scope="module")
def fitted(request):
    """A network with lines of drift, and its dense algebra."""
    make, meter, wide = SURVEYS[request.param]
    rows = make()
    fit = adjusted(rows, meter, wide=wide, drift_order=1)
    assert (fit.design.layout.count > 1) == wide
    return rows, fit, Whitened(rows, fit, meter, dict.fromkeys(dict.fromkeys(row.run for row in rows), 1))


def test_every_jump_is_what_dense_algebra_finds(fitted):
    rows, fit, dense = fitted
    told, untold = 0, 0
    for run in jumps(RunTerms(fit.solution), fit.visits):
        members = np.flatnonzero(fit.visits.run == run.run)
        np.testing.assert_array_equal(run.visit, members[1:])
        for visit, size, sd, gain in zip(run.visit.tolist(), run.size, run.sd, run.gain, strict=True):
            column = dense.jump(visit)
            rest = dense.rest(column[:, None])[:, 0]
            left = rest @ rest
            if left < 1e-8 * (column @ column):
                assert gain == 0.0 and np.isnan(size) and np.isnan(sd)
                untold += 1
                continue
            assert size == pytest.approx(rest @ dense.left / left, abs=1e-5 * MICROGAL)
            assert sd == pytest.approx(1.0 / np.sqrt(left), rel=1e-6)
            assert gain == pytest.approx((rest @ dense.left) ** 2 / left, rel=1e-6, abs=1e-7)
            told += 1
    assert told > 8 and told + untold == len(fit.visits) - len(fit.visits.run_order)


def test_some_jumps_are_not_told():
    rows = three_runs()
    # In a run whose stations nobody else reads, the last visit reads a station for the first time.
    rows += loop(np.random.default_rng(4), "ABG", run="4", start=5 * 86400.0, counts=(1,), depth=MAKE["depth"],
                 gravity=MAKE["gravity"])  # fmt: skip
    rows = [replace(row, station="Z", depth=900.0) if row.run == "4" and row.station == "G" else row for row in rows]
    fit = adjusted(rows, drift_order=1)
    (fourth,) = (one for one in jumps(RunTerms(fit.solution), fit.visits) if one.run == 3)
    assert np.isnan(fourth.size[-1]) and fourth.gain[-1] == 0.0 and fourth.gain[0] > 0.0


def test_a_jump_is_what_the_network_finds_when_it_is_listed():
    rows = three_runs(2)
    fit = adjusted(rows, drift_order=1)

    def squares(one):
        priors = one.design.priors
        off = (priors.of(one.solution.unknown[:, 0]) - priors.value) / priors.sd
        return one.solution.sum_of_squares() + float(off @ off)

    for run in jumps(RunTerms(fit.solution), fit.visits):
        for visit, size, sd, gain in zip(run.visit.tolist(), run.size, run.sd, run.gain, strict=True):
            if not gain:
                continue
            tare = Tare(run=str(run.run + 1), time=float(fit.visits.first[visit]))
            again = reduce(made_case(rows, instruments=(METER,), tares=(tare,), drift_order=1, **FIXED))
            listed = again.network.adjustment
            (unknown,) = (one for one in listed.design.unknowns if one.kind == "tare")
            assert listed.unknown(unknown) == pytest.approx((size, sd), rel=1e-6, abs=1e-5 * MICROGAL)
            assert squares(fit) - squares(listed) == pytest.approx(gain, rel=1e-6, abs=1e-7)


def test_visits_at_one_time_have_no_gap_between_them():
    rows = three_runs(3)
    visits = adjusted(rows).visits
    heads = [int(visits.rows[visits.start[v]]) for v in range(len(visits))]
    assert visits.run[0] == visits.run[1] == 0
    meant = rows[int(visits.rows[visits.start[1] - 1])].time
    rows = [replace(row, time=meant) if n == heads[1] else row for n, row in enumerate(rows)]
    fit = adjusted(rows, drift_order=1)
    first = jumps(RunTerms(fit.solution), fit.visits)[0]
    assert first.gain[0] == 0.0 and np.isnan(first.size[0]) and first.gain[1] > 0.0


def test_higher_orders_are_what_dense_algebra_finds(fitted):
    rows, fit, dense = fitted
    found = more_drift(RunTerms(fit.solution), fit.basis, fit.visits, fit.noise.weight)
    assert sorted(found) == sorted(fit.visits.run_order.tolist())
    names = list(dict.fromkeys(row.run for row in rows))
    tried = 0
    for code, (one, third) in found.items():
        run = names.index(rows[int(fit.visits.rows[fit.visits.start[fit.visits.run.tolist().index(code)]])].run)
        for gain, powers in ((one, (2,)), (third, (2, 3))):
            columns = np.column_stack([dense.power(run, power) for power in powers])
            want, rest = dense.explained(columns)
            share = np.linalg.svd(rest / np.linalg.norm(columns, axis=0), compute_uv=False)[-1] ** 2
            if share < 1e-9:
                assert gain == 0.0
            elif share > 1e-7:
                assert gain == pytest.approx(want, rel=1e-6, abs=1e-6)
                tried += 1
    assert tried > len(found)


@pytest.mark.parametrize(("orders", "nothing"), [((2, 0, 3), (False, True, True)), ((1, 2, 1), (False, False, False))])
def test_higher_orders_of_runs_that_stand_at_others(orders, nothing):
    rows = three_runs(5)
    runs = tuple(Run(name=str(n + 1), drift_order=order) for n, order in enumerate(orders))
    fit = reduce(made_case(rows, instruments=(METER,), runs=runs, **FIXED)).network.adjustment
    found = more_drift(RunTerms(fit.solution), fit.basis, fit.visits, fit.noise.weight)
    for run, none in enumerate(nothing):
        if none:
            assert found[run] == (0.0, 0.0)
    if 0 in orders:
        return
    dense = Whitened(rows, fit, METER, {str(n + 1): order for n, order in enumerate(orders)})
    want, _ = dense.explained(dense.power(1, 3)[:, None])
    assert found[1] == pytest.approx((want, want), rel=1e-6)
