"""The view in space: tubes one looks through, open troughs, vessels, the path, the ball turning as it does."""

import math
from typing import Any

import numpy as np
from pyqtgraph.opengl import GLMeshItem, GLViewWidget
from PySide6.QtCore import QPointF, QSize, Qt, Slot
from PySide6.QtGui import QKeyEvent, QMatrix4x4, QMouseEvent, QQuaternion, QResizeEvent, QVector3D, QWheelEvent
from PySide6.QtWidgets import QFrame, QHBoxLayout, QLabel, QToolButton, QVBoxLayout, QWidget

from engine.integrate.result import Regime
from engine.placement import Layout
from studio.display import Array, BallPath, evenly, layout_of, levels_of, moment_at, orientation_at, path_of
from studio.meshes import ball_mesh, hit
from studio.stage import Group, ribbon, ribbons, stage_of
from studio.theme import Theme
from studio.views.gl_items import BLEND, ClearMesh, Lines, fill
from studio.views.isometric import IsometricView
from studio.views.shading import gl_available, samples, shader
from studio.widgets.strokes import path_colours
from studio.workspace import Workspace

FIELD = 32.0
"""deg. Field of view: narrow, nearly a drawing."""
AZIMUTH, ELEVATION = -58.0, 26.0
ORBIT, KEY_ORBIT, KEY_ZOOM = 0.4, 6.0, 1.2
"""deg a px, deg a key, share a key."""
CLICK_REACH = 3.0
MOST_POINTS, SPACING = 6000, 500.0
"""Points of the path shown in space, and how many of them lie along the largest side."""
THOUSAND = 1000.0
DASH = 3
"""Points to a dash and to a gap of the path in flight."""
FREE = 1.08
"""Share of the distance added, so that nothing touches the border."""
CLEAR, CHOSEN = 0.22, 0.34
"""Opacity of what one looks through, plain and selected."""
PATH_WIDTH, RIM_WIDTH = 2.2, 1.0


def make_view3d(workspace: Workspace, theme: Theme) -> QWidget:
    """Make the view in space: with OpenGL where there is one, else drawn."""
    return SpaceView(workspace, theme) if gl_available() else IsometricView(workspace, theme)


class Space(GLViewWidget):
    """What is drawn with OpenGL, and how one moves about it."""

    def __init__(self, workspace: Workspace, theme: Theme, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        shape = self.format()
        shape.setSamples(samples())
        self.setFormat(shape)
        self.workspace, self.theme = workspace, theme
        self.follow = False
        self.layout_now = Layout(workspace.design, ())
        self._stage = stage_of(self.layout_now)
        self._path: BallPath | None = None
        self._last = self._pressed = QPointF()
        self._space = False
        self.opts["fov"] = FIELD
        self.opts["azimuth"], self.opts["elevation"] = AZIMUTH, ELEVATION
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self._path_line, self._rims = Lines("path", PATH_WIDTH), Lines("rims", RIM_WIDTH)
        self._opaque = GLMeshItem(shader=shader(), smooth=True, glOptions="opaque")
        self._clear = ClearMesh(shader=shader(), smooth=True, glOptions=BLEND)
        self._ball = GLMeshItem(shader=shader(), smooth=True, glOptions="opaque")
        for order, item in enumerate((self._opaque, self._ball, self._clear, self._rims, self._path_line)):
            item.setDepthValue(order)
            self.addItem(item)

    # -- content ----------------------------------------------------------------------------------
    def show_design(self) -> None:
        """Take the surfaces of the design."""
        self.layout_now = layout_of(self.workspace.design, self.workspace.roll)
        self._stage = stage_of(self.layout_now)
        self.colour()

    def show_roll(self) -> None:
        """Take the path of the roll."""
        self._path = path_of(self.workspace.roll)
        self.colour()
        self.show_time()

    def colour(self) -> None:
        """Colour everything anew: theme, selection, speeds."""
        self.setBackgroundColor(self.theme.colour("sheet"))
        stage = self._stage
        fill(self._opaque, stage.opaque, self._colours(stage.opaque.element, "tube_fill", 1.0))
        fill(self._clear, stage.clear, self._colours(stage.clear.element, "tube", CLEAR))
        self._rims.fill(ribbons(stage.rims, self._step), self._colours(np.repeat(stage.rim_element, 2), "tube", 1.0))
        self._colour_path()
        self._colour_ball()

    def _colours(self, element: np.ndarray, token: str, alpha: float) -> np.ndarray:
        """Colour (n, 4) float32 of corners by their element; the selected ones in the accent."""
        plain = np.array(self.theme.colour(token, alpha).getRgbF(), dtype=np.float32)
        accent = np.array(self.theme.colour("accent", CHOSEN if alpha < 1.0 else 1.0).getRgbF(), dtype=np.float32)
        chosen = [each.index for each in self.layout_now.placed if each.element.id in self.workspace.selection]
        colours = np.tile(plain, (len(element), 1))
        colours[np.isin(element, chosen)] = accent
        return colours

    def _colour_path(self) -> None:
        path = self._path
        if path is None:
            self._path_line.setVisible(False)
            return
        way = evenly(path.developed, max(float(path.developed[-1]) / MOST_POINTS, self._step * THOUSAND / SPACING))
        row = np.clip(np.searchsorted(path.developed, way, side="right") - 1, 0, len(path.t) - 1)
        place = np.stack([np.interp(way, path.developed, path.place[:, axis]) for axis in range(3)], axis=1)
        levels = levels_of(path.speed[row], path.top_speed)
        table = np.array([colour.getRgbF() for colour in path_colours(self.theme.dark)], dtype=np.float32)
        dash = np.arange(len(way)) // DASH % 2 == 0
        shown = dash | (path.regime[row] != int(Regime.FLIGHT))
        self._path_line.fill(ribbon(place, self._step, shown), table[levels])

    def _colour_ball(self) -> None:
        mesh, light = ball_mesh()
        plain, band = (self.theme.colour(token).getRgbF() for token in ("ink", "accent"))
        colours = np.where(light[:, None], np.array(band), np.array(plain)).astype(np.float32)
        fill(self._ball, Group(mesh, np.zeros(0, dtype=np.int64)), colours)
        self._ball.setVisible(self._path is not None)

    def show_time(self) -> None:
        """Put the ball where it is, turned as it is."""
        path = self._path
        self._ball.setVisible(path is not None)
        if path is None:
            return
        moment = moment_at(path, self.workspace.time)
        place = QVector3D(*moment.place.tolist())
        matrix = QMatrix4x4()
        matrix.translate(place)
        matrix.rotate(QQuaternion(*orientation_at(path, moment).tolist()))
        matrix.scale(path.radius)
        self._ball.setTransform(matrix)
        if self.follow:
            self.opts["center"] = place
        self.update()

    # -- view -------------------------------------------------------------------------------------
    def fit(self) -> None:
        """Show everything: the nearest place from which all corners are inside the view."""
        points = self._stage.points
        if len(points) == 0:
            return
        matrix = np.array(self.viewMatrix().copyDataTo()).reshape(4, 4)[:3, :3]
        seen = points @ matrix.T
        middle = 0.5 * (seen.min(axis=0) + seen.max(axis=0))
        away = np.abs(seen - middle)
        half = math.tan(math.radians(0.5 * FIELD))
        across, upright = half, half * self.height() / max(1, self.width())
        toward = seen[:, 2] - middle[2]
        distance = float((toward + np.maximum(away[:, 0] / across, away[:, 1] / upright)).max())
        self.opts["center"] = QVector3D(*(matrix.T @ middle).tolist())
        self.opts["distance"] = max(FREE * distance, 1e-2)
        self.update()

    @property
    def _step(self) -> float:
        """A thousandth of the largest side of the box round everything placed, m."""
        low, high = self.layout_now.bounds()
        return max(float((high - low).max()), 0.01) / THOUSAND

    def zoom(self, factor: float) -> None:
        """Come nearer by a factor."""
        self.opts["distance"] = float(np.clip(self.opts["distance"] / factor, 1e-3, 1e4))
        self.update()

    def ray(self, at: QPointF) -> tuple[Array, Array]:
        """Point (3,) near the eye and unit direction (3,) through a place of the view."""
        x = 2.0 * at.x() / max(1, self.width()) - 1.0
        y = 1.0 - 2.0 * at.y() / max(1, self.height())
        back, _ = (self.projectionMatrix(self.getViewport(), self.getViewport()) * self.viewMatrix()).inverted()
        near, far = (np.array(back.map(QVector3D(x, y, z)).toTuple()) for z in (-1.0, 1.0))
        away = far - near
        return near, away / math.sqrt(away @ away)

    def element_at(self, at: QPointF) -> str:
        """Id of the element under a place of the view; empty for none."""
        found = hit(self._stage.solids, *self.ray(at))
        return self.layout_now.placed[found].element.id if found is not None else ""

    # -- pointer and keys -------------------------------------------------------------------------
    def mousePressEvent(self, event: QMouseEvent) -> None:
        """Remember where a drag or click begins."""
        self._last = self._pressed = event.position()

    def mouseMoveEvent(self, event: QMouseEvent) -> None:
        """Turn with the left button; move with the middle one, or left with Shift or Space."""
        step, self._last = event.position() - self._last, event.position()
        moving = self._space or bool(event.modifiers() & Qt.KeyboardModifier.ShiftModifier)
        if event.buttons() & Qt.MouseButton.MiddleButton or (event.buttons() & Qt.MouseButton.LeftButton and moving):
            self.pan(step.x(), step.y(), 0, relative="view")
        elif event.buttons() & Qt.MouseButton.LeftButton:
            self.orbit(-ORBIT * step.x(), ORBIT * step.y())

    def mouseReleaseEvent(self, event: QMouseEvent) -> None:
        """Select what was clicked."""
        still = (event.position() - self._pressed).manhattanLength() <= CLICK_REACH
        if event.button() == Qt.MouseButton.LeftButton and still:
            found = self.element_at(event.position())
            self.workspace.select((found,) if found else ())

    def wheelEvent(self, event: QWheelEvent) -> None:
        """Zoom."""
        self.zoom(1.0015 ** (event.angleDelta().y() or event.angleDelta().x()))
        event.accept()

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Turn with the arrows, zoom with Page Up and Down or Ctrl and + or -, fit with Home."""
        key = Qt.Key(event.key())
        turns = {
            Qt.Key.Key_Left: (KEY_ORBIT, 0.0),
            Qt.Key.Key_Right: (-KEY_ORBIT, 0.0),
            Qt.Key.Key_Up: (0.0, KEY_ORBIT),
            Qt.Key.Key_Down: (0.0, -KEY_ORBIT),
        }
        if key in turns:
            self.orbit(*turns[key])
        elif key in (Qt.Key.Key_PageUp, Qt.Key.Key_Plus, Qt.Key.Key_Equal):
            self.zoom(KEY_ZOOM)
        elif key in (Qt.Key.Key_PageDown, Qt.Key.Key_Minus):
            self.zoom(1.0 / KEY_ZOOM)
        elif key == Qt.Key.Key_Home and not event.modifiers():
            self.fit()
        else:
            event.ignore()

    def keyReleaseEvent(self, event: QKeyEvent) -> None:
        """Leave keys to the window."""
        event.ignore()


class SpaceView(QFrame):
    """Sheet with the view in space, its title and two switches."""

    def __init__(self, workspace: Workspace, theme: Theme, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.setObjectName("sheet")
        self.setAccessibleName("View")
        self.setAccessibleDescription("The design in space; drag to turn, click selects an element.")
        self.workspace, self.theme = workspace, theme
        self.space = Space(workspace, theme, self)
        self.title = QLabel("View", self)
        self.title.setProperty("role", "pane")
        self.follow = self._switch("Follow", "Keep the ball in the middle", checkable=True)
        self.follow.toggled.connect(self._set_follow)
        self._lay_out()
        self.space.show_design()
        self.space.show_roll()
        self.space.fit()
        self._fitted = False
        workspace.designChanged.connect(self._take_design)
        workspace.rolled.connect(self._take_roll)
        workspace.selectionChanged.connect(self._colour)
        workspace.timeChanged.connect(self._show_time)
        workspace.opened.connect(self.fit)
        theme.changed.connect(self._colour)

    def _switch(self, words: str, tip: str, *, checkable: bool) -> QToolButton:
        button = QToolButton(self)
        button.setText(words)
        button.setToolTip(tip)
        button.setAccessibleName(words)
        button.setCheckable(checkable)
        button.setFocusPolicy(Qt.FocusPolicy.TabFocus)
        return button

    def _lay_out(self) -> None:
        """Title and switch in a row over the view."""
        column = QVBoxLayout(self)
        column.setContentsMargins(1, 1, 1, 1)
        column.setSpacing(0)
        row = QHBoxLayout()
        row.setContentsMargins(11, 5, 8, 1)
        row.addWidget(self.title)
        row.addStretch(1)
        row.addWidget(self.follow)
        column.addLayout(row)
        column.addWidget(self.space, 1)
        self.setMinimumSize(160, 120)
        self.setFocusProxy(self.space)

    def sizeHint(self) -> QSize:
        """Preferred size."""
        return QSize(440, 360)

    def resizeEvent(self, event: QResizeEvent) -> None:
        """Fit once the size is known."""
        super().resizeEvent(event)
        if not self._fitted:
            self._fitted = True
            self.space.fit()

    def element_at(self, at: QPointF) -> str:
        """Id of the element under a place of the sheet; empty for none."""
        return self.space.element_at(QPointF(self.space.mapFrom(self, at.toPoint())))

    @Slot()
    def fit(self) -> None:
        """Show everything."""
        self.space.fit()

    @Slot()
    def _take_design(self, *_: Any) -> None:
        self.space.show_design()

    @Slot()
    def _take_roll(self, *_: Any) -> None:
        self.space.show_roll()

    @Slot()
    def _colour(self, *_: Any) -> None:
        self.space.colour()

    @Slot()
    def _show_time(self, *_: Any) -> None:
        self.space.show_time()

    @Slot(bool)
    def _set_follow(self, on: bool) -> None:
        self.space.follow = on
        self.space.show_time()
