"""The findings of a reduction, by code and by severity."""

from collections.abc import Callable

import pytest

from plumbwell.study.finding import Finding
from plumbwell.study.results import Results


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
