"""The one place where an application object is made for drawing without a window.

Fonts and text need a QGuiApplication. A window makes its own before anything is drawn; the command line and
a script have none, and on Linux may have no screen either.
"""

from __future__ import annotations

import os
import sys
from functools import cache

from PySide6.QtCore import QCoreApplication
from PySide6.QtGui import QGuiApplication


@cache
def _own_application() -> QGuiApplication:
    arguments = ["plumbwell"]
    if sys.platform.startswith("linux") and not os.environ.get("QT_QPA_PLATFORM"):
        # A display that is named but cannot be reached would end the process, so none is asked for.
        arguments += ["-platform", "offscreen"]
    return QGuiApplication(arguments)


def drawing_application() -> QGuiApplication:
    """Return the running application, made without a display when there is none yet.

    On Linux the application made here uses the "offscreen" platform unless ``QT_QPA_PLATFORM`` names another.
    The environment is not changed.

    Returns
    -------
    QGuiApplication
        The application of this process; it lives until the process ends.

    Raises
    ------
    RuntimeError
        A QCoreApplication without graphics is already running, so text cannot be drawn.
    """
    running = QCoreApplication.instance()
    if running is None:
        return _own_application()
    if not isinstance(running, QGuiApplication):
        raise RuntimeError("drawing needs a QGuiApplication, but one without graphics is already running")
    return running
