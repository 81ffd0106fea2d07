"""Instruments, runs and listed tares: what is stated about how the readings were taken."""

from __future__ import annotations

from dataclasses import dataclass

from plumbwell.survey.column import Column


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Calibration:
    """A calibration table: gravity at rising counter values, linear between them.

    Parameters
    ----------
    counter : Column, counts, strictly rising
    gravity : Column, m/s2, strictly rising
    """

    counter: Column
    gravity: Column


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Instrument:
    """One gravimeter or gradiometer as survey.toml states it.

    Parameters
    ----------
    applied : tuple of str
        What the reading already holds: "tide", "tilt", "temperature", "pressure", "drift".
    calibration : Calibration or None
    scale, scale_sd : float
        Factor on calibrated readings and its standard deviation.
    clock_ahead : float
        Instrument clock less UTC, s.
    reading_floor, reseating_sd, station_floor : float
        m/s2: no single reading is believed better; re-seating where the survey cannot tell; no
        station is believed better.
    drift_rate, drift_rate_sd : float
        Expected mean drift rate and its standard deviation, m/s3.
    """

    name: str
    kind: str = "gravimeter"
    applied: tuple[str, ...] = ()
    calibration: Calibration | None = None
    scale: float = 1.0
    scale_sd: float = 0.0
    clock_ahead: float = 0.0
    reading_floor: float = 2e-8
    reseating_sd: float = 3e-8
    station_floor: float = 1e-8
    drift_rate: float = 0.0
    drift_rate_sd: float = 0.05e-5 / 3600.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Run:
    """One trip of the instrument, where survey.toml says more about it than its label. Compares by value.

    Parameters
    ----------
    instrument : str or None
        None: the only one.
    depth_shift, depth_shift_sd : float
        Added to every depth of the run, m.
    drift_order : int, "auto" or None
        None: the recipe's.
    """

    name: str
    instrument: str | None = None
    depth_shift: float = 0.0
    depth_shift_sd: float = 0.0
    drift_order: int | str | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Tare:
    """A jump of the instrument that counts from the first reading at or after `time`. Compares by value.

    Parameters
    ----------
    run : str
    time : float
        UTC, s since 2000-01-01.
    size, size_sd : float or None
        m/s2. Both: prior knowledge; size alone: held; neither: estimated.
    """

    run: str
    time: float
    size: float | None = None
    size_sd: float | None = None
