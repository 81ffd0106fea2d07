"""What may be changed about drift, tares and noise of a case, one change at a time: acts where there are some.

A change that a person can make by acts leaves the case as those acts do: what the recipe leaves to the program (drift
orders, the walk, found jumps) is chosen anew. A change of drift orders holds all other orders where they are, and the
walk on or off as it is in force.
"""

from __future__ import annotations

import json
from collections.abc import Iterator
from dataclasses import dataclass, replace
from datetime import UTC, datetime, timedelta

from plumbwell.reduction.drift_basis import HIGHEST_ORDER
from plumbwell.study.act import Act
from plumbwell.study.act_wording import tare_words
from plumbwell.study.case import Case
from plumbwell.study.docket.wording import counted
from plumbwell.study.network_steps import AUTOMATIC, applicable
from plumbwell.study.overlay import with_uses
from plumbwell.study.recipe_acts import SetRecipe
from plumbwell.study.results import Results
from plumbwell.study.tare_acts import AddTare, DropTare
from plumbwell.survey.errors import shown
from plumbwell.survey.instrument import Run, Tare

UNKNOWN = float("nan")


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Change:
    """One change of a case, before it is reduced: `acts` as in `Alternative`; None: `case` is the changed case, and
    `written` what stands in survey.toml for it. `raised` are the runs whose order is higher."""

    key: str
    sentence: str
    run: str = ""
    time: float = UNKNOWN
    acts: tuple[Act, ...] | None = None
    case: Case | None = None
    written: tuple[str, ...] = ()
    raised: tuple[int, ...] = ()

    @property
    def edits(self) -> tuple[str, ...]:
        """What stands in survey.toml for it."""
        return self.written if self.acts is None else tuple(_edit(act) for act in self.acts)

    def changed(self, case: Case) -> Case:
        """The case after the change.

        Raises
        ------
        ActRefused
            The case cannot take one of the acts.
        """
        if self.acts is None:
            return case if self.case is None else self.case
        for act in self.acts:
            case = act.apply(case)
        return case


def _stamp(seconds: float) -> str:
    """A time in s since 2000-01-01 as ISO 8601, UTC, to the ms where it is no whole second."""
    moment = datetime(2000, 1, 1, tzinfo=UTC) + timedelta(milliseconds=round(seconds * 1000.0))
    whole = moment.microsecond == 0
    return moment.replace(tzinfo=None).isoformat(timespec="seconds" if whole else "milliseconds") + "Z"


def _edit(act: Act) -> str:
    """What stands in survey.toml for an act."""
    if isinstance(act, SetRecipe):
        return f"[recipe] {act.key} = {_toml(act.value)}"
    if isinstance(act, AddTare | DropTare):
        none = "no " if isinstance(act, DropTare) else ""
        return f'{none}[[tare]] run = {_toml(act.run)}, time = "{_stamp(act.time)}"'
    return act.kind


def _toml(value: object) -> str:
    return json.dumps(value, ensure_ascii=False)


def _run_names(base: Results) -> tuple[str, ...]:
    return base.survey.readings.run.names


def _set(case: Case, key: str, value: str | int) -> SetRecipe:
    return SetRecipe(name=case.chosen_name, key=key, value=value)


def single_orders(case: Case, base: Results) -> Iterator[Change]:
    """Each run's order one lower and one higher, from 1 to 3; a run of a single time has no drift."""
    visits, orders, names = base.network.visits, base.network.adjustment.orders, _run_names(base)
    for run in visits.run_order.tolist():
        if not visits.run_length[run] > 0.0:
            continue
        for key, order in (("order_lower", orders[run] - 1), ("order_higher", orders[run] + 1)):
            if not 1 <= order <= HIGHEST_ORDER:
                continue
            changed = (*orders[:run], order, *orders[run + 1 :])
            yield _of_orders(
                case, base, changed, key=f"{key}:{names[run]}", run=names[run],
                sentence=f"Drift of run {shown(names[run])} of order {order} in place of {orders[run]}.",
            )


def orders_together(case: Case, base: Results, open_runs: set[int]) -> Iterator[Change]:
    """The orders of all automatic runs one higher, where there are two such runs or more."""
    fit, visits = base.network.adjustment, base.network.visits
    automatic = _automatic(case, base)
    raised = [
        run for run in visits.run_order.tolist()
        if run in automatic and run not in open_runs and 0 < fit.orders[run] < HIGHEST_ORDER
    ]  # fmt: skip
    if len(raised) < 2:
        return
    orders = tuple(order + 1 if run in raised else order for run, order in enumerate(fit.orders))
    yield _of_orders(
        case, base, orders, key="orders_higher",
        sentence=f"Drift of {counted(len(raised), 'run')} whose order is chosen, one order higher.",
    )


def _stated_orders(base: Results) -> dict[str, int | str]:
    return {one.name: one.drift_order for one in base.survey.runs if one.drift_order is not None}


def _automatic(case: Case, base: Results) -> set[int]:
    stated, of_recipe = _stated_orders(base), case.chosen.drift_order
    return {run for run, name in enumerate(_run_names(base)) if stated.get(name, of_recipe) == AUTOMATIC}


def _of_orders(
    case: Case, base: Results, orders: tuple[int, ...], *, key: str, sentence: str, run: str = ""
) -> Change:
    """The case with all orders written down, and the walk held on or off as it is in force."""
    fit, names, recipe = base.network.adjustment, _run_names(base), case.chosen
    raised = tuple(code for code, order in enumerate(orders) if order > fit.orders[code])
    walk: str | float = recipe.drift_walk
    if walk == "auto":
        walk = "off" if fit.walk is None else "on"
    acts = _order_acts(case, base, orders, walk)
    if acts is not None:
        return Change(key=key, sentence=sentence, run=run, acts=acts, raised=raised)
    wanted = {name: order for name, order, at in zip(names, orders, fit.basis.length, strict=True) if at > 0.0}
    listed = {one.name for one in case.survey.runs}
    runs = tuple(replace(one, drift_order=wanted.get(one.name, one.drift_order)) for one in case.survey.runs)
    runs += tuple(Run(name=name, drift_order=order) for name, order in wanted.items() if name not in listed)
    changed = replace(case, survey=replace(case.survey, runs=runs))
    written = ["[[run]] drift_order of each as in orders"]
    if walk != recipe.drift_walk:
        written.append(f"[recipe] drift_walk = {_toml(walk)}")
        changed = changed.with_recipe(case.chosen_name, replace(recipe, drift_walk=walk))
    return Change(key=key, sentence=sentence, run=run, case=changed, written=tuple(written), raised=raised)


def _order_acts(
    case: Case, base: Results, orders: tuple[int, ...], walk: str | float
) -> tuple[Act, ...] | None:
    """Acts on the recipe that give these orders: where the runs that state none of their own have all the same."""
    visits, stated, fit = base.network.visits, _stated_orders(base), base.network.adjustment
    free, own = set(), True
    for run in visits.run_order.tolist():
        name = _run_names(base)[run]
        if name not in stated:
            if visits.run_length[run] > 0.0:
                free.add(orders[run])
        elif stated[name] == AUTOMATIC or orders[run] != fit.orders[run]:
            own = False
    if len(free) != 1 or not own:
        return None
    acts: list[Act] = [_set(case, "drift_order", free.pop())]
    if isinstance(walk, str) and walk != case.chosen.drift_walk:
        acts.append(_set(case, "drift_walk", walk))
    return tuple(acts)


def walks(case: Case, base: Results) -> Iterator[Change]:
    """The walk off where it is on, on where it is off."""
    fit, asked = base.network.adjustment, case.chosen.drift_walk
    if fit.walk is not None:
        yield Change(key="walk_off", sentence="No random walk of the drift.", acts=(_set(case, "drift_walk", "off"),))
    if any(fit.orders) and asked != "on" and (fit.walk is None or not isinstance(asked, str)):
        yield Change(
            key="walk_on", sentence="A random walk of the drift, its strength estimated.",
            acts=(_set(case, "drift_walk", "on"),),
        )


def tares(case: Case, base: Results) -> Iterator[Change]:
    """Tares left out or taken in, one by one and all together; a walk in their place, and beside those proposed."""
    names, network, recipe_walk = _run_names(base), base.network, case.chosen.drift_walk
    laid = with_uses(case.survey, case.overlay)
    found = [AddTare(run=names[one.run], time=one.time) for one in applicable(network.judgement, base.recipe)]
    applied = found if network.proposed_applied else []
    inside = {(one.run, one.time) for one in network.adjustment.basis.tares}
    listed = [one for one in laid.tares if (one.run, one.time) in inside]
    walk = () if network.adjustment.walk is not None or recipe_walk == "on" else (_set(case, "drift_walk", "on"),)
    out_of_recipe = (_set(case, "tares", "listed"),) if applied else ()
    for tare in listed:
        yield _tare_change("out", tare, (DropTare(run=tare.run, time=tare.time),))
    for act in applied:
        others = tuple(one for one in applied if one is not act)
        yield _tare_change("out", act, (*out_of_recipe, *others))
    count = len(listed) + len(applied)
    drops: tuple[Act, ...] = (*out_of_recipe, *(DropTare(run=one.run, time=one.time) for one in listed))
    if count > 1:
        yield Change(key="tares_out", sentence=f"All {count} tares left out.", acts=drops)
    if count and walk:
        which = "the tare" if count == 1 else f"the {count} tares"
        yield Change(
            key="tares_out_walk_on", acts=(*drops, *walk), sentence=f"A random walk of the drift in place of {which}."
        )
    proposed = [] if applied else found
    for act in proposed:
        yield _tare_change("in", act, (act,))
    if not proposed:
        return
    together = (_set(case, "tares", "proposed"),)
    if len(proposed) > 1:
        yield Change(key="tares_in", sentence=f"All {len(proposed)} proposed tares taken in.", acts=together)
    if walk:
        which = "The proposed tare" if len(proposed) == 1 else f"All {len(proposed)} proposed tares"
        yield Change(
            key="tares_in_walk_on", acts=(*together, *walk),
            sentence=f"{which} taken in, and a random walk of the drift beside.",
        )


def _tare_change(which: str, tare: Tare | AddTare, acts: tuple[Act, ...]) -> Change:
    words = {"out": "left out", "in": "taken in"}[which]
    proposed = "Proposed tare" if which == "in" else "Tare"
    return Change(
        key=f"tare_{which}:{tare.run}@{_stamp(tare.time)}", run=tare.run, time=tare.time, acts=acts,
        sentence=f"{proposed} in {tare_words(tare.run, tare.time)} {words}.",
    )


def outliers(case: Case, base: Results) -> Iterator[Change]:
    """What else may happen to readings that do not fit, where some are named."""
    rows = len(base.network.outlier_rows)
    if not rows:
        return
    readings = counted(rows, "reading")
    for value, what in (
        ("flag", f"{readings} that do not fit, kept in full."),
        ("downweight", f"Readings weighed by how they fit; {readings} do not."),
        ("exclude", f"{readings} that do not fit, left out."),
    ):
        if value != case.chosen.outliers:
            yield Change(key=f"outliers_{value}", sentence=what, acts=(_set(case, "outliers", value),))
