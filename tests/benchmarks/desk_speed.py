"""How fast the window starts and answers, beside yardsticks of the same run: python tests/benchmarks/desk_speed.py

Whole processes are started in turn, so that a slow moment of the machine meets all alike; ratios are of medians.
"""

from __future__ import annotations

import os
import subprocess
import sys
import tempfile
import time
from pathlib import Path
from statistics import median

CHECKOUT = Path(__file__).resolve().parents[2]
WELL = CHECKOUT / "sample_surveys" / "tolly_bank_well"
ROUNDS = 7

BARE = """
import time
from PySide6.QtWidgets import QApplication, QMainWindow, QMenuBar
application = QApplication([])
{extra}
class Window(QMainWindow):
    def paintEvent(self, event):
        super().paintEvent(event)
        print(time.time(), flush=True)
        application.exit()
window = Window()
window.menuBar().addMenu("File")
window.resize(1440, 900)
window.show()
application.exec()
"""

OURS = """
import sys, time
from pathlib import Path
from plumbwell.desk import start
start.load_qt()
from PySide6.QtCore import QObject, QEvent, QTimer
from PySide6.QtWidgets import QApplication
from plumbwell.desk import shell
times = {{}}
class FirstPaint(QObject):
    def eventFilter(self, watched, event):
        if event.type() == QEvent.Type.Paint:
            times.setdefault("shell", time.time())
        return False
made = shell.Shell.__init__
def watched(self, *arguments):
    made(self, *arguments)
    self.eye = FirstPaint()
    self.installEventFilter(self.eye)
shell.Shell.__init__ = watched
def look():
    work = getattr(application.activeWindow() or windows()[0], "inhabited", None)
    work = None if work is None else work.workspace
    if work is not None and len(work.ledger.table) and work.front.currentWidget() is work.body:
        work.ledger.rows.viewport().repaint()
        times["readings"] = time.time()
        print(times["shell"], times["readings"], flush=True)
        windows()[0].close()
        application.quit()
def windows():
    return [one for one in application.topLevelWidgets() if isinstance(one, shell.Shell)]
application = QApplication([])
poll = QTimer()
poll.timeout.connect(look)
poll.start(3)
start.run(Path({folder!r}), Path({home!r}))
"""


def timed(code: str) -> list[float]:
    """Seconds from the start of a Python to each moment that it prints."""
    environment = {**os.environ, "QT_QPA_PLATFORM": "offscreen", "PYTHONPATH": str(CHECKOUT / "src")}
    environment.pop("PYTHONDONTWRITEBYTECODE", None)
    begun = time.time()
    done = subprocess.run([sys.executable, "-c", code], env=environment, capture_output=True, text=True, check=True)
    return [float(word) - begun for word in done.stdout.split()]


def starts() -> None:
    """First paints of a bare window, of one with pyqtgraph imported first, and of ours."""
    bare, graph, shell, readings = [], [], [], []
    for number in range(ROUNDS + 1):
        with tempfile.TemporaryDirectory() as home:
            found = (
                timed(BARE.format(extra="")), timed(BARE.format(extra="import pyqtgraph")),
                timed(OURS.format(folder=str(WELL), home=home)),
            )  # fmt: skip
        if number:  # the first round fills the caches
            bare.append(found[0][0])
            graph.append(found[1][0])
            shell.append(found[2][0])
            readings.append(found[2][1])
    yardstick = median(graph)
    print(f"bare window {median(bare):.2f} s; with pyqtgraph imported first {yardstick:.2f} s")
    print(f"our shell {median(shell):.2f} s, {median(shell) / median(bare):.2f} of the bare window")
    print(f"a sample's readings on screen {median(readings):.2f} s, {median(readings) / yardstick:.2f} of pyqtgraph's")


def answers() -> None:
    """From an exclusion to repainted densities, and what the chain alone takes of it."""
    sys.path[:0] = [str(CHECKOUT / "src"), str(CHECKOUT / "tests" / "made"), str(Path(__file__).parent)]
    os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")
    from PySide6.QtCore import QEventLoop, Qt
    from PySide6.QtWidgets import QApplication

    from driven_desk import Driven
    from plumbwell.study.acts import Exclude
    from plumbwell.study.reduce import reduce

    application = QApplication([])
    with tempfile.TemporaryDirectory() as home:
        window = Driven(Path(home))
        window.open(WELL)
        window.stage("density")
        n = len(window.document.results.survey.readings)
        spent, chain, keeping = [], [], []
        for row in range(20, 60, 2):
            begun = time.perf_counter()
            window.document.act(Exclude(rows=(row,), reason="timed"))
            keeping.append(time.perf_counter() - begun)
            loop = QEventLoop()
            window.document.reduced.connect(loop.quit, Qt.ConnectionType.QueuedConnection)
            loop.exec()
            application.processEvents()
            spent.append(time.perf_counter() - begun)
            window.settle()
            assert window.document.reduced_case is window.document.case
            begun = time.perf_counter()
            reduce(window.document.case)
            chain.append(time.perf_counter() - begun)
        print(
            f"exclusion to repainted densities at {n} readings: {1e3 * median(spent):.0f} ms (keeping the act "
            f"{1e3 * median(keeping):.0f} ms; the chain alone without memory {1e3 * median(chain):.0f} ms)"
        )
        window.close()
    application.processEvents()


def while_slow(*, busy: bool) -> None:
    """The longest time that the window does not answer while a step of the chain takes three seconds.

    A step that waits, or computes in a library, leaves Python to the window; a busy one wants it all the time.
    """
    from PySide6.QtCore import Qt, QTimer
    from PySide6.QtWidgets import QApplication

    from driven_desk import Driven, wait_until
    from plumbwell.study import reduce as chain
    from plumbwell.study.acts import Exclude

    application = QApplication.instance() or QApplication([])
    real = chain.docket

    def slow(results: object) -> object:
        ends = time.perf_counter() + 3.0
        while time.perf_counter() < ends:
            if busy:
                sum(range(10_000))
            else:
                time.sleep(0.05)
        return real(results)

    with tempfile.TemporaryDirectory() as home:
        window = Driven(Path(home))
        window.open(WELL)
        window.stage("density")
        chain.docket = slow
        gaps, last = [], [time.perf_counter()]

        def beat() -> None:
            now = time.perf_counter()
            gaps.append(now - last[0])
            last[0] = now

        heart = QTimer()
        heart.setTimerType(Qt.TimerType.PreciseTimer)
        heart.timeout.connect(beat)
        window.document.act(Exclude(rows=(20,), reason="timed"))
        last[0] = time.perf_counter()
        heart.start(10)
        for step in range(40):
            QTimer.singleShot(60 * step, lambda: window.work.ledger.walk(1))
        wait_until(lambda: len(gaps) > 150)
        heart.stop()
        gaps.sort()
        print(
            f"while a step {'works' if busy else 'waits'} for 3 s and rows are walked: a beat of 10 ms comes after "
            f"{1e3 * median(gaps):.0f} ms, "
            f"95 % within {1e3 * gaps[int(0.95 * len(gaps))]:.0f} ms, at most {1e3 * gaps[-1]:.0f} ms"
        )
        chain.docket = real
        wait_until(window.reduced)
        window.close()
    application.processEvents()


if __name__ == "__main__":
    if "answers" not in sys.argv:
        starts()
    answers()
    while_slow(busy=False)
    while_slow(busy=True)
