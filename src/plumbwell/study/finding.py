"""A finding of the docket: something that wants a person's eye, with its place and its mend."""

from __future__ import annotations

from dataclasses import dataclass

SEVERITIES = ("note", "look", "error")


@dataclass(frozen=True, slots=True, kw_only=True)
class Finding:
    """One finding.

    Parameters
    ----------
    code : str
        Short name of the kind, the same in flags of tables, summary and handbook.
    severity : str
        "note", "look" or "error"; an error-grade finding gives exit status 3.
    place : str
        Where: a station, an interval, a run, a file.
    text : str
        What was found, in a sentence with numbers and units.
    mend : str
        What the person can do about it.
    stations, intervals, rows : tuple of int
        What it concerns: stations and intervals from the top down, rows of the readings.
    """

    code: str
    severity: str
    place: str
    text: str
    mend: str
    stations: tuple[int, ...] = ()
    intervals: tuple[int, ...] = ()
    rows: tuple[int, ...] = ()
