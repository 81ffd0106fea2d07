"""What else could have been done with drift, tares and noise: the adjustment in force, and one change at a time.

Each row is a reduction of its own, by the same chain, worked out when it is asked for. `orders`, `tares` and `walk` of
a row tell what came of a change where the recipe leaves them to the program.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np

from plumbwell.reduction.chance import chi_square_chance
from plumbwell.reduction.model_comparison import (
    change_test,
    comparable_likelihood,
    information_criterion,
    same_levels,
    squares,
)
from plumbwell.study.act import Act
from plumbwell.study.alternative_changes import (
    UNKNOWN,
    Change,
    orders_together,
    outliers,
    single_orders,
    tares,
    walks,
)
from plumbwell.study.case import Case
from plumbwell.study.kept import Kept
from plumbwell.study.reduce import quiet, reduce
from plumbwell.study.results import Results
from plumbwell.survey.column import Array
from plumbwell.survey.errors import PlumbwellError
from plumbwell.survey.survey import Survey

IN_FORCE = "in_force"
NOT_DETERMINED = "the readings do not determine a drift of that order"


@dataclass(frozen=True, slots=True, kw_only=True)
class Alternative:
    """One way to deal with drift, tares and noise, and what comes of it. NaN: not known. SI units.

    Parameters
    ----------
    key : str
        The same wherever the change means the same: `order_higher:2`, `tare_out:2@2026-05-04T11:42:00Z`.
    sentence : str
    run : str
        Of the change; empty where it is of no single run.
    time : float
        Of the tare, UTC, s since 2000-01-01.
    acts : tuple of Act or None
        What a person does to have it, one after another; none for the one in force. None: no act stands for it, it is
        written into survey.toml (`drift_order` of a run).
    edits : tuple of str
        What stands in survey.toml for it, from what the folder states with all acts so far.
    orders : tuple of (str, int)
        Drift order of each run, in time order.
    tares : int
        How many are taken out.
    freedom : int
        Degrees of freedom: used visits less the rank of their design.
    squares, squares_chance : float
        Weighted sum of squares of what is left (the modes of a walk are left as well), and the chance of as much.
        Where noise is estimated that is 1 a degree of freedom by construction.
    reseating_sd, reading_sd : float
        Root of the mean re-seating variance, and median sd of a reading, m/s2.
    walk : float
        Strength of the drift's random walk, m/s2/s^1.5; 0 for none.
    likelihood : float
        Logarithm of the restricted likelihood. To be compared only where orders and tares are the same: the walk on
        and off, say. See `gain` for all others.
    gain : float
        Of the logarithm of the likelihood of the visits freed of stations and biases alone, over the adjustment in
        force (see `reduction.model_comparison.comparable_likelihood`). It compares all rows that have it with each
        other, whatever their orders, tares and walks; where orders and tares are the same it is the difference of
        `likelihood`. NaN where readings are used that the one in force leaves out, or the other way round, where
        readings have robust weights, or stations hang together in another way. More terms gain by chance alone: how
        much that may be, `bic` and `f_chance` say. The noise of each row is that of its restricted likelihood, so that
        terms that explain nothing may lose a little.
    bic : float
        -2 likelihood (that of `gain`) + q ln(n), q the powers of drift, tares and estimated variances, n the degrees of
        freedom of the visits freed of stations and biases. Lower is better; it compares what `gain` compares.
    f, f_steps, f_freedom, f_chance : float, int, int, float
        F test between the one in force and this one, where one holds all fixed unknowns of the other and more, with
        the weights of the larger (that of the drift order's own test): the chance is that of a larger F when the
        smaller model is true. NaN and 0 elsewhere.
    largest_change : float
        Largest change of any interval density from the one in force, kg/m3, with its sign.
    largest_change_at : str
        That interval; empty where none moves.
    largest_change_sds : float
        The same over the interval's sd in force.
    most_sds : float
        Largest change over its sd of any interval, without sign.
    rms_change : float
        Root of the mean square of the changes, kg/m3.
    problem : str
        Why it cannot be worked out; empty where it can.
    """

    key: str
    sentence: str
    run: str = ""
    time: float = UNKNOWN
    acts: tuple[Act, ...] | None = None
    edits: tuple[str, ...] = ()
    orders: tuple[tuple[str, int], ...] = ()
    tares: int = 0
    freedom: int = 0
    squares: float = UNKNOWN
    squares_chance: float = UNKNOWN
    reseating_sd: float = UNKNOWN
    reading_sd: float = UNKNOWN
    walk: float = UNKNOWN
    likelihood: float = UNKNOWN
    gain: float = UNKNOWN
    bic: float = UNKNOWN
    f: float = UNKNOWN
    f_steps: int = 0
    f_freedom: int = 0
    f_chance: float = UNKNOWN
    largest_change: float = UNKNOWN
    largest_change_at: str = ""
    largest_change_sds: float = UNKNOWN
    most_sds: float = UNKNOWN
    rms_change: float = UNKNOWN
    problem: str = ""


def alternatives(
    case: Case | Survey | Results,
    *,
    results: Results | None = None,
    kept: Kept | None = None,
    progress: Callable[[float, str], None] = quiet,
) -> tuple[Alternative, ...]:
    """The adjustment in force and what else could have been done, one change each.

    Every run's drift order one lower and one higher, those of all automatic runs one higher, the walk on or off, each
    tare left out, each proposed one taken in and all of them, the walk with and in place of tares, and readings that do
    not fit left out, weighed less or kept.

    Parameters
    ----------
    case : Case, Survey or Results
        A survey stands for the case of its own recipe, results for the survey and the recipe that they rest on.
    results : Results or None
        Of the case, where they are there.
    kept : Kept or None
        What was worked out before, shared by all reductions.
    progress : callable
        Called with the share done (0 to 1) and what is being done.

    Returns
    -------
    tuple of Alternative
        The one in force first. What cannot be worked out says why.

    Raises
    ------
    SurveyError
        The survey cannot be reduced as it is.
    """
    keep = Kept() if kept is None else kept
    if isinstance(case, Results):
        results = case
        case = Case(survey=results.survey, recipe=results.recipe)
    elif isinstance(case, Survey):
        case = Case(survey=case)
    base = reduce(case, kept=keep) if results is None else results
    rows = [_row(Change(key=IN_FORCE, sentence="The adjustment in force.", acts=()), base, base)]
    single = list(single_orders(case, base))
    rest = [*walks(case, base), *tares(case, base), *outliers(case, base)]
    count = len(single) + len(rest) + 1
    open_runs: set[int] = set()

    def worked(change: Change) -> Alternative:
        progress(len(rows) / (count + 1), "working out what else could have been done")
        try:
            other = reduce(change.changed(case), kept=keep)
        except PlumbwellError as error:
            return _unworked(change, str(error))
        lost = {one.run for one in other.network.adjustment.design.lost if one.kind == "drift"}
        if lost & set(change.raised):
            open_runs.update(lost)
            return _unworked(change, NOT_DETERMINED)
        return _row(change, other, base)

    for change in single:
        row = worked(change)
        if row.problem != NOT_DETERMINED:
            rows.append(row)
    rows += [worked(change) for change in orders_together(case, base, open_runs)]
    rows += [worked(change) for change in rest]
    return tuple(rows)


def _unworked(change: Change, problem: str) -> Alternative:
    return Alternative(
        key=change.key, sentence=change.sentence, run=change.run, time=change.time, acts=change.acts,
        edits=change.edits, problem=problem,
    )


def _robust(results: Results) -> bool:
    """True where readings have robust weights, found anew in every reduction."""
    if results.recipe.outliers == "downweight":
        return True
    return results.recipe.outliers == "exclude" and bool(results.network.judgement.alike.any())


def _row(change: Change, results: Results, base: Results) -> Alternative:
    fit, first = results.network.adjustment, base.network.adjustment
    names, freedom = results.survey.readings.run.names, fit.reseating.freedom
    left = squares(fit) if freedom > 0 else UNKNOWN
    comparable = not _robust(results) and not _robust(base) and same_levels(fit, first)
    gain = bic = UNKNOWN
    test = None
    if comparable:
        reference = first.noise.variance + first.reseating.variance
        likelihood = comparable_likelihood(fit, reference)
        gain = likelihood - comparable_likelihood(first, reference)
        estimated = results.recipe.noise == "estimate" and freedom > 0
        walking = fit.walk is not None and isinstance(results.recipe.drift_walk, str)
        bic = information_criterion(fit, likelihood, variances=int(estimated) + int(walking))
        test = change_test(fit, first)
    largest = _changes(results, base)
    return Alternative(
        key=change.key,
        sentence=change.sentence,
        run=change.run,
        time=change.time,
        acts=change.acts,
        edits=change.edits,
        orders=tuple((names[run], fit.orders[run]) for run in results.network.visits.run_order.tolist()),
        tares=len(fit.basis.tares),
        freedom=freedom,
        squares=left,
        squares_chance=chi_square_chance(left, freedom=freedom) if freedom > 0 else UNKNOWN,
        reseating_sd=float(np.sqrt(np.mean(fit.reseating.variance))),
        reading_sd=float(np.median(fit.noise.sd)),
        walk=0.0 if fit.walk is None else fit.walk.strength,
        likelihood=fit.likelihood,
        gain=gain,
        bic=bic,
        f=UNKNOWN if test is None else test.f,
        f_steps=0 if test is None else test.steps,
        f_freedom=0 if test is None else test.freedom,
        f_chance=UNKNOWN if test is None else test.p,
        largest_change=largest.size,
        largest_change_at=largest.at,
        largest_change_sds=largest.sds,
        most_sds=largest.most_sds,
        rms_change=largest.rms,
    )


@dataclass(frozen=True, slots=True, kw_only=True)
class _Changes:
    size: float = UNKNOWN
    at: str = ""
    sds: float = UNKNOWN
    most_sds: float = UNKNOWN
    rms: float = UNKNOWN


def _changes(results: Results, base: Results) -> _Changes:
    """How interval densities move, over the intervals that both have."""
    mine, theirs = results.intervals, base.intervals
    at = {pair: row for row, pair in enumerate(zip(mine.from_station, mine.to_station, strict=True))}
    rows = [
        (at[pair], row)
        for row, pair in enumerate(zip(theirs.from_station, theirs.to_station, strict=True))
        if pair in at
    ]
    moved = _of_rows(mine.density.values, rows, 0) - _of_rows(theirs.density.values, rows, 1)
    sd = _of_rows(theirs.density_sd.values, rows, 1)
    known = np.flatnonzero(np.isfinite(moved))
    if not known.size:
        return _Changes()
    with np.errstate(divide="ignore", invalid="ignore"):
        ratio = np.where(sd > 0.0, moved / sd, np.nan)
    worst = int(known[np.argmax(np.abs(moved[known]))])
    told = np.abs(ratio[np.isfinite(ratio)])
    return _Changes(
        size=float(moved[worst]),
        at=theirs.label(rows[worst][1]) if moved[worst] else "",
        sds=float(ratio[worst]),
        most_sds=float(told.max()) if told.size else UNKNOWN,
        rms=float(np.sqrt(np.mean(moved[known] ** 2))),
    )


def _of_rows(values: Array, rows: Sequence[tuple[int, int]], which: int) -> Array:
    return values[np.array([one[which] for one in rows], dtype=np.intp)]
