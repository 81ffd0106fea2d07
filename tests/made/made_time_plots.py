"""Invented plots against time: three runs with drift, one with a tare, repeats, and a point that is left out."""

from datetime import UTC, datetime

from plumbwell.plates.time_plot import DriftLine, RepeatLink, RunPanel, TareMark, TimePlot, time_points

EPOCH = datetime(2000, 1, 1, tzinfo=UTC)
PER_RUN = 20
LEFT_OUT = 33
TARE_KEY = 7
RATES = (8.8, 11.6, 6.3)


def at(day, hour, minute=0):
    """Seconds since 2000-01-01 UTC of a time in October 2025."""
    return (datetime(2025, 10, day, hour, minute, tzinfo=UTC) - EPOCH).total_seconds()


TARE_TIME = at(15, 11, 42)


def drift(run, time):
    """The invented drift of a run, tare included, in the unit of the plots."""
    jump = -38.0 if run == 1 and time > TARE_TIME else 0.0
    return RATES[run] * (time - at(14 + run, 8)) / 3600 + jump


def time_of(run, place):
    """Time of a visit: every 24 minutes from 08:00."""
    return at(14 + run, 8) + 24 * 60 * place


def error_of(place):
    """What an invented visit errs by."""
    return (-2.5, 1.0, 0.5, 3.0, -1.5)[place % 5]


def drift_plots(*, sd=4.0, outlier=None):
    """Main plot and residuals, rows 0 to 59; `outlier` is added to the value of row 5."""
    main, left = [], []
    for run in range(3):
        rows = list(range(run * PER_RUN, (run + 1) * PER_RUN))
        times = [time_of(run, place) for place in range(PER_RUN)]
        errors = [error_of(place) + (20.0 if row == LEFT_OUT else 0.0) for place, row in enumerate(rows)]
        values = [drift(run, time) + error for time, error in zip(times, errors, strict=True)]
        if run == 0 and outlier is not None:
            values[5] += outlier
        repeated = [place % 4 == 1 for place in range(PER_RUN)]
        tares = (TareMark(key=TARE_KEY, time=TARE_TIME, words="tare −38 ± 6 µGal"),) if run == 1 else ()
        edges = [times[0], TARE_TIME, TARE_TIME + 1, times[-1]] if tares else [times[0], times[-1]]
        lines = tuple(
            DriftLine(times=ends, values=tuple(drift(run, time) for time in ends), band=(3.0, 3.0))
            for ends in (tuple(edges[place : place + 2]) for place in range(0, len(edges), 2))
        )
        again = [place for place in range(PER_RUN) if repeated[place]]
        main.append(
            RunPanel(
                name=f"run {run + 1}",
                run_index=run,
                points=time_points(
                    times,
                    values,
                    rows=rows,
                    sds=[sd] * PER_RUN,
                    repeated=repeated,
                    excluded=[row == LEFT_OUT for row in rows],
                ),
                lines=lines,
                rate_words=f"+{RATES[run]}\u00a0±\u00a00.8 µGal/h",
                tares=tares,
                links=tuple(
                    RepeatLink(first=first, second=second, dashed=run == 1 and times[first] < TARE_TIME < times[second])
                    for first, second in zip(again, again[1:], strict=False)
                ),
            )
        )
        left.append(
            RunPanel(
                name=f"run {run + 1}",
                run_index=run,
                points=time_points(
                    [times[place] for place in again],
                    [errors[place] for place in again],
                    rows=[rows[place] for place in again],
                    sds=[sd] * len(again),
                ),
            )
        )
    return (
        TimePlot(title="reading less tide, station gravity removed", unit="µGal", panels=tuple(main)),
        TimePlot(title="residual of repeated stations", unit="µGal", panels=tuple(left), zero_line=True),
    )
