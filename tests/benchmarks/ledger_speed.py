"""How fast the ledger scrolls, filters and sorts: `python tests/benchmarks/ledger_speed.py [rows]`.

Page scrolls through a million rows against a plain table view over a numpy model of the same numbers, rows, columns
and size, in turn; filters and sorts against the least that numpy needs for the same.
"""

from __future__ import annotations

import os
import statistics
import sys
import time
from collections.abc import Callable
from pathlib import Path

os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")
os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
CHECKOUT = Path(__file__).resolve().parents[2]
sys.path[:0] = [str(CHECKOUT / "src"), str(CHECKOUT / "tests" / "made")]

import numpy as np  # noqa: E402
from PySide6.QtCore import QAbstractTableModel, QModelIndex  # noqa: E402
from PySide6.QtWidgets import QApplication, QHeaderView, QTableView  # noqa: E402

from made_ledger import large_table  # noqa: E402
from plumbwell.desk.ledger.ledger import Ledger  # noqa: E402
from plumbwell.desk.ledger.ledger_cells import row_height  # noqa: E402
from plumbwell.desk.ledger.table import LedgerTable  # noqa: E402
from plumbwell.desk.look import Look  # noqa: E402

SIZE = (900, 1000)
PAGES = 120
ALIGN_RIGHT = 130


class PlainModel(QAbstractTableModel):
    """The numbers and texts of a ledger with the least work a cell."""

    def __init__(self, table: LedgerTable) -> None:
        super().__init__()
        self._columns = [column.values for column in table.columns]
        self._rows = len(table)

    def rowCount(self, parent: QModelIndex | None = None) -> int:
        return 0 if parent is not None and parent.isValid() else self._rows

    def columnCount(self, parent: QModelIndex | None = None) -> int:
        return 0 if parent is not None and parent.isValid() else len(self._columns)

    def data(self, index: QModelIndex, role: int = 0) -> object:
        if role == 0:
            value = self._columns[index.column()][index.row()]
            return value if isinstance(value, str) else f"{value:.3f}"
        return ALIGN_RIGHT if role == 7 else None


def plain_view(table: LedgerTable, height: int) -> QTableView:
    """A table view as Qt makes it, with rows of a fixed height."""
    view = QTableView()
    view.setModel(PlainModel(table))
    view.verticalHeader().setSectionResizeMode(QHeaderView.ResizeMode.Fixed)
    view.verticalHeader().setDefaultSectionSize(height)
    view.setVerticalScrollMode(QTableView.ScrollMode.ScrollPerPixel)
    return view


def page(view: QTableView, place: int) -> float:
    """Time in ms of a jump to a place, painted."""
    started = time.perf_counter()
    view.verticalScrollBar().setValue(place)
    QApplication.processEvents()
    return (time.perf_counter() - started) * 1e3


def least(act: Callable[[], object], turns: int = 3) -> float:
    """The least time of a few turns, ms."""
    times = []
    for _ in range(turns):
        started = time.perf_counter()
        act()
        times.append(time.perf_counter() - started)
    return min(times) * 1e3


def tell(name: str, own: float, yardstick: float, goal: str) -> None:
    """Print one comparison."""
    print(f"{name}: {own:.1f} ms against {yardstick:.1f} ms, {own / yardstick:.2f} times ({goal})")


def main(rows: int) -> None:
    """Measure and print."""
    application = QApplication([])
    application.setStyle("Fusion")
    look = Look()
    look.choose(wanted="light")
    table = large_table(rows)
    ledger = Ledger(look)
    ledger.set_table(table)
    plain = plain_view(table, row_height(look.theme))
    for shown in (ledger, plain):
        shown.resize(*SIZE)
        shown.show()
    application.processEvents()
    step = ledger.rows.verticalScrollBar().pageStep()
    places = [rows // 3 * row_height(look.theme) + number * step for number in range(PAGES)]
    # One page of each in turn, so that whatever else the machine does falls on both alike.
    own, bare = zip(*((page(ledger.rows, place), page(plain, place)) for place in places), strict=True)
    print(f"{rows} rows, {len(table.columns)} columns, {SIZE[0]} x {SIZE[1]} px")
    tell("page scroll against a plain table view, median", statistics.median(own), statistics.median(bare), "goal 1.3")
    tell("page scroll against a plain table view, least", min(own), min(bare), "goal 1.3")
    values, layers = np.asarray(table.columns[1].values), table.columns[-1].values
    compared = least(lambda: np.flatnonzero(values > 2.9))
    looked = least(lambda: ["marrow" in layer.casefold() for layer in layers])
    number, text = (compared, "one comparison in numpy"), (looked, "one pass over one text column")
    for name, written, (yardstick, of) in (
        ("a number", "value 0 > 2.9", number),
        ("a word", "marrow", text),
        ("figures", "2.41", text),
        ("two loose figures", "37 18", text),
    ):
        own_time = least(lambda written=written: ledger.set_filter(written))
        tell(f"filter by {name} against {of}", own_time, yardstick, "under 1000 ms")
    ledger.close_filter()
    sorting = least(lambda: np.argsort(values, kind="stable"))
    tell(
        "sort against numpy",
        least(lambda: (ledger.sort_by("value_1"), ledger.sort_by("value_2"))) / 2,
        sorting,
        "under 1000 ms",
    )
    ledger.sort_as_given()
    many = range(0, rows, 2)
    listed = least(lambda: list(many))
    tell("choose every second row against a list of them", least(lambda: ledger.choose_rows(many)), listed, "at once")


if __name__ == "__main__":
    main(int(sys.argv[1]) if len(sys.argv) > 1 else 1_000_000)
