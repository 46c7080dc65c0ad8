"""The view in space: with OpenGL where there is one, else drawn; both are used alike."""

import math

import numpy as np
import pytest
from PySide6.QtCore import QPoint, QPointF, Qt
from PySide6.QtGui import QGuiApplication, QVector3D

from engine.simulate import roll
from studio.display import moment_at, path_of
from studio.theme import Theme
from studio.views.isometric import IsometricView
from studio.views.shading import gl_available, samples
from studio.views.view3d import SpaceView, make_view3d
from studio.workspace import Workspace
from tests.designs import bend_run, every_kind


@pytest.fixture(scope="module")
def rolled():
    return roll(bend_run())


@pytest.fixture
def workspace(rolled):
    made = Workspace(Theme())
    made.new(rolled.design)
    made.take_roll(rolled)
    return made


@pytest.fixture
def view(qtbot, workspace):
    made = IsometricView(workspace, workspace.theme)
    qtbot.addWidget(made)
    made.resize(500, 400)
    made.show()
    made.grab()
    return made


def on_screen(view, place):
    return QPointF(*view.to_screen(view.flat(np.asarray(place)[None]))[0].tolist())


def test_view_is_drawn_where_there_is_no_gl(qtbot, workspace):
    made = make_view3d(workspace, workspace.theme)
    qtbot.addWidget(made)
    wanted = SpaceView if gl_available() else IsometricView
    assert type(made) is wanted
    if QGuiApplication.platformName() == "offscreen":
        assert not gl_available()
    assert samples() in (0, 4)


def place_in(made, place):
    """Place on the sheet of a point in space, in either view."""
    if isinstance(made, IsometricView):
        return on_screen(made, place)
    space = made.space
    view = space.getViewport()
    seen = (space.projectionMatrix(view, view) * space.viewMatrix()).map(QVector3D(*np.asarray(place).tolist()))
    at = QPointF(0.5 * (1.0 + seen.x()) * space.width(), 0.5 * (1.0 - seen.y()) * space.height())
    return QPointF(space.mapTo(made, at.toPoint()))


def test_view_finds_the_element_under_a_place(qtbot, workspace):
    made = make_view3d(workspace, workspace.theme)
    qtbot.addWidget(made)
    made.resize(500, 400)
    made.show()
    made.fit()
    made.grab()
    layout = workspace.roll.layout
    for element in ("s1", "b1", "s2"):
        curve = layout.find(element).curve
        middle = curve[len(curve) // 2, 1:4] if len(curve) > 2 else curve[:, 1:4].mean(axis=0)
        assert made.element_at(place_in(made, middle)) == element
    assert made.element_at(QPointF(4.0, 396.0)) == ""


def test_axes_are_square_and_right_handed(view):
    for azimuth, elevation in ((0.3, 0.2), (-2.0, 1.2), (4.0, -0.7)):
        view.azimuth, view.elevation = azimuth, elevation
        axes = view.axes
        assert np.array(axes) @ np.array(axes).T == pytest.approx(np.eye(3), abs=1e-12)
        assert np.cross(axes.right, axes.up) == pytest.approx(axes.eye)


def test_everything_fits_and_still_does_after_turning(view, qtbot):
    for _ in range(3):
        corners = view.to_screen(view.world_bounds())
        assert corners.min() > 0.0
        assert corners[:, 0].max() < view.width() and corners[:, 1].max() < view.height()
        qtbot.keyClick(view, Qt.Key.Key_Left)
        qtbot.keyClick(view, Qt.Key.Key_Up)


def test_drag_turns_the_view(view, qtbot):
    before = view.azimuth, view.elevation
    qtbot.mousePress(view, Qt.MouseButton.LeftButton, pos=QPoint(200, 200))
    qtbot.mouseMove(view, QPoint(250, 220))
    qtbot.mouseRelease(view, Qt.MouseButton.LeftButton, pos=QPoint(250, 220))
    assert view.azimuth == pytest.approx(before[0] - math.radians(0.4 * 50))
    assert view.elevation == pytest.approx(before[1] + math.radians(0.4 * 20))
    assert view.workspace.selection == ()


def test_click_selects_the_element_under_the_pointer(view, qtbot):
    for element in ("s1", "b1", "s2"):
        curve = view.layout_now.find(element).curve
        at = on_screen(view, curve[len(curve) // 2, 1:4] if len(curve) > 2 else curve[:, 1:4].mean(axis=0))
        qtbot.mouseClick(view, Qt.MouseButton.LeftButton, pos=at.toPoint())
        assert view.workspace.selection == (element,)
        view.grab()
    qtbot.mouseClick(view, Qt.MouseButton.LeftButton, pos=QPoint(4, 396))
    assert view.workspace.selection == ()


def test_ball_is_where_it_is_at_the_time(view, rolled):
    view.workspace.set_time(0.5 * rolled.duration)
    at = on_screen(view, moment_at(path_of(rolled), view.workspace.time).place).toPoint()
    image, ink = view.grab().toImage(), view.theme.colour("ink")
    around = [image.pixelColor(at + QPoint(dx, dy)) for dx in range(-4, 5) for dy in range(-4, 5)]
    assert sum(abs(colour.red() - ink.red()) < 12 for colour in around) > 15


@pytest.mark.parametrize("theme", ["light", "dark"])
@pytest.mark.parametrize("size", [(900, 700), (165, 125)])
def test_every_kind_is_drawn_in_both_themes_and_sizes(qtbot, theme, size):
    workspace = Workspace(Theme(theme))
    made = make_view3d(workspace, workspace.theme)
    qtbot.addWidget(made)
    made.resize(*size)
    workspace.new(every_kind())
    workspace.select(["f1"])
    image = made.grab().toImage()
    assert len({image.pixel(x, y) for x in range(0, size[0], 3) for y in range(0, size[1], 3)}) > 10


def test_empty_design_is_an_empty_sheet(qtbot):
    workspace = Workspace(Theme())
    made = make_view3d(workspace, workspace.theme)
    qtbot.addWidget(made)
    made.resize(300, 200)
    made.grab()
    made.fit()
    workspace.new(bend_run())
    made.grab()
