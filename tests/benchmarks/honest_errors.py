"""Whether the errors that a reduction states are honest: `python tests/benchmarks/honest_errors.py`, by hand.

Invented surveys of many schemes are drawn, reduced and held against their truth and against the best linear unbiased
estimate with the true noise. Each line is one figure, what is wanted of it, and whether it is met. `--first` takes
seeds that nobody has looked at; `--only walk` one group. What the program cannot do yet says "waits".
"""

from __future__ import annotations

import argparse
import os
import sys
import time
from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace
from pathlib import Path

os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")

CHECKOUT = Path(__file__).resolve().parents[2]
sys.path[:0] = [str(CHECKOUT / "src"), str(CHECKOUT / "tests" / "made")]

import numpy as np  # noqa: E402

from made_surveys import MICROGAL  # noqa: E402
from plumbwell.study.reduce import reduce  # noqa: E402
from plumbwell.study.results import Results  # noqa: E402
from plumbwell.survey.recipe import is_unavailable  # noqa: E402
from simulated_surveys import (  # noqa: E402
    EVERY_FIFTH,
    EXACT_DEPTHS,
    FEW_RETURNS,
    NO_RETURN,
    QUIET,
    SEVENTEEN,
    VARIED,
    Scheme,
    Simulated,
    base_returns,
    honest_instrument,
    loops,
    mixed_trips,
    second_pass,
    simulated,
    there_and_back,
    trips,
)
from survey_errors import (  # noqa: E402
    Missed,
    all_missed,
    covered,
    orders_too_high,
    over_best,
    over_other,
    scaled_rms,
    whole_chi_square,
)

UGAL = MICROGAL
BENT = replace(QUIET, bend=10.0 * QUIET.visit_sd)


@dataclass(frozen=True, kw_only=True)
class Figure:
    """One measured figure and the limits between which it is wanted."""

    what: str
    value: float
    least: float = 0.0
    most: float = np.inf

    @property
    def met(self) -> bool:
        """True within the limits."""
        return bool(self.least <= self.value <= self.most)

    def __str__(self) -> str:
        wanted = f"{self.least:g} to {self.most:g}"
        if np.isinf(self.most):
            wanted = f">= {self.least:g}" if self.least > 0.0 else "told only"
        elif self.least <= 0.0:
            wanted = f"<= {self.most:g}"
        verdict = "" if wanted == "told only" else "met" if self.met else "NOT MET"
        return f"{self.what:<76} {self.value:8.3f}   {wanted:<12} {verdict}"


Seeds = range
Figures = Iterator[Figure]


def best(seeds: Seeds) -> Figures:
    """Densities against the best linear unbiased estimate, over varied surveys."""
    together: list[Missed] = []
    for name, scheme in VARIED.items():
        found = all_missed(scheme, seeds, list_tares=True)
        together += found
        yield Figure(what=f"rms error over best: {name}", value=over_best(found), most=1.10)
    yield Figure(what="rms error over best: all together", value=over_best(together), most=1.10)
    own = np.concatenate([one.best_error / one.best_sd for one in together])
    yield Figure(what="the best estimate itself: rms error/sd", value=float(np.sqrt(np.mean(own**2))))


def honest(seeds: Seeds) -> Figures:
    """Errors over sds where the survey tells its own noise, in part or not at all."""
    whole = EVERY_FIFTH.stops[0]
    turn = whole.index(EVERY_FIFTH.stations - 1) + 1
    for name, scheme in (
        ("second pass", EVERY_FIFTH),
        ("second pass, three readings", replace(EVERY_FIFTH, readings=3)),
        ("second pass as a second run", Scheme(stops=((*whole[:turn], 0), (0, *whole[turn:])))),
    ):
        found = all_missed(scheme, seeds)
        yield Figure(what=f"{name}, {scheme.freedom} dof: rms error/sd", value=scaled_rms(found), least=0.9, most=1.1)
        yield Figure(
            what=f"{name}: chi-square of the whole covariance", value=whole_chi_square(found), least=0.9, most=1.1
        )
    found = all_missed(FEW_RETURNS, seeds)
    yield Figure(what="five base returns only: share within Student's 95 %", value=covered(found), least=0.92)
    true = honest_instrument(FEW_RETURNS)
    for factor in (0.5, 0.67, 1.5):
        stated = replace(true, reseating_sd=factor * true.reseating_sd)
        value = covered(all_missed(FEW_RETURNS, seeds, instrument=stated))
        yield Figure(what=f"the same, re-seating stated at {factor:g} times the true one", value=value)
    found = all_missed(NO_RETURN, seeds)
    yield Figure(what="one pass without return: share within 95 %", value=covered(found), least=0.92)
    codes = [{finding.code for finding in one.results.findings} for one in found]
    told_all = float(np.mean([{"no_repeat", "noise_untold"} <= one for one in codes]))
    yield Figure(what="the same: share with no_repeat and noise_untold", value=told_all, least=1.0)


def orders(seeds: Seeds) -> Figures:
    """Drift orders too high where drift is linear, and found where it is bent."""
    for name, stops in (
        ("second pass", second_pass(30)), ("there and back", there_and_back(16)), ("three loops", loops(9, 3)),
        ("four trips", trips(10, 4)), ("five base returns", base_returns(16, 5)),
    ):  # fmt: skip
        found = all_missed(Scheme(stops=stops), seeds)
        yield Figure(what=f"linear drift, order too high: {name}", value=orders_too_high(found, 1), most=0.05)
    # Bent by the same amount on the way back, a run there and back hides the bend in gravity: it is not asked here.
    for name, stops in (
        ("second pass", second_pass(30)), ("three loops", loops(9, 3)), ("five base returns", base_returns(16, 5)),
    ):  # fmt: skip
        scheme = Scheme(stops=stops)
        found = all_missed(replace(scheme, bend=10.0 * scheme.visit_sd), seeds)
        yield Figure(what=f"drift bent by 10 sd, order 2 or more: {name}", value=orders_too_high(found, 1), least=0.95)
    # Bends that no run shows by itself, and all runs together do.
    scheme = Scheme(stops=mixed_trips(10, 4))
    bent = replace(scheme, bend=10.0 * scheme.visit_sd)
    found = all_missed(bent, seeds)
    yield Figure(what="all of four runs bent, two there and back: order 2 or more", value=orders_too_high(found, 1))
    yield Figure(what="the same: rms error over best", value=over_best(found))
    yield Figure(what="the same: rms error/sd", value=scaled_rms(found))
    held = scaled_rms(all_missed(bent, seeds, drift_order=2))
    yield Figure(what="the same, order 2 given: rms error/sd", value=held)


def walk(seeds: Seeds) -> Figures:
    """Slow wander of the drift, there and not there, with the walk chosen by itself."""
    for name, stops, exactly in (
        ("loops", SEVENTEEN.stops, False), ("loops, each by 12 uGal", SEVENTEEN.stops, True),
        ("second pass", second_pass(20), False), ("there and back", there_and_back(19), False),
    ):  # fmt: skip
        scheme = Scheme(stops=stops, wander=12.0 * UGAL, exactly=exactly)
        found = all_missed(scheme, seeds, drift_walk="auto")
        held = all_missed(scheme, seeds, drift_walk="off")
        taken = float(np.mean([one.results.network.adjustment.walk is not None for one in found]))
        what = f"wander of 12 uGal, {scheme.freedom} dof, {name}"
        yield Figure(what=f"{what}: rms error/sd", value=scaled_rms(found), least=0.9, most=1.2)
        yield Figure(what=f"{what}: rms error over best", value=over_best(found))
        yield Figure(what=f"{what}: share with a walk", value=taken)
        yield Figure(what=f"{what}, walk off: rms error/sd", value=scaled_rms(held))
        yield Figure(what=f"{what}, walk off: rms error over best", value=over_best(held))
    for name, scheme in (("three loops", SEVENTEEN), ("second pass", EVERY_FIFTH)):
        found = all_missed(scheme, seeds, drift_walk="auto")
        off = all_missed(scheme, seeds, drift_walk="off")
        taken = float(np.mean([one.results.network.adjustment.walk is not None for one in found]))
        yield Figure(what=f"no wander, {name}: rms error over that of no walk", value=over_other(found, off), most=1.05)
        yield Figure(what=f"no wander, {name}: share with a walk", value=taken)
        yield Figure(what=f"no wander, {name}: rms error/sd", value=scaled_rms(found))


def right_tare(one: Simulated, results: Results) -> bool:
    """True when a proposed tare stands in the true gap or the next, its size within 3 sd."""
    true = one.tares[0]
    visits = results.network.visits
    first = np.sort(visits.first)
    names = results.survey.readings.run.names
    gap = np.searchsorted(first, true.time)
    return any(
        names[found.run] == true.run
        and abs(int(np.searchsorted(first, found.time)) - int(gap)) <= 1
        and abs(found.size - true.size) <= 3.0 * found.sd
        for found in results.network.proposed
    )


def spans(one: Simulated, results: Results) -> bool:
    """True when a proposed tare's gap reaches from a base visit to a later one and the truth lies in it."""
    base = one.time[one.station == 0]
    true = one.tares[0].time
    return any(
        found.gap_from <= base[base < true][-1] + 1.0 and found.gap_to >= base[base > true][0] - 1.0
        for found in results.network.proposed
    )


def tares(seeds: Seeds) -> Figures:
    """Tares that nobody listed, proposed where they are and nowhere else."""
    for setting in ("off", "auto", "on"):
        with_tare = all_missed(replace(QUIET, tares=1), seeds, drift_walk=setting)
        without = all_missed(QUIET, seeds, drift_walk=setting)
        right = float(np.mean([right_tare(one.one, one.results) for one in with_tare]))
        more = float(np.mean([len(one.results.network.proposed) > 1 for one in with_tare]))
        false = float(np.mean([len(one.results.network.proposed) > 0 for one in without]))
        yield Figure(what=f"tare of 40 uGal in 3 uGal proposed rightly, walk {setting}", value=right, least=0.95)
        yield Figure(what=f"the same: share with more than one proposed, walk {setting}", value=more)
        yield Figure(what=f"no tare: share with one proposed, walk {setting}", value=false, most=0.05)
        if setting != "on":
            recipe = replace(EXACT_DEPTHS, tares="proposed", drift_walk=setting)
            applied = all_missed(replace(QUIET, tares=1), seeds, recipe=recipe)
            yield Figure(what=f"found tares applied, walk {setting}: rms error over best", value=over_best(applied))
            yield Figure(what=f"found tares applied, walk {setting}: rms error/sd", value=scaled_rms(applied))
    for name, scheme in (("wander of 12 uGal", replace(QUIET, wander=12.0 * UGAL)), ("bend of 10 sd", BENT)):
        without = all_missed(scheme, seeds)
        false = float(np.mean([len(one.results.network.proposed) > 0 for one in without]))
        yield Figure(what=f"{name} and no tare: share with one proposed", value=false)
        with_tare = all_missed(replace(scheme, tares=1), seeds)
        right = float(np.mean([right_tare(one.one, one.results) for one in with_tare]))
        yield Figure(what=f"{name} and a tare of 40 uGal: proposed rightly", value=right)
    once = replace(QUIET, stops=base_returns(37, 12), tares=1)
    found = [(one, reduce(one.case)) for one in (simulated(once, seed) for seed in seeds)]
    proposed = [pair for pair in found if pair[1].network.proposed]
    yield Figure(what="stations visited once: share with a proposed tare", value=len(proposed) / len(found))
    right = float(np.mean([spans(*pair) for pair in proposed])) if proposed else 0.0
    yield Figure(what="stations visited once: gap spans two base returns and holds the truth", value=right, least=0.95)


def outliers(seeds: Seeds) -> Figures:
    """Gross errors named, and taken out of the densities."""
    for name, scheme in (
        ("one reading a stop", EVERY_FIFTH),
        ("three readings", replace(EVERY_FIFTH, readings=3)),
        ("loops, four readings", replace(SEVENTEEN, readings=4)),
    ):
        wrong = replace(scheme, gross_share=0.03)
        flagged = all_missed(wrong, seeds)
        checked = named = false = clean_rows = 0
        for one in flagged:
            told = np.zeros(len(one.one.time), dtype=bool)
            told[one.results.network.outlier_rows] = True
            asked = one.one.gross & (one.results.network.adjustment.redundancy > 0.3)
            checked, named = checked + int(asked.sum()), named + int((asked & told).sum())
            false, clean_rows = false + int((told & ~one.one.gross).sum()), clean_rows + int((~one.one.gross).sum())
        clean = all_missed(scheme, seeds)
        any_false = float(np.mean([len(one.results.network.outlier_rows) > 0 for one in clean]))
        less = all_missed(wrong, seeds, outliers="downweight")
        out = all_missed(wrong, seeds, outliers="exclude")
        share = named / checked if checked else np.nan
        yield Figure(what=f"{name}: gross errors named of {checked} checked", value=share, least=0.95)
        yield Figure(what=f"{name}: false alarms a hundred good readings", value=100.0 * false / clean_rows)
        yield Figure(what=f"{name}: share of clean surveys with a false alarm", value=any_false)
        yield Figure(what=f"{name}: rms error over clean, flagged only", value=over_other(flagged, clean))
        known = [replace(one, error=one.best_error) for one in flagged]
        yield Figure(what=f"{name}: rms error over clean, gross rows known", value=over_other(known, clean))
        # Where stations are read once nothing can mend a gross error there.
        most = 1.15 if scheme.readings > 1 else np.inf
        yield Figure(what=f"{name}: rms error over clean, downweighted", value=over_other(less, clean), most=most)
        yield Figure(what=f"{name}: rms error over clean, excluded", value=over_other(out, clean))
        yield Figure(what=f"{name}: rms error/sd, downweighted", value=scaled_rms(less))


def is_there(what: str) -> bool:
    """True when the program can do what a group asks for."""
    network = reduce(simulated(Scheme(stops=loops(3, 3)), 0).case).network
    return {
        "walk": hasattr(network.adjustment, "walk") and not is_unavailable("drift_walk", "on"),
        "tares": hasattr(network, "proposed") and not is_unavailable("tares", "proposed"),
        "outliers": hasattr(network, "outlier_rows") and not is_unavailable("outliers", "downweight"),
    }.get(what, True)


GROUPS: dict[str, Callable[[Seeds], Figures]] = {
    "best": best, "honest": honest, "orders": orders, "walk": walk, "tares": tares, "outliers": outliers,
}  # fmt: skip


def main() -> int:
    """Print every figure; 1 when one is not met."""
    reader = argparse.ArgumentParser(description="Honesty of errors on invented surveys with known truth.")
    reader.add_argument("--seeds", type=int, default=200, help="surveys a figure (200)")
    reader.add_argument("--first", type=int, default=1, help="first seed (1)")
    reader.add_argument("--only", nargs="*", choices=list(GROUPS), default=list(GROUPS), help="groups of figures")
    asked = reader.parse_args()
    seeds = range(asked.first, asked.first + asked.seeds)
    print(f"seeds {seeds[0]} to {seeds[-1]}")
    met = True
    for name in asked.only:
        started = time.perf_counter()
        if not is_there(name):
            print(f"\n{name}: waits, the program cannot do it yet")
            continue
        print(f"\n{name}: {(GROUPS[name].__doc__ or '').strip()}")
        for figure in GROUPS[name](seeds):
            print(f"  {figure}", flush=True)
            met &= figure.met
        print(f"  ({time.perf_counter() - started:.0f} s)")
    return 0 if met else 1


if __name__ == "__main__":
    sys.exit(main())
