"""Invented survey folders, and the command line that works them through."""

from pathlib import Path

import pytest

from commanded import Command
from invented_surveys import Invented


@pytest.fixture
def invented(tmp_path: Path) -> Invented:
    """A maker of invented surveys in a folder of their own."""
    (tmp_path / "survey").mkdir()
    return Invented(tmp_path / "survey")


@pytest.fixture
def drawn(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> Command:
    """`plumbwell reduce` with its figures."""
    return Command(tmp_path / "out", capsys)


@pytest.fixture
def command(drawn: Command, monkeypatch: pytest.MonkeyPatch) -> Command:
    """`plumbwell reduce` without its figures, which take most of its time."""

    def write_figures(results: object, folder: Path) -> None:
        for name in ("figure.svg", "figure.png"):
            (folder / name).write_text("")

    monkeypatch.setattr("plumbwell.plates.figure_of.write_figures", write_figures)
    return drawn
