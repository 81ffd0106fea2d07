"""Ctrl-C, and the system's wish that the program ends, taken where nothing is torn apart by them.

A stop is raised as an exception wherever Python happens to be. That is right for reading and computing; it is
wrong while files change places, and while libraries that cannot bear it are loaded or draw: there it is held.
"""

from __future__ import annotations

import signal
import sys
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from types import FrameType
from typing import Any

SIGNALS = tuple(
    getattr(signal, name) for name in ("SIGINT", "SIGTERM", "SIGHUP", "SIGBREAK") if hasattr(signal, name)
)
_Handler = Callable[[int, FrameType | None], None]


class Stopped(KeyboardInterrupt):
    """The program was asked to end; `number` is that of the signal."""

    def __init__(self, number: int) -> None:
        super().__init__(number)
        self.number = number


class Stops:
    """While it is entered, each stop is noted in `number` and raised as `Stopped`.

    Parameters
    ----------
    for_good : bool
        True: the process ends after it, and what comes in its last moments is ignored. False: what stood
        before is put back.
    """

    def __init__(self, *, for_good: bool) -> None:
        self.number: int | None = None
        self._for_good = for_good
        self._former: dict[int, Any] = {}
        self._unraisable = sys.unraisablehook

    def __enter__(self) -> Stops:
        self._former = _installed(self._noted)
        sys.unraisablehook = self._swallowed
        return self

    def __exit__(self, *_: object) -> None:
        _put_back({number: signal.SIG_IGN if self._for_good else old for number, old in self._former.items()})
        sys.unraisablehook = self._unraisable

    def raise_noted(self) -> None:
        """Raise the stop that has come but was lost on its way, as happens in callbacks of other libraries."""
        if self.number is not None:
            raise Stopped(self.number)

    def _noted(self, number: int, frame: FrameType | None) -> None:
        self.number = number
        raise Stopped(number)

    def _swallowed(self, lost: sys.UnraisableHookArgs) -> None:
        if not issubclass(lost.exc_type, KeyboardInterrupt):
            self._unraisable(lost)


class Held:
    """Stops that wait; see `held`."""

    def __init__(self) -> None:
        self._waiting: list[int] = []
        self._former = _installed(self._noted)

    @contextmanager
    def let_through(self) -> Iterator[None]:
        """Within it stops act at once, those that wait first."""
        self.end()
        try:
            yield
        finally:
            self._former = _installed(self._noted)

    def end(self) -> None:
        """Put back what stood before and let it have the first stop that waits."""
        former, waiting = self._former, self._waiting
        self._waiting = []
        _put_back(former)
        if waiting:
            handler = former[waiting[0]]
            if callable(handler):
                handler(waiting[0], None)
            else:
                signal.raise_signal(waiting[0])

    def _noted(self, number: int, frame: FrameType | None) -> None:
        self._waiting.append(number)


@contextmanager
def held() -> Iterator[Held]:
    """Let stops wait until the block ends; the first of them then acts as it would have without."""
    hold = Held()
    try:
        yield hold
    finally:
        hold.end()


def _installed(handler: _Handler) -> dict[int, Any]:
    """Set a handler for all stops that are not ignored; what stood before. Only the main thread may."""
    former: dict[int, Any] = {}
    try:
        for number in SIGNALS:
            old = signal.getsignal(number)
            if old not in (None, signal.SIG_IGN):
                former[number] = old
                signal.signal(number, handler)
    except ValueError:
        return {}
    return former


def _put_back(former: dict[int, Any]) -> None:
    for number, old in former.items():
        signal.signal(number, old)
