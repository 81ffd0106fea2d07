"""The order of each run's drift polynomial, by an F test on the visits' weighted sum of squares.

The order starts at 1 and rises while the next order lowers the sum of squares beyond chance (p < 0.01), with
the weights of the higher order; the information criterion as usually coded picks too high an order in more
than half of typical runs.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from plumbwell.reduction.design import HIGHEST_ORDER
from plumbwell.reduction.network import Solution

CHANCE = 0.01
LEAST_FREEDOM = 3


@dataclass(frozen=True, slots=True, kw_only=True)
class OrderTest:
    """One F test: run code, the two orders, F, its degrees of freedom, the chance p, and whether it was taken."""

    run: int
    lower: int
    higher: int
    f: float
    freedom: tuple[int, int]
    p: float
    taken: bool


@dataclass(frozen=True, slots=True, kw_only=True)
class Fit:
    """What the test needs of one choice of orders: its degrees of freedom and its own solution."""

    freedom: int
    solution: Solution


def chosen_orders(
    start: tuple[int, ...],
    automatic: tuple[int, ...],
    fit: Callable[[tuple[int, ...]], Fit | None],
    sum_of_squares: Callable[[tuple[int, ...], Solution], float],
) -> tuple[tuple[int, ...], tuple[OrderTest, ...]]:
    """The orders that the F tests keep, run by run.

    Parameters
    ----------
    start : tuple of int by run code
        Orders to start from: 1 for automatic runs, the given ones for others.
    automatic : tuple of int
        Run codes to be tested, in time order.
    fit : callable
        Orders -> the fit with its own variance components, or None where the order is not determined.
    sum_of_squares : callable
        (orders, solution whose weights hold) -> weighted sum of squares of visit means.
    """
    from scipy.special import fdtrc

    orders = list(start)
    tests: list[OrderTest] = []

    def test(run: int, lower: int, higher: int) -> bool:
        trial = orders.copy()
        trial[run] = higher
        above = fit(tuple(trial))
        if above is None or above.freedom < LEAST_FREEDOM:
            return False
        steps = higher - lower
        s_low = sum_of_squares(tuple(orders), above.solution)
        s_high = above.solution.sum_of_squares()
        if s_high <= 0.0:
            return False
        f = max(s_low - s_high, 0.0) / steps / (s_high / above.freedom)
        p = float(fdtrc(steps, above.freedom, f))
        tests.append(
            OrderTest(
                run=run, lower=lower, higher=higher, f=f, freedom=(steps, above.freedom), p=p, taken=p < CHANCE
            )
        )
        return p < CHANCE

    for run in automatic:
        while orders[run] < HIGHEST_ORDER:
            if test(run, orders[run], orders[run] + 1):
                orders[run] += 1
            elif orders[run] == 1 and test(run, 1, HIGHEST_ORDER):
                orders[run] = HIGHEST_ORDER
            else:
                break
    return tuple(orders), tuple(tests)
