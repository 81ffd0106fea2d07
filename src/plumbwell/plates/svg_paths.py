"""SVG files made small: path data relative and to 0.01 px, and no attribute that says nothing.

Text stands in plates as outlines, so path data is nearly all of a file; written so it takes a third.
"""

from __future__ import annotations

import re
from functools import lru_cache

import numpy as np

_PATH_DATA = re.compile(r'(?<= d=")[^"]*(?=")')
_COMMAND = re.compile("[MLCZ]")
_SEPARATOR = re.compile("[MLCZ, ]+")
_PAIRS = {"M": 1, "L": 1, "C": 3, "Z": 0}
# The painter says these of every group: the unit transform, and a font though no text stands in the file.
_IDLE = re.compile(
    r' transform="matrix\(1,0,0,1,0,0\)"|\s*font-family="[^"]*" font-size="[^"]*" font-weight="[^"]*" '
    r'font-style="[^"]*"\s*|\s*vector-effect="none"'
)
_EMPTY_GROUP = re.compile(r"<g [^>]*>\s*</g>\s*")


@lru_cache(maxsize=65536)
def _hundredths(value: int) -> str:
    """Return a count of hundredths as the shortest decimal number."""
    whole, rest = divmod(abs(value), 100)
    sign = "-" if value < 0 else ""
    if not rest:
        return f"{sign}{whole}"
    return f"{sign}{whole or ''}.{rest:02d}".rstrip("0")


def _relative(found: re.Match[str]) -> str:
    """Return absolute path data in M, L, C and Z as relative data.

    Places are rounded before differences are taken, so that rounding does not add up along a path.
    """
    data = found.group()
    commands = _COMMAND.findall(data)
    numbers = np.array(_SEPARATOR.sub(" ", data).split(), dtype=np.float64)
    places = np.rint(100.0 * numbers).astype(np.int64).reshape(-1, 2)
    ends: list[int] = []  # for each command with places: the pair at which the pen stood before it, -1 for (0, 0)
    counts: list[int] = []
    pen = start = -1
    seen = 0
    for command in commands:
        pairs = _PAIRS[command]
        if not pairs:
            pen = start
            continue
        ends.append(pen)
        counts.append(pairs)
        seen += pairs
        pen = seen - 1
        if command == "M":
            start = pen
    origin = np.vstack([places, np.zeros((1, 2), dtype=np.int64)])
    before = np.repeat(np.array(ends, dtype=np.intp), np.array(counts, dtype=np.intp))
    steps = (places - origin[before]).ravel().tolist()
    texts = [_hundredths(step) for step in steps]
    written: list[str] = []
    at = 0
    for command in commands:
        after = at + 2 * _PAIRS[command]
        written.append(command.lower() + " ".join(texts[at:after]))
        at = after
    return "".join(written).replace(" -", "-")


def compact_svg(content: bytes) -> bytes:
    """Return an SVG that takes less room and shows the same to 0.01 px.

    Parameters
    ----------
    content : bytes
        As written by QSvgGenerator: absolute path data in M, L, C and Z, one curve or line a command.
    """
    text = _PATH_DATA.sub(_relative, content.decode())
    return _EMPTY_GROUP.sub("", _IDLE.sub("", text)).encode()
