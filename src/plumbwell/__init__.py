"""Gravity surveyed below ground, turned into rock density with honest errors.

The names below are the whole of the Python interface; each is imported when it is first asked for, so that
``import plumbwell`` alone loads nothing but this file.
"""

import os

# One thread in the linear algebra: our systems are small and narrow, and a pool of threads costs more than it
# gives. It only counts when it is said before numpy is imported; what the user has set stays.
os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")

__version__ = "0.1.0"

# Type checkers take this name as true; typing itself is not worth loading for it.
TYPE_CHECKING = False
if TYPE_CHECKING:
    from plumbwell.files.folder import read_survey
    from plumbwell.files.frames import alternatives_frame, frame, frames
    from plumbwell.study.alternatives import alternatives
    from plumbwell.study.case import Case
    from plumbwell.study.reduce import reduce
    from plumbwell.study.results import Results
    from plumbwell.survey.errors import InputError, PlumbwellError
    from plumbwell.survey.survey import Survey

__all__ = [
    "Case",
    "InputError",
    "PlumbwellError",
    "Results",
    "Survey",
    "__version__",
    "alternatives",
    "alternatives_frame",
    "frame",
    "frames",
    "read_survey",
    "reduce",
]

_HOME_OF = {
    "Case": "plumbwell.study.case",
    "InputError": "plumbwell.survey.errors",
    "PlumbwellError": "plumbwell.survey.errors",
    "Results": "plumbwell.study.results",
    "Survey": "plumbwell.survey.survey",
    "alternatives": "plumbwell.study.alternatives",
    "alternatives_frame": "plumbwell.files.frames",
    "frame": "plumbwell.files.frames",
    "frames": "plumbwell.files.frames",
    "read_survey": "plumbwell.files.folder",
    "reduce": "plumbwell.study.reduce",
}


def __getattr__(name: str) -> object:
    """Import a public name when it is first used."""
    home = _HOME_OF.get(name)
    if home is None:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    from importlib import import_module

    value = getattr(import_module(home), name)
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    """List the public names, also those not imported yet."""
    return sorted({*globals(), *_HOME_OF})
