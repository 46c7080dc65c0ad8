"""Tables between their knots, and moved."""

import math

import numpy as np
import pytest

from engine.geometry import primitives
from engine.geometry.pose import pose_at, pose_pointing_down
from engine.geometry.tables import end_pose, interpolate, moved, tabulate


def test_interpolant_takes_the_knots():
    table = primitives.helix(pose_at((0, 0, 0), 0.3), 0.1, 1, 0.1)
    position, first, second = interpolate(table, table[:, 0])
    assert position == pytest.approx(table[:, 1:4], abs=1e-15)
    assert first == pytest.approx(table[:, 4:7], abs=1e-12)
    assert second == pytest.approx(table[:, 7:10], abs=1e-9)


def test_interpolant_goes_on_beyond_both_ends():
    table = primitives.line(pose_at((0, 0, 0), 0.0), 1.0)
    assert interpolate(table, np.array([-0.5, 1.5]))[0][:, 0] == pytest.approx([-0.5, 1.5])


def test_tabulate_measures_arc_length_of_an_ellipse():
    """Perimeter 4 a E(e) (DLMF 19.30.5); complete elliptic integral from scipy."""
    from scipy.special import ellipe

    def ellipse(u):
        flat = np.zeros_like(u)
        return (
            np.stack([2 * np.cos(u), np.sin(u), flat], axis=1),
            np.stack([-2 * np.sin(u), np.cos(u), flat], axis=1),
            np.stack([-2 * np.cos(u), -np.sin(u), flat], axis=1),
        )

    rows = tabulate(ellipse, np.linspace(0, 2 * math.pi, 5))
    assert rows[-1, 0] == pytest.approx(8 * ellipe(0.75), rel=1e-12)
    middle = interpolate(rows, 0.5 * (rows[1:, 0] + rows[:-1, 0]))[0]
    assert (middle[:, 0] / 2) ** 2 + middle[:, 1] ** 2 == pytest.approx(1.0, abs=1e-10)


@pytest.mark.parametrize("pose", [pose_at((1, -2, 3), 2.1, 0.2), pose_pointing_down((0, 0, 1), -1.0)])
def test_moved_curve_is_the_one_drawn_in_place(pose):
    local = primitives.arc(pose_at((0, 0, 0), 0.0), 0.1, 1.0, 0.2)
    assert moved(local, pose) == pytest.approx(primitives.arc(pose, 0.1, 1.0, 0.2), abs=1e-12)


def test_end_pose_chains():
    table = primitives.arc(pose_at((0, 0, 0), 0.0), 0.1, math.pi / 2, 0.2)
    pose = end_pose(table)
    assert (pose.heading, pose.grade) == pytest.approx((math.pi / 2, 0.2))
    assert pose.position == pytest.approx([0.1, 0.1, -0.2 * 0.1 * math.pi / 2])
