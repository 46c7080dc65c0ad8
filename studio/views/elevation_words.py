"""Words in the elevation: name of the head line, what head was lost to, figures at the time cursor."""

from typing import TYPE_CHECKING

import numpy as np
from PySide6.QtCore import QPointF, QRectF
from PySide6.QtGui import QPainter

from studio.display import Array, BallPath, losses_of
from studio.resources import USUAL
from studio.views.plan_words import length_words
from studio.widgets.strokes import Ink, Labels, draw_text, font_of, pen, small_ink, text_size

if TYPE_CHECKING:
    from studio.views.elevation import ElevationView

RULER = 28.0
"""px from the lower edge: line on which the ticks of the elements stand."""
RIGHT_AXIS = 60.0
"""px kept on the right for heights."""
READOUT_GAP = 8.0
TITLE_ROOM = 190.0
"""px kept for the title."""


def write_head(painter: QPainter, view: "ElevationView", labels: Labels, head: Array) -> None:
    """Name of the head line, above it where there is room."""
    ink = small_ink(view.theme, view.font(), "second", bold=True)
    size = text_size(ink.font, "head line")
    corners = []
    for share in (0.62, 0.75, 0.5, 0.38, 0.25, 0.88, 0.12):
        x = float(head[0, 0] + share * (head[-1, 0] - head[0, 0]))
        y = float(np.interp(x, head[:, 0], head[:, 1]))
        corners += [QPointF(x, y - size[1] - 5.0)]
    at = labels.place(size, corners)
    if at is not None:
        draw_text(painter, at, "head line", ink)


def write_losses(painter: QPainter, view: "ElevationView", path: BallPath) -> None:
    """Head lost and to what, and the exaggeration of heights, in the upper right corner."""
    total, shares = losses_of(path)
    units = view.workspace.design.units
    parts = ", ".join(f"{cause} {100.0 * share:.0f} %" for cause, share in shares)
    lost = f"lost {length_words(total, units)} {units} of head: {parts}" if shares else ""
    ink = small_ink(view.theme, view.font(), "second")
    scale = f"heights × {view.exaggeration:.2g}"
    soft = small_ink(view.theme, view.font())
    right = view.width() - 12.0
    width, height = text_size(soft.font, scale)
    draw_text(painter, QPointF(right - width, 10.0), scale, soft)
    room = right - width - 18.0 - TITLE_ROOM
    lost = lost if text_size(ink.font, lost)[0] <= room else lost.split(":")[0]
    if text_size(ink.font, lost)[0] <= room:
        draw_text(painter, QPointF(right - width - 18.0 - text_size(ink.font, lost)[0], 10.0), lost, ink)


def paint_readout(painter: QPainter, view: "ElevationView", at: QPointF, lines: list[str]) -> None:
    """Box with figures beside the cursor, on the side and at the height where it covers least."""
    first = Ink(view.theme.colour("ink"), font_of(view.font(), USUAL, bold=True))
    second = small_ink(view.theme, view.font(), halo=False)
    sizes = [text_size(ink.font, text) for ink, text in zip((first, second), lines, strict=True)]
    width, height = max(size[0] for size in sizes) + 20.0, sizes[0][1] + sizes[1][1] + 14.0
    left = at.x() + READOUT_GAP
    if left + width > view.width() - RIGHT_AXIS:
        left = at.x() - READOUT_GAP - width
    top = view.height() - RULER - 10.0 - height if at.y() < 0.5 * view.height() else 36.0
    box = QRectF(round(left) + 0.5, round(top) + 0.5, round(width), round(height))
    painter.setPen(pen(view.theme.colour("line")))
    painter.setBrush(view.theme.colour("panel"))
    painter.drawRoundedRect(box, 3.0, 3.0)
    draw_text(painter, box.topLeft() + QPointF(10.0, 6.0), lines[0], first)
    draw_text(painter, box.topLeft() + QPointF(10.0, 8.0 + sizes[0][1]), lines[1], second)
