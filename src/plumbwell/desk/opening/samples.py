"""The sample surveys that can be opened from the window: invented, with the truth they were made from."""

from __future__ import annotations

from pathlib import Path

from plumbwell.resources import sample_survey

SAMPLES = {
    "tolly_bank_well": "Tolly Bank, a well with a density log",
    "quernlow_shaft": "Quernlow, a mine shaft",
}
"""Folder of each sample, and what it is called."""


def sample_folder(name: str) -> Path:
    """Folder of a sample survey."""
    return sample_survey(name)
