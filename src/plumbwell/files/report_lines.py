"""What the command line says of a reduction: what went in, what came out, and the findings in words."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from math import floor, isfinite, log10

from plumbwell.files.summary import counts
from plumbwell.files.terminal import counted, wrapped
from plumbwell.study.finding import Finding
from plumbwell.study.results import Results

HEADS = {"error": "Errors", "look": "Wants a look", "note": "Notes"}
COUNTED = {"error": ("error", "errors"), "look": ("to look at", "to look at"), "note": ("note", "notes")}


def content_lines(results: Results) -> list[str]:
    """What the survey holds, and what became of its readings."""
    rows = counts(results)
    if rows["used"] == rows["read"]:
        kinds = "all used"
    else:
        kinds = f"{rows['used']} used"
        if rows["excluded"]:
            kinds += f", {rows['excluded']} excluded by use = no"
        if rows["refused"]:
            kinds += f", {rows['refused']} refused because no station could be given to them"
    return wrapped(
        f"{results.survey.site.name}: {counted(len(results.stations), 'station')}, "
        f"{counted(len(results.intervals), 'interval')}; {counted(rows['read'], 'reading')}: {kinds}."
    )


def count_line(findings: Sequence[Finding]) -> str:
    """How many findings there are of each grade."""
    parts = []
    for severity, (one, many) in COUNTED.items():
        number = sum(finding.severity == severity for finding in findings)
        if number:
            parts.append(f"{number} {one if number == 1 else many}")
    return f"Findings: {', '.join(parts)}." if parts else "No findings."


def docket_lines(
    findings: Sequence[Finding], *, of: Sequence[Finding] | None = None, most: int | None = None
) -> list[str]:
    """The findings in words, gravest first; `of` them only some, in about `most` lines.

    A mend that serves several findings of one kind stands once, after the last of them.
    """
    lines = wrapped(count_line(findings))
    told = [one for severity in HEADS for one in (findings if of is None else of) if one.severity == severity]
    for number, one in enumerate(told):
        block = []
        if number == 0 or told[number - 1].severity != one.severity:
            block += ["", HEADS[one.severity]]
        block += wrapped(f"{one.place} ({one.code})", "  ", "    ")
        block += wrapped(one.text, "    ")
        following = told[number + 1] if number + 1 < len(told) else None
        if following is None or _kind(following) != _kind(one):
            block += wrapped(one.mend, "    to mend: ")
        if most is not None and number and len(lines) + len(block) > most:
            lines.append(f"  and {len(told) - number} more")
            break
        lines += block
    return lines


def _kind(finding: Finding) -> tuple[str, str, str]:
    return finding.severity, finding.code, finding.mend


def density_lines(results: Results) -> list[str]:
    """How many densities there are, their range, and how sure they are."""

    def known(values: Iterable[float]) -> list[float]:
        return [value / 1000.0 for value in values if isfinite(value)]

    intervals = results.intervals
    densities, common = known(intervals.density.values), known(intervals.density_common_sd.values)
    sds = [sd for sd in known(intervals.density_sd.values) if sd > 0.0]
    if not densities:
        return wrapped("No density could be computed.")
    places = min(max(3, -floor(log10(max(sds)))), 6) if sds else 3

    def range_of(values: Sequence[float]) -> str:
        least, most = (f"{value:.{places}f}" for value in (min(values), max(values)))
        if float(least) == 0.0:
            least = f"under {10.0**-places:.{places}f}"
        return least if least == most else f"{least} to {most}"

    number = "1 density of" if len(densities) == 1 else f"{len(densities)} densities from"
    text = f"{number} {range_of(densities)} g/cm3"
    if sds:
        text += f", sd (standard deviation) {range_of(sds)}"
    if common:
        text += f", and {max(common):.{places}f} common to all"
    return wrapped(text + ".")
