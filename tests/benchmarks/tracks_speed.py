"""How fast the tracks pan, in ratios of one run: `python tests/benchmarks/tracks_speed.py`.

Frames are painted one after the other into a shown window, each with another depth window. The yardsticks are painted
in the same run: a bare widget with 500 lines, and one with a smooth line of a thousand points that moves. A log of a
million samples has spikes of one sample each; that every one in view reaches its row is checked in every frame.
"""

from __future__ import annotations

import gc
import os
import time
from collections.abc import Callable, Sequence

os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")

import numpy as np
from PySide6.QtCore import QPointF, Qt
from PySide6.QtGui import QPainter, QPaintEvent, QPen
from PySide6.QtWidgets import QApplication, QWidget

from plumbwell.desk.look import Look
from plumbwell.desk.tracks.tracks import Tracks
from plumbwell.plates.log_curve import LogCurve
from plumbwell.plates.polyline import log_pieces
from plumbwell.plates.track import OriginBar, Point, Step, Track

SIZE = (640, 480)
DEEPEST = 1500.0
FRAMES = 60


class BareLines(QWidget):
    """Five hundred level lines, or a smooth line of a thousand points, moved by an offset."""

    def __init__(self, *, smooth: bool) -> None:
        super().__init__()
        self.smooth = smooth
        self.offset = 0.0
        self.resize(*SIZE)
        chance = np.random.default_rng(0)
        self.places = list(
            zip((300 + 40 * chance.standard_normal(1000)).tolist(), np.linspace(0, 470, 1000).tolist(), strict=True)
        )

    def paintEvent(self, event: QPaintEvent) -> None:
        painter = QPainter(self)
        painter.fillRect(self.rect(), Qt.GlobalColor.white)
        painter.setPen(QPen(Qt.GlobalColor.black, 1))
        if self.smooth:
            painter.setRenderHint(QPainter.RenderHint.Antialiasing)
            painter.drawPolyline([QPointF(x + self.offset, y) for x, y in self.places])
        else:
            for number in range(500):
                y = (number + self.offset) % SIZE[1]
                painter.drawLine(QPointF(0, y), QPointF(SIZE[0], y))
        painter.end()


def log_of(samples: int) -> tuple[LogCurve, np.ndarray]:
    """A log with noise, a gap and spikes, and the numbers of the samples that are spikes."""
    chance = np.random.default_rng(1)
    depth = np.linspace(0.0, DEEPEST, samples)
    value = 2.4 + 0.02 * chance.standard_normal(samples)
    value[samples // 3 : samples // 3 + samples // 50] = np.nan
    known = np.flatnonzero(np.isfinite(value))
    spikes = np.sort(chance.choice(known, 150, replace=False))
    value[spikes] = np.where(np.arange(150) % 2, 2.05, 2.85)
    return LogCurve(depth=depth, value=value), spikes


def five_tracks(line: LogCurve, stations: int) -> list[Track]:
    """Five tracks of so many stations: points twice, staircase with log, difference, sd by origin."""
    depths = np.linspace(0.0, DEEPEST, stations).tolist()
    edges = list(zip(depths, depths[1:], strict=False))
    noise = np.random.default_rng(2).standard_normal(stations).tolist()
    rows = list(zip(depths, noise, strict=True))
    gravity = tuple(Point(depth=z, value=0.08 * z, sd=0.01) for z in depths)
    left = tuple(Point(depth=z, value=0.01 * n, sd=0.006) for z, n in rows)
    density, difference = (
        tuple(
            Step(top=top, base=base, value=middle + 0.01 * n, sd=0.01)
            for (top, base), n in zip(edges, noise, strict=False)
        )
        for middle in (2.4, 0.0)
    )
    bars = tuple(OriginBar(depth=z, sd=5 + 0.3 * n, shares=(0.6, 0.3, 0.08, 0.02)) for z, n in rows)
    unit = "g/cm\u00b3"
    return [
        Track(title="gravity", unit="mGal", low=-5.0, high=125.0, weight=0.75, points=gravity),
        Track(title="left over", unit="mGal", low=-0.05, high=0.05, points=left, signed=True),
        Track(
            title="density",
            unit=unit,
            low=2.0,
            high=2.9,
            weight=2.0,
            steps=density,
            line=line,
            step_name="gravity",
            line_name="log",
        ),
        Track(title="difference", unit=unit, low=-0.1, high=0.1, steps=difference, signed=True),
        Track(title="sd", unit="\u00b5Gal", low=0.0, high=8.0, bars=bars, origins=("depth", "reading", "drift", "tie")),
    ]


def shown(look: Look, tracks: Sequence[Track], stations: Sequence[float]) -> Tracks:
    """Tracks in a shown window."""
    widget = Tracks(look)
    widget.resize(*SIZE)
    widget.set_tracks(
        tracks,
        depth_label="MD",
        unit="m",
        upward=False,
        stations=stations,
        markers=[(f"Bed {number}", 140.0 * number) for number in range(10)],
        measured=(0.0, DEEPEST),
    )
    widget.show()
    QApplication.processEvents()
    return widget


def frame_times(move: Callable[[int], None], widget: QWidget) -> tuple[float, float, float]:
    """Least, median and 95th percentile of the time of a frame, ms."""
    times = []
    gc.collect()
    gc.disable()
    try:
        for number in range(FRAMES):
            move(number)
            started = time.perf_counter()
            widget.repaint()
            times.append(1e3 * (time.perf_counter() - started))
    finally:
        gc.enable()
    kept = np.sort(times[3:])
    return float(kept[0]), float(np.median(kept)), float(np.percentile(kept, 95))


def panned(widget: Tracks, length: float) -> Callable[[int], None]:
    """Moves the window a little with every frame."""
    room = max(DEEPEST - length, 0.2 * length)

    def move(number: int) -> None:
        top = -0.1 * length + room * number / FRAMES
        widget.set_window(top, top + length)

    return move


def pointed(widget: Tracks) -> Callable[[int], None]:
    """Moves the crosshair a little with every frame."""
    return lambda number: widget.set_crosshair(200.0 + number)


def spikes_lost(widget: Tracks, line: LogCurve, spikes: np.ndarray) -> int:
    """Number of spikes in view that do not reach their px row."""
    track = next(track for track in widget._scene.tracks if track.line is line)
    frame = widget._places().tracks[widget._scene.tracks.index(track)]
    inside = spikes[(line.depth[spikes] >= frame.depth_top) & (line.depth[spikes] <= frame.depth_base)]
    reach: dict[int, list[tuple[float, float]]] = {}
    for piece in log_pieces(line, track.low, track.high, frame):
        for y, low, high in zip(piece.y.tolist(), *(side.tolist() for side in piece.extent), strict=True):
            reach.setdefault(int(np.floor(y)), []).append((low, high))
    x, y = track.x_of(line.value[inside], frame), np.floor(frame.y_of(line.depth[inside])).astype(int)
    return sum(
        not any(low - 1e-6 <= column <= high + 1e-6 for low, high in reach.get(row, []))
        for column, row in zip(x.tolist(), y.tolist(), strict=True)
    )


def report(name: str, times: tuple[float, float, float], yard: tuple[float, float]) -> None:
    """Print a frame time and what it is in both yardsticks."""
    least, middle, slow = times
    print(
        f"{name:44} least {least:6.2f}  median {middle:6.2f}  95 % {slow:6.2f} ms; "
        f"{middle / yard[0]:5.1f} times 500 lines, {middle / yard[1]:5.1f} times a line of 1000 points"
    )


def main() -> None:
    """Measure and print."""
    application = QApplication.instance() or QApplication([])
    look = Look()
    look.choose(wanted="light")
    yard = []
    for smooth in (False, True):
        bare = BareLines(smooth=smooth)
        bare.show()
        application.processEvents()
        times = frame_times(lambda number, bare=bare: setattr(bare, "offset", float(number)), bare)  # type: ignore[misc]
        yard.append(times[1])
        print(f"yardstick, {'a line of 1000 points' if smooth else '500 lines'}: median {times[1]:.2f} ms")
        bare.close()
    both = (yard[0], yard[1])
    stations = np.linspace(0.0, DEEPEST, 500).tolist()
    for samples, lengths in ((10_000, (500.0, 1500.0, 30.0)), (1_000_000, (500.0, 1500.0, 5.0))):
        line, spikes = log_of(samples)
        tracks = five_tracks(line, 500)
        widget = shown(look, tracks, stations)
        for length in lengths:
            move = panned(widget, length)
            name = f"five tracks, log 1e{len(str(samples)) - 1}, {length:.0f} m in view"
            report(name, frame_times(move, widget), both)
            lost = 0
            for number in range(FRAMES):
                move(number)
                lost += spikes_lost(widget, line, spikes)
            print(f"{'':44} spikes lost in {FRAMES} frames: {lost}")
        widget.set_window(100.0, 600.0)
        widget.repaint()
        report("  crosshair alone", frame_times(pointed(widget), widget), both)
        widget.close()
    alone = shown(look, [next(track for track in tracks if track.line is line)], stations)
    report("log of 1e6 samples alone, 500 m in view", frame_times(panned(alone, 500.0), alone), both)
    alone.close()


if __name__ == "__main__":
    main()
