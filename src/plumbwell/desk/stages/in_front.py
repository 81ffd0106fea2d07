"""What stands in front in each stage: the table of its ledger, and the plots beside it.

Before there is a result the readings are shown as they were written, and all else by a sentence. What is chosen, in
view and pointed at is put into the same views by the thread.
"""

from __future__ import annotations

from collections.abc import Collection
from typing import TYPE_CHECKING

from plumbwell.desk.following import TIMED
from plumbwell.desk.ledger.table import LedgerTable
from plumbwell.desk.look import Look
from plumbwell.desk.shown import Shown
from plumbwell.desk.stages import states
from plumbwell.desk.stages.density import density_table
from plumbwell.desk.stages.depth_tracks import density_tracks, reduction_tracks
from plumbwell.desk.stages.drift import drift_table
from plumbwell.desk.stages.handover import handover_table
from plumbwell.desk.stages.readings import readings_table
from plumbwell.desk.stages.reduction import reduction_table
from plumbwell.desk.stages.time_series import drift_plots, reading_plots
from plumbwell.plates.depth_scale import DepthScale
from plumbwell.study.case import Case

if TYPE_CHECKING:
    from plumbwell.desk.views import Views

DRIFT_WEIGHTS = (2.6, 1.0)
"""Heights of the visits against drift, and of the residuals under them."""

REDUCING = "The survey is being reduced."
CANNOT_REDUCE = "There is no result: the survey cannot be reduced as it stands. The line at the foot says why."
EMPTY = {
    states.READINGS: "There are no readings.",
    states.DRIFT: "No reading in use belongs to a station.",
    states.REDUCTION: "There is no station.",
    states.DENSITY: "One station makes no interval: densities need gravity at two depths.",
    states.HANDOVER: "",
}


def stage_table(
    stage: str, case: Case | None, one: Shown | None, depth: DepthScale, written: Collection[str]
) -> LedgerTable | None:
    """The table of a stage; None where there is nothing to show yet.

    Parameters
    ----------
    stage : str
    case : Case or None
        The present one, shown as written while there is no result.
    one : Shown or None
        The result in front.
    depth : DepthScale
    written : collection of str
        Names of the outputs that were written from it.
    """
    if stage == states.READINGS and case is not None:
        return readings_table(case if one is None else one.case, one, depth)
    if one is None:
        return None
    if stage == states.DRIFT:
        return drift_table(one)
    if stage == states.REDUCTION:
        return reduction_table(one)
    if stage == states.DENSITY:
        return density_table(one)
    return handover_table(one, written)


def show_plots(work: Views, look: Look, case: Case | None, one: Shown | None, waiting: str) -> None:
    """Put the plots of the stage in front beside its ledger.

    Parameters
    ----------
    work : Views
    look : Look
    case : Case or None
    one : Shown or None
    waiting : str
        Why there is no result; where there is none.
    """
    stage = work.stage
    if stage in TIMED:
        work.plots.setCurrentWidget(work.times)
        if stage == states.READINGS and case is not None:
            work.times.set_plots(reading_plots(case if one is None else one.case, one), noun="reading")
        elif one is not None:
            plots = drift_plots(one)
            work.times.set_plots(plots, DRIFT_WEIGHTS[: len(plots)])
        else:
            work.times.set_plots(())
            work.times.set_empty(waiting)
    elif stage == states.HANDOVER:
        work.plots.setCurrentWidget(work.handover)
    else:
        work.plots.setCurrentWidget(work.tracks)
        if one is None:
            work.tracks.set_tracks(
                (), depth_label=look.depth.label, unit=look.depth.unit, upward=False, stations=(), markers=(),
                measured=(0.0, 1.0), stage=stage,
            )  # fmt: skip
            return
        bars = look.theme.reach
        work.tracks.set_tracks(
            density_tracks(one, bars) if stage == states.DENSITY else reduction_tracks(one, bars),
            depth_label=one.plate.depth_label,
            unit=one.plate.depth_unit,
            upward=one.scale.upward,
            stations=[station.depth for station in one.plate.stations],
            markers=one.plate.markers,
            measured=one.plate.depth_range,
            stage=stage,
        )
