"""Charts of the roll over time, one under the other, sharing the time cursor."""

import math
from typing import Any, ClassVar

import numpy as np
from PySide6.QtCore import QPointF, QRectF, Qt, Slot
from PySide6.QtGui import QPainter
from PySide6.QtWidgets import QWidget

from engine.units import display
from studio.display import Array, BallPath, Series, path_of, series_of, thinned
from studio.theme import Theme
from studio.views.canvas import Canvas, Margins, round_step
from studio.widgets.strokes import draw_text, pen, polygon, small_ink, text_size
from studio.workspace import Workspace

ROW_GAP = 20.0
TICK_ROOM = 90.0
"""px. Least distance of figures on the time axis."""
LEAST_SPAN = {"m/s": 0.01, "rad": 0.02, "g": 0.05, "rad/s": 0.1, "m": 0.001}
"""Smallest range of a chart by unit, so that rounding noise is not blown up."""


class ChartsView(Canvas):
    """Speed, wall angle, load, slip, spin and head over time."""

    margins: ClassVar[Margins] = Margins(16.0, 50.0, 76.0, 28.0)
    stretches: ClassVar[bool] = True

    def __init__(self, workspace: Workspace, theme: Theme, parent: QWidget | None = None) -> None:
        super().__init__(workspace, theme, "Over time", parent)
        self.setAccessibleDescription("Charts of the roll over time; click or drag to move the time cursor.")
        self._path: BallPath | None = None
        self._series: list[Series] = []
        self._take_roll()
        workspace.rolled.connect(self._take_roll)
        workspace.timeChanged.connect(self.update)

    @Slot()
    def _take_roll(self, *_: Any) -> None:
        empty = self._path is None
        self._path = path_of(self.workspace.roll)
        self._series = series_of(self._path) if self._path is not None else []
        self.fit() if self._fitted or empty else self.redraw()

    def world_bounds(self) -> Array | None:
        """Time across, s; upright the charts have ranges of their own."""
        if self._path is None:
            return None
        return np.array([[0.0, 0.0], [max(1e-3, float(self._path.t[-1])), 1.0]])

    def band(self, number: int) -> QRectF:
        """Place of a chart on the sheet."""
        room, count = self.room(), max(1, len(self._series))
        height = (room.height() - ROW_GAP * (count - 1)) / count
        return QRectF(1.0, room.top() + number * (height + ROW_GAP), room.right() - 1.0, height)

    # -- painting ---------------------------------------------------------------------------------
    def paint_static(self, painter: QPainter) -> None:
        """Paint the charts and the time axis."""
        if self._path is None:
            return
        self._paint_times(painter)
        for number, series in enumerate(self._series):
            self._paint_series(painter, self.band(number), series)

    def _paint_times(self, painter: QPainter) -> None:
        """Upright lines at round times, figures below."""
        step = round_step(TICK_ROOM / float(self.scale[0]))
        digits = max(0, -math.floor(math.log10(step) + 1e-9))
        low, high = self.to_world(QPointF(1.0, 0.0))[0], self.to_world(QPointF(self.room().right(), 0.0))[0]
        ink = small_ink(self.theme, self.font(), halo=False)
        painter.setPen(pen(self.theme.colour("grid")))
        for count in range(max(0, math.ceil(low / step)), math.floor(high / step) + 1):
            x = round(self.point(count * step, 0.0).x()) + 0.5
            painter.setPen(pen(self.theme.colour("grid")))
            painter.drawLine(QPointF(x, self.room().top()), QPointF(x, self.room().bottom()))
            words = f"{count * step:.{digits}f} s"
            draw_text(painter, QPointF(x - 0.5 * text_size(ink.font, words)[0], self.height() - 22.0), words, ink)

    def _paint_series(self, painter: QPainter, band: QRectF, series: Series) -> None:
        """One chart: its zero or lowest line, its curve, its range on the right, its name."""
        path = self._path
        low, high = self.span(series)
        if path is None:
            return
        points = np.stack([self.origin[0] + path.t * self.scale[0], self._heights(band, series)], axis=1)
        painter.setPen(pen(self.theme.colour("line")))
        base = band.bottom() - (0.0 - low) / (high - low) * band.height() if low < 0.0 < high else band.bottom()
        painter.drawLine(QPointF(band.left(), base), QPointF(band.right(), base))
        painter.save()
        painter.setClipRect(band.adjusted(0.0, -2.0, 0.0, 2.0))
        painter.setPen(pen(self.theme.colour("second"), 1.5))
        for piece in _pieces(points):
            kept = thinned(piece, 1.0, np.zeros(len(piece), dtype=np.int64))
            painter.drawPolyline(polygon(piece[kept]))
        painter.restore()
        ink = small_ink(self.theme, self.font())
        draw_text(painter, QPointF(12.0, band.top() - 18.0), series.words, ink)
        for value, y in ((high, band.top() - 3.0), (low, band.bottom() - text_size(ink.font, "0")[1] + 3.0)):
            draw_text(painter, QPointF(band.right() + 8.0, y), self.figure(series, value), ink)

    def _heights(self, band: QRectF, series: Series) -> Array:
        low, high = self.span(series)
        return np.asarray(band.bottom() - (series.values - low) / (high - low) * band.height())

    def span(self, series: Series) -> tuple[float, float]:
        """Lowest and highest value of a chart; from 0 where nothing is negative, but for heights."""
        known = series.values[np.isfinite(series.values)]
        low, high = (float(known.min()), float(known.max())) if len(known) else (0.0, 0.0)
        if series.unit != "m":
            low = min(low, 0.0)
        return low, max(high, low + LEAST_SPAN[series.unit])

    def figure(self, series: Series, value: float) -> str:
        """Value in the units of the design."""
        if series.unit == "g":
            return f"{value:.2f} g"
        number, word = display(value, series.unit, self.workspace.design.units)
        word = {"deg": "°"}.get(word, f" {word}" if word else "")
        digits = 0 if abs(number) >= 100.0 else (1 if abs(number) >= 10.0 else 2)
        return f"{number:.{digits}f}{word}".replace("-", "\u2212")

    def paint_moving(self, painter: QPainter) -> None:
        """Paint the time cursor and the values at it."""
        path = self._path
        if path is None:
            return
        t = self.workspace.time
        x = self.point(t, 0.0).x()
        if not 0.0 < x < self.room().right():
            return
        painter.setPen(pen(self.theme.colour("accent"), 1.25))
        painter.drawLine(QPointF(x, self.room().top() - 4.0), QPointF(x, self.room().bottom() + 4.0))
        ink = small_ink(self.theme, self.font(), "ink", bold=True)
        for number, series in enumerate(self._series):
            value = float(np.interp(t, path.t, series.values))
            if not math.isfinite(value):
                continue
            band = self.band(number)
            words, y = self.figure(series, value), self._spot(band, series, value)
            width, height = text_size(ink.font, words)
            left = x + 6.0 if x + 10.0 + width < self.room().right() else x - 6.0 - width
            top = min(max(y - height - 2.0, band.top() - 14.0), band.bottom() - height)
            painter.setPen(Qt.PenStyle.NoPen)
            painter.setBrush(self.theme.colour("accent"))
            painter.drawEllipse(QPointF(x, y), 2.5, 2.5)
            draw_text(painter, QPointF(left, top), words, ink)

    def _spot(self, band: QRectF, series: Series, value: float) -> float:
        low, high = self.span(series)
        return band.bottom() - (value - low) / (high - low) * band.height()

    # -- time -------------------------------------------------------------------------------------
    def take_hold(self, at: QPointF) -> bool:
        """Scrub."""
        self.dragged(at)
        return self._path is not None

    def dragged(self, at: QPointF) -> None:
        """Move the time cursor under the pointer."""
        self.workspace.set_time(float(self.to_world(at)[0]))


def _pieces(points: Array) -> list[Array]:
    """Parts of a line (n, 2) without nan, of two points or more."""
    good = np.isfinite(points[:, 1])
    edges = np.flatnonzero(np.diff(np.concatenate([[0], good.astype(np.int8), [0]])))
    return [points[a:b] for a, b in zip(edges[::2], edges[1::2], strict=True) if b - a > 1]
