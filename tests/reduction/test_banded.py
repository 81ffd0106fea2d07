"""Banded matrices with a corner against dense algebra: invented matrices whose pattern is the layout's own."""

import numpy as np
import pytest
from scipy.linalg import null_space

from plumbwell.reduction import banded
from plumbwell.reduction.banded import Layout, columns_of, factored, held, layout, products

SHAPES = {
    "one block": Layout(size=9, banded=9, block=9, count=1),
    "one block and a corner": Layout(size=11, banded=8, block=8, count=1),
    "two blocks": Layout(size=10, banded=10, block=5, count=2),
    "blocks, the last not full": Layout(size=23, banded=23, block=5, count=5),
    "blocks and a corner": Layout(size=26, banded=22, block=5, count=5),
    "corner of one, full blocks": Layout(size=21, banded=20, block=4, count=5),
    "a corner alone": Layout(size=3, banded=0, block=1, count=1),
}


def on_pattern(one):
    """True where an element may stand: by blocks that are the same or neighbours, and in the corner."""
    every = np.arange(one.size)
    block = np.where(every < one.banded, every // one.block, -9)
    near = np.abs(block[:, None] - block[None, :]) <= 1
    low = every >= one.banded
    return near | low[:, None] | low[None, :]


def flat_of(one, dense):
    """The flat array of a dense matrix, filled by the rule that what stands once is added once."""
    first, second = (each.ravel() for each in np.indices(dense.shape))
    kept = (dense[first, second] != 0.0) & one.once(first, second)
    place = one.place(first[kept], second[kept])
    assert place.min() >= 0
    filled = np.bincount(place, dense[first[kept], second[kept]], minlength=one.starts[3]).astype(float)
    return one.mirrored(filled)


def some(one, seed=1, flat_along=None):
    """A positive definite matrix on the pattern, units far apart; or one that is flat along some directions."""
    chance = np.random.default_rng(seed)
    rows = np.zeros((6 * one.size, one.size))
    for row in rows:
        # All that one row touches has to lie within the pattern of each other.
        start = int(chance.integers(one.count))
        at = np.isin(np.arange(one.size) // one.block, (start, start + 1)) | (np.arange(one.size) >= one.banded)
        row[at] = chance.standard_normal(np.count_nonzero(at))
        if flat_along is not None:
            row[at] -= flat_along[at] @ (np.linalg.pinv(flat_along[at]) @ row[at])
    dense = rows.T @ rows
    dense = 0.5 * (dense + dense.T)
    unit = np.ones(one.size) if flat_along is not None else 10.0 ** chance.uniform(-4.0, 4.0, one.size)
    return dense * np.outer(unit, unit)


@pytest.fixture(params=SHAPES, scope="module")
def shaped(request):
    """A layout, a dense matrix, its flat array and its factor."""
    one = SHAPES[request.param]
    dense = some(one)
    flat = flat_of(one, dense)
    return one, dense, flat, factored(one, flat)


def scaled_inverse(dense):
    """The inverse, found with the diagonal scaled to 1."""
    scale = 1.0 / np.sqrt(np.diag(dense))
    return np.linalg.inv(dense * scale[:, None] * scale) * scale[:, None] * scale


def test_each_element_has_a_place_of_its_own(shaped):
    one, dense, flat, _ = shaped
    first, second = (each.ravel() for each in np.indices(dense.shape))
    place = one.place(first, second)
    pattern = on_pattern(one)[first, second]
    assert ((place >= 0) == pattern).all() and place.max() < one.starts[3]
    np.testing.assert_array_equal(flat[place[pattern]], dense[first, second][pattern])
    # Two elements share a place only when they are one another's mirror.
    by_place = {}
    for at, pair in zip(place[pattern].tolist(), zip(first[pattern], second[pattern], strict=True), strict=True):
        by_place.setdefault(at, set()).add(frozenset(pair))
    assert all(len(pairs) == 1 for pairs in by_place.values())
    # Added by the rule, every element is there whole: the columns that come back are the matrix.
    np.testing.assert_array_equal(columns_of(one, flat, np.arange(one.size)), dense)
    np.testing.assert_array_equal(flat[one.diagonal()], np.diag(dense))


def test_solutions_and_determinant_are_those_of_the_dense_matrix(shaped):
    one, dense, _, factor = shaped
    scale = 1.0 / np.sqrt(np.diag(dense))
    unit = dense * scale[:, None] * scale
    condition = np.linalg.cond(unit)
    side = np.random.default_rng(2).standard_normal((one.size, 3))
    wanted = np.linalg.solve(unit, side * scale[:, None]) * scale[:, None]
    for got, want in ((factor.solve(side), wanted), (factor.solve(side[:, 1]), wanted[:, 1])):
        assert got.shape == want.shape
        # Relative to the size of the answer in units of the scaled matrix: rounding times the condition.
        by = scale[:, None] if got.ndim == 2 else scale
        assert np.abs((got - want) / by).max() < 1e-14 * condition * np.abs(want / by).max()
    sign, logarithm = np.linalg.slogdet(unit)
    assert sign == 1.0
    assert factor.log_determinant == pytest.approx(logarithm - 2.0 * np.log(scale).sum(), abs=1e-13 * condition)
    inverse = np.linalg.inv(unit)
    np.testing.assert_allclose(
        factor.whole() / np.outer(scale, scale), inverse, rtol=0, atol=1e-14 * condition * np.linalg.norm(inverse, 2)
    )


def test_elements_of_the_inverse_on_the_pattern(shaped):
    one, dense, _, factor = shaped
    scale = 1.0 / np.sqrt(np.diag(dense))
    unit = dense * scale[:, None] * scale
    wanted = np.linalg.inv(unit)
    first, second = np.nonzero(on_pattern(one))
    got = factor.inverse[one.place(first, second)] / (scale[first] * scale[second])
    np.testing.assert_allclose(
        got, wanted[first, second], rtol=0, atol=1e-14 * np.linalg.cond(unit) * np.abs(wanted).max()
    )


def test_products_on_and_off_the_pattern(shaped):
    one, dense, _, factor = shaped
    scale = 1.0 / np.sqrt(np.diag(dense))
    wanted = np.linalg.inv(dense * scale[:, None] * scale)
    chance = np.random.default_rng(3)
    count, rows, dense_rows = 40, [], []
    for _ in range(2):
        vectors = np.zeros((count, one.size))
        for n in range(count):
            if n % 5 == 4:
                continue  # a vector of nothing
            at = chance.choice(one.size, size=min(1 + n % 3, one.size), replace=False)
            vectors[n, at] = chance.standard_normal(at.size)
        row, unknown = np.nonzero(vectors)
        rows.append((row, unknown, vectors[row, unknown] / scale[unknown]))
        dense_rows.append(vectors)
    if one.count > 2:
        first, second = (part[1] for part in rows)
        assert (~on_pattern(one)[np.ix_(first, second)]).any(), "no pair off the pattern is tried"
    want = np.einsum("nq,qp,np->n", dense_rows[0], wanted, dense_rows[1])
    got = products(factor, *rows, count)
    np.testing.assert_allclose(got, want, rtol=0, atol=1e-13 * np.linalg.cond(wanted) * np.abs(wanted).max())
    assert (got[4::5] == 0.0).all()


def test_products_are_solved_for_in_several_helpings(monkeypatch):
    one = SHAPES["blocks and a corner"]
    factor = factored(one, flat_of(one, some(one)))
    far = (np.arange(18), np.zeros(18, dtype=int), np.ones(18)), (np.arange(18), np.arange(4, 22), np.ones(18))
    at_once = products(factor, *far, 18)
    monkeypatch.setattr(banded, "SOLVED_AT_ONCE", 4)
    np.testing.assert_allclose(products(factor, *far, 18), at_once, rtol=1e-12)


@pytest.mark.parametrize("name", ["one block", "blocks, the last not full", "blocks and a corner"])
def test_held_is_the_inverse_without_some_unknowns(name):
    one = SHAPES[name]
    dense = some(one)
    numbers = np.unique([0, 3, one.size // 2, one.size - 1])
    factor = held(one, flat_of(one, dense), numbers)
    rest = np.setdiff1d(np.arange(one.size), numbers)
    wanted = np.zeros_like(dense)
    wanted[np.ix_(rest, rest)] = scaled_inverse(dense[np.ix_(rest, rest)])
    size = np.sqrt(np.diag(wanted)) + np.where(np.isin(np.arange(one.size), numbers), 1.0, 0.0)
    off = (factor.whole() - wanted) / np.outer(size, size)
    assert np.abs(off).max() < 1e-10
    assert (factor.whole()[numbers] == 0.0).all() and (factor.whole()[:, numbers] == 0.0).all()
    first, second = np.nonzero(on_pattern(one))
    on = factor.inverse[one.place(first, second)]
    assert np.abs((on - wanted[first, second]) / (size[first] * size[second])).max() < 1e-10


@pytest.mark.parametrize("name", SHAPES)
def test_pins_restore_the_rank_of_a_semidefinite_matrix(name):
    one = SHAPES[name]
    chance = np.random.default_rng(5)
    open_ = chance.standard_normal((one.size, 2))
    semi = some(one, seed=4, flat_along=open_)
    factor = factored(one, flat_of(one, semi), pin=1e-10)
    assert len(factor.pins) == null_space(semi, rcond=1e-10).shape[1] == open_.shape[1]
    pinned = semi.copy()
    own = np.diag(semi)[factor.pins]
    pinned[factor.pins, factor.pins] += np.where(own > 0.0, own, 1.0)
    sides = chance.standard_normal((one.size, 2))
    np.testing.assert_allclose(
        factor.solve(sides), np.linalg.solve(pinned, sides), rtol=0,
        atol=1e-12 * np.linalg.cond(pinned) * np.abs(sides).max(),
    )


def test_a_matrix_that_is_not_definite_is_refused():
    for name in ("one block", "blocks and a corner"):
        one = SHAPES[name]
        dense = some(one)
        for at in (0, one.size - 1):
            spoiled = dense.copy()
            spoiled[at, at] *= -1.0
            with pytest.raises(np.linalg.LinAlgError, match="not positive definite"):
                factored(one, flat_of(one, spoiled))
        # Singular to rounding: two unknowns that are one.
        row = dense[1] / np.sqrt(dense[1, 1]) * np.sqrt(dense[0, 0])
        twin = dense.copy()
        twin[0], twin[:, 0], twin[0, 0] = row, row, dense[0, 0]
        with pytest.raises(np.linalg.LinAlgError, match="not positive definite"):
            factored(one, flat_of(one, twin))


def test_the_layout_chosen_for_a_size_and_a_bandwidth():
    small = layout(banded.ONE_BLOCK, 0, 3)
    assert (small.count, small.block, small.corner) == (1, banded.ONE_BLOCK, 0)
    wide = layout(2000, 30, 40)
    assert (wide.banded, wide.corner, wide.block, wide.count) == (1970, 30, 81, 25)
    # Any two unknowns within the bandwidth lie in one block or in two neighbours, with all that lies between.
    first = np.arange(1970 - 40)
    assert (wide.place(first, first + 40) >= 0).all()
    # A band as wide as the matrix is one block; a narrow one has blocks of the least size.
    assert layout(2000, 0, 600).count == 1
    assert layout(2000, 0, 2).block == banded.LEAST_BLOCK
    empty = factored(layout(0, 0, 0), np.zeros(layout(0, 0, 0).starts[3]))
    assert empty.solve(np.zeros((0, 2))).shape == (0, 2) and empty.log_determinant == 0.0


def test_a_scale_given_is_the_measure_of_the_pivots():
    one = SHAPES["two blocks"]
    dense = some(one)
    flat = flat_of(one, dense)
    # What was taken from one unknown leaves a ten-thousandth of it: small by its own size before.
    before = 1.0 / np.sqrt(np.diag(dense))
    small = before.copy()
    small[7] /= 1e3
    factor = factored(one, flat, pin=1e-4, scale=small)
    assert factor.pins.tolist() == [7]
    assert factored(one, flat, pin=1e-4, scale=before).pins.size == 0
