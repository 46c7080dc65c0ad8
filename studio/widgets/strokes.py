"""Strokes shared by the drawings: lines from arrays, the path in its colours, text, labels that keep off each other."""

from collections.abc import Sequence
from functools import lru_cache
from typing import NamedTuple

import numpy as np
import pyqtgraph
from PySide6.QtCore import QPointF, QRectF, Qt
from PySide6.QtGui import QColor, QFont, QFontMetricsF, QPainter, QPainterPath, QPen, QPolygonF
from pyqtgraph.functions import arrayToQPolygonF

from engine.integrate.result import Regime
from studio.display import LEVELS, Array, Indices, runs_of, thinned
from studio.resources import SMALL, USUAL
from studio.theme import Theme

LIGHT_SPAN, DARK_SPAN = (0.0, 0.9), (0.42, 1.0)
"""Part of the palette used on a light and on a dark sheet: its far end would not stand off the ground."""
THIN_STEP = 1.5
"""px between the points of a drawn path."""
TICK_STEP, TICK_SIZE = 5.0, 6.0
"""px between the ticks that mark slipping, and their length."""
HALO = 3.0
"""px of sheet colour round a text that stands on a drawing."""


@lru_cache(maxsize=4)
def path_colours(dark: bool, count: int = LEVELS) -> tuple[QColor, ...]:
    """Colours along a path, slow to fast: cividis (Nunez, Anderton, Renslow 2018), safe for colour-blind eyes."""
    low, high = DARK_SPAN if dark else LIGHT_SPAN
    colours = pyqtgraph.colormap.get("cividis").map(np.linspace(low, high, count), mode="float")
    return tuple(QColor.fromRgbF(*(float(part) for part in row[:3])) for row in colours)


def polygon(points: Array) -> QPolygonF:
    """Polygon of points (n, 2) in px."""
    return arrayToQPolygonF(points[:, 0], points[:, 1])


def pen(colour: QColor, width: float = 1.0, style: Qt.PenStyle = Qt.PenStyle.SolidLine) -> QPen:
    """Pen with flat ends and round corners."""
    return QPen(colour, width, style, Qt.PenCapStyle.FlatCap, Qt.PenJoinStyle.RoundJoin)


def font_of(base: QFont, size: float = USUAL, bold: bool = False) -> QFont:
    """Font of the window in another size and weight."""
    made = QFont(base)
    made.setPixelSize(round(size))
    made.setWeight(QFont.Weight.DemiBold if bold else QFont.Weight.Normal)
    return made


# -- the path -------------------------------------------------------------------------------------
class Stroke(NamedTuple):
    """A path on screen: points (n, 2) px, colour level (n,), regime (n,)."""

    points: Array
    level: Indices
    regime: Indices


def thin(stroke: Stroke) -> Stroke:
    """The path with no more points than can be seen."""
    kept = thinned(stroke.points, THIN_STEP, stroke.level * 4 + stroke.regime)
    return Stroke(stroke.points[kept], stroke.level[kept], stroke.regime[kept])


def draw_path(painter: QPainter, stroke: Stroke, colours: Sequence[QColor], width: float) -> None:
    """Draw a thinned path, one line per run of one colour and regime: solid, dotted in flight."""
    line = pen(colours[0], width)
    for first, last in runs_of(stroke.level * 4 + stroke.regime):
        line.setColor(colours[int(stroke.level[first])])
        line.setStyle(_style(int(stroke.regime[first])))
        painter.setPen(line)
        painter.drawPolyline(polygon(stroke.points[first : last + 1]))


def _style(regime: int) -> Qt.PenStyle:
    return Qt.PenStyle.DotLine if regime == int(Regime.FLIGHT) else Qt.PenStyle.SolidLine


def draw_slip(painter: QPainter, stroke: Stroke, colour: QColor, gap: float) -> None:
    """Draw short ticks on the right of the path wherever it slips; `gap` px off its middle."""
    slipping = stroke.regime == int(Regime.SLIPPING)
    if not slipping.any():
        return
    path = QPainterPath()
    for first, last in runs_of(slipping.astype(np.int64)):
        if slipping[first]:
            _add_ticks(path, stroke.points[first : last + 1], gap)
    painter.setPen(pen(colour, 1.0))
    painter.setBrush(Qt.BrushStyle.NoBrush)
    painter.drawPath(path)


def _add_ticks(path: QPainterPath, points: Array, gap: float) -> None:
    """Add slanted ticks along a line."""
    step = np.diff(points, axis=0)
    along = np.concatenate([[0.0], np.cumsum(np.hypot(step[:, 0], step[:, 1]))])
    if along[-1] < 1e-6:
        return
    places = np.arange(0.5 * min(TICK_STEP, along[-1]), along[-1], TICK_STEP)
    piece = np.clip(np.searchsorted(along, places, side="right") - 1, 0, len(step) - 1)
    size = np.maximum(np.hypot(*step[piece].T), 1e-9)[:, None]
    ahead = step[piece] / size
    right = np.stack([-ahead[:, 1], ahead[:, 0]], axis=1)
    middle = points[piece] + ahead * (places - along[piece])[:, None]
    near = middle + gap * right
    far = near + TICK_SIZE * (right - 0.5 * ahead)
    for a, b in zip(near.tolist(), far.tolist(), strict=True):
        path.moveTo(*a)
        path.lineTo(*b)


# -- text -----------------------------------------------------------------------------------------
class Ink(NamedTuple):
    """How a text is written: colour, font, whether the sheet is left free round it."""

    colour: QColor
    font: QFont
    halo: QColor | None = None


def text_size(font: QFont, text: str) -> tuple[float, float]:
    """Width and height of a text, px."""
    metrics = QFontMetricsF(font)
    return metrics.horizontalAdvance(text), metrics.height()


def draw_text(painter: QPainter, at: QPointF, text: str, ink: Ink) -> None:
    """Write a text whose box has its upper left corner at a place."""
    metrics = QFontMetricsF(ink.font)
    base = QPointF(round(at.x()), round(at.y() + metrics.ascent()))
    if ink.halo is not None:
        outline = QPainterPath()
        outline.addText(base, ink.font, text)
        painter.setBrush(Qt.BrushStyle.NoBrush)
        painter.strokePath(outline, QPen(ink.halo, HALO, Qt.PenStyle.SolidLine, Qt.PenCapStyle.RoundCap, Qt.PenJoinStyle.RoundJoin))
    painter.setFont(ink.font)
    painter.setPen(ink.colour)
    painter.drawText(base, text)


class Labels:
    """Places of texts already written; a new one goes to the first of its places that is free."""

    def __init__(self, inside: QRectF) -> None:
        self.inside = inside
        self.taken: list[QRectF] = []

    def take(self, rect: QRectF) -> None:
        """Keep a place free of labels."""
        self.taken.append(rect)

    def free(self, rect: QRectF) -> bool:
        """Whether a place is inside and free."""
        return self.inside.contains(rect) and not any(rect.intersects(other) for other in self.taken)

    def place(self, size: tuple[float, float], corners: Sequence[QPointF]) -> QPointF | None:
        """First free one of some upper left corners, taken at once; None when all are taken."""
        for corner in corners:
            rect = QRectF(corner.x() - 2.0, corner.y() - 1.0, size[0] + 4.0, size[1] + 2.0)
            if self.free(rect):
                self.take(rect)
                return corner
        return None


def round_about(x: float, y: float, size: tuple[float, float], gap: float) -> list[QPointF]:
    """Upper left corners of a text about a place: right, left, above, below and the four slants."""
    w, h = size
    middle_x, middle_y = x - 0.5 * w, y - 0.5 * h
    offsets = [(x + gap, middle_y), (x - gap - w, middle_y), (middle_x, y - gap - h), (middle_x, y + gap)]
    offsets += [(x + gap, y - gap - h), (x + gap, y + gap), (x - gap - w, y - gap - h), (x - gap - w, y + gap)]
    return [QPointF(a, b) for a, b in offsets]


def small_ink(theme: Theme, base: QFont, token: str = "soft", *, bold: bool = False, halo: bool = True) -> Ink:
    """Small text of a drawing."""
    return Ink(theme.colour(token), font_of(base, SMALL, bold), theme.colour("sheet") if halo else None)
