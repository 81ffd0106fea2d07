"""Labels and names as they may stand in a survey folder: one line, no control characters, not endless.

They go to terminals, tables, LAS headers and figures, so that what would steer those is refused where it
is read. Characters that only cannot be seen are told elsewhere.
"""

from __future__ import annotations

import re
from dataclasses import dataclass

from plumbwell.survey.errors import shown

MAXIMUM_LABEL = 200
# C0 and C1 controls, line and paragraph separators, marks that turn the direction of what follows.
_CONTROL = re.compile("[\x00-\x1f\x7f-\x9f\u2028-\u202e\u2066-\u2069]")


@dataclass(frozen=True, slots=True)
class UnfitLabel:
    """What is wrong with a label: found, expected, mend."""

    found: str
    expected: str
    mend: str


def unfit_label(text: str, longest: int = MAXIMUM_LABEL) -> UnfitLabel | None:
    """What is wrong with a label or name, or None when it may stand."""
    if _CONTROL.search(text):
        return UnfitLabel(
            f'"{shown(text)}", with control characters',
            "characters that can be printed, on one line",
            "write it anew without these characters",
        )
    if len(text) > longest:
        return UnfitLabel(
            f'"{shown(text)}", {len(text)} characters',
            f"at most {longest} characters",
            "write a shorter one, and the rest as a note",
        )
    return None
