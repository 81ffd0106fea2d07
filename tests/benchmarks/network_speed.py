"""How the network grows with the readings, in ratios of one run: `python tests/benchmarks/network_speed.py`.

One BLAS thread. Time a reading from a thousand to three hundred thousand; one solution against LSMR to 1e-12 on the
same equations; the covariances of all neighbours against one solution; and a whole `plumbwell reduce` of a survey
folder of a hundred thousand readings and ten thousand stations with gross errors, reading and writing apart, with its
memory.
"""

from __future__ import annotations

import json
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
from large_networks import network_case, write_folder

from plumbwell.reduction.adjustment import Adjustment
from plumbwell.reduction.checked import visit_means
from plumbwell.reduction.network import solve
from plumbwell.study.reduce import reduce
from plumbwell.study.results import Results

PLAIN = {"drift_walk": "off", "drift_order": 1}


def least(work: Callable[[], Any], turns: int) -> float:
    """The least time of some turns, s."""
    best = np.inf
    for _ in range(turns):
        started = time.perf_counter()
        work()
        best = min(best, time.perf_counter() - started)
    return best


def solved(fit: Adjustment) -> Callable[[], Any]:
    """One solution of the network anew: normal equations, factor, answer and residuals."""
    return lambda: solve(fit.design, fit.solution.weight, fit.visit_mean[:, None], fit.solution.ties)


def growth() -> dict[int, Results]:
    """Time a reading of one solution and of the whole network step."""
    print("readings, unknowns of the border, us a reading: one solution, the network step (orders, noise, judgement)")
    found = {}
    for readings in (1_000, 10_000, 100_000, 300_000):
        case = network_case(readings, **PLAIN)
        results = reduce(case)
        fit, count = results.network.adjustment, len(results.survey.readings)
        one = least(solved(fit), 7)
        step = results.timing["network"]
        print(f"  {count:7d} {fit.design.size:6d} {one / count * 1e6:8.2f} {step / count * 1e6:8.1f}", flush=True)
        found[readings] = results
    return found


def against_lsmr(results: Results) -> None:
    """From readings to gravity, against LSMR on the same equations: readings, visit effects, priors; columns scaled."""
    from scipy.sparse import coo_array
    from scipy.sparse.linalg import lsmr

    fit = results.network.adjustment
    one, priors, visits, noise = fit.design, fit.design.priors, fit.visits, fit.noise
    rows = visits.rows
    values = results.readings.observed.values[rows] - fit.held[rows]
    visit = np.repeat(np.arange(len(visits)), np.diff(visits.start))
    number = np.arange(len(rows))
    unknowns = one.of_run[fit.basis.run[rows]]
    filled = unknowns >= 0
    in_border = one.in_border[visits.station[visit]]
    station = np.where(in_border >= 0, one.n_stations + in_border, visits.station[visit])
    width = one.n_stations + one.size
    row = np.concatenate([number, np.repeat(number, filled.sum(axis=1)), number])
    column = np.concatenate([station, one.n_stations + unknowns[filled], width + visit])
    entry = np.concatenate([np.ones(len(rows)), one.row_value[filled], np.ones(len(rows))]) / noise.sd[row]
    effects, prior_rows = len(rows) + np.arange(len(visits)), len(rows) + len(visits) + priors.row
    row = np.concatenate([row, effects, prior_rows])
    column = np.concatenate([column, width + np.arange(len(visits)), one.n_stations + priors.unknown])
    entry = np.concatenate([entry, 1.0 / np.sqrt(fit.reseating.variance), priors.factor / priors.sd[priors.row]])
    shape = (len(rows) + len(visits) + len(priors), width + len(visits))
    matrix = coo_array((entry, (row, column)), shape=shape).tocsr()
    size = np.sqrt(np.asarray((matrix**2).sum(axis=0)).ravel())
    scale = 1.0 / np.where(size > 0.0, size, 1.0)
    scaled = matrix.multiply(scale).tocsr()
    side = np.concatenate([values / noise.sd, np.zeros(len(visits)), priors.value / priors.sd])
    answer: list[Any] = []

    def by_lsmr() -> None:
        answer[:] = [lsmr(scaled, side, atol=1e-12, btol=1e-12, conlim=0.0, maxiter=20000)]

    def by_network() -> None:
        mean = visit_means(noise.weight, values, visits.start)
        solve(one, fit.solution.weight, mean[:, None], fit.solution.ties)

    slow, quick = least(by_lsmr, 1), least(by_network, 7)
    gravity = answer[0][0][: one.n_stations] * scale[: one.n_stations]
    off = np.abs(gravity - fit.solution.gravity[:, 0])[one.in_border < 0].max()
    print(
        f"LSMR to 1e-12: {slow:.2f} s, {answer[0][2]} steps; the network {quick * 1e3:.0f} ms: {slow / quick:.0f} "
        f"times (goal 15); station gravity apart by {off * 1e8:.1e} uGal"
    )


def neighbours(results: Results) -> None:
    """Variances of all intervals and their covariances with the next, against one solution."""
    errors, fit = results.intervals.errors, results.network.adjustment
    drift = errors.parts["drift"]
    quick = least(solved(fit), 7)
    pairs = least(lambda: (drift.variance(), drift.with_follower()), 3)
    inverse = least(lambda: np.linalg.norm(solved(fit)().factor.inverse), 3) - quick
    print(
        f"covariances of {len(errors.independent)} intervals and their neighbours: {pairs * 1e3:.0f} ms, elements of "
        f"the inverse {inverse * 1e3:.0f} ms, {(pairs + inverse) / quick:.2f} of one solution (goal 1)"
    )


def whole_reduction(recipe: str) -> None:
    """A survey folder of 1e5 readings through the command line, in a process of its own."""
    with tempfile.TemporaryDirectory() as place:
        folder, out = Path(place) / "survey", Path(place) / "out"
        write_folder(folder, 100_000, gross=0.02, recipe=recipe)
        script = (
            "import resource, sys\nfrom plumbwell.cli import main\n"
            "status = main(sys.argv[1:])\n"
            "print(resource.getrusage(resource.RUSAGE_SELF).ru_maxrss)\nsys.exit(status)\n"
        )
        started = time.perf_counter()
        done = subprocess.run(
            [sys.executable, "-c", script, "reduce", str(folder), "--out", str(out)], capture_output=True, text=True
        )
        whole = time.perf_counter() - started
        if done.returncode not in (0, 3):
            print(done.stderr)
            return
        timing = json.loads((out / "summary.json").read_text("utf-8"))["timing"]
        own = sum(timing.values())
        memory = int(done.stdout.split()[-1]) / 1024.0 / 1024.0
        parts = ", ".join(f"{part} {seconds:.2f}" for part, seconds in timing.items())
        print(f"{recipe!r}: {own:.2f} s of {whole:.1f} with reading and writing (goal 3); {memory:.2f} GiB (goal 1)")
        print(f"  {parts}", flush=True)


if __name__ == "__main__":
    every = growth()
    against_lsmr(every[100_000])
    neighbours(every[100_000])
    del every
    whole_reduction('outliers = "flag"')
    whole_reduction('outliers = "downweight"')
