"""The developed elevation: what it shows, scrubbing through time, selecting by name."""

import pytest
from PySide6.QtCore import QPoint, QPointF, Qt

from engine.simulate import roll
from studio.display import moment_at, path_of
from studio.theme import Theme
from studio.views.elevation import ElevationView
from studio.workspace import Workspace
from tests.designs import bend_run, helix_run


@pytest.fixture(scope="module")
def rolled():
    return roll(helix_run())


@pytest.fixture
def view(qtbot, rolled):
    workspace = Workspace(Theme())
    made = ElevationView(workspace, workspace.theme)
    qtbot.addWidget(made)
    made.resize(900, 260)
    made.show()
    workspace.new(rolled.design)
    workspace.take_roll(rolled)
    made.grab()
    return made


def test_head_line_and_track_fit_in(view):
    corners = view.to_screen(view.world_bounds())
    assert corners[:, 0].min() > 0.0 and corners[:, 0].max() < view.width()
    assert corners[:, 1].min() > 0.0 and corners[:, 1].max() < view.height()
    assert view.exaggeration == pytest.approx(view.scale[1] / view.scale[0])


def test_press_and_drag_scrub_through_time(view, qtbot, rolled):
    path = path_of(rolled)
    for press, release in (((300, 120), (520, 140)), ((600, 60), (200, 200))):
        qtbot.mousePress(view, Qt.MouseButton.LeftButton, pos=QPoint(*press))
        at = moment_at(path, view.workspace.time).developed
        assert at == pytest.approx(view.to_world(QPointF(*press))[0], abs=1e-6)
        qtbot.mouseMove(view, QPoint(*release))
        qtbot.mouseRelease(view, Qt.MouseButton.LeftButton, pos=QPoint(*release))
        at = moment_at(path, view.workspace.time).developed
        assert at == pytest.approx(view.to_world(QPointF(*release))[0], abs=1e-6)


def test_drag_beyond_the_ends_stays_within_the_roll(view, qtbot, rolled):
    qtbot.mousePress(view, Qt.MouseButton.LeftButton, pos=QPoint(400, 100))
    qtbot.mouseMove(view, QPoint(899, 100))
    assert view.workspace.time == pytest.approx(rolled.duration)
    qtbot.mouseMove(view, QPoint(1, 100))
    assert view.workspace.time == 0.0
    qtbot.mouseRelease(view, Qt.MouseButton.LeftButton, pos=QPoint(1, 100))


def test_arrow_keys_step_through_time(view, qtbot):
    qtbot.keyClick(view, Qt.Key.Key_Right)
    assert view.workspace.time == pytest.approx(0.02)
    qtbot.keyClick(view, Qt.Key.Key_Right, Qt.KeyboardModifier.ShiftModifier)
    assert view.workspace.time == pytest.approx(0.22)
    qtbot.keyClick(view, Qt.Key.Key_Left)
    assert view.workspace.time == pytest.approx(0.20)


def test_click_on_a_name_selects_and_leaves_the_time(view, qtbot):
    view.workspace.set_time(1.0)
    name = next(name for name in view.names if name.element == "h1")
    qtbot.mouseClick(view, Qt.MouseButton.LeftButton, pos=name.box.center().toPoint())
    assert view.workspace.selection == ("h1",)
    assert view.workspace.time == 1.0


def test_names_do_not_overlap(qtbot):
    workspace = Workspace(Theme())
    made = ElevationView(workspace, workspace.theme)
    qtbot.addWidget(made)
    made.resize(240, 200)
    result = roll(bend_run())
    workspace.new(result.design)
    workspace.take_roll(result)
    made.grab()
    boxes = [name.box for name in made.names if not name.box.isNull()]
    assert len(made.names) == 3 and boxes
    assert not any(one.intersects(other) for i, one in enumerate(boxes) for other in boxes[:i])


def test_head_line_is_drawn_above_the_track(view, rolled):
    path = path_of(rolled)
    image, second = view.grab().toImage(), view.theme.colour("second")
    sample = int(0.55 * len(path.t))
    at = view.point(float(path.developed[sample]), float(path.head[sample]))
    column = [image.pixelColor(round(at.x()), round(at.y()) + step) for step in (-1, 0, 1)]
    assert min(abs(colour.red() - second.red()) + abs(colour.blue() - second.blue()) for colour in column) < 60
    assert at.y() < view.point(0.0, float(path.place[sample, 2])).y()


def test_a_design_that_cannot_be_rolled_says_why(view):
    view.workspace.take_failure("The run has no elements.")
    before = view.grab().toImage()
    assert view.world_bounds() is None
    view.workspace.take_failure("Another reason, longer than the first one.")
    assert view.grab().toImage() != before


@pytest.mark.parametrize("theme", ["light", "dark"])
@pytest.mark.parametrize("size", [(1600, 400), (165, 125)])
def test_is_drawn_in_both_themes_and_sizes(qtbot, rolled, theme, size):
    workspace = Workspace(Theme(theme))
    made = ElevationView(workspace, workspace.theme)
    qtbot.addWidget(made)
    made.resize(*size)
    workspace.new(rolled.design)
    workspace.take_roll(rolled)
    workspace.set_time(rolled.duration)
    image = made.grab().toImage()
    assert image.width() == size[0]
    assert len({image.pixel(x, y) for x in range(0, size[0], 3) for y in range(0, size[1], 3)}) > 10


def test_grip_dragged_down_makes_the_element_steeper_in_one_step(view, qtbot):
    view.workspace.select(["h1"])
    view.grab()
    key, at = view.grip()
    assert key == "h1"
    before, time = view.workspace.design, view.workspace.time
    drop = before.runs[0].element("h1").drop
    start, end = at.toPoint(), at.toPoint() + QPoint(0, 30)
    qtbot.mousePress(view, Qt.MouseButton.LeftButton, pos=start)
    for y in (10, 20, 30):
        qtbot.mouseMove(view, start + QPoint(0, y))
    qtbot.mouseRelease(view, Qt.MouseButton.LeftButton, pos=end)
    lowered = view.workspace.design.runs[0].element("h1").drop - drop
    assert lowered == pytest.approx(30.0 / view.scale[1], abs=2.0 / view.scale[1] + 6e-4)
    assert view.workspace.time == time
    view.workspace.undo_stack.undo()
    assert view.workspace.design is before
