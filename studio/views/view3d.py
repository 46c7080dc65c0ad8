"""The view in space: tubes one looks through, open troughs, vessels, the path in its colours, the ball turning as it does."""

import math
from typing import Any

import numpy as np
from OpenGL import GL
from PySide6.QtCore import QPointF, QSize, Qt, Slot
from PySide6.QtGui import QKeyEvent, QMatrix4x4, QMouseEvent, QQuaternion, QResizeEvent, QVector3D, QWheelEvent
from PySide6.QtWidgets import QFrame, QHBoxLayout, QLabel, QToolButton, QVBoxLayout, QWidget
from pyqtgraph.opengl import GLLinePlotItem, GLMeshItem, GLViewWidget, MeshData

from engine.placement import Layout
from studio.display import Array, BallPath, layout_of, levels_of, moment_at, orientation_at, path_of
from studio.meshes import Meshes, Stage, Surface, pick, sphere
from studio.theme import Theme
from studio.views.isometric import IsometricView
from studio.views.shading import gl_available, shader
from studio.widgets.strokes import path_colours
from studio.workspace import Workspace

FIELD = 32.0
"""deg. Field of view: narrow, nearly a drawing."""
AZIMUTH, ELEVATION = -58.0, 26.0
ORBIT, KEY_ORBIT, KEY_ZOOM = 0.4, 6.0, 1.2
"""deg a px, deg a key, share a key."""
CLICK_REACH = 3.0
MOST_POINTS = 6000
"""Points of the path shown in space."""
CLEAR, VESSEL_GLASS = 0.34, 0.5
PATH_WIDTH, RIM_WIDTH = 2.2, 1.0

BLEND: dict[Any, Any] = {
    GL.GL_DEPTH_TEST: True,
    GL.GL_BLEND: True,
    "glBlendFuncSeparate": (GL.GL_SRC_ALPHA, GL.GL_ONE_MINUS_SRC_ALPHA, GL.GL_ONE, GL.GL_ONE_MINUS_SRC_ALPHA),
}


def make_view3d(workspace: Workspace, theme: Theme) -> QWidget:
    """Make the view in space: with OpenGL where there is one, else drawn."""
    return SpaceView(workspace, theme) if gl_available() else IsometricView(workspace, theme)


class ClearMesh(GLMeshItem):
    """Surface one looks through: far sides first, then near sides, without hiding what is inside."""

    def paint(self) -> None:
        """Draw in two passes."""
        GL.glEnable(GL.GL_CULL_FACE)
        GL.glDepthMask(GL.GL_FALSE)
        for hidden in (GL.GL_FRONT, GL.GL_BACK):
            GL.glCullFace(hidden)
            super().paint()
        GL.glDepthMask(GL.GL_TRUE)
        GL.glDisable(GL.GL_CULL_FACE)


class Space(GLViewWidget):
    """What is drawn with OpenGL, and how one moves about it."""

    def __init__(self, workspace: Workspace, theme: Theme, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.workspace, self.theme = workspace, theme
        self.follow = False
        self._meshes = Meshes()
        self.show_nothing()
        self._path: BallPath | None = None
        self._last = self._pressed = QPointF()
        self._space = False
        self.opts["fov"] = FIELD
        self.opts["azimuth"], self.opts["elevation"] = AZIMUTH, ELEVATION
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self._path_line = GLLinePlotItem(width=PATH_WIDTH, antialias=True, glOptions=BLEND)
        self._rims = GLLinePlotItem(mode="lines", width=RIM_WIDTH, antialias=True, glOptions=BLEND)
        self._solid = GLMeshItem(shader=shader(), smooth=True, glOptions="opaque")
        self._clear = ClearMesh(shader=shader(), smooth=True, glOptions=BLEND)
        self._ball = GLMeshItem(shader=shader(), smooth=True, glOptions="opaque")
        for order, item in enumerate((self._solid, self._ball, self._path_line, self._rims, self._clear)):
            item.setDepthValue(order)
            self.addItem(item)

    # -- content ----------------------------------------------------------------------------------
    def show_nothing(self) -> None:
        """Start on an empty stage."""
        self.layout_now = Layout(self.workspace.design, ())
        self._stage: Stage = self._meshes.stage(self.layout_now)

    def show_design(self) -> None:
        """Take the surfaces of the design."""
        self.layout_now = layout_of(self.workspace.design, self.workspace.roll)
        self._stage = self._meshes.stage(self.layout_now)
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
        _fill(self._solid, stage.solid, self._colours(stage.solid_element, "tube_fill", 1.0))
        _fill(self._clear, stage.clear, self._colours(stage.clear_element, "tube_fill", CLEAR))
        rims = self._colours(np.repeat(stage.rim_element, 2), "tube", 1.0)
        self._rims.setVisible(len(stage.rims) > 0)
        if len(stage.rims):
            self._rims.setData(pos=stage.rims.reshape(-1, 3), color=rims)
        self._colour_path()
        self._colour_ball()

    def _colours(self, element: np.ndarray, token: str, alpha: float) -> np.ndarray:
        """Colour (n, 4) float32 of corners by their element; the selected ones in the accent."""
        plain = np.array(self.theme.colour(token, alpha).getRgbF(), dtype=np.float32)
        accent = np.array(self.theme.colour("accent", min(1.0, alpha + 0.15)).getRgbF(), dtype=np.float32)
        chosen = [each.index for each in self.layout_now.placed if each.element.id in self.workspace.selection]
        colours = np.tile(plain, (len(element), 1))
        colours[np.isin(element, chosen)] = accent
        return colours

    def _colour_path(self) -> None:
        path = self._path
        self._path_line.setVisible(path is not None)
        if path is None:
            return
        step = max(1, len(path.t) // MOST_POINTS)
        levels = levels_of(path.speed[::step], path.top_speed)
        table = np.array([colour.getRgbF() for colour in path_colours(self.theme.dark)], dtype=np.float32)
        self._path_line.setData(pos=path.place[::step].astype(np.float32), color=table[levels])

    def _colour_ball(self) -> None:
        surface, dark = sphere()
        light, ink = (self.theme.colour(token).getRgbF() for token in ("soft", "ink"))
        colours = np.where(dark[:, None], np.array(ink), np.array(light)).astype(np.float32)
        _fill(self._ball, surface, colours)

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
        """Show everything: the sphere round all that is placed fills the smaller side of the view."""
        low, high = self.layout_now.bounds()
        reach = max(0.5 * float(np.sqrt(((high - low) ** 2).sum())), 0.02)
        aspect = min(1.0, self.height() / max(1, self.width()))
        half = math.atan(math.tan(math.radians(0.5 * FIELD)) * aspect)
        self.opts["center"] = QVector3D(*(0.5 * (low + high)).tolist())
        self.opts["distance"] = 0.92 * reach / math.sin(half)
        self.update()

    def zoom(self, factor: float) -> None:
        """Come nearer by a factor."""
        self.opts["distance"] = float(np.clip(self.opts["distance"] / factor, 1e-3, 1e4))
        self.update()

    def ray(self, at: QPointF) -> tuple[Array, Array]:
        """Eye (3,) and unit direction (3,) through a place of the view."""
        x = 2.0 * at.x() / max(1, self.width()) - 1.0
        y = 1.0 - 2.0 * at.y() / max(1, self.height())
        back, _ = (self.projectionMatrix(self.getViewport(), self.getViewport()) * self.viewMatrix()).inverted()
        near, far = (np.array(back.map(QVector3D(x, y, z)).toTuple()) for z in (-1.0, 1.0))
        eye = np.array(self.cameraPosition().toTuple()) if hasattr(self.cameraPosition(), "toTuple") else near
        away = far - near
        return eye, away / math.sqrt(away @ away)

    def element_at(self, at: QPointF) -> str:
        """Id of the element under a place of the view; empty for none."""
        eye, ray = self.ray(at)
        stage = self._stage
        found = [(pick(eye, ray, stage.solid), stage.solid_element), (pick(eye, ray, stage.clear), stage.clear_element)]
        (distance, corner), element = min(found, key=lambda pair: pair[0][0])
        return self.layout_now.placed[int(element[corner])].element.id if math.isfinite(distance) else ""

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


def _fill(item: GLMeshItem, surface: Surface, colours: np.ndarray) -> None:
    """Give an item a surface with the normals it brings; without triangles it is not shown."""
    item.setVisible(len(surface.faces) > 0)
    if len(surface.faces) == 0:
        return
    mesh = MeshData(vertexes=surface.vertices, faces=surface.faces, vertexColors=colours)
    mesh._vertexNormals = surface.normals
    item.setMeshData(meshdata=mesh)

