"""Signs of heading, grade and side."""

import math

import numpy as np
import pytest

from engine.geometry.pose import Pose, cross, pose_at, pose_pointing_down, regraded, turned


def test_heading_turns_from_x_toward_y_and_grade_falls():
    pose = pose_at((0, 0, 0), math.pi / 2, 0.75)
    assert pose.tangent == pytest.approx([0, 0.8, -0.6])
    assert pose.heading == pytest.approx(math.pi / 2)
    assert pose.grade == pytest.approx(0.75)


def test_side_is_left():
    assert pose_at((0, 0, 0), 0.0, 0.3).side == pytest.approx([0, 1, 0])


@pytest.mark.parametrize("heading", [-2.0, 0.0, 1.0])
def test_vertical_pose_still_has_a_heading(heading):
    pose = pose_pointing_down((0, 0, 0), heading)
    assert pose.heading == pytest.approx(heading)
    assert pose.grade == math.inf
    steep = pose_at((0, 0, 0), heading, 1e6)
    assert steep.down == pytest.approx(pose.down, abs=2e-6)
    rising = Pose(np.zeros(3), -pose.tangent, -pose.down)
    assert rising.heading == pytest.approx(heading)
    assert rising.grade == -math.inf


def test_regraded_keeps_place_and_heading():
    pose = regraded(pose_pointing_down((1, 2, 3), 0.4), 0.1)
    assert pose.position == pytest.approx([1, 2, 3])
    assert (pose.heading, pose.grade) == pytest.approx((0.4, 0.1))


def test_turned_is_positive_to_the_left():
    pose = turned(pose_at((1, 0, 0), 0.2, 0.1), 0.5, np.array([0.0, 0.0, -1.0]))
    assert (pose.heading, pose.grade) == pytest.approx((0.7, 0.1))
    assert pose.position == pytest.approx([1, 0, -1])


def test_cross_is_numpys():
    a, b = np.array([1.0, 2.0, 3.0]), np.array([-2.0, 0.5, 4.0])
    assert cross(a, b) == pytest.approx(np.cross(a, b))
