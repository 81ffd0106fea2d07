"""How fast a whole reduction is, in ratios of one run: `python tests/benchmarks/reduce_speed.py`, one BLAS thread.

Each pair of things to compare is run in turn, and the least of at least seven times counts. The yardstick, a fixed
piece of numpy work, tells how quick the machine was at that moment.
"""

from __future__ import annotations

import gc
import time
from collections.abc import Callable
from dataclasses import replace
from itertools import count
from typing import Any

import numpy as np
from bare_chain import bare_chain, bare_survey
from large_surveys import large_case

from plumbwell.earth.tide import rigid_tide
from plumbwell.study.case import Case
from plumbwell.study.kept import Kept
from plumbwell.study.reduce import reduce

FRESH = count(1)


def least(*works: Callable[[], Any], turns: int = 15) -> list[float]:
    """The least time of each work, run in turn, s."""
    best = [np.inf] * len(works)
    for work in works:
        work()
    gc.collect()
    gc.disable()
    try:
        for _ in range(turns):
            for number, work in enumerate(works):
                started = time.perf_counter()
                work()
                best[number] = min(best[number], time.perf_counter() - started)
    finally:
        gc.enable()
    return best


RANDOM = np.random.default_rng(0).standard_normal(20000)


def yardstick() -> None:
    """Fixed work: sines, sorting and sums of twenty thousand numbers, near a millisecond."""
    for _ in range(4):
        np.sum(np.sin(RANDOM))
    np.sort(RANDOM)


def changing(case: Case, key: str) -> Callable[[], None]:
    """A reduction that finds everything kept but what one changed key of the recipe asks for anew."""
    kept = Kept()
    before = getattr(case.chosen, key)

    def work() -> None:
        value = before * (1.0 + 1e-4 * next(FRESH))
        reduce(case, recipe=replace(case.chosen, **{key: value}), kept=kept)

    return work


def against_bare_numpy() -> None:
    """One key changed at each turn, drift order and noise held, against the same arithmetic in bare numpy."""
    case = large_case(500, 100, drift_order=1, noise="as_given")
    bare = bare_survey(case)
    check = reduce(case)
    gravity = bare_chain(bare, tide_factor=1.16, depth_sd=0.03, reference=2670.0)[0]
    off = np.ptp(gravity - gravity[0] - check.stations.gravity.values)
    print(f"bare chain and program: station gravity within {off * 1e8:.2f} uGal")

    def floor() -> None:
        bare_chain(bare, tide_factor=1.16 + 1e-6 * next(FRESH), depth_sd=0.03, reference=2670.0)

    keys = ("tide_factor", "pressure_admittance", "reference_density", "depth_sd", "same_place", "gradient_sd")
    times = least(yardstick, floor, *(changing(case, key) for key in keys))
    print(f"yardstick {times[0] * 1e3:.2f} ms, bare chain {times[1] * 1e3:.2f} ms")
    for key, seconds in zip(keys, times[2:], strict=True):
        print(f"  held, {key}: {seconds * 1e3:.2f} ms, {seconds / times[1]:.1f} times the bare chain (goal 6)")


def chosen_anew() -> None:
    """Drift orders and noise chosen anew at each turn."""
    case = large_case(500, 100)
    keys = ("tide_factor", "pressure_admittance", "reference_density")
    times = least(yardstick, *(changing(case, key) for key in keys))
    for key, seconds in zip(keys, times[1:], strict=True):
        print(
            f"chosen anew, {key}: {seconds * 1e3:.2f} ms (goal 16 on a quiet machine), "
            f"{seconds / times[0]:.1f} yardsticks of {times[0] * 1e3:.2f} ms"
        )


def growth() -> None:
    """A hundred times the readings at the same stations."""
    few, many = (large_case(number, 100, drift_order=1) for number in (1000, 100000))
    short, long = least(lambda: reduce(few), lambda: reduce(many), turns=7)
    print(
        f"1e3 readings {short * 1e3:.1f} ms, 1e5 readings {long * 1e3:.0f} ms: "
        f"{long / short / 100:.2f} of linear (goal 1.3 at most)"
    )


def tide_routes() -> None:
    """The quick ephemeris against the full one."""
    utc = 8.0e8 + np.arange(2000) * 1800.0
    place = {"latitude": 0.8, "longitude": 0.2, "height": 100.0}
    quick, full = least(
        lambda: rigid_tide(utc, **place), lambda: rigid_tide(utc, full=True, **place), turns=7
    )
    off = np.abs(rigid_tide(utc, **place) - rigid_tide(utc, full=True, **place)).max()
    print(f"tide: full route {full / quick:.1f} times the quick one (goal 5), off {off * 1e8:.4f} uGal (goal 0.02)")


if __name__ == "__main__":
    against_bare_numpy()
    chosen_anew()
    growth()
    tide_routes()
