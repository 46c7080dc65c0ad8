"""A sheet one draws on: world and screen, zoom at the pointer, drag to move, fit, a grid that suits the scale.

What does not move is painted once into a picture and kept until the view, the theme or the drawing changes; the ball
and the time cursor are painted over it.
"""

import math
from collections.abc import Callable
from typing import ClassVar, NamedTuple

import numpy as np
from PySide6.QtCore import QCoreApplication, QEvent, QLine, QPointF, QRectF, QSize, Qt
from PySide6.QtGui import QFocusEvent, QKeyEvent, QMouseEvent, QPainter, QPaintEvent, QPixmap, QResizeEvent, QWheelEvent
from PySide6.QtWidgets import QWidget

from engine.units import LENGTHS
from studio.display import Array
from studio.resources import USUAL
from studio.theme import Theme
from studio.widgets.strokes import Ink, draw_text, font_of, pen
from studio.workspace import Workspace

ZOOM_STEP = 1.0015
"""Zoom per eighth of a degree of the wheel; one notch (120) makes 1.2."""
KEY_ZOOM, KEY_PAN = 1.25, 48.0
LEAST_SCALE, MOST_SCALE = 1.0, 200_000.0
"""px per m: a kilometre on the sheet, a tenth of a millimetre across 20 px."""
GRID_STEP = 16.0
"""px. Least distance of grid lines."""
MAJOR = 5
CLICK_REACH = 3.0
"""px. A press that moves less is a click."""
TITLE_AT = QPointF(12.0, 9.0)


class Margins(NamedTuple):
    """px kept free round what is fitted."""

    left: float = 28.0
    top: float = 40.0
    right: float = 28.0
    bottom: float = 28.0


class Canvas(QWidget):
    """Sheet with a view of the world (x right, y up, m): screen = origin + scale (x, -y)."""

    margins: ClassVar[Margins] = Margins()
    stretches: ClassVar[bool] = False
    """Whether x and y may have scales of their own."""

    def __init__(self, workspace: Workspace, theme: Theme, title: str, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.workspace, self.theme, self.title = workspace, theme, title
        self.scale = np.array([1000.0, 1000.0])
        self.origin = np.array([0.0, 0.0])
        self._picture: QPixmap | None = None
        self._fitted = False
        self._space = self._panned = False
        self._pressed: QPointF | None = None
        self._last = QPointF()
        self.setMouseTracking(True)
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setMinimumSize(160, 120)
        self.setAccessibleName(title)
        theme.changed.connect(self.redraw)
        workspace.opened.connect(self.fit)

    # -- what a drawing brings --------------------------------------------------------------------
    def world_bounds(self) -> Array | None:
        """Low and high corner (2, 2) of what is drawn, m; None when there is nothing."""
        return None

    def paint_static(self, painter: QPainter) -> None:
        """Paint what stays while the ball moves."""

    def paint_moving(self, painter: QPainter) -> None:
        """Paint the ball and the time cursor."""

    def clicked(self, at: QPointF) -> None:
        """Answer a click."""

    def take_hold(self, at: QPointF) -> bool:
        """Whether a press of the left button starts a drag of the drawing's own."""
        return False

    def dragged(self, at: QPointF) -> None:
        """Answer a move of a drag of the drawing's own."""

    def let_go(self, at: QPointF) -> None:
        """Answer the end of a drag of the drawing's own."""

    def hovered(self, at: QPointF) -> None:
        """Answer a move of the pointer."""

    # -- view -------------------------------------------------------------------------------------
    def sizeHint(self) -> QSize:
        """Preferred size."""
        return QSize(560, 360)

    def to_screen(self, points: Array) -> Array:
        """Points (n, 2) in m to px."""
        return np.asarray(self.origin + points * (self.scale * (1.0, -1.0)))

    def point(self, x: float, y: float) -> QPointF:
        """One point in m to px."""
        return QPointF(float(self.origin[0] + x * self.scale[0]), float(self.origin[1] - y * self.scale[1]))

    def to_world(self, at: QPointF) -> Array:
        """Place in px to m, (2,)."""
        return np.array([(at.x() - self.origin[0]) / self.scale[0], (self.origin[1] - at.y()) / self.scale[1]])

    def fit(self) -> None:
        """Show everything."""
        bounds = self.world_bounds()
        room = self.room()
        if bounds is None or room.width() < 8.0 or room.height() < 8.0:
            self._fitted = bounds is None and self._fitted
            self.redraw()
            return
        size = np.maximum(bounds[1] - bounds[0], 1e-3)
        scale = np.array([room.width(), room.height()]) / size
        self.scale = scale if self.stretches else np.full(2, scale.min())
        self.scale = np.clip(self.scale, LEAST_SCALE, MOST_SCALE)
        centre = np.array([room.center().x(), room.center().y()])
        self.origin = centre - bounds.mean(axis=0) * self.scale * (1.0, -1.0)
        self._fitted = True
        self.redraw()

    def room(self) -> QRectF:
        """Part of the sheet into which things are fitted, px."""
        left, top, right, bottom = self.margins
        return QRectF(left, top, self.width() - left - right, self.height() - top - bottom)

    def zoom(self, factor: float, at: QPointF) -> None:
        """Zoom so that what is under the pointer stays there."""
        factor = float(np.clip(factor, LEAST_SCALE / self.scale.min(), MOST_SCALE / self.scale.max()))
        fixed = np.array([at.x(), at.y()])
        self.origin = fixed + (self.origin - fixed) * factor
        self.scale = self.scale * factor
        self._fitted = False
        self.redraw()

    def pan(self, dx: float, dy: float) -> None:
        """Move the view by some px."""
        self.origin = self.origin + (dx, dy)
        self._fitted = False
        self.redraw()

    def redraw(self) -> None:
        """Paint everything anew."""
        self._picture = None
        self.update()

    # -- painting ---------------------------------------------------------------------------------
    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint the kept picture, and what moves over it."""
        ratio = self.devicePixelRatioF()
        if self._picture is None or self._picture.devicePixelRatio() != ratio:
            self._picture = self._painted(ratio)
        painter = QPainter(self)
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        painter.drawPixmap(0, 0, self._picture)
        painter.setClipRect(self.rect().adjusted(1, 1, -1, -1))
        self.paint_moving(painter)
        painter.setClipping(False)
        self._paint_border(painter)

    def _painted(self, ratio: float) -> QPixmap:
        """Picture of what does not move."""
        picture = QPixmap(QSize(math.ceil(self.width() * ratio), math.ceil(self.height() * ratio)))
        picture.setDevicePixelRatio(ratio)
        picture.fill(self.theme.colour("sheet"))
        painter = QPainter(picture)
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        painter.setFont(self.font())
        self.paint_static(painter)
        ink = Ink(self.theme.colour("soft"), font_of(self.font(), USUAL, bold=True), self.theme.colour("sheet"))
        draw_text(painter, TITLE_AT, self.title, ink)
        painter.end()
        return picture

    def _paint_border(self, painter: QPainter) -> None:
        painter.setRenderHint(QPainter.RenderHint.Antialiasing, False)
        painter.setBrush(Qt.BrushStyle.NoBrush)
        painter.setPen(pen(self.theme.colour("soft" if self.hasFocus() else "line")))
        painter.drawRect(self.rect().adjusted(0, 0, -1, -1))

    def paint_grid(self, painter: QPainter, across: bool = True) -> None:
        """Hair lines at round lengths in the unit of the design, each fifth stronger; `across`: upright ones too."""
        painter.setRenderHint(QPainter.RenderHint.Antialiasing, False)
        low, high = self.to_world(QPointF(0, self.height())), self.to_world(QPointF(self.width(), 0))
        for axis in (0, 1) if across else (1,):
            step = self.grid_step(axis)
            numbers = range(math.ceil(low[axis] / step), math.floor(high[axis] / step) + 1)
            for strong, token in ((False, "grid"), (True, "grid_major")):
                painter.setPen(pen(self.theme.colour(token)))
                lines = [self._grid_line(axis, number * step) for number in numbers if (number % MAJOR == 0) is strong]
                painter.drawLines(lines)
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)

    def _grid_line(self, axis: int, value: float) -> QLine:
        """Line of the grid at a coordinate, m."""
        spot = round(float(self.origin[axis] + value * self.scale[axis] * (1.0, -1.0)[axis]))
        return QLine(spot, 0, spot, self.height()) if axis == 0 else QLine(0, spot, self.width(), spot)

    def grid_step(self, axis: int, least: float = GRID_STEP) -> float:
        """Round length (1, 2, 5 in the unit of the design) of at least `least` px, m."""
        unit = LENGTHS[self.workspace.design.units]
        return round_step(least / self.scale[axis] / unit) * unit

    # -- pointer and keys -------------------------------------------------------------------------
    def wheelEvent(self, event: QWheelEvent) -> None:
        """Zoom at the pointer."""
        turn = event.angleDelta().y() or event.angleDelta().x()
        self.zoom(ZOOM_STEP**turn, event.position())
        event.accept()

    def mousePressEvent(self, event: QMouseEvent) -> None:
        """Begin to move the view, to drag or to click."""
        self._last = event.position()
        self._drag: Callable[[QPointF], None] | None = None
        left = event.button() == Qt.MouseButton.LeftButton
        if event.button() == Qt.MouseButton.MiddleButton or (left and self._space):
            self._drag, self._panned = self._move_view, True
            self.setCursor(Qt.CursorShape.ClosedHandCursor)
        elif left:
            self._pressed = event.position()
            if self.take_hold(event.position()):
                self._drag = self.dragged

    def mouseMoveEvent(self, event: QMouseEvent) -> None:
        """Move the view, drag, or look what is under the pointer."""
        drag = getattr(self, "_drag", None)
        if drag is not None and event.buttons():
            drag(event.position())
        elif not event.buttons():
            self.hovered(event.position())
        self._last = event.position()

    def mouseReleaseEvent(self, event: QMouseEvent) -> None:
        """End a drag; a press without a move is a click."""
        drag, self._drag = getattr(self, "_drag", None), None
        self.setCursor(Qt.CursorShape.OpenHandCursor if self._space else Qt.CursorShape.ArrowCursor)
        if drag == self.dragged:
            self.let_go(event.position())
        elif drag is None and self._pressed is not None and event.button() == Qt.MouseButton.LeftButton:
            if (event.position() - self._pressed).manhattanLength() <= CLICK_REACH:
                self.clicked(event.position())
        self._pressed = None

    def _move_view(self, at: QPointF) -> None:
        self.pan(at.x() - self._last.x(), at.y() - self._last.y())

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Zoom with Page Up and Down (Ctrl + and -), move with the arrows or Space and a drag, fit with Home."""
        key, middle = event.key(), QPointF(self.rect().center())
        pans = {
            Qt.Key.Key_Left: (KEY_PAN, 0.0),
            Qt.Key.Key_Right: (-KEY_PAN, 0.0),
            Qt.Key.Key_Up: (0.0, KEY_PAN),
            Qt.Key.Key_Down: (0.0, -KEY_PAN),
        }
        if key in (Qt.Key.Key_PageUp, Qt.Key.Key_Plus, Qt.Key.Key_Equal):
            self.zoom(KEY_ZOOM, middle)
        elif key in (Qt.Key.Key_PageDown, Qt.Key.Key_Minus):
            self.zoom(1.0 / KEY_ZOOM, middle)
        elif key in pans and event.modifiers() in (Qt.KeyboardModifier.NoModifier, Qt.KeyboardModifier.KeypadModifier):
            self.pan(*pans[Qt.Key(key)])
        elif key == Qt.Key.Key_Home and not event.modifiers():
            self.fit()
        elif key == Qt.Key.Key_Space:
            self._space, self._panned = True, self._panned and event.isAutoRepeat()
            self.setCursor(Qt.CursorShape.OpenHandCursor)
        else:
            super().keyPressEvent(event)

    def keyReleaseEvent(self, event: QKeyEvent) -> None:
        """Let go of Space; when nothing was moved with it, it means what it means to the window."""
        if event.key() != Qt.Key.Key_Space or event.isAutoRepeat():
            super().keyReleaseEvent(event)
            return
        moved, self._space, self._panned = self._panned, False, False
        self.unsetCursor()
        parent = self.parentWidget()
        if not moved and parent is not None:
            again = QKeyEvent(QEvent.Type.KeyPress, Qt.Key.Key_Space, event.modifiers())
            QCoreApplication.sendEvent(parent, again)

    def resizeEvent(self, event: QResizeEvent) -> None:
        """Keep everything in sight as long as it was fitted, else keep the middle."""
        before, after = event.oldSize(), event.size()
        if self._fitted or not before.isValid():
            self.fit()
        else:
            self.pan(0.5 * (after.width() - before.width()), 0.5 * (after.height() - before.height()))

    def focusInEvent(self, event: QFocusEvent) -> None:
        """Show the focus at the border."""
        self.update()

    def focusOutEvent(self, event: QFocusEvent) -> None:
        """Let go of Space with the focus."""
        self._space = False
        self.update()


def round_step(least: float) -> float:
    """Smallest of 1, 2, 5 times a power of ten that is at least `least`."""
    power = 10.0 ** math.floor(math.log10(least))
    return power * next(factor for factor in (1.0, 2.0, 5.0, 10.0) if factor * power >= least * (1.0 - 1e-9))
