"""Work beside the window: a live lane where the newest request replaces the one that waits, and a long lane.

A request is a function of frozen values and a ticket; it touches no Qt object, no document and no database. Its
answer comes back through one signal in the window's thread. Who asked drops an answer whose ticket is stale.
"""

from __future__ import annotations

import sys
from collections.abc import Callable
from dataclasses import dataclass
from threading import Condition, Event, Thread
from time import monotonic
from typing import Any

from PySide6.QtCore import QObject, Signal

TURN = 0.0005
"""Seconds after which a thread of ours lets another one have its turn."""

LEAST_PAUSE = 0.05
"""Seconds between two tellings of progress: twenty a second at most."""

PATIENCE = 1.5
"""Seconds that a closing window waits for work that cannot be interrupted."""


class Stopped(Exception):
    """The person stopped the work."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Answer:
    """What came of a request: its ticket, and a value or an exception."""

    ticket: int
    value: Any = None
    error: BaseException | None = None


class Lane(QObject):
    """One thread that works off requests: one running, one waiting.

    Parameters
    ----------
    name : str
        Of the thread.
    replaces : bool
        True: a new request takes the place of the waiting one, so that a drag never builds a queue.

    Signals
    -------
    answered(Answer)
    progressed(int, float, str)
        Ticket, share done (0 to 1), what is being done.
    """

    answered = Signal(object)
    progressed = Signal(int, float, str)

    def __init__(self, name: str, *, replaces: bool, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self._replaces = replaces
        self._waiting: list[tuple[int, Callable[[Progress], Any]]] = []
        self._wake = Condition()
        self._ended = False
        self._progress: Progress | None = None
        self._ticket = 0
        self._thread = Thread(target=self._work, name=name, daemon=True)
        self._started = False

    def request(self, work: Callable[[Progress], Any]) -> int:
        """Ask for work; returns its ticket. `work` is given the progress that it tells and asks."""
        with self._wake:
            self._ticket += 1
            if self._replaces:
                self._waiting.clear()
            self._waiting.append((self._ticket, work))
            if not self._started:
                self._started = True
                # The window's thread shall not wait five milliseconds whenever it wants to go on.
                sys.setswitchinterval(TURN)
                self._thread.start()
            self._wake.notify()
            return self._ticket

    def stop(self) -> None:
        """Ask the running work to stop at its next telling; what waits is answered as stopped at once."""
        with self._wake:
            waiting, self._waiting = self._waiting, []
            if self._progress is not None:
                self._progress.stopped.set()
        for ticket, _ in waiting:
            self.answered.emit(Answer(ticket=ticket, error=Stopped()))

    def end(self) -> None:
        """Take no more work, stop what is running, and tell nothing any more."""
        with self._wake:
            self._waiting.clear()
            self._ended = True
            if self._progress is not None:
                self._progress.stopped.set()
            self._wake.notify()

    def join(self, patience: float) -> bool:
        """Wait so many seconds for the thread of an ended lane; whether it has ended."""
        if self._started:
            self._thread.join(patience)
        return not self._thread.is_alive()

    def _work(self) -> None:
        while True:
            with self._wake:
                while not self._waiting and not self._ended:
                    self._wake.wait()
                if self._ended:
                    return
                ticket, work = self._waiting.pop(0)
                self._progress = progress = Progress(self, ticket)
            try:
                answer = Answer(ticket=ticket, value=work(progress))
            except BaseException as error:  # noqa: BLE001  it is handed to who asked
                answer = Answer(ticket=ticket, error=error)
            # Told under the lock: once the lane has ended, the object of its signals may be gone.
            with self._wake:
                self._progress = None
                if self._ended:
                    return
                self.answered.emit(answer)

    def tell(self, ticket: int, share: float, what: str) -> None:
        """Tell how far the work of a ticket is; for its progress."""
        with self._wake:
            if not self._ended:
                self.progressed.emit(ticket, share, what)


def end_all(*lanes: Lane, patience: float = PATIENCE) -> bool:
    """End lanes together; waits a little for work that cannot be interrupted. Whether all threads have ended."""
    for lane in lanes:
        lane.end()
    until = monotonic() + patience
    return all([lane.join(max(until - monotonic(), 0.0)) for lane in lanes])


class Progress:
    """How far the work of one ticket is. Calling it tells; it raises `Stopped` when the person stopped the work."""

    def __init__(self, lane: Lane, ticket: int) -> None:
        self._lane = lane
        self._ticket = ticket
        self._told = 0.0
        self.stopped = Event()

    def __call__(self, share: float, what: str) -> None:
        """Tell the share done and what is being done next."""
        if self.stopped.is_set():
            raise Stopped
        now = monotonic()
        if now - self._told >= LEAST_PAUSE:
            self._told = now
            self._lane.tell(self._ticket, share, what)
