"""How the window starts: the bare window at once, then the desk in it, then the survey read beside.

Here alone the log, the failure dialog and the application's own settings are set up.
"""

from __future__ import annotations

import builtins
import signal
import sys
from pathlib import Path
from typing import TYPE_CHECKING

from plumbwell import __version__

if TYPE_CHECKING:
    from plumbwell.desk.shell import Shell

HEARTBEAT = 200
"""Milliseconds between two moments in which Python may see that the system wants the program to end."""


def load_qt() -> None:
    """Load Qt, and leave Python's own import in place.

    The binding reads the source of every module that is loaded after it, for a spelling of names that is not used
    here; without that the desk is loaded an eighth faster.

    Raises
    ------
    ImportError
        A library that Qt needs is missing.
    """
    plain_import = builtins.__import__
    try:
        import PySide6.QtWidgets  # noqa: F401
    finally:
        builtins.__import__ = plain_import


def run(path: Path | None, home: Path) -> int:
    """Show the window until it is closed.

    Parameters
    ----------
    path : Path or None
        Survey folder to open; None shows the doors.
    home : Path
        The user's data folder.

    Returns
    -------
    int
        Exit status.
    """
    load_qt()
    from PySide6.QtCore import QTimer
    from PySide6.QtWidgets import QApplication

    from plumbwell.desk.look import Look
    from plumbwell.desk.settings import Settings
    from plumbwell.desk.shell import Shell

    application = QApplication.instance() or QApplication([sys.argv[0]])
    assert isinstance(application, QApplication)
    application.setApplicationName("Plumbwell")
    application.setApplicationVersion(__version__)
    application.setStyle("Fusion")
    look = Look()
    shell = Shell(look, Settings(home))
    shell.show()
    # The bare window is painted before the desk is loaded, which takes the GUI thread for a moment.
    application.processEvents()
    QTimer.singleShot(0, lambda: furnish(shell, home, path))
    # Python looks at signals only when it runs: a timer lets it, so that Ctrl-C in a terminal closes the window.
    heartbeat = QTimer()
    heartbeat.timeout.connect(lambda: None)
    heartbeat.start(HEARTBEAT)
    former = {number: signal.signal(number, lambda *_: shell.close()) for number in (signal.SIGINT, signal.SIGTERM)}
    try:
        return application.exec()
    finally:
        heartbeat.stop()
        for number, handler in former.items():
            signal.signal(number, handler)
        from plumbwell.desk.opening import failure

        failure.uninstall()


def furnish(shell: Shell, home: Path, path: Path | None) -> None:
    """Load the desk into the bare window, and open a survey."""
    from plumbwell.desk.opening import failure
    from plumbwell.desk.window import Desk

    failure.install(home, shell.look, shell)
    desk = Desk(shell, home)
    if path is not None:
        desk.open(path)
