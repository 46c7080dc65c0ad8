"""The view in space where there is no OpenGL: drawn panel by panel from far to near; drag to turn it."""

import math
from typing import Any, ClassVar, NamedTuple

import numpy as np
from PySide6.QtCore import QPointF, Qt, Slot
from PySide6.QtGui import QColor, QKeyEvent, QPainter
from PySide6.QtWidgets import QWidget

from studio.display import Array, BallPath, layout_of, levels_of, moment_at, orientation_at, path_of
from studio.panels import Panels, panels_of, rotated
from studio.theme import Theme
from studio.views.canvas import Canvas, Margins
from studio.widgets.marks import LEAST_BALL, draw_ball
from studio.widgets.strokes import Stroke, draw_path, path_colours, pen, polygon, thin
from studio.workspace import Workspace

AZIMUTH, ELEVATION = math.radians(-58.0), math.radians(26.0)
ORBIT, KEY_ORBIT = math.radians(0.4), math.radians(6.0)
"""rad a px, rad a key."""
STEEPEST = math.radians(89.0)
PATH_WIDTH = 1.8
SEAM = 0.7
"""px. Panels are drawn this much larger, so that no paper shows between them."""
SHADES = 40
"""Steps of light; each has its brushes ready."""
LIGHT_LIGHT, DARK_LIGHT = (0.84, 1.05), (0.72, 1.42)
"""Share of the fill that a panel shows in the least and in the most light, on a light and on a dark sheet."""
DOTS = np.concatenate([np.eye(3), -np.eye(3)])
"""Places on the ball that show how it turns."""


class Axes(NamedTuple):
    """Unit vectors (3,) to the right, up and toward the eye."""

    right: Array
    up: Array
    eye: Array


class IsometricView(Canvas):
    """Parallel projection of the design."""

    margins: ClassVar[Margins] = Margins(24.0, 40.0, 24.0, 24.0)

    def __init__(self, workspace: Workspace, theme: Theme, parent: QWidget | None = None) -> None:
        super().__init__(workspace, theme, "View", parent)
        self.setAccessibleDescription("The design in space; drag to turn, click selects an element.")
        self.azimuth, self.elevation = AZIMUTH, ELEVATION
        self._path: BallPath | None = None
        self._panels: Panels = panels_of(layout_of(workspace.design, workspace.roll))
        self._order = np.zeros(0, dtype=np.int64)
        self._corners = np.zeros((0, 4, 2))
        self._turning = QPointF()
        self._take_design()
        self._take_roll()
        workspace.designChanged.connect(self._take_design)
        workspace.rolled.connect(self._take_roll)
        workspace.selectionChanged.connect(self.redraw)
        workspace.timeChanged.connect(self.update)

    @Slot()
    def _take_design(self, *_: Any) -> None:
        empty = len(self._panels.middle) == 0
        self.layout_now = layout_of(self.workspace.design, self.workspace.roll)
        self._panels = panels_of(self.layout_now)
        self.fit() if empty else self.redraw()

    @Slot()
    def _take_roll(self, *_: Any) -> None:
        self._path = path_of(self.workspace.roll)
        self.redraw()

    @property
    def axes(self) -> Axes:
        """Axes of the projection."""
        ca, sa, ce, se = (f(x) for x in (self.azimuth, self.elevation) for f in (math.cos, math.sin))
        eye = np.array([ce * ca, ce * sa, se])
        right = np.array([-sa, ca, 0.0])
        return Axes(right, np.cross(eye, right), eye)

    def flat(self, points: Array) -> Array:
        """Points (n, 3) to the plane of the drawing (n, 2), m."""
        axes = self.axes
        return np.stack([points @ axes.right, points @ axes.up], axis=-1)

    def world_bounds(self) -> Array | None:
        """Corners of everything placed, in the plane of the drawing."""
        if not self.layout_now.placed:
            return None
        points = np.concatenate([self._panels.outline, np.zeros((0, 3))])
        flat = self.flat(points)
        return np.stack([flat.min(axis=0), flat.max(axis=0)]) if len(flat) else None

    # -- painting ---------------------------------------------------------------------------------
    def paint_static(self, painter: QPainter) -> None:
        """Paint panels from far to near, then the path."""
        axes = self.axes
        corners, light, depth = self._panels.seen(axes.eye)
        self._corners = self.to_screen(self.flat(corners.reshape(-1, 3))).reshape(-1, 4, 2)
        self._order = np.argsort(depth)
        brushes = self._brushes()
        shade = np.clip((light * SHADES).astype(np.int64), 0, SHADES - 1)
        chosen = [each.index for each in self.layout_now.placed if each.element.id in self.workspace.selection]
        accent = np.isin(self._panels.element, chosen)
        pens = [pen(self.theme.colour(token, alpha), 0.9) for token, alpha in (("tube", 0.95), ("accent", 1.0))]
        for number in self._order.tolist():
            fill, edge = brushes[int(accent[number])][int(shade[number])], pens[int(accent[number])]
            self._paint_panel(painter, number, fill, edge)
        self._paint_path(painter)

    def _paint_panel(self, painter: QPainter, number: int, fill: QColor, edge: Any) -> None:
        """Fill of a panel, and the edges it shows: along the track for tubes, none between panels of a vessel."""
        corners = self._corners[number]
        painter.setPen(pen(fill, SEAM))
        painter.setBrush(fill)
        painter.drawPolygon(polygon(corners))
        painter.setPen(edge)
        for side in self._panels.edges[number]:
            if side >= 0:
                a, b = corners[side], corners[(side + 1) % 4]
                painter.drawLine(QPointF(*a.tolist()), QPointF(*b.tolist()))

    def _brushes(self) -> list[list[QColor]]:
        """Fills by light, plain and selected."""
        found = []
        low, high = DARK_LIGHT if self.theme.dark else LIGHT_LIGHT
        for token in ("tube_fill", "accent_bg"):
            base = self.theme.colour(token)
            row = []
            for step in range(SHADES):
                shade = low + (high - low) * step / (SHADES - 1)
                parts = [min(1.0, part * shade) for part in base.getRgbF()[:3]]
                row.append(QColor.fromRgbF(*parts))
            found.append(row)
        return found

    def _paint_path(self, painter: QPainter) -> None:
        path = self._path
        if path is None:
            return
        stroke = Stroke(self.to_screen(self.flat(path.place)), levels_of(path.speed, path.top_speed), path.regime)
        painter.setBrush(Qt.BrushStyle.NoBrush)
        draw_path(painter, thin(stroke), path_colours(self.theme.dark), PATH_WIDTH)

    def paint_moving(self, painter: QPainter) -> None:
        """Paint the ball, with dots that turn with it."""
        path = self._path
        if path is None:
            return
        moment = moment_at(path, self.workspace.time)
        at = QPointF(*self.to_screen(self.flat(moment.place[None]))[0].tolist())
        radius = max(path.radius * float(self.scale[0]), LEAST_BALL + 2.0)
        draw_ball(painter, at, radius, self.theme)
        axes = self.axes
        turned = rotated(DOTS, orientation_at(path, moment))
        painter.setPen(Qt.PenStyle.NoPen)
        painter.setBrush(self.theme.colour("sheet"))
        for dot in turned[turned @ axes.eye > 0.25]:
            place = at + QPointF(float(dot @ axes.right), -float(dot @ axes.up)) * (radius * 0.8)
            painter.drawEllipse(place, 0.2 * radius, 0.2 * radius)

    # -- pointer and keys -------------------------------------------------------------------------
    def element_at(self, at: QPointF) -> str:
        """Id of the nearest element under a place of the screen; empty for none."""
        point = np.array([at.x(), at.y()])
        low, high = self._corners.min(axis=1), self._corners.max(axis=1)
        near = ((point >= low - 2.0) & (point <= high + 2.0)).all(axis=1)
        for number in self._order[::-1].tolist():
            if near[number]:
                return self.layout_now.placed[int(self._panels.element[number])].element.id
        return ""

    def clicked(self, at: QPointF) -> None:
        """Select what is under the pointer."""
        found = self.element_at(at)
        self.workspace.select((found,) if found else ())

    def take_hold(self, at: QPointF) -> bool:
        """Turn the view with the left button."""
        self._turning = at
        return True

    def dragged(self, at: QPointF) -> None:
        """Turn the view."""
        step, self._turning = at - self._turning, at
        self.turn(-ORBIT * step.x(), ORBIT * step.y())

    def let_go(self, at: QPointF) -> None:
        """Take a press without a move as a click."""
        if self._pressed is not None and (at - self._pressed).manhattanLength() <= 3.0:
            self.clicked(at)

    def turn(self, azimuth: float, elevation: float) -> None:
        """Turn the view by angles, rad, about the middle of the sheet."""
        self.azimuth += azimuth
        self.elevation = min(max(self.elevation + elevation, -STEEPEST), STEEPEST)
        self.fit() if self._fitted else self.redraw()

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Turn with the arrows; the rest as on every sheet."""
        turns = {
            Qt.Key.Key_Left: (KEY_ORBIT, 0.0),
            Qt.Key.Key_Right: (-KEY_ORBIT, 0.0),
            Qt.Key.Key_Up: (0.0, KEY_ORBIT),
            Qt.Key.Key_Down: (0.0, -KEY_ORBIT),
        }
        if event.key() in turns and not event.modifiers() & Qt.KeyboardModifier.ControlModifier:
            self.turn(*turns[Qt.Key(event.key())])
        else:
            super().keyPressEvent(event)
