"""Windows for the tests of the desk, closed at their end."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import pytest

from driven_desk import Driven
from plumbwell.desk.look import Look
from shown_texts import look_of


@pytest.fixture
def look(qapp: Any) -> Iterator[Look]:
    """The light look in force, set back afterwards."""
    with look_of() as look:
        yield look


@pytest.fixture
def driven(tmp_path: Path) -> Iterator[Callable[..., Driven]]:
    """Makes windows over one data folder."""
    made: list[Driven] = []

    def make(**options: Any) -> Driven:
        made.append(Driven(tmp_path / "home", **options))
        return made[-1]

    yield make
    for one in made:
        one.close()
