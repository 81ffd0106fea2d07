"""How fast the program starts and works a survey through: `python tests/benchmarks/startup_speed.py [more arguments]`.

Whole processes against processes that do the least that such work must do, in turn, the least of nine times each.
"""

from __future__ import annotations

import subprocess
import sys
import tempfile
import time
from pathlib import Path

CHECKOUT = Path(__file__).resolve().parents[2]
SURVEY = CHECKOUT / "tests" / "data" / "reiche_zeche_shaft"


def seconds(*arguments: str) -> float:
    """Wall time of one Python process, s."""
    started = time.perf_counter()
    subprocess.run([sys.executable, *arguments], check=False, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
    return time.perf_counter() - started


def compare(name: str, goal: float, work: list[str], floor: list[str], turns: int = 9) -> None:
    """Print the ratio of the least times."""
    best = [float("inf")] * 2
    for _ in range(turns):
        for number, arguments in enumerate((work, floor)):
            best[number] = min(best[number], seconds(*arguments))
    print(f"{name}: {best[0] * 1e3:.0f} ms against {best[1] * 1e3:.0f} ms, {best[0] / best[1]:.2f} times (goal {goal})")


if __name__ == "__main__":
    compare("plumbwell --version against python -c pass", 3.0, ["-m", "plumbwell", "--version"], ["-c", "pass"])
    with tempfile.TemporaryDirectory() as folder:
        reduction = ["-m", "plumbwell", "reduce", str(SURVEY), "--out", str(Path(folder) / "out"), *sys.argv[1:]]
        imports = ["-c", "import numpy, scipy.linalg, PySide6.QtGui"]
        compare("whole reduce of the real survey against imports", 2.5, reduction, imports)
