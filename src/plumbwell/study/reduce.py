"""The one chain: a case worked through from raw rows to densities and docket.

`reduce` runs every step in order at every change; a step whose inputs are the same objects gives the object that
it gave before, and what follows is found again. Window, command line and Python share it.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from time import perf_counter

import numpy as np

from plumbwell.density.interval import LESS_LOG, IntervalDensities, Pairs, interval_densities, interval_pairs
from plumbwell.density.interval_errors import AlongHole, CommonTerms, IntervalErrors, interval_errors
from plumbwell.density.layer_boundaries import layer_boundaries
from plumbwell.density.layers import Layers, plain_layers
from plumbwell.density.log_mean import log_integrals, log_mean_columns
from plumbwell.reduction.adjustment import Adjustment
from plumbwell.reduction.calibration import calibrated
from plumbwell.reduction.effects import (
    anomalies,
    free_air_choice,
    known_parts,
    normal_at_station,
    normal_gravity,
    northward_pull,
    reference_shell,
)
from plumbwell.reduction.estimates import OBSERVED, TO_STATION, estimates
from plumbwell.reduction.located import Located, located
from plumbwell.reduction.network import TieRows
from plumbwell.reduction.positions import WellPath, well_path
from plumbwell.reduction.rank_lost import OpenDirections, open_directions, told_estimates
from plumbwell.reduction.reference_rock import reference_rock
from plumbwell.reduction.scale_factor import ScaleEstimate, scale_estimates
from plumbwell.reduction.settling import network_settling
from plumbwell.reduction.stations import placement, row_depths
from plumbwell.reduction.tide_effect import modelled_tide, shifted_tides, tide, tide_comparison, utc_time
from plumbwell.reduction.tilt_pressure import Pressure, pressure_effect, tilt
from plumbwell.reduction.to_station import gravity_slopes
from plumbwell.reduction.visits import Visits, visits
from plumbwell.study.case import Case
from plumbwell.study.docket.kinds import docket
from plumbwell.study.kept import Kept
from plumbwell.study.network_steps import (
    NetworkInputs,
    NetworkWork,
    doubtful_scales,
    network_work,
    noise_terms,
    rescaled,
    scales_told,
)
from plumbwell.study.overlay import with_notes, with_uses
from plumbwell.study.results import IntervalResults, NetworkResults, ReadingResults, Results, StationResults
from plumbwell.survey.column import (
    Column,
    Index,
    Input,
    computed,
    constant_column,
    frozen,
    frozen_index,
)
from plumbwell.survey.errors import SurveyError
from plumbwell.survey.instrument import Instrument
from plumbwell.survey.places import Markers, Ties
from plumbwell.survey.readings import Readings
from plumbwell.survey.recipe import Recipe
from plumbwell.survey.site import Site
from plumbwell.survey.survey import Survey

SCALE_STEPS = 3
"""Steps in which an estimated scale settles: each leaves of the last what that was of 1."""


def quiet(share: float, what: str) -> None:
    """Progress that tells nobody."""


def reduce(
    case: Case | Survey,
    *,
    recipe: Recipe | None = None,
    kept: Kept | None = None,
    progress: Callable[[float, str], None] = quiet,
) -> Results:
    """One survey worked through with one recipe.

    Parameters
    ----------
    case : Case or Survey
        A survey stands for the case of its own recipe.
    recipe : Recipe or None
        None: the case's own.
    kept : Kept or None
        What was worked out before; the result is the same without it.
    progress : callable
        Called with the share done (0 to 1) and what is being done.

    Returns
    -------
    Results

    Raises
    ------
    SurveyError
        The survey can be read but not reduced: no used reading belongs to a station.
    """
    keep = Kept() if kept is None else kept
    case = Case(survey=case) if isinstance(case, Survey) else case
    # A note changes no number, so that the chain does not see it.
    survey = keep(with_uses, case.survey, case.overlay.without_notes)
    chosen = case.chosen if recipe is None else recipe
    timing: dict[str, float] = {}
    started = perf_counter()

    def done(part: str, share: float) -> None:
        nonlocal started
        now = perf_counter()
        timing[part] = now - started
        started = now
        progress(share, part)

    readings, site, instruments = survey.readings, survey.site, survey.instruments
    # What asks only for measured columns is found again when rows go in or out of use.
    measured = case.survey.readings
    utc = keep(utc_time, measured, instruments)
    depths = keep(row_depths, measured, survey.runs, survey.places)
    placed = keep.settled(
        placement, readings, depths, survey.places, survey.ties, utc=utc.values, same_place=chosen.same_place
    )
    path = keep(well_path, survey.path, north_correction=site.north_correction)
    where = keep(located, placed, depths, path, site)
    station = where.placement.station
    if len(keep.settled(visits, readings, station, utc=utc.values, visit_gap=chosen.visit_gap)) == 0:
        raise SurveyError("no reading in use belongs to a station: nothing can be reduced")
    done("stations", 0.1)
    choice = keep(
        free_air_choice, site, system=chosen.normal_gravity, form=chosen.height_form, free_air=chosen.free_air
    )
    reference = keep(
        reference_rock, chosen.reference_density, survey.markers, survey.logs, path, site
    )
    normal = keep(normal_gravity, where.positions, choice)
    shell = keep(reference_shell, where.positions, site, choice, reference)
    parts = keep(known_parts, where.positions, site, choice, normal=normal, shell=shell)
    done("known parts", 0.2)
    raw = keep(calibrated, measured, instruments, remove_tide=chosen.tide != "none")
    modelled = keep(modelled_tide, utc, site=site, source=chosen.tide, tide_table=survey.tide_table)
    tidal = keep(
        tide, measured, instruments, modelled, utc=utc, loading=survey.loading,
        factor=1.0 if chosen.tide == "table" else chosen.tide_factor,
    )
    at_station = keep(_rows_at, station)
    tilted = keep(
        _tilt, measured, instruments, where, site, at_station, system=chosen.normal_gravity, form=chosen.height_form
    )
    pressure = keep(
        _pressure, readings, instruments, where, at_station, admittance=chosen.pressure_admittance,
        barometer=survey.barometer_elevation, ground=site.ground_elevation,
    )
    still = keep(_still, len(readings))
    observed = keep(_observed, raw, tidal, tilted, pressure.column, still)
    done("corrections", 0.4)
    ties = keep(_tie_rows, survey.ties, where)
    noise = keep(noise_terms, measured, instruments, estimate=chosen.noise == "estimate")
    asked = keep(
        NetworkInputs, readings=readings, utc=utc.values, station=station, where=where, ties=ties,
        instruments=instruments, runs=survey.runs, tares=survey.tares,
    )
    scales = keep(doubtful_scales, measured, instruments, raw.values)
    worked = network_work(keep, asked, observed.values, scales[1], noise, chosen)
    estimated: tuple[ScaleEstimate, ...] = ()
    if chosen.scale_factor == "estimate" and len(ties.station):
        for _ in range(SCALE_STEPS):
            estimated = keep(
                scale_estimates, worked.adjustment, worked.gravity.gravity, instrument=readings.instrument.code,
                station=station, n_instruments=len(readings.instrument.names),
            )
            instruments = keep(rescaled, instruments, readings, estimated)
            raw = keep(calibrated, measured, instruments, remove_tide=chosen.tide != "none")
            observed = keep(_observed, raw, tidal, tilted, pressure.column, still)
            scales = keep(doubtful_scales, measured, instruments, raw.values)
            worked = network_work(keep, asked, observed.values, scales[1], noise, chosen)
    pairs = _pairs(keep, where, worked, chosen)
    to_station = still
    if np.any(where.placement.off_station):
        slope = keep(
            gravity_slopes, worked.gravity.gravity, where, pairs.top, pairs.base, reference=reference, choice=choice,
            site=site,
        )
        to_station = keep(_to_station, where, slope, path, depths.sensor)
        observed = keep(_observed, raw, tidal, tilted, pressure.column, to_station)
        worked = network_work(keep, asked, observed.values, scales[1], noise, chosen)
        pairs = _pairs(keep, where, worked, chosen)
    stays, network, counts = worked.visits, worked.parts, worked.counts
    fit, gravity = worked.adjustment, worked.gravity
    columns = keep(estimates, observed, fit, gravity, network, station)
    untold = keep(_open_directions, fit, stays, ties, counts)
    columns = keep(told_estimates, columns, untold, fit.basis, stays, network, gravity.datum)
    done("network", 0.6)
    left = keep(anomalies, columns.gravity, parts, gravity.datum)
    densities = keep(interval_densities, pairs, columns.gravity, where.positions, parts, left, choice)
    errors = keep(
        interval_errors, densities, gravity, parts, left,
        elevation=where.positions.elevation.values,
        collar_elevation=site.collar_elevation,
        along=keep(_along_hole, where, path, site, system=chosen.normal_gravity, depth_sd=chosen.depth_sd),
        common=CommonTerms(
            gradient_sd=chosen.gradient_sd if choice.measured is None else choice.measured[1],
            scale_sd=scales[0],
            depth_scale_sd=chosen.depth_scale_sd,
            datum_sd=chosen.datum_sd,
        ),
    )
    logged = keep(
        log_mean_columns, survey.logs, keep(log_integrals, survey.logs, path, site),
        sensor_depth=where.sensor_depth, upper=pairs.top, lower=pairs.base, path=path,
    )
    less_log = keep(_less_log, densities.density, logged.density)
    layers = keep(
        _layers, chosen.layers, chosen.layer_boundaries, densities, errors, where, survey.markers, path, site,
        choice.radius,
    )
    done("densities", 0.8)
    labels = where.placement.label
    results = Results(
        survey=keep(with_notes, survey, case.overlay),
        recipe=chosen,
        choice=choice,
        reference=reference,
        readings=ReadingResults(
            utc=utc, calibrated=raw, tide=tidal, tilt=tilted, pressure_effect=pressure.column,
            to_station=to_station, observed=observed, estimates=columns,
        ),
        network=NetworkResults(
            visits=stays, ties=ties, tie_station=tuple(labels[one] for one in ties.station.tolist()),
            parts=network, adjustment=fit, gravity=gravity, judgement=worked.judgement,
            proposed_applied=worked.proposed_applied, walk_not_needed=worked.walk_not_needed,
            scales=keep(scales_told, instruments, readings, estimated),
            open=untold,
            settling=keep(network_settling, observed, columns.drift, fit, noise.reading_floor, noise.estimate),
        ),
        stations=StationResults(
            label=labels, role=where.placement.role, located=where, visits=counts,
            gravity=columns.gravity, gravity_sd=columns.gravity_sd, parts=parts, anomalies=left,
        ),
        intervals=IntervalResults(
            from_station=tuple(labels[one] for one in pairs.top.tolist()),
            to_station=tuple(labels[one] for one in pairs.base.tolist()),
            densities=densities, errors=errors, log=logged,
            density=densities.density, density_sd=errors.density_sd, density_common_sd=errors.common_sd,
            density_slab=densities.slab, log_density=logged.density, log_coverage=logged.coverage,
            density_less_log=less_log, dof=fit.reseating.t_freedom,
        ),
        layers=layers,
        pressure=pressure,
        tide_comparison=keep(
            tide_comparison, readings, keep(shifted_tides, readings, utc, site), chosen.tide_factor
        ),
    )
    results = replace(results, findings=docket(results))
    done("docket", 1.0)
    return replace(results, timing=timing)


def _pairs(keep: Kept, where: Located, worked: NetworkWork, chosen: Recipe) -> Pairs:
    return keep.settled(
        interval_pairs, where.positions, where.placement.role, worked.parts.of_station, worked.counts,
        min_thickness=chosen.min_thickness,
    )


def _rows_at(station: Index) -> Index:
    return frozen_index(np.maximum(station, 0))


def _tilt(
    readings: Readings,
    instruments: tuple[Instrument, ...],
    where: Located,
    site: Site,
    rows: Index,
    *,
    system: str,
    form: str,
) -> Column:
    gravity = normal_at_station(where.positions, site, system=system, form=form)
    return tilt(readings, instruments, gravity=gravity, station_rows=rows)


def _still(number: int) -> Column:
    return constant_column("to_station", "m/s2", np.zeros(number))


def _pressure(
    readings: Readings,
    instruments: tuple[Instrument, ...],
    where: Located,
    rows: Index,
    *,
    admittance: float,
    barometer: float | str | None,
    ground: float,
) -> Pressure:
    elevation = where.positions.elevation
    with_tool = barometer == "station"
    stated = ground if barometer is None or isinstance(barometer, str) else barometer
    return pressure_effect(
        readings,
        instruments,
        admittance=admittance,
        barometer_elevation=elevation if with_tool else stated,
        rows=rows if with_tool else None,
        depth_below_ground=ground - elevation.values[rows],
    )


def _observed(raw: Column, tidal: Column, tilted: Column, pressed: Column, moved: Column) -> Column:
    return computed(
        "observed", "m/s2", OBSERVED, Input("calibrated", raw), Input("tide", tidal), Input("tilt", tilted),
        Input("pressure_effect", pressed), Input("to_station", moved),
    )


def _tie_rows(ties: Ties | None, where: Located) -> TieRows:
    labels = {name: number for number, name in enumerate(where.placement.label)}
    rows = [] if ties is None else [n for n, name in enumerate(ties.station) if name in labels]
    if ties is None or not rows:
        return TieRows(station=frozen_index([]), value=frozen([]), weight=frozen([]))
    return TieRows(
        station=frozen_index([labels[ties.station[n]] for n in rows]),
        value=frozen(ties.gravity.values[rows]),
        weight=frozen(1.0 / ties.gravity_sd.values[rows] ** 2),
    )


def _open_directions(fit: Adjustment, stays: Visits, ties: TieRows, counts: Index) -> OpenDirections:
    # Modes of a walk have a variance of their own, and gravity that stands in the border belongs to its station.
    asked = tuple(one for one in fit.design.unknowns if one.kind in ("bias", "drift", "tare"))
    return open_directions(fit.basis, stays, ties, unknowns=asked, lost=fit.design.lost, n_stations=len(counts))


def _to_station(where: Located, slope: Column, path: WellPath, sensor: Column) -> Column:
    """What brings each reading to its station's sensor depth."""
    placed = where.placement
    at = np.maximum(placed.station, 0)
    on_path = ~np.isnan(placed.sensor_depth[at])
    row_tvd = path.at(np.where(on_path, sensor.values, 0.0))[0]
    station_tvd = path.at(np.where(on_path, placed.sensor_depth[at], 0.0))[0]
    drop = np.where(on_path, station_tvd - row_tvd, -placed.off_station)
    drop = np.where((placed.off_station == 0.0) | (placed.station < 0), 0.0, drop)
    return computed(
        "to_station", "m/s2", TO_STATION, Input("drop", constant_column("drop", "m", drop)), Input("slope", slope)
    )


def _along_hole(where: Located, path: WellPath, site: Site, *, system: str, depth_sd: float) -> AlongHole:
    """What depth errors move at each station."""
    depth, stated = where.sensor_depth.values, where.placement.elevation_sd
    plumb = ~np.isnan(stated) | np.isnan(depth)
    northward = (path.at(depth + 0.5)[2] - path.at(depth - 0.5)[2]) if len(path.depth) else np.zeros(len(depth))
    pull = northward_pull(system, latitude=where.positions.latitude.values, height=site.collar_elevation)
    return AlongHole(
        sd=frozen(np.where(np.isnan(stated), depth_sd, stated)),
        depth=frozen(np.nan_to_num(depth)),
        cosine=frozen(np.where(plumb, 1.0, where.positions.cos_inclination.values)),
        pull=frozen(np.where(plumb, 0.0, pull * northward)),
    )


def _less_log(density: Column, log_density: Column) -> Column:
    return computed("density_less_log", "kg/m3", LESS_LOG, Input("density", density), Input("log_density", log_density))


def _layers(
    manner: str,
    boundaries: str | float,
    densities: IntervalDensities,
    errors: IntervalErrors,
    where: Located,
    markers: Markers | None,
    path: WellPath,
    site: Site,
    radius: float,
) -> Layers | None:
    if manner == "none":
        return None
    pairs = densities.pairs
    edges = layer_boundaries(boundaries, pairs, where, markers, path, site)
    if edges is None or len(edges.elevation) < 2:
        return None
    elevation = where.positions.elevation.values
    return plain_layers(
        tops=elevation[pairs.top],
        bases=elevation[pairs.base],
        density=densities.density.values,
        variance=errors.independent.variance(),
        covariance=errors.independent.matrix,
        boundaries=edges.elevation,
        radius=radius + site.geoid_height,
    )
