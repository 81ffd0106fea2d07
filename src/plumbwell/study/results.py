"""What a reduction gives: tables of columns for readings, stations, intervals and layers, and the docket.

All values are SI; `study.tables` says how each stands in an output file.
"""

from __future__ import annotations

from dataclasses import dataclass, field

from plumbwell.density.interval import IntervalDensities
from plumbwell.density.interval_errors import IntervalErrors
from plumbwell.density.layers import Layers
from plumbwell.density.log_mean import LogMeans
from plumbwell.reduction.adjustment import Adjustment
from plumbwell.reduction.datums import StationGravity
from plumbwell.reduction.effects import Anomalies, FreeAirChoice, KnownParts
from plumbwell.reduction.estimates import Estimates
from plumbwell.reduction.found_errors import ProposedTare
from plumbwell.reduction.judged import Judgement
from plumbwell.reduction.located import Located
from plumbwell.reduction.network import TieRows
from plumbwell.reduction.network_parts import Parts
from plumbwell.reduction.rank_lost import OpenDirections
from plumbwell.reduction.reference_rock import ReferenceLayers
from plumbwell.reduction.scale_factor import ScaleTold
from plumbwell.reduction.settling import Settling
from plumbwell.reduction.tide_effect import TideComparison
from plumbwell.reduction.tilt_pressure import Pressure
from plumbwell.reduction.visits import Visits
from plumbwell.study.finding import Finding
from plumbwell.survey.column import Column, Index
from plumbwell.survey.recipe import Recipe
from plumbwell.survey.survey import Survey


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class ReadingResults:
    """Every raw row, (n,) each: corrections m/s2 and what the network leaves.

    `estimates` holds run bias, drift, visit effect, residual, standardised residual and redundancy.
    """

    utc: Column
    calibrated: Column
    tide: Column
    tilt: Column
    pressure_effect: Column
    to_station: Column
    observed: Column
    estimates: Estimates


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class StationResults:
    """Stations from the top down, (s,) each.

    Parameters
    ----------
    label, role : tuple of str
    located : Located
        Depths and positions.
    visits : (s,) int array
        Number of used visits.
    gravity, gravity_sd : Column, m/s2
    parts : KnownParts
    anomalies : Anomalies
    """

    label: tuple[str, ...]
    role: tuple[str, ...]
    located: Located
    visits: Index
    gravity: Column
    gravity_sd: Column
    parts: KnownParts
    anomalies: Anomalies

    def __len__(self) -> int:
        return len(self.label)


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class IntervalResults:
    """Intervals from the top down, (k,) each.

    Parameters
    ----------
    from_station, to_station : tuple of str
    densities : IntervalDensities
    errors : IntervalErrors
    log : LogMeans
    density, density_sd, density_common_sd, density_slab, log_density, density_less_log : Column, kg/m3
    log_coverage : Column, 0 to 1
    dof : int
        Degrees of freedom of Student's t for intervals of confidence.
    """

    from_station: tuple[str, ...]
    to_station: tuple[str, ...]
    densities: IntervalDensities
    errors: IntervalErrors
    log: LogMeans
    density: Column
    density_sd: Column
    density_common_sd: Column
    density_slab: Column
    log_density: Column
    log_coverage: Column
    density_less_log: Column
    dof: int

    def __len__(self) -> int:
        return len(self.from_station)

    def label(self, row: int) -> str:
        """The interval as `from~to`."""
        return f"{self.from_station[row]}~{self.to_station[row]}"


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class NetworkResults:
    """The adjusted network: what it rests on, its solution, its datum, and what does not fit it.

    Parameters
    ----------
    visits, ties, parts, adjustment, gravity
        As in force.
    tie_station : tuple of str
    judgement : Judgement
        Jumps that nobody listed and readings in error, whether they are taken out or not.
    proposed_applied : bool
        True where the jumps are taken out.
    walk_not_needed : bool
        True where a walk of the drift is left out because the found jumps explain what it would.
    scales : tuple of ScaleTold
        Scales that were asked to be estimated.
    settling : Settling
        How the visits settled.
    open : OpenDirections
        What the readings leave open.
    """

    visits: Visits
    ties: TieRows
    tie_station: tuple[str, ...]
    parts: Parts
    adjustment: Adjustment
    gravity: StationGravity
    judgement: Judgement
    proposed_applied: bool
    walk_not_needed: bool
    scales: tuple[ScaleTold, ...]
    settling: Settling
    open: OpenDirections

    @property
    def proposed(self) -> tuple[ProposedTare, ...]:
        """Jumps that nobody listed, in time order."""
        return self.judgement.proposed

    @property
    def outlier_rows(self) -> Index:
        """Rows of the readings that are named as outliers."""
        return self.judgement.rows


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Results:
    """One survey worked through with one recipe.

    Parameters
    ----------
    survey : Survey
    recipe : Recipe
    choice : FreeAirChoice
    reference : ReferenceLayers
    readings : ReadingResults
    network : NetworkResults
    stations : StationResults
    intervals : IntervalResults
    layers : Layers or None
        None: the recipe asks for none, or there is no interval.
    pressure : Pressure
    tide_comparison : TideComparison or None
    findings : tuple of Finding
        The docket, errors first.
    timing : dict of str to float
        Seconds of each part of the chain.
    """

    survey: Survey
    recipe: Recipe
    choice: FreeAirChoice
    reference: ReferenceLayers
    readings: ReadingResults
    network: NetworkResults
    stations: StationResults
    intervals: IntervalResults
    layers: Layers | None
    pressure: Pressure
    tide_comparison: TideComparison | None
    findings: tuple[Finding, ...] = ()
    timing: dict[str, float] = field(default_factory=dict)

    @property
    def absolute(self) -> bool:
        """True when a tie fixes the gravity of stations that were read."""
        return bool(((self.network.gravity.datum < 0) & (self.stations.visits > 0)).any())
