"""The sample surveys are what their script makes, to the last byte."""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path

import pytest

SAMPLES = Path(__file__).parents[2] / "sample_surveys"
BY_HAND = {"survey.toml", "README.md"}


@pytest.fixture(scope="module")
def made(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Both surveys, made anew as a person would make them."""
    folder = tmp_path_factory.mktemp("made")
    command = [sys.executable, "-B", str(SAMPLES / "make_samples.py"), str(folder)]
    subprocess.run(command, check=True, env=os.environ | {"PYTHONPATH": str(SAMPLES.parent / "src")})
    return folder


@pytest.mark.parametrize("survey", ["tolly_bank_well", "quernlow_shaft"])
def test_sample_tables_are_reproduced_to_the_byte(made: Path, survey: str) -> None:
    kept = {path.name: path.read_bytes() for path in (SAMPLES / survey).iterdir() if path.name not in BY_HAND}
    again = {path.name: path.read_bytes() for path in (made / survey).iterdir()}
    assert sorted(again) == sorted(kept)
    for name, content in kept.items():
        assert again[name] == content, f"{survey}/{name} is not what make_samples.py makes"


@pytest.mark.parametrize("survey", ["tolly_bank_well", "quernlow_shaft"])
def test_samples_say_that_they_are_invented(survey: str) -> None:
    assert "**Everything here is invented**" in (SAMPLES / survey / "README.md").read_text(encoding="utf-8")
    assert "(invented)" in (SAMPLES / survey / "survey.toml").read_text(encoding="utf-8")
    for path in (SAMPLES / survey).glob("*.csv"):
        assert path.read_text(encoding="utf-8").startswith("# Invented data"), path.name
