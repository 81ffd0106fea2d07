"""The order of each run's drift polynomial, by an F test on the visits' weighted sum of squares.

The order starts at 1 and rises while the next order lowers the sum of squares beyond chance (p < 0.01), with
the weights of the higher order; the information criterion as usually coded picks too high an order in more
than half of typical runs. Bends that no run shows by itself, or that one run's order takes up for all, show when all
runs are raised together, which is tried first.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

from plumbwell.reduction.chance import f_chance
from plumbwell.reduction.drift_basis import HIGHEST_ORDER

CHANCE = 0.01
NEVER = 4.0
"""F under which no step is taken: of F with 2 and very many degrees of freedom 1 % lies above 4.61."""

LEAST_FREEDOM = 3


EVERY_RUN = -1
"""In place of a run's code: all automatic runs together."""


@dataclass(frozen=True, slots=True, kw_only=True)
class OrderTest:
    """One F test: run code, the two orders, F, its degrees of freedom, the chance p, and whether the higher was taken.

    A step that plainly explains nothing (p over 0.1) is told with the weights of the lower order.

    Run `EVERY_RUN`: all automatic runs that stood at the lower order together; taken when what came of it stayed.
    """

    run: int
    lower: int
    higher: int
    f: float
    freedom: tuple[int, int]
    p: float
    taken: bool


@dataclass(frozen=True, slots=True, kw_only=True)
class Comparison:
    """Weighted sums of squares of the visits by the lower and higher orders, and degrees of freedom of the higher."""

    low: float
    high: float
    freedom: int

    def test(self, run: int, lower: int, higher: int, steps: int) -> OrderTest | None:
        """The F test of so many terms more; None where too few degrees of freedom are left."""
        if self.freedom < LEAST_FREEDOM or self.high <= 0.0:
            return None
        f = max(self.low - self.high, 0.0) / steps / (self.high / self.freedom)
        p = f_chance(f, steps=steps, freedom=self.freedom)
        return OrderTest(
            run=run, lower=lower, higher=higher, f=f, freedom=(steps, self.freedom), p=p, taken=p < CHANCE
        )


Orders = tuple[int, ...]
Compare = Callable[[Orders, Orders], Comparison | None]


def chosen_orders(
    start: Orders, automatic: tuple[int, ...], compare: Compare
) -> tuple[Orders, tuple[OrderTest, ...]]:
    """The orders that the F tests keep.

    Parameters
    ----------
    start : tuple of int by run code
        Orders to start from: 1 for automatic runs, the given ones for others.
    automatic : tuple of int
        Run codes to be tested, in time order.
    compare : callable
        (lower orders, higher orders) -> both fits compared with the weights of the higher one, or None where the
        higher orders are not determined.

    Notes
    -----
    Run by run each order rises by single steps, and once from 1 to 3 where 2 is not kept. Where two runs or more are
    bent alike, the first tests see the bends of the others as noise, and one run's cubic may take up what is none of
    its own. So all runs are raised to 2 together as well, F with as many degrees of freedom as runs; when that
    explains more than chance would, runs whose own bend does not are lowered again, the weakest first, and the single
    steps go on from there. Of the two outcomes the one that leaves the smaller mean square stays, both weighed with
    the weights of the orders that hold both: each with weights of its own leaves 1, for those are estimated from
    what it leaves.
    """
    alone, tests = _run_by_run(start, automatic, compare)
    raising = [run for run in automatic if start[run] == 1]
    if len(raising) < 2:
        return alone, tests
    found = compare(start, _raised(start, raising))
    if found is None:
        # Runs that can hold no parabola do not keep the others from it.
        raising = [run for run in raising if compare(start, _raised(start, [run])) is not None]
        found = compare(start, _raised(start, raising)) if len(raising) > 1 else None
    joint = None if found is None else found.test(EVERY_RUN, 1, 2, len(raising))
    if joint is None:
        return alone, tests
    if joint.taken:
        lowered = _lowered(_raised(start, raising), raising, compare)
        together, further = _run_by_run(lowered, automatic, compare)
        if together != alone and _leaves_less(together, alone, compare):
            return together, (joint, *further)
    return alone, (replace(joint, taken=False), *tests)


def _raised(orders: Orders, runs: list[int], higher: int = 2) -> Orders:
    return tuple(higher if run in runs else order for run, order in enumerate(orders))


def _run_by_run(
    start: Orders, automatic: tuple[int, ...], compare: Compare
) -> tuple[Orders, tuple[OrderTest, ...]]:
    orders, tests = start, []

    def raises(run: int, higher: int) -> bool:
        nonlocal orders
        lower, above = orders[run], _raised(orders, [run], higher)
        found = compare(orders, above)
        test = None if found is None else found.test(run, lower, higher, higher - lower)
        if test is None:
            return False
        tests.append(test)
        if test.taken:
            orders = above
        return test.taken

    for run in automatic:
        while orders[run] < HIGHEST_ORDER:
            if not raises(run, orders[run] + 1) and not (orders[run] == 1 and raises(run, HIGHEST_ORDER)):
                break
    return orders, tuple(tests)


def _lowered(orders: Orders, raised: list[int], compare: Compare) -> Orders:
    """The orders without the parabolas that explain no more than chance would beside all the others."""
    raised = list(raised)
    while raised:
        weak = []
        for run in raised:
            found = compare(_raised(orders, [run], 1), orders)
            test = None if found is None else found.test(run, 1, 2, 1)
            if test is not None and not test.taken:
                weak.append((test.p, run))
        if not weak:
            break
        run = max(weak)[1]
        raised.remove(run)
        orders = _raised(orders, [run], 1)
    return orders


def _leaves_less(one: Orders, other: Orders, compare: Compare) -> bool:
    """True where the first orders leave a smaller mean square than the second."""
    both = tuple(map(max, one, other))
    mean_square = []
    for orders in (one, other):
        found = compare(orders, both)
        if found is None:
            return False
        freedom = found.freedom + sum(both) - sum(orders)
        mean_square.append(found.low / freedom if freedom > 0 else float("inf"))
    return mean_square[0] < mean_square[1]


def raised_together(
    start: Orders,
    automatic: tuple[int, ...],
    compare: Callable[[Orders], tuple[int, float, dict[int, tuple[float, float]]]],
) -> tuple[Orders, tuple[OrderTest, ...]]:
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
    of one order serve the other. Steps whose F is never taken, whatever the degrees of freedom, are not told.
    """
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
                if f < NEVER:
                    continue
                p = f_chance(f, steps=steps, freedom=freedom - steps)
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
