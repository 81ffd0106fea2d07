"""A log beside the survey: which curve is the density, how it becomes rising SI columns, what is refused."""

from __future__ import annotations

import math
from pathlib import Path

import numpy as np
import pytest

from plumbwell.files.collected import Collected
from plumbwell.files.log_tables import read_log
from plumbwell.files.statements import LogStatement, NamedFile
from plumbwell.survey.log import DensityLog

HEAD = """\
~V
VERS. 2.0:
WRAP. NO:
~W
STRT.FT {first}:
STOP.FT {last}:
STEP.FT 0:
NULL. -999.25:
~C
DEPT.FT :
RHOB.G/CC :
{extra}~A
"""


def _log(
    folder: Path,
    text: str,
    *,
    name: str = "hole.las",
    density: str | None = None,
    correction: str | None = None,
) -> tuple[DensityLog | None, Collected]:
    (folder / name).write_text(text, encoding="utf-8")
    stated = LogStatement(
        file=NamedFile(key="[[log]] file", name=name, row=9),
        density=density,
        correction=correction,
        datum_height=5.2,
    )
    collected = Collected()
    return read_log(folder.resolve(), stated, collected), collected


def _las(rows: list[str], extra: str = "") -> str:
    head = HEAD.format(first=rows[0].split()[0], last=rows[-1].split()[0], extra=extra)
    return head + "\n".join(rows) + "\n"


def test_density_is_found_by_its_dimension_and_turned_to_si(tmp_path: Path) -> None:
    log, collected = _log(tmp_path, _las(["100 2.5 80", "101 -999.25 81", "102 2.7 82"], "GR.GAPI :\n"))
    assert log is not None and not collected.problems and not collected.notes
    assert (log.file, log.curve, log.datum_height) == ("hole.las", "RHOB", 5.2)
    np.testing.assert_allclose(log.depth.values, [30.48, 30.7848, 31.0896], rtol=1e-14)
    np.testing.assert_allclose(log.density.values, [2500.0, math.nan, 2700.0], rtol=1e-14)
    assert log.density.origin is not None
    assert log.density.origin.lines.tolist() == [14, 15, 16]
    assert log.density.origin.cells == ("2.5", "-999.25", "2.7")


def test_log_that_runs_upward_is_turned_and_doubled_depths_keep_the_first(tmp_path: Path) -> None:
    log, collected = _log(tmp_path, _las(["102 2.7", "101 2.6", "101 2.2", "100 2.5"]))
    assert log is not None
    assert log.density.values.tolist() == [2500.0, 2600.0, 2700.0]
    assert log.density.origin is not None and log.density.origin.cells == ("2.5", "2.6", "2.7")
    assert [note.code for note in collected.notes] == ["log_turned", "log_depth_twice"]


def test_several_densities_are_told_and_none_is_taken(tmp_path: Path) -> None:
    text = _las(["100 2.5 0.02", "101 2.6 0.01"], "DRHO.G/CC :\n")
    log, collected = _log(tmp_path, text)
    assert log is None and not collected.problems
    (note,) = collected.notes
    assert (note.code, note.severity) == ("log_several_densities", "look")
    assert note.text == "several curves have the dimension of density (RHOB.G/CC, DRHO.G/CC); none is taken"
    assert note.mend == 'write density = "RHOB" in the [[log]] of this file, if that is it'


def test_a_stated_curve_or_correction_settles_it(tmp_path: Path) -> None:
    text = _las(["100 2.5 0.02", "101 2.6 0.01"], "DRHO.G/CC :\n")
    log, _ = _log(tmp_path, text, density="rhob")
    assert log is not None and log.density.values.tolist() == [2500.0, 2600.0]
    log, collected = _log(tmp_path, text, density="drho")
    assert log is None
    assert [str(one) for one in collected.problems] == [
        "hole.las, DRHO.G/CC: found densities whose median is 0.015 g/cm3; expected a median of 0.8 to 6 g/cm3; "
        "to mend: name the density curve as density in the [[log]] of this file, or correct its unit"
    ]
    log, _ = _log(tmp_path, text, correction="DRHO")
    assert log is not None and log.curve == "RHOB"
    assert log.correction is not None and log.correction.values.tolist() == [20.0, 10.0]


@pytest.mark.parametrize(
    ("text", "density", "told"),
    [
        (
            _las(["100 2.5", "101 2.6"]),
            "RHOZ",
            'hole.las: found no curve "RHOZ", which survey.toml names as the density curve; expected one of '
            "DEPT.FT, "
            "RHOB.G/CC; to mend: correct the name in the [[log]] of hole.las in survey.toml",
        ),
        (
            _las(["100 2.5", "101 2.6"]).replace("RHOB.G/CC", "RHOB.XX"),
            "RHOB",
            'hole.las, RHOB.XX: found the unit "XX"; expected one of g/cm3, g/cc, kg/m3, t/m3, lb/ft3; '
            "to mend: write the unit of the curve",
        ),
        (
            _las(["100 2.5", "101 2.6"]).replace("RHOB.G/CC", "RHOB."),
            None,
            "hole.las: found no curve with a unit of density (curves: DEPT.FT, RHOB.); expected a curve in "
            "one of g/cm3, "
            "g/cc, kg/m3, t/m3, lb/ft3; to mend: write the unit of the density curve, or remove the log from "
            "survey.toml",
        ),
        (
            _las(["100 -9999", "101 2.6", "102 -9999"]),
            None,
            "hole.las, row 13, RHOB.G/CC: found -9999 in 2 rows (rows 13, 15), not the file's null value; "
            "expected one "
            "null value, as the header states it (in a CSV an empty cell); "
            "to mend: correct the null value in the header, or these values",
        ),
        (
            _las(["100 2500", "101 2.6", "102 2.6"]),
            None,
            "hole.las, row 13, RHOB.G/CC: found the density 2500 (1 such, row 13); expected densities above "
            "0, at most "
            "10 g/cm3; to mend: correct the unit of the curve, or write the null value where the log is bad",
        ),
        (
            _las(["100 2500", "101 2600", "102 2600"]),
            None,
            "hole.las, RHOB.G/CC: found densities whose median is 2600 g/cm3; expected a median of 0.8 to 6 g/cm3; "
            "to mend: write the unit kg/m3 at the curve, which would fit; or name another curve",
        ),
        (
            _las(["100 2.5", "101 2.6"]).replace("G/CC", "K/M3"),
            None,
            "hole.las, RHOB.K/M3: found densities whose median is 0.00255 g/cm3; expected a median of 0.8 to 6 "
            "g/cm3; to mend: write the unit g/cm3 at the curve, which would fit; or name another curve",
        ),
        (
            "gamma log\n" + _las(["100 2.5", "101 2.6"]),
            None,
            "hole.las, row 1: found text before the first section: gamma log; expected a LAS file, which begins with "
            "~V; to mend: check that this is a LAS 2.0 file",
        ),
        (
            _las(["100 sand", "101 2.6"]),
            "RHOB",
            'hole.las, row 13, RHOB.G/CC: found "sand"; expected a number; to mend: write a number, or leave '
            "the cell empty",
        ),
    ],
)
def test_log_that_cannot_be_taken(tmp_path: Path, text: str, density: str | None, told: str) -> None:
    log, collected = _log(tmp_path, text, density=density)
    assert log is None
    assert [str(problem) for problem in collected.problems] == [told]


def test_csv_log_needs_a_depth(tmp_path: Path) -> None:
    log, collected = _log(tmp_path, "z [m],rho [g/cm3]\n1,2.5\n", name="log.csv")
    assert log is None
    assert [str(problem) for problem in collected.problems] == [
        "log.csv, depth: found no column of depths (the header has z [m], rho [g/cm3]); expected a column "
        "depth [m]; "
        "to mend: rename the column of depths to depth [m], with its unit"
    ]
