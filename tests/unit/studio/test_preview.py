"""Live roll: the latest design wins, a fault or a refusal never stops the window."""

import threading
import time
from types import SimpleNamespace

import pytest

from engine.errors import DesignError
from engine.model.design import Design
from engine.model.edits import set_field
from studio.workers import preview as module
from studio.workers.preview import BROKE_OFF, NOTHING_TO_ROLL, Preview
from studio.workspace import Workspace
from tests.designs import bend_run

LIMIT_MS = 5000


def fake_roll(design, run_id):
    """Stand-in for a roll: only what the workspace reads."""
    return SimpleNamespace(design=design, run_id=run_id, outcome="arrived", duration=1.0)


class Roller:
    """Stand-in for the engine: counts calls, may wait for a gate."""

    def __init__(self):
        self.seen, self.previous, self.cancelled = [], [], 0
        self.gate = threading.Event()
        self.gate.set()

    def __call__(self, design, run_id, previous=None, *, cancel):
        self.seen.append(design)
        self.previous.append(previous)
        while not self.gate.wait(0.005):
            if cancel[0]:
                self.cancelled += 1
                return SimpleNamespace(design=design, run_id=run_id, outcome="cancelled", duration=0.0)
        return fake_roll(design, run_id)


@pytest.fixture
def parts(qapp):
    workspace, roller = Workspace(), Roller()
    preview = Preview(workspace, roller)
    yield workspace, roller, preview
    roller.gate.set()
    preview.finish()


def with_radius(design, value):
    return set_field(design, "runs[0].elements[1].radius", value)


def test_roll_arrives_for_the_open_design(parts, qtbot):
    workspace, roller, _ = parts
    workspace.new(bend_run())
    qtbot.waitUntil(lambda: workspace.current, timeout=LIMIT_MS)
    assert workspace.roll.design is workspace.design


def test_while_one_roll_runs_only_the_latest_design_waits(parts, qtbot):
    workspace, roller, _ = parts
    roller.gate.clear()
    workspace.new(bend_run())
    for value in (0.2, 0.21, 0.22, 0.23):
        workspace.edit("radius", with_radius(workspace.design, value))
    assert not workspace.current
    roller.gate.set()
    qtbot.waitUntil(lambda: workspace.current, timeout=LIMIT_MS)
    assert workspace.roll.design.runs[0].elements[1].radius == 0.23
    assert len(roller.seen) == 2


def test_an_old_roll_that_takes_long_is_stopped(parts, qtbot, monkeypatch):
    workspace, roller, _ = parts
    monkeypatch.setattr(module, "PATIENCE", 0.0)
    roller.gate.clear()
    workspace.new(bend_run())
    qtbot.waitUntil(lambda: len(roller.seen) == 1, timeout=LIMIT_MS)
    workspace.edit("radius", with_radius(workspace.design, 0.2))
    qtbot.waitUntil(lambda: roller.cancelled == 1, timeout=LIMIT_MS)
    roller.gate.set()
    qtbot.waitUntil(lambda: workspace.current, timeout=LIMIT_MS)


def test_a_quick_design_rolls_in_the_same_frame(parts, qtbot):
    workspace, roller, preview = parts
    workspace.new(bend_run())
    qtbot.waitUntil(lambda: workspace.current, timeout=LIMIT_MS)
    workspace.edit("radius", with_radius(workspace.design, 0.2))
    qtbot.waitUntil(lambda: workspace.current, timeout=LIMIT_MS)
    assert preview.seconds < module.QUICK
    workspace.edit("radius", with_radius(workspace.design, 0.21))
    assert workspace.current
    assert roller.previous[-1] is not None


def test_refusal_is_told_in_its_own_sentence(qapp, qtbot):
    workspace = Workspace()

    def refuse(design, run_id, previous=None, *, cancel):
        raise DesignError("The ball does not fit.")

    preview = Preview(workspace, refuse)
    with qtbot.waitSignal(workspace.rollFailed, timeout=LIMIT_MS) as told:
        workspace.new(bend_run())
    assert told.args == ["The ball does not fit."]
    assert workspace.problem == "The ball does not fit."
    preview.finish()


def test_a_fault_of_the_program_is_told_and_rolling_goes_on(qapp, qtbot, caplog):
    workspace, calls = Workspace(), []

    def break_once(design, run_id, previous=None, *, cancel):
        calls.append(design)
        if len(calls) == 1:
            raise ValueError("made up")
        return fake_roll(design, run_id)

    preview = Preview(workspace, break_once)
    with qtbot.waitSignal(workspace.rollFailed, timeout=LIMIT_MS) as told:
        workspace.new(bend_run())
    assert told.args == [BROKE_OFF]
    assert "made up" in caplog.text
    workspace.edit("radius", with_radius(workspace.design, 0.2))
    qtbot.waitUntil(lambda: workspace.current, timeout=LIMIT_MS)
    assert workspace.problem == ""
    preview.finish()


def test_a_design_without_elements_says_what_to_do(parts):
    workspace, roller, _ = parts
    workspace.new(Design())
    assert workspace.problem == NOTHING_TO_ROLL
    assert roller.seen == []


def test_the_window_is_not_held_up_by_a_long_roll(parts):
    workspace, roller, _ = parts
    roller.gate.clear()
    begun = time.perf_counter()
    workspace.new(bend_run())
    workspace.edit("radius", with_radius(workspace.design, 0.2))
    assert time.perf_counter() - begun < 0.2
