"""Strokes shared by the drawings: lines from arrays, the path in its colours, text, labels that keep off each other."""

from collections.abc import Sequence
from functools import lru_cache
from typing import NamedTuple

import numpy as np
import pyqtgraph
from pyqtgraph.functions import arrayToQPolygonF
from PySide6.QtCore import QPointF, QRectF, QSize, Qt
from PySide6.QtGui import QColor, QFont, QFontMetricsF, QPainter, QPainterPath, QPen, QPixmap, QPolygonF

from engine.integrate.result import Regime
from studio.display import LEVELS, Array, Indices, runs_of, thinned
from studio.resources import SMALL, USUAL
from studio.theme import Theme

LIGHT_SPAN, DARK_SPAN = (0.0, 0.9), (0.42, 1.0)
"""Part of the palette used on a light and on a dark sheet: its far end would not stand off the ground."""
THIN_STEP = 1.5
"""px between the points of a drawn path."""
COLOUR_STEP, COLOUR_RUNS, LONGEST_COLOUR = 8.0, 300.0, 60.0
"""px: least length of one colour; a long path has about so many stretches of a colour, none longer than the last."""
TICK_STEP, TICK_SIZE = 5.0, 6.0
"""px between the ticks that mark slipping, and their length."""
HALO = 1.75
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
    level = _held(stroke.points, stroke.level)
    kept = thinned(stroke.points, THIN_STEP, level * 4 + stroke.regime)
    return Stroke(stroke.points[kept], level[kept], stroke.regime[kept])


def _held(points: Array, level: Indices) -> Indices:
    """Levels that change no more often than can be told apart."""
    along = np.concatenate([[0.0], np.cumsum(np.hypot(*np.diff(points, axis=0).T))])
    step = max(COLOUR_STEP, min(LONGEST_COLOUR, float(along[-1]) / COLOUR_RUNS))
    bins = np.floor(along / step).astype(np.int64)
    first = np.concatenate([[True], np.diff(bins) != 0])
    return level[np.maximum.accumulate(np.where(first, np.arange(len(level)), 0))]


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
    base = QPointF(round(at.x()), round(at.y() + QFontMetricsF(ink.font).ascent()))
    if ink.halo is not None:
        ratio = painter.device().devicePixelRatioF()
        halo = _halo(text, ink.font.toString(), ink.halo.name(), ratio)
        painter.drawPixmap(QPointF(base.x() - HALO, base.y() - HALO - round(QFontMetricsF(ink.font).ascent())), halo)
    painter.setFont(ink.font)
    painter.setPen(ink.colour)
    painter.drawText(base, text)


@lru_cache(maxsize=512)
def _halo(text: str, font_name: str, colour: str, ratio: float) -> QPixmap:
    """Sheet colour round a text, kept because outlines of letters are slow to stroke."""
    font = QFont()
    font.fromString(font_name)
    width, height = text_size(font, text)
    size = QSize(int(ratio * (width + 2.0 * HALO + 2.0)), int(ratio * (height + 2.0 * HALO + 2.0)))
    picture = QPixmap(size)
    picture.setDevicePixelRatio(ratio)
    picture.fill(Qt.GlobalColor.transparent)
    outline = QPainterPath()
    outline.addText(QPointF(HALO, HALO + round(QFontMetricsF(font).ascent())), font, text)
    painter = QPainter(picture)
    painter.setRenderHint(QPainter.RenderHint.Antialiasing)
    round_pen = QPen(
        QColor(colour), 2.0 * HALO, Qt.PenStyle.SolidLine, Qt.PenCapStyle.RoundCap, Qt.PenJoinStyle.RoundJoin
    )
    painter.strokePath(outline, round_pen)
    painter.end()
    return picture


class Labels:
    """Places of texts already written; a new one goes to the first of its places that is free.

    `inside` is the sheet; `lines` (n, 2) px are points of the drawing that texts should rather not cover.
    """

    def __init__(self, inside: QRectF, lines: Array | None = None) -> None:
        self.inside = inside
        self.lines = lines if lines is not None else np.zeros((0, 2))
        self.taken: list[QRectF] = []

    def take(self, rect: QRectF) -> None:
        """Keep a place free of labels."""
        self.taken.append(rect)

    def free(self, rect: QRectF) -> bool:
        """Whether a place is inside and free."""
        return self.inside.contains(rect) and not any(rect.intersects(other) for other in self.taken)

    def clear(self, rect: QRectF) -> bool:
        """Whether a place is clear of the lines of the drawing."""
        x, y = self.lines[:, 0], self.lines[:, 1]
        return not bool(((x > rect.left()) & (x < rect.right()) & (y > rect.top()) & (y < rect.bottom())).any())

    def place(self, size: tuple[float, float], corners: Sequence[QPointF], *, needed: bool = True) -> QPointF | None:
        """First free one of some upper left corners, taken at once; None when all are taken.

        Places clear of lines come first; a text that is not `needed` is left out rather than written over lines.
        """
        rects = [
            (corner, QRectF(corner.x() - 2.0, corner.y() - 1.0, size[0] + 4.0, size[1] + 2.0)) for corner in corners
        ]
        free = [(corner, rect) for corner, rect in rects if self.free(rect)]
        chosen = next((pair for pair in free if self.clear(pair[1])), free[0] if free and needed else None)
        if chosen is None:
            return None
        self.take(chosen[1])
        return chosen[0]


def dotted(points: Array, step: float = 5.0) -> Array:
    """Points (m, 2) each `step` px along a line (n, 2) px, for `Labels`."""
    along = np.concatenate([[0.0], np.cumsum(np.hypot(*np.diff(points, axis=0).T))])
    places = np.arange(0.0, min(along[-1], 4000.0 * step), step)
    return np.stack([np.interp(places, along, points[:, 0]), np.interp(places, along, points[:, 1])], axis=1)


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
