"""The lowest line: gravity frame, transported frame, bank."""

import math

import numpy as np
import pytest

from engine.geometry import primitives
from engine.geometry.frames import banked, refined, side_of, with_gravity_down, with_transported_down
from engine.geometry.pose import pose_at, pose_pointing_down
from engine.geometry.spirals import clothoid
from engine.geometry.tables import down_at, interpolate

START = pose_at((0, 0, 1), 0.3, 0.1)
POINTS = np.array([[0.1, 0.02, 0.0], [0.2, -0.05, -0.05], [0.3, 0.0, -0.15]])


def curves():
    return {
        "line": primitives.line(START, 0.5),
        "helix": primitives.helix(START, 0.1, 2, 0.1),
        "clothoid": clothoid(START, 0.2, (0, 8), 0.1),
        "easing": primitives.easing(START, 0.3, 0.1, 1.0),
        "loop": primitives.loop(START, 0.1, 0.06),
        "free line": primitives.free_line(START, POINTS),
    }


@pytest.mark.parametrize("name", curves())
@pytest.mark.parametrize("bank", [(0.0, 0.0), (0.0, 0.6), (-0.4, 0.3)])
def test_down_is_unit_normal_and_its_derivative_is_true(name, bank):
    table = banked(curves()[name], *bank)
    down, change = table[:, 10:13], table[:, 13:16]
    assert np.linalg.norm(down, axis=1) == pytest.approx(1.0, abs=1e-12)
    assert np.abs((down * table[:, 4:7]).sum(axis=1)).max() < 1e-12
    if bank == (0.0, 0.0) and name == "line":
        assert np.abs(change).max() == 0.0
        return
    plain = curves()[name]
    fine = banked(refined(plain, 4 * len(table)), *bank)
    assert np.abs(down_at(table, fine[:, 0]) - fine[:, 10:13]).max() < 1e-6


@pytest.mark.parametrize("name", ["helix", "easing", "clothoid"])
def test_gravity_frame_derivative_against_a_closed_form(name):
    """down = (-z + (z.t) t)/|...| by differences of the exact formula on a much finer curve."""
    table = curves()[name]
    s = table[1:-1, 0]
    h = 1e-5
    frames = []
    for step in (-2 * h, -h, h, 2 * h):
        tangent = interpolate(table, s + step)[1]
        raw = tangent[:, 2:] * tangent - [0, 0, 1]
        frames.append(raw / np.linalg.norm(raw, axis=1, keepdims=True))
    measured = (frames[0] - 8 * frames[1] + 8 * frames[2] - frames[3]) / (12 * h)
    assert np.abs(measured - table[1:-1, 13:16]).max() < 1e-6 * max(1.0, np.abs(measured).max())


def test_gravity_frame_is_the_lowest_line():
    table = primitives.helix(START, 0.1, 2, 0.1)
    side, _ = side_of(table)
    assert np.abs(side[:, 2]).max() < 1e-14
    assert (table[:, 12] < -0.9).all()


def test_side_is_the_left_of_travel():
    table = primitives.line(pose_at((0, 0, 0), 0.0), 1.0)
    assert side_of(table)[0] == pytest.approx(np.tile([0, 1, 0], (2, 1)))


def test_positive_bank_turns_down_toward_the_left():
    table = banked(primitives.line(pose_at((0, 0, 0), 0.0), 1.0), 0.0, 0.5)
    assert table[0, 10:13] == pytest.approx([0, 0, -1])
    assert table[-1, 10:13] == pytest.approx([0, math.sin(0.5), -math.cos(0.5)], abs=1e-14)
    half = down_at(table, np.array([0.5]))[0]
    assert math.atan2(half[1], -half[2]) == pytest.approx(0.25, abs=1e-7)


def test_bank_keeps_the_curve():
    plain = primitives.helix(START, 0.1, 1, 0.1)
    table = banked(plain, -0.8, 0.8)
    assert interpolate(table, plain[:, 0])[0] == pytest.approx(plain[:, 1:4], abs=1e-13)


def test_loop_presses_outward_at_its_top_and_ends_in_the_gravity_frame():
    table = primitives.loop(pose_at((0, 0, 0), 0.0), 0.1, 0.0)
    top = down_at(table, np.array([0.1 * math.pi]))[0]
    assert top == pytest.approx([0, 0, 1], abs=1e-9)
    shifted = primitives.loop(pose_at((0, 0, 0), 0.0), 0.1, 0.06)
    assert shifted[-1, 10:13] == pytest.approx([0, 0, -1], abs=1e-12)
    assert np.linalg.norm(np.diff(shifted[:, 10:13], axis=0), axis=1).max() < 0.1


def test_drop_that_pulls_out_presses_on_the_outside():
    start = pose_pointing_down((0, 0, 1), 0.0)
    table = primitives.free_line(start, np.array([[0.03, 0, -0.1], [0.15, 0, -0.15], [0.3, 0, -0.155]]))
    assert table[0, 4:7] == pytest.approx([0, 0, -1])
    assert table[0, 10:13] == pytest.approx([-1, 0, 0])
    assert table[-1, 12] < -0.95
    assert np.abs(table[:, 11]).max() < 1e-12


def test_transport_does_not_turn_about_the_tangent():
    table = with_transported_down(primitives.helix(START, 0.1, 2, 0.3)[:, :10], START.down)
    across = np.cross(table[:, 4:7], table[:, 10:13])
    assert np.abs((table[:, 13:16] * across).sum(axis=1)).max() < 1e-12
    gravity = with_gravity_down(table[:, :10])
    roll = math.atan2(float(gravity[-1, 10:13] @ across[-1]), float(gravity[-1, 10:13] @ table[-1, 10:13]))
    slope = math.atan(0.3 / (2 * 2 * math.pi * 0.1))
    expected = 2 * 2 * math.pi * math.sin(slope)
    first = START.down @ np.cross(table[0, 4:7], gravity[0, 10:13])
    assert abs(first) < 1e-12
    assert math.remainder(abs(roll) - expected, 2 * math.pi) == pytest.approx(0.0, abs=1e-5)


def test_refined_table_is_the_same_curve():
    table = primitives.helix(START, 0.1, 1, 0.1)
    fine = refined(table, 300)
    assert len(fine) > 300
    angle = fine[:, 0] / 0.1 / math.sqrt(1 + (0.1 / (0.2 * math.pi)) ** 2)
    centre = START.position + 0.1 * np.array([-math.sin(0.3), math.cos(0.3), 0])
    radius = np.linalg.norm((fine[:, 1:4] - centre)[:, :2], axis=1)
    assert radius == pytest.approx(0.1, abs=1e-11)
    assert fine[:, 3] == pytest.approx(1 - 0.1 * angle / (2 * math.pi), abs=1e-11)
