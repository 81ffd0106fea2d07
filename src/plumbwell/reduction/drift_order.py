"""The order of each run's drift polynomial, by an F test on the visits' weighted sum of squares.

The order starts at 1 and rises while the next order lowers the sum of squares beyond chance (p < 0.01), with
the weights of the higher order; the information criterion as usually coded picks too high an order in more
than half of typical runs.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from plumbwell.reduction.drift_basis import HIGHEST_ORDER

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
class Comparison:
    """Weighted sums of squares of the visits by the lower and higher order, and degrees of freedom of the higher."""

    low: float
    high: float
    freedom: int


def chosen_orders(
    start: tuple[int, ...],
    automatic: tuple[int, ...],
    compare: Callable[[tuple[int, ...], int, int], Comparison | None],
) -> tuple[tuple[int, ...], tuple[OrderTest, ...]]:
    """The orders that the F tests keep, run by run.

    Parameters
    ----------
    start : tuple of int by run code
        Orders to start from: 1 for automatic runs, the given ones for others.
    automatic : tuple of int
        Run codes to be tested, in time order.
    compare : callable
        (orders, run code, higher order of that run) -> both fits compared with the weights of the higher one, or
        None where the higher order is not determined.
    """
    from scipy.special import fdtrc

    orders = list(start)
    tests: list[OrderTest] = []

    def test(run: int, lower: int, higher: int) -> bool:
        found = compare(tuple(orders), run, higher)
        if found is None or found.freedom < LEAST_FREEDOM or found.high <= 0.0:
            return False
        steps = higher - lower
        f = max(found.low - found.high, 0.0) / steps / (found.high / found.freedom)
        p = float(fdtrc(steps, found.freedom, f))
        tests.append(
            OrderTest(
                run=run, lower=lower, higher=higher, f=f, freedom=(steps, found.freedom), p=p, taken=p < CHANCE
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


def raised_together(
    start: tuple[int, ...],
    automatic: tuple[int, ...],
    compare: Callable[[tuple[int, ...]], tuple[int, float, dict[int, tuple[float, float]]]],
) -> tuple[tuple[int, ...], tuple[OrderTest, ...]]:
    """The orders that the F tests keep where very many degrees of freedom make the runs' tests independent.

    Parameters
    ----------
    start, automatic
        As in `chosen_orders`.
    compare : callable
        Orders -> degrees of freedom, weighted sum of squares, and for each run how much of it the next order and the
        third would explain, all with the weights of the orders given.

    Notes
    -----
    All runs are raised at once, step by step as one alone would be. With some hundred degrees of freedom the weights
    of one order serve the other.
    """
    from scipy.special import fdtrc

    orders, tests, waiting = list(start), [], list(automatic)
    while waiting:
        freedom, left, gains = compare(tuple(orders))
        raised = []
        for run in waiting:
            one, third = gains[run]
            order = orders[run]
            for higher, gain in ((order + 1, one), (HIGHEST_ORDER, third if order == 1 else 0.0)):
                steps = higher - order
                if gain <= 0.0 or steps < 1 or higher > HIGHEST_ORDER:
                    continue
                f = gain / steps / ((left - gain) / (freedom - steps))
                p = float(fdtrc(steps, freedom - steps, f))
                tests.append(
                    OrderTest(
                        run=run, lower=order, higher=higher, f=f, freedom=(steps, freedom - steps), p=p,
                        taken=p < CHANCE,
                    )
                )
                if p < CHANCE:
                    orders[run] = higher
                    raised.append(run)
                    break
        waiting = [run for run in raised if orders[run] < HIGHEST_ORDER]
    return tuple(orders), tuple(tests)
