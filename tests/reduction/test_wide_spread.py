"""Covariances of wide networks pair by pair, against whole matrices; invented surveys of many runs solved in bands."""

from dataclasses import replace

import numpy as np
import pytest

from made_surveys import MICROGAL, made_case
from many_runs import METER, in_bands, many_runs
from plumbwell.density.interval_errors import through
from plumbwell.reduction import wide_spread
from plumbwell.reduction.spread import Spread, low_rank
from plumbwell.reduction.wide_spread import Sums, WideSpread, single
from plumbwell.study.reduce import reduce


@pytest.fixture(params=["chain", "base", "shuffled"], scope="module")
def wide(request):
    """What the border adds to gravity of a survey of many runs, and the same as a whole matrix in uGal2."""
    one = many_runs(request.param)
    with pytest.MonkeyPatch.context() as patch:
        in_bands(patch)
        results = reduce(
            made_case(one.rows, instruments=(METER,), noise="as_given", drift_order=1, drift_walk="off")
        )
    solution = results.network.adjustment.solution
    design = solution.design
    assert design.layout.count > 2
    spread = WideSpread(
        design=design, border=solution.border, factor=solution.factor, anchors=np.zeros(0, dtype=np.intp),
        shares=np.zeros((design.n_stations, 0)), answers=np.zeros((design.size, 0)),
    )  # fmt: skip
    answer = solution.at_stations(np.eye(design.size))
    return spread, answer @ solution.factor.whole() @ answer.T


def assert_close(got, wanted):
    """Agreement to 1e-8 uGal2, some uGal2 being usual."""
    np.testing.assert_allclose(np.asarray(got) / MICROGAL**2, np.asarray(wanted) / MICROGAL**2, rtol=0, atol=1e-8)


def every_pair(n):
    """All ordered pairs of so many."""
    first, second = np.indices((n, n))
    return first.ravel(), second.ravel()


def test_pairs_near_and_far_and_the_matrix(wide):
    one, whole = wide
    first, second = every_pair(len(whole))
    assert_close(one.between(single(first), single(second)).reshape(whole.shape), whole)
    assert_close(one.matrix(single(np.arange(len(whole)))), whole)
    # Off the pattern: stations of the first and the last run have elements of the inverse that stand nowhere.
    design = one.design
    touched = [design.touched_unknown[design.touched_station == at] for at in range(len(whole))]
    places = [design.layout.place(a[:, None], b[None, :]).min() for a in touched[1:3] for b in touched[-3:]]
    assert min(places) < 0 and np.abs(whole).min() > 0.0


def test_it_does_not_matter_how_many_pairs_are_formed_at_a_time(wide, monkeypatch):
    one, whole = wide
    first, second = every_pair(len(whole))
    monkeypatch.setattr(wide_spread, "AT_ONCE", 1)
    some = np.arange(0, len(first), 7)
    assert_close(one.between(single(first[some]), single(second[some])), whole[first[some], second[some]])


def sums_of(n, count, seed):
    """Quantities of two stations each, and their matrix; some take nothing of one of the two."""
    chance = np.random.default_rng(seed)
    first, second = chance.integers(n, size=count), chance.integers(n, size=count)
    by_first, by_second = chance.standard_normal(count), chance.standard_normal(count)
    by_first[3], by_second[5] = 0.0, 0.0
    by = np.zeros((count, n))
    np.add.at(by, (np.arange(count), first), by_first)
    np.add.at(by, (np.arange(count), second), by_second)
    return Sums(first=first, second=second, by_first=by_first, by_second=by_second), by


def test_sums_of_two_stations(wide):
    one, whole = wide
    sums, by = sums_of(len(whole), 30, 1)
    others, by_others = sums_of(len(whole), 30, 2)
    wanted = by @ whole @ by_others.T
    assert_close(one.between(sums, others), np.diag(wanted))
    assert_close(one.matrix(sums), by @ whole @ by.T)
    some = np.array([2, 2, 9])
    assert_close(one.between(sums[some], others[some]), np.diag(wanted)[some])
    assert len(sums) == 30 and len(sums[some]) == 3


def test_anchors_are_taken_from_every_station(wide):
    one, whole = wide
    n, chance = len(whole), np.random.default_rng(3)
    turn, spread = np.eye(n), one
    for anchors in (np.array([2, n - 1]), np.array([7])):
        shares = chance.uniform(-0.5, 1.5, (n, len(anchors)))
        spread = spread.anchored(anchors, shares)
        picked = np.zeros((len(anchors), n))
        picked[np.arange(len(anchors)), anchors] = 1.0
        turn = turn - shares @ picked
    wanted = turn @ whole @ turn.T
    first, second = every_pair(n)
    assert_close(spread.between(single(first), single(second)).reshape(n, n), wanted)
    assert_close(spread.matrix(single(np.arange(n))), wanted)
    sums, by = sums_of(n, 25, 4)
    assert_close(spread.matrix(sums), by @ wanted @ by.T)


@pytest.fixture
def gravity(wide):
    """A whole spread: own errors of stations, a common column, and what the border adds; and its matrix."""
    one, whole = wide
    n, chance = len(whole), np.random.default_rng(5)
    own = chance.uniform(1.0, 9.0, n) * MICROGAL**2
    columns, signs = chance.standard_normal((n, 2)) * MICROGAL, np.array([1.0, -1.0])
    spread = Spread(diagonal=own, columns=columns, signs=signs, wide=(one,))
    return spread, np.diag(own) + (columns * signs) @ columns.T + whole


@pytest.mark.parametrize("datum", ["one", "two", "some"])
def test_gravity_referred_to_its_datum_has_exact_zeros_there(gravity, datum):
    spread, whole = gravity
    n = len(whole)
    at = {"one": np.zeros(n, dtype=int), "two": np.where(np.arange(n) < 9, 3, 12),
          "some": np.where(np.arange(n) % 3 == 0, 6, -1)}[datum]  # fmt: skip
    turn = np.eye(n)
    taken = np.flatnonzero(at >= 0)
    turn[taken, at[taken]] -= 1.0
    referred, wanted = spread.referred(at), turn @ whole @ turn.T
    assert_close(referred.matrix(), wanted)
    assert_close(referred.variance(), np.maximum(np.diag(wanted), 0.0))
    first, second = every_pair(n)
    assert_close(referred.between(first, second).reshape(n, n), wanted)
    for own in np.unique(at[taken]).tolist():
        if at[own] != own:
            continue
        assert referred.variance()[own] == 0.0 and not referred.matrix()[own].any()
        assert not referred.between(np.full(n, own), np.arange(n)).any()
        assert not referred.between(np.arange(n), np.full(n, own)).any()


def test_sums_of_spreads(gravity, wide):
    spread, whole = gravity
    more = low_rank(np.full((len(whole), 1), MICROGAL))
    assert_close((spread + more).matrix(), whole + MICROGAL**2)
    assert_close((spread + spread).variance(), 2.0 * np.diag(whole))


def test_covariances_along_a_chain(gravity):
    spread, whole = gravity
    n = len(whole)
    chance = np.random.default_rng(6)
    pairs = Sums(
        first=np.arange(n - 1), second=np.arange(1, n), by_first=chance.uniform(-2.0, -1.0, n - 1),
        by_second=chance.uniform(1.0, 2.0, n - 1),
    )  # fmt: skip
    by = np.zeros((n - 1, n))
    by[np.arange(n - 1), np.arange(n - 1)], by[np.arange(n - 1), np.arange(1, n)] = pairs.by_first, pairs.by_second
    follower = np.append(np.arange(1, n - 1), -1)
    datum = np.zeros(n, dtype=int)
    turn = np.eye(n)
    turn[:, 0] -= 1.0
    chain, wanted = through(spread, pairs, follower), by @ whole @ by.T
    referred, from_datum = through(spread.referred(datum), pairs, follower), by @ turn @ whole @ turn.T @ by.T
    for one, want in ((chain, wanted), (referred, from_datum), (chain + referred, wanted + from_datum)):
        assert len(one) == n - 1
        assert_close(one.matrix(), want)
        assert_close(one.variance(), np.diag(want))
        assert_close(one.with_follower(), np.append(np.diag(want, 1), 0.0))
        some = np.array([0, 4, 4, n - 2])
        assert_close(one.matrix(some), want[np.ix_(some, some)])
        assert_close(one.between(some, some[::-1]), want[some, some[::-1]])
    # Of two stations that both answer with one weight the datum falls out, whatever it is.
    even = replace(pairs, by_first=-np.ones(n - 1), by_second=np.ones(n - 1))
    assert_close(through(spread.referred(datum), even, follower).matrix(), through(spread, even, follower).matrix())
