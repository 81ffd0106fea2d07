"""The ledger as drawn: heads of two lines, equally tall rows, values and standard deviations in columns.

Numbers stand at the right of their column, plus-minus signs under one another, units in heads.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from PySide6.QtGui import QPainter

from plumbwell.plates.axis import head_height, title_baseline, unit_baseline
from plumbwell.plates.lettering import draw_text, text_height, text_width
from plumbwell.plates.numbers import NO_VALUE, column_decimals, number, sd_text
from plumbwell.plates.painting import draw_mark, hairline_across, whole
from plumbwell.plates.plate import DENSITY_UNIT, PlateInterval, SurveyPlate
from plumbwell.plates.theme import Theme

ROW_HEIGHT, LEAST_ROW_HEIGHT = 24, 14
MARK_ROOM = 22.0
EDGE = 8.0
AMBER_RATIO = 3.0
WIDEST_LABELS = 170.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Cell:
    """A cell: value, the standard deviation after it, face and colour role of the value."""

    words: str
    sd: str = ""
    face: str = "text"
    role: str = "ink"


@dataclass(frozen=True, slots=True, kw_only=True)
class ExcerptColumn:
    """A column: name, unit beneath it, one cell each row."""

    name: str
    unit: str
    cells: tuple[Cell, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class Excerpt:
    """A table as drawn: its columns and, for each row, the kind of its mark or None."""

    columns: tuple[ExcerptColumn, ...]
    marks: tuple[str | None, ...]

    @property
    def rows(self) -> int:
        """Return the number of rows."""
        return len(self.marks)


def _values(
    name: str,
    unit: str,
    values: Sequence[float | None],
    sds: Sequence[float | None],
    *,
    signed: bool = False,
    decimals: int | None = None,
) -> ExcerptColumn:
    places = column_decimals(sds, default=3) if decimals is None else decimals
    cells = []
    for value, sd in zip(values, sds, strict=True):
        words = number(value, places, signed=signed)
        known = words != NO_VALUE
        cells.append(
            Cell(words=words, sd=sd_text(sd, places) if known else "", role="ink" if known else "muted")
        )
    return ExcerptColumn(name=name, unit=unit, cells=tuple(cells))


def interval_excerpt(plate: SurveyPlate) -> Excerpt:
    """Return the ledger of a plate's intervals, with log, difference and ratio where there are any."""
    intervals = plate.intervals
    none = [None] * len(intervals)
    depth_unit = plate.depth_unit
    density_sds = [interval.sd for interval in intervals]
    places = column_decimals(density_sds, default=3)
    columns = [
        ExcerptColumn(
            name="No", unit="", cells=tuple(Cell(words=str(interval.number)) for interval in intervals)
        ),
        _values("top", depth_unit, [interval.top for interval in intervals], none, decimals=1),
        _values("base", depth_unit, [interval.base for interval in intervals], none, decimals=1),
        _values("density", DENSITY_UNIT, [interval.density for interval in intervals], density_sds),
    ]
    if any(interval.log is not None for interval in intervals):
        columns.append(
            _values("log", DENSITY_UNIT, [interval.log for interval in intervals], none, decimals=places)
        )
    elif any(interval.slab is not None for interval in intervals):
        columns.append(
            _values(
                "slab form", DENSITY_UNIT, [interval.slab for interval in intervals], none, decimals=places
            )
        )
    if any(interval.difference is not None for interval in intervals):
        columns.append(
            _values(
                "difference",
                DENSITY_UNIT,
                [interval.difference for interval in intervals],
                [interval.difference_sd for interval in intervals],
                signed=True,
            )
        )
    if any(interval.ratio is not None for interval in intervals):
        cells = tuple(
            Cell(words=number(interval.ratio, 1, signed=True), face="emphasis", role="amber")
            if interval.ratio is not None and abs(interval.ratio) >= AMBER_RATIO
            else Cell(
                words=number(interval.ratio, 1, signed=True),
                role="ink" if interval.ratio is not None else "muted",
            )
            for interval in intervals
        )
        columns.append(ExcerptColumn(name="ratio", unit="to sd", cells=cells))
    return Excerpt(columns=tuple(columns), marks=tuple(_mark(interval) for interval in intervals))


def _mark(interval: PlateInterval) -> str | None:
    """Return the mark of a row: wherever its ratio stands in amber too, which never is without its shape."""
    far = interval.ratio is not None and abs(interval.ratio) >= AMBER_RATIO
    return "look" if interval.flagged or far else None


def station_excerpt(plate: SurveyPlate) -> Excerpt:
    """Return the ledger of a plate's stations in order of depth: label, depth, gravity, what is left over."""
    stations = sorted(plate.stations, key=lambda station: station.depth)
    none = [None] * len(stations)
    columns = [
        ExcerptColumn(
            name="station", unit="", cells=tuple(Cell(words=station.label) for station in stations)
        ),
        _values(
            plate.depth_label, plate.depth_unit, [station.depth for station in stations], none, decimals=1
        ),
    ]
    if any(station.gravity is not None for station in stations):
        columns.append(
            _values(
                plate.gravity_label,
                plate.gravity_unit,
                [station.gravity for station in stations],
                [station.gravity_sd for station in stations],
            )
        )
    if any(station.anomaly is not None for station in stations):
        columns.append(
            _values(
                plate.anomaly_label,
                plate.gravity_unit,
                [station.anomaly for station in stations],
                [station.anomaly_sd for station in stations],
                signed=True,
            )
        )
    return Excerpt(columns=tuple(columns), marks=(None,) * len(stations))


def _face(face: str, row_height: float) -> str:
    """Return the face in rows too low for the text size: the small one."""
    return "small" if face == "text" and row_height < 20 else face


def _slots(column: ExcerptColumn, theme: Theme, row_height: float) -> tuple[float, float]:
    """Return the widths of a column's widest value and widest standard deviation."""
    text, small = _face("text", row_height), "small"
    value = max(
        (text_width(theme, _face(cell.face, row_height), cell.words) for cell in column.cells), default=0.0
    )
    sd = max(
        (text_width(theme, small if text == "small" else text, cell.sd) for cell in column.cells), default=0.0
    )
    return value, sd + 6 if sd else 0.0


def column_widths(excerpt: Excerpt, theme: Theme, row_height: float = ROW_HEIGHT) -> list[float]:
    """Return the natural width of each column in px, with 8 px at its right edge and 10 px before it."""
    widths = []
    for index, column in enumerate(excerpt.columns):
        value, sd = _slots(column, theme, row_height)
        head = max(text_width(theme, "emphasis", column.name), text_width(theme, "small", column.unit))
        natural = max(value + sd, head) + EDGE + (MARK_ROOM if index == 0 else 10.0)
        # Only the first column holds names; long ones are shortened, numbers never.
        widths.append(min(natural, WIDEST_LABELS) if index == 0 else natural)
    return [float(whole(width)) for width in widths]


def draw_excerpt(
    painter: QPainter,
    excerpt: Excerpt,
    theme: Theme,
    *,
    left: float,
    top: float,
    widths: Sequence[float],
    row_height: float,
) -> None:
    """Draw a ledger: heads above `top`, rows below it.

    Parameters
    ----------
    left, top : float
        Left edge, and the lower edge of the head line, in px.
    widths : sequence of float
        Width of each column in px.
    row_height : float
        14 to 24 px; below 20 px the small size is used.
    """
    head = top - head_height(theme)
    right_end = left + sum(widths)
    cap = text_height(theme, _face("text", row_height))
    for row, mark in enumerate(excerpt.marks):
        if mark:
            draw_mark(painter, theme, mark, x=left + 11, y=top + (row + 0.5) * row_height)
        hairline_across(
            painter, left, right_end, top + (row + 1) * row_height - 1, theme.colour("hair"), theme.hairline
        )
    right = left
    for column, width in zip(excerpt.columns, widths, strict=True):
        column_left, right = right, right + width
        edge = right - EDGE
        room = (column_left, edge)
        draw_text(
            painter,
            theme,
            column.name,
            x=edge,
            baseline=head + title_baseline(theme),
            face="emphasis",
            align="right",
            room=room,
        )
        draw_text(
            painter,
            theme,
            column.unit,
            x=edge,
            baseline=head + unit_baseline(theme),
            face="small",
            role="muted",
            align="right",
            room=room,
        )
        _, sd_slot = _slots(column, theme, row_height)
        for row, cell in enumerate(column.cells):
            baseline = top + row * row_height + (row_height - 1 + cap) / 2
            draw_text(
                painter,
                theme,
                cell.words,
                x=edge - sd_slot,
                baseline=baseline,
                face=_face(cell.face, row_height),
                role=cell.role,
                align="right",
                room=(column_left, edge),
            )
            draw_text(
                painter,
                theme,
                cell.sd,
                x=edge,
                baseline=baseline,
                face=_face("text", row_height),
                role="muted",
                align="right",
                room=(column_left, edge),
            )
