"""All kinds of findings, and the docket of a reduction made of them."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator

from plumbwell.study.docket import (
    bends,
    corrections,
    depths,
    drift,
    gravity_with_depth,
    joins,
    jumps,
    network,
    noise,
    outliers,
    rock,
    settling,
    stated,
    ties,
)
from plumbwell.study.docket.wording import listed
from plumbwell.study.finding import SEVERITIES, Finding
from plumbwell.study.results import Results

KINDS: tuple[Callable[[Results], Iterator[Finding]], ...] = (
    stated.masses_left,
    stated.recipe_left,
    network.single_station,
    network.network_parts,
    drift.tares_part,
    network.noise_untold,
    network.rank_lost,
    network.no_repeat,
    drift.drift_contradicts,
    depths.second_places,
    depths.places_disagree,
    rock.no_density,
    corrections.pressure_refused,
    network.few_freedom,
    noise.no_majority,
    noise.noise_at_floor,
    noise.noise_of_few,
    noise.one_station_repeated,
    noise.weights_far_apart,
    drift.drift_large,
    network.equal_times,
    network.datum_station,
    network.tie_unvisited,
    network.unplaced_ties,
    network.tares_outside,
    ties.tie_far,
    ties.ties_disagree,
    ties.scale_estimated,
    depths.above_ground,
    depths.places_far,
    gravity_with_depth.gravity_with_depth,
    rock.log_disagrees,
    depths.one_thick,
    corrections.tide_disagrees,
    corrections.no_tide,
    corrections.instruments_tide,
    corrections.tilt_partly,
    corrections.pressure_partly,
    corrections.loading_unused,
    jumps.tares_proposed,
    outliers.outliers,
    settling.visit_settling,
    settling.visits_creep_alike,
    joins.run_hangs_by_one,
    bends.bend_untold,
    depths.crosses_ground,
    depths.far_apart,
    rock.density_outside,
    network.relative,
    stated.measured_gradient,
    corrections.permanent_tide,
    corrections.applied_before,
    network.order_chosen,
    network.drift_held,
    jumps.walk_kept,
    jumps.walk_left_out,
    jumps.walk_untested,
    network.single_visits,
    outliers.unchecked,
    depths.depth_assumed,
    depths.path_assumed,
    depths.path_ends,
    depths.close_stations,
    rock.density_unsure,
    rock.log_uncovered,
    rock.layers_untold,
    rock.reference_from_log,
    stated.notes_of_readers,
)

MOST = 8
"""Findings with one code that stand each on their own; what is more is told in one."""

GRAVEST_FIRST = {severity: rank for rank, severity in enumerate(reversed(SEVERITIES))}


def docket(results: Results) -> tuple[Finding, ...]:
    """The findings of a reduction: errors first, then what wants a look, then notes; each from the top down.

    Parameters
    ----------
    results : Results
        Complete but for its findings.

    Returns
    -------
    tuple of Finding
        Within a severity those of the whole survey come first, then by the first station that they name.
    """
    top = results.intervals.densities.pairs.top

    def place(one: Finding) -> tuple[int, int]:
        first = one.stations[0] if one.stations else -1
        if one.intervals:
            first = int(top[one.intervals[0]])
        return GRAVEST_FIRST[one.severity], first

    return _capped(sorted((one for kind in KINDS for one in kind(results)), key=place))


def _capped(findings: list[Finding]) -> tuple[Finding, ...]:
    """The findings, those beyond the first eight of a code gathered into one."""
    if len(findings) <= MOST:
        return tuple(findings)
    of_code: dict[str, list[Finding]] = {}
    for one in findings:
        of_code.setdefault(one.code, []).append(one)
    kept: list[Finding] = []
    for one in findings:
        group = of_code[one.code]
        if len(group) <= MOST or any(one is other for other in group[: MOST - 1]):
            kept.append(one)
        elif one is group[MOST - 1]:
            rest = group[MOST - 1 :]
            kept.append(
                Finding(
                    code=one.code,
                    severity=one.severity,
                    place=one.place,
                    text=f"{len(rest)} more of this kind: {listed([other.place for other in rest])}.",
                    mend=one.mend,
                    stations=tuple(sorted({number for other in rest for number in other.stations})),
                    intervals=tuple(sorted({number for other in rest for number in other.intervals})),
                    rows=tuple(sorted({number for other in rest for number in other.rows})),
                )
            )
    return tuple(kept)


def flags_of(findings: Iterable[Finding], n: int, which: str) -> list[str]:
    """The codes of findings that name each row of a table, joined by ";", "" where none does.

    Parameters
    ----------
    findings : iterable of Finding
    n : int
        Number of rows of the table.
    which : str
        "stations", "intervals" or "rows".
    """
    codes: list[dict[str, None]] = [{} for _ in range(n)]
    for one in findings:
        for row in getattr(one, which):
            codes[row][one.code] = None
    return [";".join(of_row) for of_row in codes]
