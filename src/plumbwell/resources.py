"""Where the files are that the program brings along: fonts, icons, themes, tables, handbook.

In a wheel they lie beside the package, in ``resource_files``; in a checkout at its top, in ``resources``.
"""

from pathlib import Path

_PACKAGE = Path(__file__).resolve().parent
_PLACES = (_PACKAGE / "resource_files", _PACKAGE.parents[1] / "resources")


def resource(name: str) -> Path:
    """Path of a file or folder that the program brings along.

    Parameters
    ----------
    name : str
        Path below the resources, with forward slashes: ``"fonts/licence.txt"``.

    Returns
    -------
    Path
        Absolute path; beside the package first, then at the checkout's top.

    Raises
    ------
    FileNotFoundError
        When neither place has it; the message names both.
    """
    for place in _PLACES:
        path = place / name
        if path.exists():
            return path
    looked = " nor ".join(str(place / name) for place in _PLACES)
    raise FileNotFoundError(f"resource {name!r} is missing: neither {looked} is there; please reinstall")
