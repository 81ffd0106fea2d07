"""Pictures of every stage, made by driving the real program: run it, then look at each.

    python tests/desk/gallery.py FOLDER [NAME ...]

Both themes, 1440 x 900 and 1180 x 720, text scale 1 and 1.5, the samples and the real survey; NAMEs keep those
pictures alone whose file name holds one of them.
"""

from __future__ import annotations

import os
import sys
import tempfile
from collections.abc import Iterator
from pathlib import Path

os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")
os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
CHECKOUT = Path(__file__).resolve().parents[2]
sys.path[:0] = [str(CHECKOUT / "src"), str(CHECKOUT / "tests" / "made")]

SURVEYS = {
    "well": CHECKOUT / "sample_surveys" / "tolly_bank_well",
    "mine": CHECKOUT / "sample_surveys" / "quernlow_shaft",
    "real": CHECKOUT / "tests" / "data" / "reiche_zeche_shaft",
}
SIZES = ((1440, 900), (1180, 720))
LOOKS = (("light", 1.0), ("dark", 1.0), ("light", 1.5))
PAGES = {"readings": "settle", "drift": "settle", "reduction": "recipe", "density": "neighbours", "handover": "history"}
CHOSEN = {"readings": 10, "drift": 8, "reduction": 2, "density": 1, "handover": 0}


def names() -> Iterator[tuple[str, str, tuple[int, int], str, float]]:
    """File name, survey, size, theme and text scale of each picture's window."""
    for survey in ("none", *SURVEYS, "refused"):
        for size in SIZES:
            for theme, scale in LOOKS:
                yield f"{survey}-{size[0]}-{theme}-{scale:g}", survey, size, theme, scale


def main(folder: Path, wanted: list[str]) -> int:
    """Make the pictures; the exit status."""
    from PySide6.QtCore import QPoint
    from PySide6.QtTest import QTest
    from PySide6.QtWidgets import QApplication

    from driven_desk import Driven, wait_until

    application = QApplication([])
    folder.mkdir(parents=True, exist_ok=True)
    made = 0
    for name, survey, size, theme, scale in names():
        if wanted and not any(word in name for word in wanted):
            continue
        with tempfile.TemporaryDirectory() as home:
            window = Driven(Path(home), size=size, theme=theme, scale=scale)
            if survey == "none":
                window.picture(folder / f"{name}.png")
            elif survey == "refused":
                spoiled = spoiled_survey(Path(home) / "spoiled")
                window.desk.open(spoiled)
                wait_until(lambda shown=window: shown.desk.problems.isVisible())
                window.picture(folder / f"{name}.png")
            else:
                window.open(SURVEYS[survey])
                for stage, page in PAGES.items():
                    window.stage(stage)
                    rows = len(window.work.ledger.table)
                    level = window.work.following.level
                    window.work.selection.choose(level, (min(CHOSEN[stage], rows - 1),) if level != "file" else ())
                    window.work.open_page(page)
                    window.settle()
                    if stage in ("reduction", "density"):
                        tracks = window.work.tracks
                        QTest.mouseMove(tracks, QPoint(int(0.7 * tracks.width()), int(0.62 * tracks.height())))
                    window.picture(folder / f"{name}-{stage}.png")
                    made += 1
            made += 1
            window.close()
    print(f"{made} pictures in {folder}")
    application.processEvents()
    return 0


def spoiled_survey(folder: Path) -> Path:
    """A copy of the real survey with a few wrong cells, to see how they are told."""
    import shutil

    shutil.copytree(SURVEYS["real"], folder)
    lines = (folder / "readings.csv").read_text(encoding="utf-8").splitlines()
    head = next(number for number, line in enumerate(lines) if not line.startswith("#"))
    for row, cell, text in ((head + 3, 0, "2026-02-30T09:00:00Z"), (head + 9, -1, "many"), (head + 12, 0, "")):
        cells = lines[row].split(",")
        cells[cell] = text
        lines[row] = ",".join(cells)
    (folder / "readings.csv").write_text("\n".join(lines) + "\n", encoding="utf-8")
    return folder


if __name__ == "__main__":
    if len(sys.argv) < 2:
        print(__doc__)
        raise SystemExit(2)
    raise SystemExit(main(Path(sys.argv[1]), sys.argv[2:]))
