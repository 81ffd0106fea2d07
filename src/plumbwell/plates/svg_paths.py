"""SVG files made small: path data relative and to 0.01 px, and no attribute that says nothing.

Text stands in plates as outlines, so path data is nearly all of a file; written so it takes a third.
"""

from __future__ import annotations

import re

import numpy as np
from numpy.typing import NDArray

_PATH_DATA = re.compile(rb'(?<= d=")[^"]*(?=")')
_PAIRS = {b"M": 1, b"L": 1, b"C": 3, b"Z": 0}
_PAIRS_OF_CODE = np.array([_PAIRS.get(bytes([code]), 0) for code in range(256)], dtype=np.intp)
_NOT_NUMBERS = bytes.maketrans(b"MLCZ,", b"     ")
_NOT_COMMANDS = b"0123456789+-.eE, \t\r\n"
_MOVE, _CLOSE = ord("M"), ord("Z")
# The painter says these of every group: the unit transform, and a font though no text stands in the file.
_IDLE = re.compile(
    rb' transform="matrix\(1,0,0,1,0,0\)"|\s*font-family="[^"]*" font-size="[^"]*" font-weight="[^"]*" '
    rb'font-style="[^"]*"\s*|\s*vector-effect="none"'
)
# Stands for path data while the rest is searched; no text of an XML file holds this character.
_HELD = b"\x00"
_EMPTY_GROUP = re.compile(rb"<g [^>]*>\s*</g>\s*")


def _words_of(hundredths: NDArray[np.int64]) -> NDArray[np.object_]:
    """Return counts of hundredths, 0 or more, as the shortest decimal numbers."""
    wholes, rests = np.divmod(hundredths, 100)
    whole_words = np.array(["", *map(str, range(int(wholes.max(initial=0)) + 1))], dtype=object)
    rest_words = np.array(["", *(f".{rest:02d}".rstrip("0") for rest in range(1, 100))], dtype=object)
    return whole_words[np.where((wholes == 0) & (rests > 0), 0, wholes + 1)] + rest_words[rests]


def _steps(
    places: NDArray[np.int64], codes: NDArray[np.uint8], pairs: NDArray[np.intp], begins: NDArray[np.intp]
) -> NDArray[np.int64]:
    """Return each place less the place at which the pen stood before its command.

    Parameters
    ----------
    places : (p, 2) array
        Of all paths, one after the other.
    codes, pairs : (c,) array
        Commands as letters, and how many places each has.
    begins : array
        The first command of each path: before it the pen stands at (0, 0).
    """
    last = np.cumsum(pairs) - 1
    starts = np.maximum.accumulate(np.where(codes == _MOVE, last, -1))
    # A row of zeros at the end stands for (0, 0), as row -1.
    pen = np.concatenate([[-1], np.where(codes == _CLOSE, starts, last)[:-1]])
    pen[begins] = -1
    origin = np.vstack([places, np.zeros((1, 2), dtype=np.int64)])
    return places - origin[np.repeat(pen, pairs)]


def _relative(paths: list[bytes]) -> list[str]:
    """Return absolute path data in M, L, C and Z as relative data.

    All paths of a file are taken at once, since most are short. Places are rounded before differences are
    taken, so that rounding does not add up along a path.
    """
    letters = [path.translate(None, _NOT_COMMANDS) for path in paths]
    ends = np.cumsum([len(letter) for letter in letters])
    codes = np.frombuffer(b"".join(letters), dtype=np.uint8)
    pairs = _PAIRS_OF_CODE[codes]
    numbers = np.fromstring(b" ".join(paths).translate(_NOT_NUMBERS).decode(), dtype=np.float64, sep=" ")
    places = np.rint(100.0 * numbers).astype(np.int64).reshape(-1, 2)
    steps = _steps(places, codes, pairs, np.concatenate([[0], ends[:-1]])).ravel()
    # What stands before each number: a blank or the letter of its command, and its sign, which parts as well.
    negative = steps < 0
    leads = np.where(negative, "-", " ").astype(object)
    drawn = np.flatnonzero(pairs)
    firsts = 2 * (np.cumsum(pairs) - pairs)[drawn]
    letters_signed = np.array([chr(code) + sign for sign in ("", "-") for code in range(256)], dtype=object)
    leads[firsts] = letters_signed[(codes[drawn] | 0x20) + 256 * negative[firsts].astype(np.intp)]
    texts = leads + _words_of(np.abs(steps))
    closes = np.flatnonzero(codes == _CLOSE)
    after = 2 * np.cumsum(pairs)[closes] - 1
    texts[after] = texts[after] + "z"
    tokens = texts.tolist()
    cuts = np.concatenate([[0], 2 * np.cumsum(pairs)[ends - 1]]).tolist()
    return ["".join(tokens[first:last]) for first, last in zip(cuts, cuts[1:], strict=False)]


def compact_svg(content: bytes) -> bytes:
    """Return an SVG that takes less room and shows the same to 0.01 px.

    Parameters
    ----------
    content : bytes
        As written by QSvgGenerator: absolute path data in M, L, C and Z, one curve or line a command.
    """
    paths = _PATH_DATA.findall(content)
    # What stands around the path data is searched without it: that is a tenth of the file.
    around = _EMPTY_GROUP.sub(b"", _IDLE.sub(b"", _PATH_DATA.sub(_HELD, content)))
    if not paths:
        return around
    first, *others = around.split(_HELD)
    return first + b"".join(
        path.encode() + after for path, after in zip(_relative(paths), others, strict=True)
    )
