"""How problems are gathered to what is shown, and how rows and cells are written in it."""

from plumbwell.survey.errors import InputError, Problem, gathered, row_ranges, shown


def problem(row, *, column="depth [m]", found="x", expected="a number", mend="write it", file="readings.csv"):
    return Problem(file=file, row=row, column=column, found=found, expected=expected, mend=mend)


def test_one_cause_is_one_block_that_names_its_other_rows():
    (one,) = gathered([problem(2), problem(9, found="y"), *(problem(row) for row in range(10, 78))])
    assert (one.row, one.found) == (2, "x, and 69 more rows: 9-77")


def test_another_file_column_expectation_or_mend_is_another_cause():
    several = [problem(2), problem(3, file="path.csv"), problem(3, column="time"), problem(3, expected="a time"),
               problem(3, mend="remove it")]  # fmt: skip
    assert gathered(several) == tuple(several)


def test_problems_of_whole_files_are_never_gathered():
    whole = [problem(None), problem(None)]
    assert gathered(whole) == tuple(whole)


def test_the_error_keeps_every_problem_and_shows_the_blocks():
    error = InputError([problem(2), problem(4, column="time"), problem(5)])
    assert [one.row for one in error.problems] == [2, 4, 5]
    assert str(error).split("\n") == [
        "readings.csv, row 2, depth [m]: found x, and 1 more row: 5; expected a number; to mend: write it",
        "readings.csv, row 4, time: found x; expected a number; to mend: write it",
    ]


def test_many_ranges_end_before_they_tire():
    assert row_ranges([1, 2, 3, 7, 9, 10]) == "1-3, 7, 9-10"
    assert row_ranges(list(range(1, 40, 2))) == "1, 3, 5, 7, 9, 11, 13, 15 …"


def test_control_characters_are_escaped_and_long_texts_cut():
    assert shown("a\x1b[31m\u202eb") == "a\\x1b[31m\\u202eb"
    assert shown("a" * 81) == "a" * 79 + "…" and shown("a" * 81, 100) == "a" * 81
