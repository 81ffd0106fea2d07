"""A reduced survey on one plate: core strip, ledger, fan and tracks, as an SVG or PNG file.

The plate is 1440 px wide and 900 to 1440 px high. Equal plates give equal bytes: nothing comes from a
clock.
"""

from __future__ import annotations

import re
from pathlib import Path

from PySide6.QtCore import QBuffer, QIODevice, QRect, QSize
from PySide6.QtGui import QImage, QPainter
from PySide6.QtSvg import QSvgGenerator

from plumbwell.plates.application import drawing_application
from plumbwell.plates.axis import Frame, axis_width, draw_depth_axis
from plumbwell.plates.fan import draw_fan, interval_ribbons, station_ribbons
from plumbwell.plates.findings_list import draw_findings_list
from plumbwell.plates.layout import (
    FAN_WIDTH,
    FINDINGS_RIGHT,
    LINE,
    MARGIN,
    REMARK_GAP,
    TITLE_HEIGHT,
    Layout,
    plate_layout,
    scale_remark,
)
from plumbwell.plates.ledger_excerpt import Excerpt, draw_excerpt
from plumbwell.plates.lettering import draw_text, text_width
from plumbwell.plates.naming import draw_base_name, draw_curve_names, draw_layer_names
from plumbwell.plates.painting import hairline_across, painting
from plumbwell.plates.plate import SurveyPlate
from plumbwell.plates.strip import KEY_HEIGHT, draw_strip, draw_tone_key
from plumbwell.plates.survey_tracks import survey_tracks
from plumbwell.plates.svg_paths import compact_svg
from plumbwell.plates.svg_text import svg_texts, with_glyphs
from plumbwell.plates.theme import Theme
from plumbwell.plates.track import Track
from plumbwell.plates.track_curves import draw_track
from plumbwell.plates.track_row import draw_grid, draw_track_head, names_track, track_frames, track_gap

DEPTH_PAD = 8.0
METRE = 39.3701 * 96
_SIZE = re.compile(rb'width="[^"]*mm" height="[^"]*mm"')


def _draw_frame_text(painter: QPainter, plate: SurveyPlate, layout: Layout, theme: Theme) -> None:
    """Draw title, subtitle, caution and foot."""
    right = layout.width - MARGIN
    room = (MARGIN, right)
    draw_text(painter, theme, plate.title, x=MARGIN, baseline=36, face="heading", room=room)
    draw_text(painter, theme, plate.subtitle, x=MARGIN, baseline=57, face="small", role="muted", room=room)
    if layout.caution:
        for y in (TITLE_HEIGHT, TITLE_HEIGHT + len(layout.caution) * 20 + 10):
            hairline_across(painter, MARGIN, right, y, theme.colour("ink"))
        for index, line in enumerate(layout.caution):
            draw_text(painter, theme, line, x=MARGIN, baseline=TITLE_HEIGHT + 20 + index * 20, room=room)
    else:
        hairline_across(painter, layout.strip_right, layout.width, TITLE_HEIGHT, theme.colour("rule"))
    hairline_across(painter, 0, layout.width, layout.foot_top, theme.colour("rule"))
    for index, pieces in enumerate(layout.remarks):
        x = float(MARGIN)
        baseline = layout.foot_top + 19 + index * LINE
        for piece in pieces:
            box = draw_text(
                painter, theme, piece, x=x, baseline=baseline, face="small", role="muted", room=room
            )
            x = box.right() + REMARK_GAP
    draw_text(
        painter,
        theme,
        scale_remark(theme),
        x=right,
        baseline=layout.foot_top + 19,
        face="small",
        role="muted",
        align="right",
    )


def _draw_ledger(
    painter: QPainter, plate: SurveyPlate, excerpt: Excerpt, layout: Layout, frame: Frame, theme: Theme
) -> float:
    """Draw the ledger, the findings under it and the fan, and return the right edge of the fan."""
    top, row_height, right = layout.body_top, layout.row_height, layout.ledger_right
    draw_excerpt(
        painter,
        excerpt,
        theme,
        left=layout.ledger_left,
        top=top,
        widths=layout.columns,
        row_height=row_height,
    )
    if plate.intervals:
        ribbons = interval_ribbons(
            [(i.top, i.base, i.density, i.from_prior) for i in plate.intervals],
            first_row=top,
            row_height=row_height,
        )
    else:
        depths = sorted(station.depth for station in plate.stations)
        ribbons = station_ribbons(
            depths, [None] * (len(depths) - 1), first_row=top, row_height=row_height
        )
    draw_findings_list(
        painter,
        layout.findings,
        theme,
        left=layout.ledger_left,
        top=layout.findings_top,
        right=right - FINDINGS_RIGHT,
        base=layout.body_base,
    )
    draw_fan(painter, ribbons, frame.across(right, right + FAN_WIDTH), theme)
    return right + FAN_WIDTH


def _draw_tracks(
    painter: QPainter, plate: SurveyPlate, tracks: list[Track], frame: Frame, theme: Theme
) -> None:
    """Draw tracks side by side over one grid, with names at the curves and under the tops of layers."""
    names_stand = names_track(tracks)
    for index, (track, own) in enumerate(zip(tracks, track_frames(theme, tracks, frame), strict=True)):
        draw_track_head(painter, track, own, theme)
        boxes = draw_track(painter, track, own, theme)
        boxes += draw_base_name(painter, track, own, theme, taken=boxes)
        boxes += draw_curve_names(painter, track, own, theme, taken=boxes)
        if index == names_stand:
            draw_layer_names(painter, track, own, theme, markers=plate.names_in_view, taken=boxes)


def draw_figure(painter: QPainter, plate: SurveyPlate, size: tuple[int, int], theme: Theme) -> None:
    """Draw a survey's plate.

    Parameters
    ----------
    painter : QPainter
        Paints in px; the ground is filled here.
    plate : SurveyPlate
    size : tuple of int
        Width (1440) and height in px, as `figure_size` gives it.
    theme : Theme
    """
    layout = plate_layout(plate, theme, height=size[1])
    painter.fillRect(QRect(0, 0, layout.width, layout.height), theme.colour("ground"))
    low, high = plate.depth_range
    key_top = layout.foot_top - KEY_HEIGHT - 4
    strip = Frame(
        left=0,
        top=layout.head_top + 12,
        right=layout.strip_right,
        base=(key_top if plate.has_density else layout.foot_top) - 14,
        depth_top=low,
        depth_base=high,
    )
    draw_strip(painter, plate, strip, theme)
    if plate.has_density:
        draw_tone_key(painter, theme, left=MARGIN + 1, top=key_top, width=176)
    pad = DEPTH_PAD * (high - low) / (layout.body_base - layout.body_top - 2 * DEPTH_PAD)
    body = Frame(
        left=layout.strip_right + 16,
        top=layout.body_top,
        right=layout.width - MARGIN,
        base=layout.body_base,
        depth_top=low - pad,
        depth_base=high + pad,
    )
    fan_right = body.left
    if layout.excerpt is not None:
        fan_right = _draw_ledger(painter, plate, layout.excerpt, layout, body, theme)
    width, head_room = float(axis_width(theme)), FAN_WIDTH - 8.0
    if layout.excerpt is None:
        width, head_room = (
            max(width, min(text_width(theme, "emphasis", plate.depth_label), 140.0)),
            0.0,
        )
    axis = body.across(fan_right, fan_right + width)
    stations = [station.depth for station in plate.stations]
    depths = draw_depth_axis(
        painter,
        axis,
        theme,
        label=plate.depth_label,
        unit=plate.depth_unit,
        stations=stations,
        measured=(low, high),
        head_room=head_room,
    )
    tracks = survey_tracks(plate, wide=layout.excerpt is None, bars=theme.reach)
    across = body.across(axis.right + track_gap(theme) / 2, body.right)
    draw_grid(
        painter,
        across,
        theme,
        depths=depths,
        # One in the pad above the first station would lie against the line under the heads.
        markers=[depth for _, depth in plate.markers if low <= depth <= high],
        ground=low < 0 < high,
    )
    if tracks:
        _draw_tracks(painter, plate, tracks, across, theme)
    hairline_across(painter, body.left, body.right, layout.body_top - 1, theme.colour("ink"))
    _draw_frame_text(painter, plate, layout, theme)


def figure_size(plate: SurveyPlate, theme: Theme) -> tuple[int, int]:
    """Return the width and height of a plate in px: 1440 wide, as high as its rows need from 900 to 1440."""
    drawing_application()
    layout = plate_layout(plate, theme)
    return layout.width, layout.height


def svg_bytes(plate: SurveyPlate, theme: Theme) -> bytes:
    """Return a survey's plate as an SVG; text stands in it as outlines."""
    width, height = figure_size(plate, theme)
    buffer = QBuffer()
    buffer.open(QIODevice.OpenModeFlag.WriteOnly)
    generator = QSvgGenerator()
    generator.setOutputDevice(buffer)
    generator.setResolution(96)
    generator.setSize(QSize(width, height))
    generator.setViewBox(QRect(0, 0, width, height))
    generator.setTitle(plate.title)
    generator.setDescription(plate.subtitle)
    with svg_texts() as texts, painting(generator) as painter:
        draw_figure(painter, plate, (width, height), theme)
    content = with_glyphs(compact_svg(bytes(buffer.data().data())), texts)
    # In px, since millimetres are written too coarsely for a whole number of px.
    return _SIZE.sub(f'width="{width}" height="{height}"'.encode(), content, count=1)


# Packs a fifth faster than the default, into a file a twentieth larger.
PACKING = 80


def figure_image(plate: SurveyPlate, theme: Theme, scale: float = 2) -> QImage:
    """Return a survey's plate as an image, `scale` device px to each px of the plate."""
    width, height = figure_size(plate, theme)
    image = QImage(round(width * scale), round(height * scale), QImage.Format.Format_RGB32)
    for set_resolution in (image.setDotsPerMeterX, image.setDotsPerMeterY):
        set_resolution(round(METRE * scale))
    with painting(image) as painter:
        painter.scale(scale, scale)
        draw_figure(painter, plate, (width, height), theme)
    return image


def packed_png(image: QImage) -> bytes:
    """Return an image as a PNG; packing lets other threads go on."""
    buffer = QBuffer()
    buffer.open(QIODevice.OpenModeFlag.WriteOnly)
    image.save(buffer, "PNG", PACKING)  # type: ignore[call-overload]
    return bytes(buffer.data().data())


def write_svg(path: Path, plate: SurveyPlate, theme: Theme) -> None:
    """Write a survey's plate as an SVG.

    Raises
    ------
    OSError
        The file cannot be written.
    """
    path.write_bytes(svg_bytes(plate, theme))


def write_png(path: Path, plate: SurveyPlate, theme: Theme, scale: float = 2) -> None:
    """Write a survey's plate as a PNG, `scale` device px to each px of the plate.

    Raises
    ------
    OSError
        The file cannot be written.
    """
    path.write_bytes(packed_png(figure_image(plate, theme, scale)))
