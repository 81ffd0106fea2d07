"""How the tests of reading spoil a small survey folder and hear what is said of it."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest

from plumbwell.files.folder import read_survey
from plumbwell.survey.errors import InputError
from small_folder import READINGS, TOML


@pytest.fixture
def told(tmp_path: Path) -> Callable[..., str]:
    """Writes a survey folder and returns the text of the error that reading it raises."""

    def tell(toml: str = TOML, readings: str | bytes | None = READINGS, **tables: str) -> str:
        (tmp_path / "survey.toml").write_text(toml, encoding="utf-8")
        if readings is not None:
            data = readings if isinstance(readings, bytes) else readings.encode()
            (tmp_path / "readings.csv").write_bytes(data)
        for name, text in tables.items():
            (tmp_path / f"{name}.csv").write_text(text, encoding="utf-8")
        with pytest.raises(InputError) as caught:
            read_survey(tmp_path)
        return str(caught.value)

    return tell
