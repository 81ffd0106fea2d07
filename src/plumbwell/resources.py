"""Where the files are that the program brings along: fonts, icons, themes, tables, handbook, sample surveys.

In a wheel they lie beside the package, in ``resource_files`` and ``sample_surveys``; in a checkout at its top, in
``resources`` and ``sample_surveys``.
"""

from pathlib import Path

_PACKAGE = Path(__file__).resolve().parent
_PLACES = (_PACKAGE / "resource_files", _PACKAGE.parents[1] / "resources")
_SAMPLES = (_PACKAGE / "sample_surveys", _PACKAGE.parents[1] / "sample_surveys")


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
    return _found(name, _PLACES, "resource")


def sample_survey(name: str) -> Path:
    """Folder of a sample survey that the program brings along.

    Parameters
    ----------
    name : str
        Name of its folder.

    Raises
    ------
    FileNotFoundError
        When it is missing; the message names the places.
    """
    return _found(name, _SAMPLES, "sample survey")


def _found(name: str, places: tuple[Path, ...], what: str) -> Path:
    for place in places:
        path = place / name
        if path.exists():
            return path
    looked = " nor ".join(str(place / name) for place in places)
    raise FileNotFoundError(f"{what} {name!r} is missing: neither {looked} is there; please reinstall")
