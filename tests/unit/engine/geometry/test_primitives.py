"""Curves of runs against their closed forms, between the knots."""

import math

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.interpolate import CubicSpline
from scipy.optimize import minimize_scalar
from scipy.special import fresnel

from engine.geometry import primitives
from engine.geometry.pose import from_pose, pose_at
from engine.geometry.spirals import clothoid
from engine.geometry.tables import interpolate

NEAR = 1e-10
"""m. What a table may be off its curve: a hundredth of what the engine's reference cases allow."""


def between(table):
    """Arc lengths at a third and at the middle of every piece."""
    step = np.diff(table[:, 0])
    return np.concatenate([table[:-1, 0] + step / 3.0, table[:-1, 0] + step / 2.0])


def off(found, exact):
    return np.sqrt(((found - exact) ** 2).sum(axis=1)).max()


def curvature(table, s):
    _, first, second = interpolate(table, s)
    return np.sqrt((np.cross(first, second) ** 2).sum(axis=1)) / np.sqrt((first**2).sum(axis=1)) ** 3


def helix_point(s, radius, sense, grade):
    angle = s / (radius * math.sqrt(1 + grade * grade))
    return np.stack([radius * np.sin(angle), sense * radius * (1 - np.cos(angle)), -grade * radius * angle], axis=1)


@pytest.mark.parametrize("turn", [math.pi / 3, -1.0, 40 * math.pi])
@pytest.mark.parametrize("radius", [0.04, 0.5, 2.0])
def test_arc_with_grade_is_a_helix(turn, radius):
    grade = 0.15
    table = primitives.arc(pose_at((0, 0, 0), 0.0), radius, turn, grade)
    s = between(table)
    assert off(interpolate(table, s)[0], helix_point(s, radius, math.copysign(1, turn), grade)) < NEAR
    assert curvature(table, s) == pytest.approx(1 / (radius * (1 + grade**2)), rel=1e-6)
    assert table[-1, 0] == pytest.approx(radius * abs(turn) * math.sqrt(1 + grade**2), rel=1e-14)


def test_helix_falls_by_its_drop_and_turns_by_its_sign():
    table = primitives.helix(pose_at((1, 2, 3), 0.7), 0.1, -2.25, 0.2)
    assert table[-1, 3] == pytest.approx(2.8, abs=1e-14)
    heading = math.atan2(table[-1, 5], table[-1, 4])
    assert heading == pytest.approx(0.7 - 0.25 * 2 * math.pi, abs=1e-12)


def test_no_piece_turns_by_more_than_a_tenth():
    start = pose_at((0, 0, 0), 0.2, 0.1)
    for table in (
        primitives.helix(start, 0.1, 3, 0.1),
        clothoid(start, 0.3, (-4.0, 9.0), 0.1),
        primitives.loop(start, 0.1, 0.06),
        primitives.easing(start, 0.2, -0.5, 2.0),
        primitives.free_line(start, np.array([[0.1, 0.02, 0.0], [0.2, -0.05, -0.1]])),
    ):
        turn = np.arccos(np.clip((table[1:, 4:7] * table[:-1, 4:7]).sum(axis=1), -1, 1))
        assert turn.max() <= 0.1


@pytest.mark.parametrize("length, last", [(0.15, 1 / 0.15), (0.1, 30.0), (1.0, -2.0)])
def test_clothoid_against_fresnel_integrals(length, last):
    """x = a C(l/a), y = a S(l/a) with a = sqrt(pi / sharpness) (DLMF 7.2.7, 7.2.8)."""
    table = clothoid(pose_at((0, 0, 0), 0.0), length, (0.0, last), 0.0)
    s = between(table)
    scale = math.sqrt(math.pi * length / abs(last))
    sine, cosine = fresnel(s / scale)
    exact = np.stack([scale * cosine, math.copysign(scale, last) * sine, 0 * s], axis=1)
    assert off(interpolate(table, s)[0], exact) < NEAR
    assert curvature(table, s) == pytest.approx(abs(last) * s / length, rel=1e-6, abs=1e-6 * abs(last))


def test_clothoid_with_grade_keeps_its_plan():
    start = pose_at((0.1, 0.2, 0.3), 1.0)
    flat, sloped = (clothoid(start, 0.2, (2.0, -5.0), grade) for grade in (0.0, 0.3))
    assert sloped[:, 1:3] == pytest.approx(flat[:, 1:3], abs=1e-14)
    assert sloped[-1, 0] == pytest.approx(0.2 * math.sqrt(1.09), rel=1e-14)
    assert sloped[-1, 3] == pytest.approx(0.3 - 0.06, abs=1e-14)


def test_easing_follows_its_grade():
    length, first, last = 0.3, 0.05, 0.9
    table = primitives.easing(pose_at((0, 0, 0), 0.0), length, first, last)
    s = between(table)
    place, slope, _ = interpolate(table, s)
    u = place[:, 0] / length
    assert -place[:, 2] == pytest.approx(length * (first * u + (last - first) * (u**3 - 0.5 * u**4)), abs=NEAR)
    grade = first + (last - first) * u * u * (3 - 2 * u)
    assert -slope[:, 2] / slope[:, 0] == pytest.approx(grade, abs=1e-8)
    bend = (last - first) * 6 * u * (1 - u) / length / (1 + grade**2) ** 1.5
    assert curvature(table, s) == pytest.approx(bend, abs=1e-6 * bend.max())
    exact = quad(lambda x: math.sqrt(1 + (first + (last - first) * x * x * (3 - 2 * x)) ** 2), 0, 1, epsabs=1e-13)[0]
    assert table[-1, 0] == pytest.approx(length * exact, rel=1e-11)
    assert np.abs(table[[0, -1], 7:10]).max() < 1e-12


def test_loop_without_shift_is_a_circle():
    table = primitives.loop(pose_at((0, 0, 0), 0.0), 0.1, 0.0)
    s = between(table)
    exact = np.stack([0.1 * np.sin(s / 0.1), 0 * s, 0.1 * (1 - np.cos(s / 0.1))], axis=1)
    assert off(interpolate(table, s)[0], exact) < NEAR
    assert curvature(table, s) == pytest.approx(10.0, rel=1e-6)


def test_loop_shifts_to_the_left_and_leaves_as_it_came():
    start = pose_at((0, 0, 1), 0.5, 0.1)
    table = primitives.loop(start, 0.08, 0.05)
    assert table[-1, 1:4] == pytest.approx(start.position + 0.05 * start.side, abs=1e-13)
    assert table[-1, 4:7] == pytest.approx(start.tangent, abs=1e-13)
    s = between(table)
    local = (interpolate(table, s)[0] - start.position) @ np.stack([start.tangent, start.side, -start.down], axis=1)
    u = np.mod(np.arctan2(local[:, 0], 0.08 - local[:, 2]), 2 * math.pi) / (2 * math.pi)
    assert np.hypot(local[:, 0], 0.08 - local[:, 2]) == pytest.approx(0.08, abs=NEAR)
    assert local[:, 1] == pytest.approx(0.05 * u**3 * (10 - 15 * u + 6 * u * u), abs=NEAR)


def test_free_line_is_the_clamped_cubic_spline():
    start = pose_at((0, 0, 0), 0.0, 0.1)
    points = np.array([[0.1, 0.0, -0.01], [0.2, 0.05, -0.02], [0.25, 0.15, -0.05]])
    table = primitives.free_line(start, points)
    through = np.concatenate([[[0, 0, 0]], points])
    knots = np.concatenate([[0], np.cumsum(np.linalg.norm(np.diff(through, axis=0), axis=1))])
    spline = CubicSpline(knots, through, bc_type=((1, start.tangent), (2, np.zeros(3))))
    for point in interpolate(table, between(table))[0][::7]:
        span = np.linspace(0, knots[-1], 400)
        near = span[np.argmin(((spline(span) - point) ** 2).sum(axis=1))]
        found = minimize_scalar(
            lambda u, p=point: float(((spline(u) - p) ** 2).sum()),
            bounds=(near - 0.002, near + 0.002),
            method="bounded",
            options={"xatol": 1e-12},
        )
        assert math.sqrt(found.fun) < 1e-9
    for point in points:
        assert np.linalg.norm(table[:, 1:4] - point, axis=1).min() < 1e-12


def test_free_line_length_is_true():
    start = pose_at((0, 0, 0), 0.0)
    table = primitives.free_line(start, np.array([[0.1, 0.03, 0.0], [0.2, -0.02, -0.02]]))
    dense = interpolate(table, np.linspace(0, table[-1, 0], 20001))
    assert np.abs(np.linalg.norm(dense[1], axis=1) - 1).max() < 1e-7
    assert np.linalg.norm(np.diff(dense[0], axis=0), axis=1).sum() == pytest.approx(table[-1, 0], rel=1e-8)


def test_circle_is_closed_and_runs_anticlockwise():
    axis = np.array([0.0, 0.6, 0.8])
    table = primitives.circle(np.array([1.0, 2.0, 3.0]), axis, 0.2)
    assert table[0, 1:4] == pytest.approx(table[-1, 1:4], abs=1e-14)
    assert table[-1, 0] == pytest.approx(0.4 * math.pi, rel=1e-14)
    spoke = (table[:, 1:4] - [1, 2, 3]) / 0.2
    assert np.cross(spoke, table[:, 4:7]) == pytest.approx(np.tile(axis, (len(table), 1)), abs=1e-13)
    assert table[:, 10:13] == pytest.approx(spoke, abs=1e-13)


def test_straight_measures_in_plan_and_between_points():
    table = primitives.straight(pose_at((0, 0, 0), math.pi / 2), 0.4, 0.75)
    assert table[-1, :4] == pytest.approx([0.5, 0.0, 0.4, -0.3], abs=1e-15)
    drop = primitives.straight_between(np.array([0.0, 0.0, 1.0]), np.array([0.0, 0.0, 0.2]))
    assert drop[-1, 0] == pytest.approx(0.8)
    assert np.isfinite(drop).all()


def test_points_are_given_forward_left_up():
    start = pose_at((1, 1, 1), math.pi / 2, 0.2)
    assert from_pose(start, np.array([[1.0, 2.0, 3.0]]))[0] == pytest.approx([-1.0, 2.0, 4.0])
