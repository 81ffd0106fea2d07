"""Where the program keeps what a person has not put anywhere: the user's own data folder, and who the user is."""

from __future__ import annotations

import getpass
import os
import sys
from collections.abc import Mapping
from pathlib import Path

from plumbwell.survey.errors import shown

NAME = "Plumbwell"
OWN_HOME = "PLUMBWELL_HOME"
"""Variable of the environment that names the data folder itself."""


def data_folder(
    environment: Mapping[str, str] | None = None, *, platform: str = sys.platform, home: Path | None = None
) -> Path:
    """The folder for the program's own data of this user; it need not be there yet.

    Parameters
    ----------
    environment : mapping or None
        None: that of the process. `PLUMBWELL_HOME` wins; then `XDG_DATA_HOME`, where it is absolute, and
        `LOCALAPPDATA`, each on its systems.
    platform : str
        As `sys.platform`.
    home : Path or None
        None: the user's home.
    """
    said = os.environ if environment is None else environment
    if said.get(OWN_HOME):
        return Path(said[OWN_HOME]).expanduser().absolute()
    base = Path.home() if home is None else home
    if platform == "win32":
        return Path(said.get("LOCALAPPDATA") or base / "AppData" / "Local") / NAME
    if platform == "darwin":
        return base / "Library" / "Application Support" / NAME
    named = said.get("XDG_DATA_HOME", "")
    return (Path(named) if named.startswith("/") else base / ".local" / "share") / NAME


def user_name() -> str:
    """The name under which the user is known to the system; empty when there is none."""
    try:
        return shown(getpass.getuser())
    except (OSError, KeyError, ImportError):
        return ""
