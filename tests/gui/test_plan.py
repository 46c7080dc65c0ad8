"""The plan as a person uses it: look, click, zoom, move."""

import numpy as np
import pytest
from PySide6.QtCore import QPoint, QPointF, Qt
from PySide6.QtGui import QColor, QWheelEvent
from PySide6.QtWidgets import QFrame

from engine.model.edits import set_field
from engine.simulate import roll
from studio.theme import Theme
from studio.views.canvas import round_step
from studio.views.plan import PlanView
from studio.widgets.strokes import Labels, path_colours
from studio.workspace import Workspace
from tests.designs import bend_run, every_kind, funnel_run

SAME_COLOUR = 12
"""Levels of 255 by which an antialiased line may differ from its colour."""


@pytest.fixture(scope="module")
def rolled():
    return roll(bend_run())


@pytest.fixture
def view(qtbot, rolled):
    workspace = Workspace(Theme())
    made = PlanView(workspace, workspace.theme)
    qtbot.addWidget(made)
    made.resize(700, 500)
    made.show()
    workspace.new(rolled.design)
    workspace.take_roll(rolled)
    return made


def spot(view, element, share=0.5):
    """Place on screen of a point of an element's centreline."""
    curve = view.layout_now.find(element).curve
    place = [float(np.interp(share * curve[-1, 0], curve[:, 0], curve[:, column])) for column in (1, 2)]
    return view.point(*place).toPoint()


def press(qtbot, view, at):
    qtbot.mouseClick(view, Qt.MouseButton.LeftButton, pos=at)


def near(one: QColor, other: QColor) -> bool:
    pairs = zip(one.getRgb()[:3], other.getRgb()[:3], strict=True)
    return max(abs(a - b) for a, b in pairs) <= SAME_COLOUR


def wheel(view, at, turn):
    event = QWheelEvent(
        QPointF(at),
        QPointF(view.mapToGlobal(at)),
        QPoint(),
        QPoint(0, turn),
        Qt.MouseButton.NoButton,
        Qt.KeyboardModifier.NoModifier,
        Qt.ScrollPhase.NoScrollPhase,
        False,
    )
    view.wheelEvent(event)


def test_everything_is_in_sight_when_a_design_is_opened(view):
    corners = view.to_screen(view.world_bounds())
    assert corners.min() > 0.0
    assert corners[:, 0].max() < view.width() and corners[:, 1].max() < view.height()
    assert view.scale[0] == view.scale[1]


def test_click_selects_the_element_under_the_pointer_and_empty_sheet_none(view, qtbot):
    press(qtbot, view, spot(view, "b1"))
    assert view.workspace.selection == ("b1",)
    press(qtbot, view, QPoint(690, 60))
    assert view.workspace.selection == ()


def test_selected_element_has_grips_at_its_ends_and_centre(view):
    view.workspace.select(["b1"])
    view.grab()
    assert sorted(grip.role for grip, _ in view.grips) == ["centre", "inlet", "outlet"]
    entry = view.layout_now.find("b1")
    grip, at = next(pair for pair in view.grips if pair[0].role == "outlet")
    assert view.to_world(at) == pytest.approx(entry.outlet.position[:2])
    assert view.grip_at(at) is grip


def test_wheel_zooms_at_the_pointer(view):
    at = QPoint(200, 150)
    before, scale = view.to_world(QPointF(at)), view.scale.copy()
    wheel(view, at, 120)
    assert view.scale == pytest.approx(1.197 * scale, rel=0.01)
    assert view.to_world(QPointF(at)) == pytest.approx(before)


def test_middle_button_and_space_move_the_view(view, qtbot):
    for button, space in ((Qt.MouseButton.MiddleButton, False), (Qt.MouseButton.LeftButton, True)):
        origin = view.origin.copy()
        if space:
            qtbot.keyPress(view, Qt.Key.Key_Space)
        qtbot.mousePress(view, button, pos=QPoint(100, 100))
        qtbot.mouseMove(view, QPoint(130, 90))
        qtbot.mouseRelease(view, button, pos=QPoint(130, 90))
        if space:
            qtbot.keyRelease(view, Qt.Key.Key_Space)
        assert view.origin - origin == pytest.approx([30.0, -10.0])
    assert view.workspace.selection == ()


def test_space_alone_is_passed_on_to_the_window(qtbot, rolled):
    class Frame(QFrame):
        seen = 0

        def keyPressEvent(self, event):
            self.seen += event.key() == Qt.Key.Key_Space

    frame = Frame()
    qtbot.addWidget(frame)
    workspace = Workspace(Theme())
    inner = PlanView(workspace, workspace.theme, frame)
    frame.show()
    qtbot.keyClick(inner, Qt.Key.Key_Space)
    assert frame.seen == 1


def test_home_fits_again(view, qtbot):
    fitted = view.origin.copy(), view.scale.copy()
    qtbot.keyClick(view, Qt.Key.Key_PageUp)
    qtbot.keyClick(view, Qt.Key.Key_Left)
    assert view.scale[0] > fitted[1][0]
    qtbot.keyClick(view, Qt.Key.Key_Home)
    assert view.origin == pytest.approx(fitted[0]) and view.scale == pytest.approx(fitted[1])


def test_wall_is_drawn_in_its_colour_and_accent_when_selected(view):
    at = spot(view, "s2")
    beside = at - QPoint(round(0.008 * view.scale[0]), 0)
    assert near(view.grab().toImage().pixelColor(beside), view.theme.colour("tube_fill"))
    view.workspace.select(["s2"])
    assert near(view.grab().toImage().pixelColor(beside), view.theme.colour("accent_bg"))


def test_ball_is_drawn_where_it_is_at_the_time(view):
    for share in (0.3, 0.8):
        view.workspace.set_time(share * view.workspace.roll.duration)
        track = view.workspace.roll.trajectory
        place = track.x[np.searchsorted(track.t, view.workspace.time)]
        at = view.point(float(place[0]), float(place[1])).toPoint()
        assert near(view.grab().toImage().pixelColor(at), view.theme.colour("ink"))


def test_path_is_drawn_in_a_colour_of_the_palette(view):
    view.workspace.set_time(0.0)
    track = view.workspace.roll.trajectory
    place = track.x[int(0.9 * len(track.x))]
    at, image = view.point(float(place[0]), float(place[1])).toPoint(), view.grab().toImage()
    seen = [image.pixelColor(at + QPoint(dx, dy)) for dx in (-1, 0, 1) for dy in (-1, 0, 1)]
    assert any(near(one, colour) for one in seen for colour in path_colours(False))


def test_time_moves_the_ball_without_painting_the_walls_anew(view):
    view.grab()
    picture = view._picture
    view.workspace.set_time(0.5)
    view.grab()
    assert view._picture is picture
    view.workspace.select(["s1"])
    view.grab()
    assert view._picture is not picture


def test_edit_is_drawn_before_it_is_rolled(view):
    wider = set_field(view.workspace.design, "runs[0].elements[1].radius", 0.3)
    view.workspace.edit("radius", wider)
    assert view.layout_now.find("b1").element.radius == 0.3
    assert not view.workspace.current
    view.grab()


@pytest.mark.parametrize("theme", ["light", "dark"])
@pytest.mark.parametrize("size", [(1200, 800), (170, 130)])
def test_every_kind_is_drawn_in_both_themes_and_sizes(qtbot, theme, size):
    workspace = Workspace(Theme(theme))
    made = PlanView(workspace, workspace.theme)
    qtbot.addWidget(made)
    made.resize(*size)
    workspace.new(every_kind())
    for entry in made.layout_now.placed:
        workspace.select([entry.element.id])
        image = made.grab().toImage()
    assert near(image.pixelColor(2, 2), workspace.theme.colour("sheet")) or near(
        image.pixelColor(3, 3), workspace.theme.colour("sheet")
    )
    colours = {image.pixel(x, y) for x in range(0, size[0], 3) for y in range(0, size[1], 3)}
    assert len(colours) > 10


def test_a_design_without_runs_is_an_empty_sheet(qtbot):
    workspace = Workspace(Theme())
    made = PlanView(workspace, workspace.theme)
    qtbot.addWidget(made)
    made.grab()
    assert made.world_bounds() is None and made.element_at(QPointF(50, 50)) == ""


def test_funnel_is_named_and_told_by_its_tip(qtbot):
    workspace = Workspace(Theme())
    made = PlanView(workspace, workspace.theme)
    qtbot.addWidget(made)
    made.resize(500, 400)
    workspace.new(funnel_run())
    origin = made.layout_now.find("f1").origin
    at = made.point(float(origin[0]) + 0.1, float(origin[1])).toPoint()
    qtbot.mouseMove(made, at)
    made.hovered(QPointF(at))
    assert made.toolTip() == "f1"


@pytest.mark.parametrize(
    ("least", "wanted"), [(0.9, 1.0), (1.0, 1.0), (1.1, 2.0), (3.0, 5.0), (0.06, 0.1), (700.0, 1000.0)]
)
def test_steps_of_the_grid_are_round(least, wanted):
    assert round_step(least) == pytest.approx(wanted)


def test_labels_keep_off_each_other_and_off_lines():
    from PySide6.QtCore import QRectF

    labels = Labels(QRectF(0, 0, 200, 100), np.array([[50.0, 50.0]]))
    corners = [QPointF(40, 45), QPointF(100, 45)]
    assert labels.place((30, 12), corners) == corners[1]
    assert labels.place((30, 12), corners, needed=False) is None
    assert labels.place((30, 12), corners) == corners[0]
    assert labels.place((30, 12), corners) is None


def drag(qtbot, view, start, end):
    qtbot.mousePress(view, Qt.MouseButton.LeftButton, pos=start)
    for share in (0.25, 0.5, 0.75, 1.0):
        qtbot.mouseMove(view, start + (end - start) * share)
    qtbot.mouseRelease(view, Qt.MouseButton.LeftButton, pos=end)


def test_grip_dragged_edits_the_element_as_one_step(view, qtbot):
    view.workspace.select(["b1"])
    view.grab()
    before = view.workspace.design
    at = next(at for grip, at in view.grips if grip.role == "centre").toPoint()
    drag(qtbot, view, at, at - QPoint(0, round(0.05 * view.scale[1])))
    assert view.workspace.design.runs[0].element("b1").radius == pytest.approx(0.2, abs=0.004)
    assert view.workspace.selection == ("b1",)
    view.workspace.undo_stack.undo()
    assert view.workspace.design is before
    assert not view.workspace.undo_stack.canUndo()


def test_two_drags_are_two_steps(view, qtbot):
    view.workspace.select(["s1"])
    for _ in range(2):
        view.grab()
        at = next(at for grip, at in view.grips if grip.role == "outlet").toPoint()
        drag(qtbot, view, at, at + QPoint(40, 0))
    assert view.workspace.undo_stack.count() == 2


def test_drag_beyond_what_is_allowed_leaves_the_last_that_was(view, qtbot):
    view.workspace.select(["s1"])
    view.grab()
    at = next(at for grip, at in view.grips if grip.role == "outlet").toPoint()
    drag(qtbot, view, at, QPoint(-4000, at.y()))
    assert view.workspace.design.runs[0].element("s1").length >= 1e-3
