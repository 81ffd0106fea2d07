"""Invented surveys with their truth, and the best that could be made of them: densities by dense least squares.

A survey is drawn from a scheme and a seed; each ingredient has a stream of its own, so that gross errors or a
tare can be added to the very same noise. `best_estimate` knows the true noise, drift order, walk and tares and
shares nothing with the reduction: the yardstick that no estimate from the readings alone can beat.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from made_surveys import HOUR, MICROGAL, MILLIGAL, SITE, STILL, Row, made_case
from plumbwell.earth.ellipsoid import WGS84, mean_curvature
from plumbwell.earth.normal_gravity import gravity_at_height
from plumbwell.study.case import Case
from plumbwell.survey.instrument import Instrument, Tare
from plumbwell.survey.recipe import Recipe

FOUR_PI_G = 4.0 * np.pi * 6.67430e-11
READING_INTERVAL = 60.0
# Readings, drift and noise alone: depths without error, nothing else to be corrected.
EXACT_DEPTHS = replace(STILL, depth_sd=0.0)
Stops = tuple[tuple[int, ...], ...]


def second_pass(stations: int, *, every: int = 5, step: int = 2, passes: int = 2) -> Stops:
    """All stations downward with the base, station 0, every so many stops; then again on every `step`-th one."""
    stops: list[int] = []
    for number in range(passes):
        for station in range(1, stations, step if number else 1):
            if len(stops) % every == 0:
                stops.append(0)
            stops.append(station)
    return ((*stops, 0),)


def there_and_back(stations: int) -> Stops:
    """Down past every station and up again, the deepest read once."""
    return ((*range(stations), *range(stations - 2, -1, -1)),)


def loops(stations: int, times: int) -> Stops:
    """Every station from the top down, so many times over, as one run."""
    return (tuple(range(stations)) * times,)


def trips(stations: int, times: int) -> Stops:
    """Down past every station and back to the base, so many times, each trip a run of its own."""
    return ((*range(stations), 0),) * times


def mixed_trips(stations: int, times: int) -> Stops:
    """Trips, a run each: in turn down and straight back to the base, and down and up past every station."""
    return tuple(there_and_back(stations)[0] if number % 2 else (*range(stations), 0) for number in range(times))


def base_returns(stations: int, returns: int) -> Stops:
    """Every station once; so many returns to the base, station 0, evenly spread and the last at the end."""
    stops = [0]
    for some in np.array_split(np.arange(1, stations), returns):
        stops += [*some.tolist(), 0]
    return (tuple(stops),)


def one_pass(stations: int) -> Stops:
    """Every station once, no return."""
    return (tuple(range(stations)),)


@dataclass(frozen=True, kw_only=True)
class Scheme:
    """How surveys are drawn; m, s and m/s2.

    Parameters
    ----------
    stops : tuple of tuples of int
        Stations in the order in which they are read, a tuple a run; station 0 is the highest.
    spacing : (float, float)
        Least and greatest distance of neighbouring stations.
    readings : int
        Readings a stop.
    reading_noise, reseating : float
        Sd of a reading within its visit, and of a visit.
    rate_sd : float
        Sd of the mean drift rate, m/s3, which is drawn for every run.
    bend : float
        Greatest departure of the quadratic drift of every run from its best straight line.
    wander : float
        Root mean square, over the run and about its best straight line, that an integrated random walk has on
        average; `exactly` scales each walk to it.
    exactly : bool
    tares : int
        In gaps between visits drawn at random, over all runs together.
    tare_size : float
        Either sign.
    gross_share, gross_least, gross_most : float
        Share of the readings with gross errors, rounded up, and their size, either sign.
    pause : (float, float)
        Least and greatest time from the last reading of a stop to the first of the next.
    """

    stops: Stops
    spacing: tuple[float, float] = (20.0, 80.0)
    readings: int = 1
    reading_noise: float = 3.0 * MICROGAL
    reseating: float = 3.0 * MICROGAL
    rate_sd: float = 0.05 * MILLIGAL / HOUR
    bend: float = 0.0
    wander: float = 0.0
    exactly: bool = False
    tares: int = 0
    tare_size: float = 40.0 * MICROGAL
    gross_share: float = 0.0
    gross_least: float = 50.0 * MICROGAL
    gross_most: float = 200.0 * MICROGAL
    pause: tuple[float, float] = (600.0, 1500.0)

    @property
    def stations(self) -> int:
        """Number of stations."""
        return 1 + max(max(run) for run in self.stops)

    @property
    def visit_sd(self) -> float:
        """Sd of the mean of one visit."""
        return float(np.sqrt(self.reseating**2 + self.reading_noise**2 / self.readings))

    @property
    def freedom(self) -> int:
        """Visits less what they must tell: stations, a bias and the drift of each run, tares; the level left out."""
        order = 2 if self.bend else 1
        return sum(map(len, self.stops)) - (self.stations + (1 + order) * len(self.stops) - 1) - self.tares


EVERY_FIFTH = Scheme(stops=second_pass(30))
"""30 stations, every fifth stop at the base, a second pass on every other one: 25 degrees of freedom."""
SEVENTEEN = Scheme(stops=loops(9, 3))
"""Three loops past nine stations: 17 degrees of freedom."""
QUIET = Scheme(stops=loops(8, 4), reading_noise=3e-8 / np.sqrt(2.0), reseating=3e-8 / np.sqrt(2.0))
"""Four loops past eight stations, 3 uGal a visit."""
FEW_RETURNS = Scheme(stops=base_returns(16, 5))
"""Five returns to the base and nothing else twice: 4 degrees of freedom."""
NO_RETURN = Scheme(stops=one_pass(20), readings=3)
VARIED = {
    "every fifth stop at base, second pass": EVERY_FIFTH,
    "the same, drift bent by 10 sd": replace(EVERY_FIFTH, bend=10.0 * EVERY_FIFTH.visit_sd),
    "the same, 20 stations, reading noise rules": Scheme(
        stops=second_pass(20), readings=5, reading_noise=8e-8, reseating=2e-8
    ),
    "the same, 20 stations, re-seating rules": Scheme(
        stops=second_pass(20), readings=5, reading_noise=3e-8, reseating=8e-8
    ),
    "there and back, 30 stations": Scheme(stops=there_and_back(30)),
    "there and back, 10 close stations": Scheme(stops=there_and_back(10), spacing=(3.0, 12.0), readings=3),
    "three loops": SEVENTEEN,
    "four trips of ten stations": Scheme(stops=trips(10, 4)),
    "four loops, two listed tares": replace(QUIET, tares=2),
    "five base returns only": FEW_RETURNS,
}


def honest_instrument(scheme: Scheme) -> Instrument:
    """An instrument that states the true noise and the true doubt about its drift rate.

    Where a stop has one reading, noise within visits and re-seating are told together: the floor stands for the
    one, the stated re-seating for all the rest.
    """
    plain = Instrument(name="A", drift_rate_sd=scheme.rate_sd)
    if scheme.readings > 1:
        return replace(plain, reseating_sd=scheme.reseating)
    return replace(plain, reseating_sd=float(np.sqrt(scheme.visit_sd**2 - plain.reading_floor**2)))


@dataclass(frozen=True, eq=False, kw_only=True)
class Simulated:
    """A survey and its truth.

    Parameters
    ----------
    case : Case
    scheme : Scheme
    density : (k,) array
        Of the intervals between neighbouring stations, kg/m3.
    gravity : (s,) array
        Less that of station 0, m/s2.
    by_gravity : (k, s) array
        What gravity moves in the densities, kg/m3 per m/s2, station 0 as datum.
    time, station, run, visit : (n,) arrays
        Of every reading, in its order.
    drift : (n,) array
        Polynomial, walk and tares, m/s2; bias not counted.
    rate : tuple of float
        Mean rate of each run without walk and tares, m/s3.
    strength : tuple of float
        Of the walk of each run, m/s2/s^1.5.
    tares : tuple of Tare
        With their true sizes.
    gross : (n,) bool array
    """

    case: Case
    scheme: Scheme
    density: NDArray[np.float64]
    gravity: NDArray[np.float64]
    by_gravity: NDArray[np.float64]
    time: NDArray[np.float64]
    station: NDArray[np.intp]
    run: NDArray[np.intp]
    visit: NDArray[np.intp]
    drift: NDArray[np.float64]
    rate: tuple[float, ...]
    strength: tuple[float, ...]
    tares: tuple[Tare, ...]
    gross: NDArray[np.bool_]


def simulated(
    scheme: Scheme,
    seed: int,
    *,
    instrument: Instrument | None = None,
    list_tares: bool = False,
    recipe: Recipe = EXACT_DEPTHS,
    **changed: Any,
) -> Simulated:
    """A survey of one scheme.

    Parameters
    ----------
    scheme : Scheme
    seed : int
    instrument : Instrument or None
        Named "A". None: one that states the truth.
    list_tares : bool
        True: the survey lists its tares, without their sizes.
    recipe : Recipe
    changed
        Keys of the recipe.
    """
    chance = [np.random.default_rng([seed, stream]) for stream in range(8)]
    depth = np.concatenate([[0.0], np.cumsum(chance[0].uniform(*scheme.spacing, scheme.stations - 1))])
    density = chance[0].uniform(2200.0, 2800.0, len(depth) - 1)
    gravity, by_gravity = _true_gravity(depth, density)
    station = np.repeat(np.array([one for run in scheme.stops for one in run]), scheme.readings)
    stop_run = np.array([number for number, run in enumerate(scheme.stops) for _ in run])
    run, visit = np.repeat(stop_run, scheme.readings), np.repeat(np.arange(len(stop_run)), scheme.readings)
    time = _times(scheme, stop_run, chance[1])
    drift, rate, strength = np.zeros(len(time)), [], []
    bias = 1000.0 * MICROGAL * chance[2].standard_normal(len(scheme.stops))
    for number in range(len(scheme.stops)):
        past = time[run == number] - time[run == number][0]
        share = past / past[-1]
        rate.append(float(scheme.rate_sd * chance[2].standard_normal()))
        # t2 - t + 1/6 is what a parabola leaves of its best straight line from 0 to 1; 1/6, at both ends, is the most.
        drift[run == number] = rate[-1] * past + 6.0 * scheme.bend * (share**2 - share)
        strength.append(walk_strength(scheme.wander, float(past[-1])))
        walk = strength[-1] * _walk(past, chance[3])
        if scheme.exactly and scheme.wander:
            walk *= scheme.wander / _about_line(past, walk)
        drift[run == number] += walk
    tares = _tares(scheme, stop_run, visit, time, chance[4])
    for one in tares:
        drift += one.size * ((run == int(one.run)) & (time >= one.time))
    noise = scheme.reading_noise * chance[5].standard_normal(len(time))
    noise += scheme.reseating * chance[6].standard_normal(len(stop_run))[visit]
    gross = np.zeros(len(time), dtype=bool)
    gross[chance[7].permutation(len(time))[: int(np.ceil(scheme.gross_share * len(time)))]] = True
    size = chance[7].uniform(scheme.gross_least, scheme.gross_most, len(time))
    wrong = np.where(gross, size * chance[7].choice([-1.0, 1.0], len(time)), 0.0)
    reading = gravity[station] + bias[run] + drift + noise + wrong
    rows = [
        Row(time=t, reading=value, depth=depth[at], station=f"S{at:03d}", run=str(of))
        for t, value, at, of in zip(time.tolist(), reading.tolist(), station.tolist(), run.tolist(), strict=True)
    ]
    case = made_case(
        rows,
        instruments=(instrument or honest_instrument(scheme),),
        tares=tuple(Tare(run=one.run, time=one.time) for one in tares) if list_tares else (),
        recipe=recipe,
        **changed,
    )
    return Simulated(
        case=case, scheme=scheme, density=density, gravity=gravity, by_gravity=by_gravity, time=time, station=station,
        run=run, visit=visit, drift=drift, rate=tuple(rate), strength=tuple(strength), tares=tares, gross=gross,
    )  # fmt: skip


def walk_strength(wander: float, length: float) -> float:
    """Strength of an integrated random walk, m/s2/s^1.5, that has a given root mean square about its best line.

    Notes
    -----
    With unit strength over unit time the mean square of the walk is 1/12 on average; its mean takes 1/20 of that
    away and its slope 3 (1/20 - 1/18 + 1/63): 1/420 is left, worked out by hand from w(t) = int (t - u) dB(u).
    """
    return wander * np.sqrt(420.0 / length**3)


def walk_covariance(past: NDArray[np.float64]) -> NDArray[np.float64]:
    """Covariance of an integrated random walk of unit strength that starts at 0 with rate 0, (n, n)."""
    least, most = np.minimum.outer(past, past), np.maximum.outer(past, past)
    return least**2 * most / 2.0 - least**3 / 6.0


def _walk(past: NDArray[np.float64], chance: np.random.Generator) -> NDArray[np.float64]:
    """An integrated random walk of unit strength at the given times, each step with its exact covariance."""
    walk, rate = np.zeros(len(past)), 0.0
    for number, step in enumerate(np.diff(past).tolist(), 1):
        first, second = chance.standard_normal(2)
        walk[number] = walk[number - 1] + rate * step + step**1.5 * (first / 2.0 + second / np.sqrt(12.0))
        rate += np.sqrt(step) * first
    return walk


def _about_line(past: NDArray[np.float64], values: NDArray[np.float64]) -> float:
    """Root mean square of values about their best straight line."""
    return float(np.std(values - np.polynomial.Polynomial.fit(past, values, 1)(past)))


def _times(scheme: Scheme, stop_run: NDArray[np.intp], chance: np.random.Generator) -> NDArray[np.float64]:
    """Time of every reading, s; whole seconds, a night between runs."""
    pause = np.round(chance.uniform(*scheme.pause, len(stop_run)))
    pause[1:][np.diff(stop_run) > 0] = 12.0 * HOUR
    start = np.cumsum(pause + READING_INTERVAL * (scheme.readings - 1))
    return (start[:, None] + READING_INTERVAL * np.arange(scheme.readings)).ravel()


def _tares(
    scheme: Scheme,
    stop_run: NDArray[np.intp],
    visit: NDArray[np.intp],
    time: NDArray[np.float64],
    chance: np.random.Generator,
) -> tuple[Tare, ...]:
    """Tares in the middle of gaps between visits of one run."""
    gaps = np.flatnonzero(np.diff(stop_run) == 0)
    chosen = np.sort(chance.choice(gaps, scheme.tares, replace=False))
    return tuple(
        Tare(
            run=str(stop_run[gap]),
            time=float(time[visit == gap][-1] + time[visit == gap + 1][0]) / 2.0,
            size=float(scheme.tare_size * chance.choice([-1.0, 1.0])),
        )
        for gap in chosen
    )


def _true_gravity(
    depth: NDArray[np.float64], density: NDArray[np.float64]
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Gravity of the stations of a vertical hole less that of the first, and what it moves in the densities.

    The shell theorem from the top down, d(delta r2)/dr = 4 pi G rho r2, with delta = g - gamma = 0 at the first.
    """
    height = SITE.collar_elevation + SITE.geoid_height - depth
    radius = 1.0 / mean_curvature(SITE.latitude, WGS84) + height
    volume = FOUR_PI_G * (radius[:-1] ** 3 - radius[1:] ** 3) / 3.0
    delta = np.concatenate([[0.0], -np.cumsum(volume * density)]) / radius**2
    gravity = gravity_at_height("WGS84", latitude=SITE.latitude, height=height) + delta
    by_gravity = np.zeros((len(density), len(depth)))
    at = np.arange(len(density))
    by_gravity[at, at], by_gravity[at, at + 1] = radius[:-1] ** 2 / volume, -(radius[1:] ** 2) / volume
    return gravity - gravity[0], by_gravity


@dataclass(frozen=True, eq=False, kw_only=True)
class Best:
    """The best linear unbiased estimate of a simulated survey: densities, kg/m3, and their covariance."""

    density: NDArray[np.float64]
    covariance: NDArray[np.float64]


def best_estimate(one: Simulated) -> Best:
    """Densities by dense generalised least squares with the true noise, drift order, walk, tares and gross rows.

    Unknown are station gravity (less that of station 0), a bias and the drift of each run and the sizes of the
    tares; what is known beforehand of a run's mean rate enters as an observation. Rows with gross errors count with
    the mean square of such errors added to their variance. Where a stop has many readings their slope within the stop
    tells of drift too, as the reduction does not ask: without any return that makes the best estimate better, else
    it is nothing.
    """
    scheme, time, station, run, visit = one.scheme, one.time, one.station, one.run, one.visit
    observed = one.case.survey.readings.reading.values
    order = 2 if scheme.bend else 1
    columns = [station == number for number in range(1, scheme.stations)]
    known: list[tuple[list[int], float]] = []
    least, most = scheme.gross_least, scheme.gross_most
    wrong = one.gross * (least**2 + least * most + most**2) / 3.0
    covariance = np.diag(scheme.reading_noise**2 + wrong) + scheme.reseating**2 * (visit[:, None] == visit)
    for number in range(len(scheme.stops)):
        mine = run == number
        length = np.ptp(time[mine])
        past = np.where(mine, time - time[mine][0], 0.0)
        columns.append(mine)
        known.append(([len(columns) + power for power in range(order)], length))
        columns += [mine * (past / length) ** power for power in range(1, order + 1)]
        if scheme.wander:
            covariance += np.outer(mine, mine) * one.strength[number] ** 2 * walk_covariance(past)
    columns += [(run == int(tare.run)) & (time >= tare.time) for tare in one.tares]
    # In units of 1e-8 m/s2, so that no matrix is lost to underflow or to bad scaling.
    design = np.column_stack(columns).astype(float)
    weighted = np.linalg.solve(covariance / MICROGAL**2, np.column_stack([design, observed / MICROGAL]))
    normal, side = design.T @ weighted[:, :-1], design.T @ weighted[:, -1]
    for unknowns, length in known:
        row = np.zeros(len(columns))
        row[unknowns] = 1.0 / (length * scheme.rate_sd / MICROGAL)
        normal += np.outer(row, row)
    inverse = np.linalg.inv(normal)
    stations = scheme.stations - 1
    gravity = np.concatenate([[0.0], (inverse @ side)[:stations]]) * MICROGAL
    through = one.by_gravity[:, 1:] * MICROGAL
    return Best(
        density=one.density + one.by_gravity @ (gravity - one.gravity),
        covariance=through @ inverse[:stations, :stations] @ through.T,
    )
