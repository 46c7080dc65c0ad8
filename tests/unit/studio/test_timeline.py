"""Playback: figures on the line, scrubbing, steps, playing to the end."""

import pytest
from PySide6.QtCore import QPoint, Qt

from engine.simulate import roll
from studio.theme import Theme
from studio.views.timeline import Playback, tick_step
from studio.workspace import Workspace
from tests.designs import bend_run


@pytest.fixture
def playback(qtbot):
    workspace = Workspace()
    workspace.new(bend_run())
    workspace.take_roll(roll(workspace.design))
    made = Playback(workspace, Theme())
    qtbot.addWidget(made)
    made.resize(900, 76)
    made.show()
    made.workspace = workspace
    return made


@pytest.mark.parametrize(("duration", "most", "step"), [(1.25, 9, 0.2), (14.2, 8, 2.0), (60.0, 7, 10.0), (0.9, 9, 0.1)])
def test_figures_stand_at_round_times(duration, most, step):
    assert tick_step(duration, most) == pytest.approx(step)
    assert duration / step <= most


def test_press_and_drag_scrub(playback, qtbot):
    line, workspace = playback.line, playback.workspace
    x = line.x_of(0.5 * line.duration)
    qtbot.mousePress(line, Qt.MouseButton.LeftButton, pos=QPoint(round(x), 20))
    assert workspace.time == pytest.approx(0.5 * line.duration, abs=line.duration / line.width())
    assert line.t_of(line.x_of(0.3)) == pytest.approx(0.3)


def test_keys_step_and_jump(playback, qtbot):
    line, workspace = playback.line, playback.workspace
    qtbot.keyClick(line, Qt.Key.Key_Right)
    assert workspace.time == pytest.approx(0.01)
    qtbot.keyClick(line, Qt.Key.Key_Right, Qt.KeyboardModifier.ShiftModifier)
    assert workspace.time == pytest.approx(0.11)
    qtbot.keyClick(line, Qt.Key.Key_End)
    assert workspace.time == line.duration
    qtbot.keyClick(line, Qt.Key.Key_Home)
    assert workspace.time == 0.0


def test_plays_to_the_end_and_stops(playback, qtbot):
    playback.speed.setCurrentIndex(playback.speed.findData(10.0))
    playback.toggle()
    assert playback.playing
    qtbot.waitUntil(lambda: not playback.playing, timeout=5000)
    assert playback.workspace.time == playback.line.duration


def test_slow_motion_is_slow(playback, qtbot):
    playback.speed.setCurrentIndex(playback.speed.findData(0.01))
    playback.toggle()
    qtbot.wait(200)
    playback.pause()
    assert 0.0 < playback.workspace.time < 0.02
