"""Small invented surveys for the tests of the docket, and their findings."""

from collections.abc import Callable
from pathlib import Path

import pytest

from invented_surveys import Invented
from plumbwell.study.finding import Finding
from plumbwell.study.results import Results


@pytest.fixture
def invented(tmp_path: Path) -> Invented:
    """A maker of invented surveys in a folder of their own."""
    return Invented(tmp_path)


@pytest.fixture
def found() -> Callable[[Results, str], list[Finding]]:
    """The findings of a reduction with one code."""
    return lambda results, code: [one for one in results.findings if one.code == code]


@pytest.fixture
def graver() -> Callable[[Results], list[str]]:
    """The findings of a survey above a note, in words."""
    return lambda results: [
        f"{one.severity} {one.code}: {one.text}" for one in results.findings if one.severity != "note"
    ]
