"""LAS 2.0: Canadian Well Logging Society, LAS Version 2.0, a digital standard for logs, September 1992.

Each test holds one rule of that text (and, where it says so, of the updates of January 2014 and
February 2017). The example file is made up; its densities were worked out by hand from
(0.3086 - gravity difference / 10 m) / 0.08387172739. A general reader of LAS files serves as
second opinion.
"""

from __future__ import annotations

import math
from pathlib import Path

import lasio
import numpy as np
import pytest

from plumbwell.files.collected import Collected
from plumbwell.files.las import LasFile, las_of, las_text, read_las
from plumbwell.survey.errors import InputError

EXAMPLE = """\
~VERSION INFORMATION
 VERS.                 2.0 : CWLS LOG ASCII STANDARD - VERSION 2.0
 WRAP.                  NO : ONE LINE PER DEPTH STEP
~WELL INFORMATION
 STRT.M          100.0000  : FIRST DEPTH
 STOP.M          130.0000  : LAST DEPTH
 STEP.M           10.0000  : STEP
 NULL.           -999.25   : NULL VALUE
 COMP.    MADE-UP SURVEYS  : COMPANY
 WELL.    TEST HOLE 1      : WELL
 LOC .    12:30 ROAD       : LOCATION
~CURVE INFORMATION
 DEPT.M                    : 1  DEPTH
 GOBS.MGAL                 : 2  RELATIVE GRAVITY
 RHOG.G/C3                 : 3  INTERVAL DENSITY BELOW STATION
~PARAMETER INFORMATION
 FAG .MGAL/M     0.30860   : FREE-AIR GRADIENT USED
~ASCII LOG DATA
  100.0000    0.0000     2.4871
  110.0000    1.0000     2.5467
  120.0000    1.9500     2.3679
  130.0000    3.0500  -999.2500
"""


def _read(text: str) -> tuple[LasFile, Collected]:
    collected = Collected()
    las = las_of(text.encode(), file="made_up.las", collected=collected)
    assert las is not None, [str(problem) for problem in collected.problems]
    return las, collected


def _refused(text: str) -> list[str]:
    collected = Collected()
    assert las_of(text.encode(), file="made_up.las", collected=collected) is None
    return [str(problem) for problem in collected.problems]


def test_header_lines_are_cut_at_first_dot_first_space_last_colon() -> None:
    las, _ = _read(EXAMPLE)
    by_name = {line.mnemonic: line for line in las.well}
    assert (by_name["LOC"].value, by_name["LOC"].description) == ("12:30 ROAD", "LOCATION")
    assert (by_name["WELL"].unit, by_name["WELL"].value) == ("", "TEST HOLE 1")
    assert (las.parameters[0].mnemonic, las.parameters[0].unit, las.parameters[0].value) == (
        "FAG",
        "MGAL/M",
        "0.30860",
    )


def test_null_is_compared_as_a_number_and_never_applied_to_the_index() -> None:
    las, _ = _read(EXAMPLE.replace("-999.25 ", "130.0   ").replace("-999.2500", " 130.000"))
    assert las.curves[0].values is not None and las.curves[2].values is not None
    assert las.curves[0].values[-1] == 130.0
    assert math.isnan(las.curves[2].values[-1])


def test_sections_in_lower_case_and_comments_above_the_data() -> None:
    text = EXAMPLE.replace("~ASCII LOG DATA", "~a  depth gobs rhog").replace(
        "~CURVE", "# a comment\n  ~curve"
    )
    las, _ = _read(text)
    assert [curve.mnemonic for curve in las.curves] == ["DEPT", "GOBS", "RHOG"]


def test_wrapped_data_have_the_index_alone_on_its_line() -> None:
    head, data = EXAMPLE.split("~ASCII LOG DATA\n")
    wrapped = "".join("{}\n {}\n {}\n".format(*row.split()) for row in data.splitlines())
    las, collected = _read(
        head.replace("WRAP.                  NO", "WRAP.                 YES") + "~A\n" + wrapped
    )
    plain, _ = _read(EXAMPLE)
    assert not collected.notes
    for one, other in zip(las.curves, plain.curves, strict=True):
        assert one.values is not None and other.values is not None
        np.testing.assert_array_equal(one.values, other.values)
    broken = (
        head.replace("WRAP.                  NO", "WRAP.                 YES")
        + "~A\n"
        + wrapped.replace("2.5467", "2.5467 7")
    )
    assert _refused(broken) == [
        "made_up.las, row 24: found values that do not fit the number of curves, here or just before; "
        "expected the "
        "index alone on a line, then 2 values; to mend: the file may be damaged: export the log anew"
    ]


def test_wrap_no_with_values_on_several_lines_is_told() -> None:
    head, data = EXAMPLE.split("~ASCII LOG DATA\n")
    las, collected = _read(
        head + "~A\n" + "".join("{}\n{} {}\n".format(*row.split()) for row in data.splitlines())
    )
    assert [note.code for note in collected.notes] == ["las_wrap"]
    assert las.lines.tolist() == [19, 21, 23, 25]


def test_two_curves_wrapped_under_wrap_no_are_refused() -> None:
    """A two-curve file with one value a line can be read in two ways."""
    text = EXAMPLE.replace(" RHOG.G/C3                 : 3  INTERVAL DENSITY BELOW STATION\n", "")
    text = text.split("~ASCII")[0] + "~A\n100\n1\n110\n2\n"
    assert _refused(text)[0] == (
        "made_up.las, row 18: found 1 value; expected 2, one for each curve; "
        "to mend: correct the row; a missing value is written as the null value"
    )


def test_missing_sections_are_refused() -> None:
    assert _refused(EXAMPLE.split("~ASCII")[0]) == [
        "made_up.las: found no data section (~A); expected the values under a line that begins with ~A; "
        "to mend: the file may be cut off: export the log anew"
    ]
    assert _refused(EXAMPLE.split("  100.0000    0.0")[0]) == [
        "made_up.las, row 18: found a data section (~A) without data; expected a row of values for each "
        "depth; "
        "to mend: export the log anew"
    ]
    without = EXAMPLE.replace("~CURVE", "~PARAMETER")
    assert _refused(without)[0].startswith("made_up.las: found no curve section (~C), or an empty one; ")


def test_data_must_be_the_last_section() -> None:
    assert _refused(EXAMPLE + "~OTHER\nwords\n") == [
        "made_up.las, row 23: found a section after the data: ~OTHER; expected the data section last; "
        "to mend: move the section before ~A, or remove it"
    ]


def test_short_row_is_refused_at_its_line_in_the_file() -> None:
    assert _refused(EXAMPLE.replace("  110.0000    1.0000     2.5467", "  110.0000    1.0000")) == [
        "made_up.las, row 20: found 2 values; expected 3, one for each curve; "
        "to mend: correct the row; a missing value is written as the null value"
    ]


def test_values_that_run_together_are_never_split() -> None:
    assert _refused(EXAMPLE.replace("3.0500  -999.2500", "3.0500-999.2500")) == [
        "made_up.las, row 22: found 2 values; expected 3, one for each curve; "
        "to mend: part the values that run together, perhaps 3.0500 and -999.2500"
    ]


def test_commas_and_decimal_commas() -> None:
    head, data = EXAMPLE.split("~ASCII LOG DATA\n")
    with_commas = "".join(",".join(row.split()) + "\n" for row in data.splitlines())
    las, collected = _read(head + "~A\n" + with_commas)
    assert las.curves[1].values is not None and las.curves[1].values.tolist() == [0.0, 1.0, 1.95, 3.05]
    assert [note.code for note in collected.notes] == ["las_commas"]
    assert _refused(head + "~A\n" + data.replace(".", ","))[0].startswith(
        "made_up.las, row 19: found decimal commas: "
    )


def test_strt_unit_must_be_that_of_the_index() -> None:
    assert _refused(EXAMPLE.replace("STRT.M ", "STRT.FT")) == [
        'made_up.las, row 5, STRT: found the unit "FT", and "M" at the curve DEPT; expected one unit for the '
        "depths; "
        "to mend: find out which is right, and write it at STRT and at DEPT"
    ]


def test_text_and_date_curves_stay_text() -> None:
    text = EXAMPLE.replace("1.0000 ", "2026-05-04T09:00:00").replace("0.0000     2", "sand     2")
    las, _ = _read(text)
    assert las.curves[1].values is None
    assert las.curves[1].cells[:2] == ("sand", "2026-05-04T09:00:00")
    assert las.curves[2].values is not None


def test_version_1_2_and_3() -> None:
    las, collected = _read(
        EXAMPLE.replace("VERS.                 2.0", "VERS.                 1.2").replace(
            "WELL.    TEST HOLE 1      : WELL", "WELL.    WELL      : TEST HOLE 1"
        )
    )
    assert {line.mnemonic: line.value for line in las.well}["WELL"] == "TEST HOLE 1"
    assert [note.code for note in collected.notes] == ["las_version"]
    assert _refused(EXAMPLE.replace("VERS.                 2.0", "VERS.                 3.0")) == [
        "made_up.las, row 2, VERS: found LAS version 3.0; expected LAS 2.0 (or 1.2); to mend: save the log "
        "as LAS 2.0"
    ]


def test_missing_null_takes_the_usual_one_only() -> None:
    las, collected = _read(
        EXAMPLE.replace(" NULL.           -999.25   : NULL VALUE\n", "").replace("1.9500", " -9999")
    )
    assert las.null == -999.25
    assert las.curves[1].values is not None and las.curves[1].values[2] == -9999.0
    assert "las_null" in [note.code for note in collected.notes]


def test_curves_of_one_name_are_told_apart() -> None:
    las, collected = _read(EXAMPLE.replace("GOBS.MGAL", "RHOG.G/C3"))
    assert [curve.mnemonic for curve in las.curves] == ["DEPT", "RHOG", "RHOG[2]"]
    assert [note.code for note in collected.notes] == ["las_curve_twice"]


def test_end_mark_ends_the_file() -> None:
    las, _ = _read(EXAMPLE + "\x1a")
    assert len(las.lines) == 4


def test_a_general_reader_agrees(tmp_path: Path) -> None:
    path = tmp_path / "made_up.las"
    path.write_text(EXAMPLE)
    ours, theirs = read_las(path), lasio.read(str(path))
    for curve, values in zip(ours.curves, theirs.data.T, strict=True):
        assert curve.values is not None
        np.testing.assert_array_equal(curve.values, values)


def test_read_las_raises_with_the_name_of_the_file(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="^gone.las: found a file that cannot be opened"):
        read_las(tmp_path / "gone.las")


def _written(values: list[float], **more: object) -> str:
    depth = [100.0, 100.5, 101.0]
    return las_text(
        well=(("COMP", "", "Müller: & Co", "COMPANY"), ("WELL", "", "Hollow Fell 1", "WELL")),
        curves=(("DEPT", "M", "measured depth", depth), ("RHOG", "G/C3", "interval density", values)),
        parameters=(("FAG", "MGAL/M", "0.3086", "free-air gradient"),),
        **more,  # type: ignore[arg-type]
    )


def test_written_file_keeps_the_rules_of_1992(tmp_path: Path) -> None:
    """ASCII, unwrapped, no exponents, one dot and one colon rule a header line, NULL -999.25, STEP given."""
    text = _written([2.5, math.nan, 1e-7])
    assert text.isascii() and max(map(len, text.splitlines())) <= 256
    head, data = text.split("~ASCII LOG DATA\n")
    assert "e-" not in data.lower()
    assert [row.split() for row in data.splitlines()] == [
        ["100.0000", "2.5000"],
        ["100.5000", "-999.2500"],
        ["101.0000", "0.0000"],
    ]
    header = [line for line in head.splitlines() if not line.startswith("~")]
    assert all(line.count(":") == 1 for line in header)
    wanted = {"STRT.M": "100.0000", "STOP.M": "101.0000", "STEP.M": "0.5000", "NULL.": "-999.25"}
    stated = {line.split()[0]: line.split()[1] for line in header}
    assert {key: stated[key] for key in wanted} == wanted


def test_written_file_is_read_back_by_us_and_by_a_general_reader(tmp_path: Path) -> None:
    path = tmp_path / "written.las"
    path.write_text(_written([2.5, math.nan, 2.25], other=("free words",)))
    ours, theirs = read_las(path), lasio.read(str(path))
    assert ours.version == 2.0 and not ours.wrap and ours.null == -999.25
    assert ours.other == ("free words",)
    assert {line.mnemonic: line.value for line in ours.well}["COMP"] == "Muller; & Co"
    for curve, values in zip(ours.curves, theirs.data.T, strict=True):
        assert curve.values is not None
        np.testing.assert_array_equal(curve.values, values)


def test_uneven_index_has_step_zero() -> None:
    text = las_text(
        well=(), curves=(("DEPT", "M", "depth", [1.0, 2.0, 4.0]), ("X", "", "x", [1.0, 2.0, 3.0]))
    )
    assert next(line for line in text.splitlines() if line.startswith(" STEP")).split()[1] == "0.0000"
