"""The plate of a reduced survey: results in SI turned into what the plate shows, and written as figures.

Depth on the plate is measured depth where every station of the column lies on the path, else vertical depth
below the depth datum.
"""

from __future__ import annotations

from pathlib import Path
from threading import Thread

import numpy as np

from plumbwell import __version__
from plumbwell.earth.constants import GRAM_PER_CM3, MILLIGAL
from plumbwell.plates.figure import figure_image, packed_png, write_svg
from plumbwell.plates.hole_depths import HoleDepths, hole_depths
from plumbwell.plates.log_curve import LogCurve
from plumbwell.plates.numbers import counted, number, sd_decimals
from plumbwell.plates.plate import PlateFinding, PlateInterval, PlateStation, SurveyPlate
from plumbwell.plates.theme import theme_named
from plumbwell.reduction.reference_rock import log_depth
from plumbwell.study.cautions import OTHER_MASSES
from plumbwell.study.finding import Finding
from plumbwell.study.results import Results
from plumbwell.survey.column import Array, Index

ROUND_DEPTH = 100.0  # m, from which the depth of the hole is told without decimals


def _known(value: float, factor: float = 1.0) -> float | None:
    return float(value) / factor if np.isfinite(value) else None


def _sd(value: float) -> float | None:
    """Standard deviation in mGal; None for a datum station, which is held."""
    return _known(value, MILLIGAL) or None


def survey_plate(results: Results, depths: HoleDepths | None = None) -> SurveyPlate:
    """The plate of a reduced survey.

    Parameters
    ----------
    results : Results
    depths : HoleDepths or None
        The depths to show; None: measured depth in metres where there is one.
    """
    survey, stations, intervals = results.survey, results.stations, results.intervals
    site = survey.site
    depths = hole_depths(results) if depths is None else depths
    scale, depth, column = depths.scale, depths.stations, depths.column
    pairs = intervals.densities.pairs
    flagged = {row for finding in results.findings if finding.severity != "note" for row in finding.intervals}
    rows = []
    for row, (top, base) in enumerate(zip(pairs.top.tolist(), pairs.base.tolist(), strict=True)):
        sd = _known(intervals.density_sd.values[row], GRAM_PER_CM3)
        difference = _known(intervals.density_less_log.values[row], GRAM_PER_CM3)
        rows.append(
            PlateInterval(
                number=row + 1,
                top=float(depth[top]),
                base=float(depth[base]),
                density=_known(intervals.density.values[row], GRAM_PER_CM3),
                sd=sd,
                common_sd=_known(intervals.density_common_sd.values[row], GRAM_PER_CM3),
                slab=_known(intervals.density_slab.values[row], GRAM_PER_CM3),
                log=_known(intervals.log_density.values[row], GRAM_PER_CM3),
                difference=difference,
                difference_sd=sd if difference is not None else None,
                ratio=difference / sd if difference is not None and sd else None,
                flagged=row in flagged,
            )
        )
    curves = [
        LogCurve.of(depths.of_hole(log_depth(log, site)), log.density.values / GRAM_PER_CM3)
        for log in survey.logs[:1]
    ]
    markers = (
        []
        if survey.markers is None
        else list(zip(survey.markers.marker, depths.of_hole(survey.markers.depth.values).tolist(), strict=True))
    )
    deepest = float(np.nanmax(depth[column])) if column.any() else 0.0
    used = np.flatnonzero(column)
    return SurveyPlate(
        title=site.name,
        subtitle=", ".join(
            [
                counted(len(used), "station"),
                *([counted(len(rows), "interval")] if rows else []),
                f"to {number(scale.number_of(deepest), 0 if abs(deepest) >= ROUND_DEPTH else 1)} {scale.unit}",
            ]
        ),
        depth_label=scale.label,
        depth_unit=scale.unit,
        intervals=tuple(rows),
        stations=tuple(
            PlateStation(
                label=stations.label[one],
                depth=float(depth[one]),
                gravity=_known(stations.gravity.values[one], MILLIGAL),
                gravity_sd=_sd(stations.gravity_sd.values[one]),
                anomaly=_known(stations.anomalies.anomaly.values[one], MILLIGAL),
                anomaly_sd=_sd(stations.gravity_sd.values[one]),
                part=int(results.network.parts.of_station[one]),
            )
            for one in used.tolist()
        ),
        markers=tuple((name, float(at)) for name, at in markers if np.isfinite(at)),
        log=curves[0] if curves else None,
        findings=tuple(
            PlateFinding(
                severity=finding.severity, depth=_finding_depth(finding, depth, pairs.top), words=finding.text
            )
            for finding in results.findings
            if finding.severity != "note"
        ),
        remarks=_remarks(results),
        caution=OTHER_MASSES,
        gravity_label="gravity" if results.absolute else "relative gravity",
    )


def _finding_depth(finding: Finding, depth: Array, top: Index) -> float | None:
    """Depth at which a finding stands: of its first station, or of the top of its first interval."""
    if finding.stations:
        return _known(depth[finding.stations[0]])
    return _known(depth[top[finding.intervals[0]]]) if finding.intervals else None


def _remarks(results: Results) -> tuple[str, ...]:
    """What the numbers rest on, for the foot of the plate."""
    recipe, choice = results.recipe, results.choice
    kind = "normal" if choice.measured is None else "measured"
    reference = recipe.reference_density
    rock = f"{reference / GRAM_PER_CM3:.6g} g/cm³" if isinstance(reference, float) else f"by {reference}"
    dof = results.intervals.dof
    common = results.intervals.density_common_sd.values / GRAM_PER_CM3
    most = float(np.nanmax(common)) if np.isfinite(common).any() else 0.0
    shared = (f"common to all densities: ± {number(most, sd_decimals(most))} g/cm³ (1 sd)",) if most > 0 else ()
    return (
        f"shell form; {recipe.normal_gravity}, {kind} gradient {choice.gradient / MILLIGAL:.5f} mGal/m",
        f"reference rock {rock}",
        "gravity absolute by ties" if results.absolute else "gravity relative to the datum station",
        f"{dof} degree{'' if dof == 1 else 's'} of freedom",
        *shared,
        f"Plumbwell {__version__}",
    )


def write_figures(results: Results, folder: Path) -> tuple[Path, Path]:
    """Write figure.svg and figure.png of a reduced survey; gives their paths.

    Parameters
    ----------
    results : Results
    folder : Path
        Existing folder.

    Raises
    ------
    OSError
        When a figure cannot be written.
    """
    plate, theme = survey_plate(results), theme_named("print")
    paths = (folder / "figure.svg", folder / "figure.png")
    image, packed = figure_image(plate, theme), []
    # Packing is nearly half of the work and needs no painter: it goes on beside the drawing of the other file.
    packing = Thread(target=lambda: packed.append(packed_png(image)), name="packing of figure.png")
    packing.start()
    try:
        write_svg(paths[0], plate, theme)
    finally:
        packing.join()
    paths[1].write_bytes(packed[0])
    return paths
