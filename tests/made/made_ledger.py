"""Invented ledgers: intervals of a well with a log, visits of a day, and as many rows as are wanted."""

from datetime import UTC, datetime

import numpy as np

from plumbwell.desk.ledger.table import TEXT, TIME, LedgerColumn, LedgerTable

# No, top, base, step of gravity mGal, density, sd, log, sd of the difference, mark.
ROWS = (
    (24, 554.0, 576.0, 2.489, 2.3301, 0.0071, 2.3343, 0.0091, None),
    (25, 576.0, 598.0, 2.488, 2.3302, 0.0072, 2.3281, 0.0092, None),
    (26, 598.0, 612.0, 1.697, 2.2340, 0.0112, 2.2732, 0.0131, "look"),
    (27, 612.0, 626.0, 1.723, 2.2108, 0.0118, 2.2769, 0.0134, "look"),
    (28, 626.0, 640.0, 1.717, 2.2163, 0.0119, 2.2948, 0.0132, "look"),
    (29, 640.0, 652.0, 1.476, 2.2121, 0.0138, 2.2803, 0.0149, "look"),
    (30, 652.0, 664.0, 1.440, 2.2478, 0.0131, 2.2817, 0.0147, None),
    (31, 664.0, 684.0, 1.959, 2.5109, 0.0072, 2.4921, 0.0093, None),
    (32, 684.0, 704.0, 1.951, 2.5151, 0.0071, 2.5203, 0.0092, None),
    (33, 704.0, 724.0, 1.980, 2.4982, 0.0069, 2.5056, 0.0091, None),
    (34, 724.0, 746.0, 2.156, 2.5101, 0.0068, 2.5188, 0.0090, None),
    (35, 746.0, 768.0, 2.144, 2.5162, 0.0069, 2.5191, 0.0091, None),
    (36, 768.0, 788.0, 2.552, 2.1570, 0.0079, 2.1559, 0.0098, None),
    (37, 788.0, 808.0, 2.530, 2.1702, 0.0078, 2.0391, 0.0102, "look"),
    (38, 808.0, 828.0, 2.535, 2.1671, 0.0079, 2.1688, 0.0099, None),
    (39, 828.0, 846.0, 2.273, 2.1731, 0.0089, 2.1582, 0.0108, "note"),
    (40, 846.0, 860.0, 0.893, 2.9171, 0.0091, 2.9248, 0.0110, "changed"),
    (41, 860.0, 874.0, 0.888, 2.9221, 0.0089, 2.9203, 0.0109, None),
    (42, 874.0, 888.0, 0.888, 2.9219, 0.0090, 2.9088, 0.0111, None),
    (43, 888.0, 902.0, 0.863, 2.9431, 0.0091, 2.9287, 0.0112, None),
)
NAMES = ("Pell Sandstone", "Lower Pell", "Marrow Shale", "Corran Salt", "Kett Anhydrite")


def interval_table(*, repeats=1, **changes):
    """Intervals, down the hole; the hole goes on downward with every repeat."""
    rows = np.array([row[1:8] for row in ROWS])
    values = np.tile(rows, (repeats, 1))
    values[:, :2] += np.repeat(np.arange(repeats) * 348.0, len(ROWS))[:, None]
    top, base, step, density, sd, log, difference_sd = values.T.copy()
    n = len(values)
    columns = (
        LedgerColumn(key="top", name="top", unit="m MD", heading="top [m]", values=top, decimals=1),
        LedgerColumn(key="base", name="base", unit="m MD", heading="base [m]", values=base, decimals=1),
        LedgerColumn(key="step", name="Δg", unit="mGal", heading="step [mGal]", values=step, narrow=False),
        LedgerColumn(
            key="density", name="density", unit="g/cm³", heading="density [g/cm3]", values=density, sds=sd,
            what="interval density, shell form",
        ),
        LedgerColumn(key="log", name="log", unit="g/cm³", heading="log [g/cm3]", values=log, decimals=3),
        LedgerColumn(
            key="difference", name="difference", unit="g/cm³", heading="difference [g/cm3]", values=density - log,
            sds=difference_sd, signed=True, narrow=False,
        ),
        LedgerColumn(
            key="ratio", name="ratio", unit="to sd", heading="ratio", values=(density - log) / difference_sd,
            decimals=1, signed=True, amber_from=3.0,
        ),
        LedgerColumn(
            key="layer", name="layer", heading="layer", kind=TEXT, italic=True, shown=False,
            values=tuple(NAMES[min(row % len(ROWS) // 4, 4)] for row in range(n)),
        ),
    )  # fmt: skip
    given = {
        "stage": "density",
        "level": "interval",
        "numbers": tuple(str(ROWS[0][0] + row) for row in range(n)),
        "columns": columns,
        "marks": tuple(ROWS[row % len(ROWS)][8] for row in range(n)),
        "hints": tuple("lighter than the log" if ROWS[row % len(ROWS)][8] == "look" else "" for row in range(n)),
        "excluded": np.zeros(n, dtype=bool),
        "top": top,
        "base": base,
        "density": density,
    }
    return LedgerTable(**{**given, **changes})


def seconds(*moment):
    """A moment in UTC as s since 2000-01-01."""
    return (datetime(*moment, tzinfo=UTC) - datetime(2000, 1, 1, tzinfo=UTC)).total_seconds()


def visit_table(**changes):
    """Seven visits of one day, the fifth left out; the hole is gone down and up."""
    clock = ((11, 22), (11, 41), (12, 2), (12, 17), (12, 39), (13, 1), (13, 22))
    depth = np.array([874.0, 902.0, 640.0, 0.0, 704.0, 746.0, 788.0])
    none = np.nan
    columns = (
        LedgerColumn(
            key="time", name="time", unit="UTC", heading="time", kind=TIME,
            values=np.array([seconds(2025, 10, 15, *one) for one in clock]),
        ),
        LedgerColumn(key="depth", name="depth", unit="m MD", heading="depth [m]", values=depth, decimals=1),
        LedgerColumn(
            key="kind", name="", heading="kind", kind=TEXT, italic=True, values=("", "", "base", "base", "", "", "")
        ),
        LedgerColumn(
            key="readings", name="readings", heading="readings", values=np.array([6.0, 7, 6, 6, 6, 7, 6]), decimals=0
        ),
        LedgerColumn(
            key="less_tide", name="less tide", unit="µGal", heading="less_tide [uGal]", decimals=1, signed=True,
            values=np.array([55.3, 59.02, 20.1, 29.6, none, 36.1, 40.2]),
        ),
        LedgerColumn(
            key="residual", name="residual", unit="µGal", heading="residual [uGal]", signed=True,
            values=np.array([none, none, -4.6, 2.0, none, none, 12.04]),
            sds=np.array([2.9, 2.9, 2.8, 3.0, 2.9, 2.9, 11.5]),
        ),
        LedgerColumn(
            key="ratio", name="ratio", unit="to sd", heading="ratio", decimals=1, signed=True, amber_from=3.0,
            values=np.array([none, none, -1.6, 0.7, none, none, 1.1]),
        ),
    )  # fmt: skip
    given = {
        "stage": "drift",
        "level": "visit",
        "numbers": tuple(str(number) for number in range(31, 38)),
        "number_unit": "visit",
        "columns": columns,
        "marks": (None, None, "changed", None, "excluded", None, None),
        "hints": ("", "", "depth changed from 638.0 m", "", "Pump started, needle restless.", "", ""),
        "excluded": np.array([False, False, False, False, True, False, False]),
        "top": depth,
        "base": depth,
        "density": np.full(7, none),
    }
    return LedgerTable(**{**given, **changes})


def large_table(n, *, columns=8):
    """So many invented readings down a hole: depth, numbers with and without standard deviation, a text."""
    chance = np.random.default_rng(20)
    depth = np.sort(chance.uniform(0.0, 2000.0, n))
    made = [LedgerColumn(key="depth", name="depth", unit="m MD", heading="depth [m]", values=depth, decimals=1)]
    for place in range(columns - 2):
        sds = chance.uniform(0.006, 0.014, n) if place % 3 == 0 else None
        made.append(
            LedgerColumn(
                key=f"value_{place}", name=f"value {place}", unit="mGal", heading=f"value_{place} [mGal]",
                values=chance.normal(2.5, 0.4, n), sds=sds, signed=place % 2 == 1,
            )
        )  # fmt: skip
    labels = tuple(NAMES[place] for place in chance.integers(0, len(NAMES), n))
    made.append(LedgerColumn(key="layer", name="layer", heading="layer", kind=TEXT, italic=True, values=labels))
    return LedgerTable(
        stage="readings",
        level="reading",
        numbers=tuple(map(str, range(1, n + 1))),
        columns=tuple(made),
        marks=(None,) * n,
        hints=("",) * n,
        excluded=np.zeros(n, dtype=bool),
        top=depth,
        base=depth,
        density=np.full(n, np.nan),
    )
