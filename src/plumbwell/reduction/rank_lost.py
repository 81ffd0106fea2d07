"""What the gravity of stations loses when readings and priors leave unknowns of the drift open.

Such an unknown is held at 0 while the network is solved. Along with it moves all that no reading tells from it:
other unknowns of the border, and stations. A station that moves against its datum has no gravity; one that does not
keeps its own, whatever the held value is.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from plumbwell.reduction.broken_visits import unbroken_stretches
from plumbwell.reduction.drift_basis import DriftBasis, DriftUnknown, regressor
from plumbwell.reduction.estimates import Estimates
from plumbwell.reduction.network import TieRows
from plumbwell.reduction.network_parts import Parts
from plumbwell.reduction.visits import Visits
from plumbwell.survey.column import Array, Column, Index, Input, Law, computed, constant_column

UNTOUCHED = 1e-6
"""Of the largest change that an unknown of a direction makes at any visit; what moves by less stands still."""


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class OpenDirections:
    """Changes of the unknowns that change no visit, no tie and no prior: one for each unknown that was held.

    Parameters
    ----------
    unknowns : tuple of DriftUnknown
        Those of the border, the held ones last.
    border : (q, k) array
        Change of each; 0 for all held ones but the direction's own. The largest change that one unknown of a
        direction makes at any visit is 1.
    stations : (s, k) array
        Change of each station's gravity, before a datum.
    """

    unknowns: tuple[DriftUnknown, ...]
    border: Array
    stations: Array

    def undetermined(self, datum: Index, *, held: DriftUnknown | None = None) -> NDArray[np.bool_]:
        """True for the stations whose gravity the readings leave open, (s,).

        Parameters
        ----------
        datum : (s,) int array
            Datum station of each station, -1 where a tie fixes it.
        held : DriftUnknown or None
            Only what moves along with this one; None: with any.
        """
        moves = self.stations if held is None else self.stations[:, [self._direction(held)]]
        taken = np.where((datum >= 0)[:, None], moves[np.maximum(datum, 0)], 0.0)
        return np.any(np.abs(moves - taken) > UNTOUCHED, axis=1)

    def moves(self, unknown: DriftUnknown) -> bool:
        """True for an unknown of the border that the readings leave open: held, or moving along with a held one."""
        if unknown not in self.unknowns:
            return False
        row = np.abs(self.border[self.unknowns.index(unknown)])
        return bool(np.any(row > UNTOUCHED * np.max(np.abs(self.border), axis=0, initial=0.0)))

    def partners(self, held: DriftUnknown) -> tuple[DriftUnknown, ...]:
        """The unknowns that move along with a held one, itself left out."""
        change = np.abs(self.border[:, self._direction(held)])
        moved = change > UNTOUCHED * np.max(change)
        return tuple(one for one, moves in zip(self.unknowns, moved.tolist(), strict=True) if moves and one != held)

    def _direction(self, held: DriftUnknown) -> int:
        return self.unknowns.index(held) - (len(self.unknowns) - self.border.shape[1])


def open_directions(
    basis: DriftBasis,
    visits: Visits,
    ties: TieRows,
    *,
    unknowns: Sequence[DriftUnknown],
    lost: Sequence[DriftUnknown],
    n_stations: int,
) -> OpenDirections:
    """The directions that a network leaves open, one for each lost unknown.

    Parameters
    ----------
    basis, visits, ties
        What the network rests on.
    unknowns : sequence of DriftUnknown
        The border unknowns that were solved for, of the orders that were chosen; constants that the datum of a part
        makes superfluous are not among them.
    lost : sequence of DriftUnknown
        Those that were held at 0, since nothing determines them; without them all is determined.
    n_stations : int

    Notes
    -----
    With g the stations, x the border and B the regressors of unbroken stretches of visits, a direction has
    g_j + (B x)_i = 0 for every stretch i at station j, g_j = 0 at a tie, and x changes no prior: neither the mean
    drift rate of a run nor a tare of a size with an sd. The stations eliminated, x is in the null space of
    the rows that remain. Even weights serve: asked is what can be told at all, not how well.
    """
    every = (*unknowns, *lost)
    if not lost:
        return OpenDirections(unknowns=every, border=np.zeros((len(every), 0)), stations=np.zeros((n_stations, 0)))
    start = unbroken_stretches(basis, visits)
    counts = np.diff(start)
    rows = np.column_stack(
        [np.add.reduceat(regressor(basis, one, visits.rows), start[:-1]) / counts for one in every]
    )
    station = visits.station[np.searchsorted(visits.start, start[:-1], side="right") - 1]
    mean = np.zeros((n_stations, len(every)))
    np.add.at(mean, station, rows)
    mean /= np.maximum(np.bincount(station, minlength=n_stations), 1)[:, None]
    mean[ties.station] = 0.0
    scale = np.sqrt(np.sum(rows**2, axis=0))
    scale = 1.0 / np.where(scale > 0.0, scale, 1.0)
    told = np.vstack([rows - mean[station], _prior_rows(basis, every)]) * scale
    # The lost unknowns alone are lacking, so that the null space has one dimension for each of them.
    null = np.linalg.eigh(told.T @ told)[1][:, : len(lost)] * scale[:, None]
    border = null @ np.linalg.pinv(null[-len(lost) :])
    border[-len(lost) :] = np.eye(len(lost))
    # Two tares in one gap cancel at every visit: what counts is the largest change that one unknown makes alone.
    border /= np.max(np.max(np.abs(rows), axis=0)[:, None] * np.abs(border), axis=0)
    return OpenDirections(unknowns=every, border=border, stations=-mean @ border)


WHERE_TOLD = Law(
    "estimate that the readings determine",
    "the estimate; none where an unknown that was held moves along",
    "definition",
    lambda estimate, told: np.where(np.asarray(told) > 0.0, estimate, np.nan),
)


def told_estimates(
    columns: Estimates, found: OpenDirections, basis: DriftBasis, visits: Visits, parts: Parts, datum: Index
) -> Estimates:
    """The estimates without those that the readings leave open: gravity of stations, run bias and drift of rows.

    Visit effects and residuals are the same whatever the held values are, and stay.

    Parameters
    ----------
    columns : Estimates
    found : OpenDirections
    basis, visits, parts
        What the network rests on.
    datum : (s,) int array
        Datum station of each station, -1 where a tie fixes it.
    """
    if not found.border.shape[1]:
        return columns
    at_station = constant_column("told", "", ~found.undetermined(datum))
    bias, drift = _open_rows(found, basis, parts, datum)

    def where_told(of: Column, told: Column) -> Column:
        return computed(of.key, of.unit, WHERE_TOLD, Input("estimate", of), Input("told", told))

    return replace(
        columns,
        gravity=where_told(columns.gravity, at_station),
        gravity_sd=where_told(columns.gravity_sd, at_station),
        run_bias=where_told(columns.run_bias, constant_column("told", "", ~bias)),
        drift=where_told(columns.drift, constant_column("told", "", ~drift)),
    )


def _open_rows(
    found: OpenDirections, basis: DriftBasis, parts: Parts, datum: Index
) -> tuple[NDArray[np.bool_], NDArray[np.bool_]]:
    """True for the rows whose run bias, and for those whose drift and tares, the readings leave open."""
    rows = np.arange(len(basis.run))
    bias = np.zeros((len(basis.start), found.border.shape[1]))
    drift = np.zeros((len(rows), found.border.shape[1]))
    for number, one in enumerate(found.unknowns):
        if one.kind == "bias":
            bias[one.run] += found.border[number]
        else:
            drift += regressor(basis, one, rows)[:, None] * found.border[number]
    for run, part in enumerate(parts.of_run.tolist()):
        members = np.flatnonzero((parts.of_station == part) & (datum >= 0) & (part >= 0))
        if members.size:
            bias[run] += found.stations[datum[members[0]]]
    return np.any(np.abs(bias) > UNTOUCHED, axis=1)[basis.run], np.any(np.abs(drift) > UNTOUCHED, axis=1)


def _prior_rows(basis: DriftBasis, unknowns: Sequence[DriftUnknown]) -> Array:
    """A row for each prior, (p, q): the mean drift of each run with a stated rate, tares of a size with an sd."""
    rows = []
    for run in sorted({one.run for one in unknowns if one.kind == "drift"}):
        if basis.rate_sd[run] < np.inf:
            # At the run's last used reading the scaled time is 1: the drift there is the sum of all powers.
            rows.append([1.0 if one.kind == "drift" and one.run == run else 0.0 for one in unknowns])
    for number, one in enumerate(unknowns):
        if one.kind == "tare" and basis.tares[one.tare].size_sd is not None:
            rows.append([1.0 if other == number else 0.0 for other in range(len(unknowns))])
    return np.array(rows, dtype=np.float64).reshape(len(rows), len(unknowns))
