"""Curves beside curves: lips and sharp edges."""

import math

import numpy as np
import pytest

from engine.geometry import primitives
from engine.geometry.frames import banked
from engine.geometry.offsets import edge_table, offset_curve, second_derivative
from engine.geometry.pose import pose_at
from engine.geometry.tables import interpolate

START = pose_at((0, 0, 0), 0.0, 0.1)


def test_offset_of_a_helix_to_the_side_is_a_helix():
    radius, grade, distance = 0.15, 0.1, 0.02
    table = primitives.arc(START, radius, 3.0, grade)
    lip = offset_curve(table, math.pi / 2, distance)
    inner = radius - distance
    steeper = grade * radius / inner
    assert lip[-1, 0] == pytest.approx(inner * 3.0 * math.sqrt(1 + steeper**2), rel=1e-10)
    assert np.linalg.norm(lip[:, 7:10], axis=1) == pytest.approx(1 / (inner * (1 + steeper**2)), rel=1e-6)
    s = 0.5 * (lip[1:, 0] + lip[:-1, 0])
    angle = s / (inner * math.sqrt(1 + steeper**2))
    exact = np.stack(
        [inner * np.sin(angle), radius - inner * np.cos(angle), -grade * radius * angle], axis=1
    )
    assert np.abs(interpolate(lip, s)[0] - exact).max() < 1e-10


@pytest.mark.parametrize("phi", [-1.8, -0.6, 0.9, 2.0])
def test_offset_keeps_its_distance_and_is_unit_speed(phi):
    table = banked(primitives.arc(START, 0.15, 2.0, 0.1), 0.0, 0.5)
    lip = offset_curve(table, phi, 0.012)
    assert np.linalg.norm(lip[:, 1:4] - table[:, 1:4], axis=1) == pytest.approx(0.012, abs=1e-14)
    s = 0.5 * (lip[1:, 0] + lip[:-1, 0])
    assert np.abs(np.linalg.norm(interpolate(lip, s)[1], axis=1) - 1).max() < 1e-6
    assert np.abs((lip[:, 4:7] * lip[:, 10:13]).sum(axis=1)).max() < 1e-12


@pytest.mark.parametrize("side", [-1, 1])
def test_old_centreline_lies_at_the_angle_asked_for(side):
    table = primitives.arc(START, 0.15, 2.0, 0.1)
    lip = offset_curve(table, side * 1.4, 0.012, side * math.pi / 2)
    inward = (table[:, 1:4] - lip[:, 1:4]) / 0.012
    left = np.cross(lip[:, 4:7], lip[:, 10:13])
    angle = np.arctan2((inward * left).sum(axis=1), (inward * lip[:, 10:13]).sum(axis=1))
    assert angle == pytest.approx(side * math.pi / 2, abs=1e-12)


def test_second_derivative_is_exact_for_quintics_on_uneven_knots():
    s = np.array([0.0, 0.3, 0.45, 1.0, 1.2])
    power = np.arange(6)
    factor = np.array([1.0, -2.0, 3.0, 0.5, -1.0, 0.7])
    value = (factor * s[:, None] ** power).sum(axis=1, keepdims=True)
    slope = (factor[1:] * power[1:] * s[:, None] ** power[:-1]).sum(axis=1, keepdims=True)
    bend = (factor[2:] * power[2:] * power[1:-1] * s[:, None] ** power[:-2]).sum(axis=1, keepdims=True)
    assert second_derivative(s, value, slope) == pytest.approx(bend, abs=1e-10)


def test_edge_faces_its_wall_from_one_limit_and_open_air_from_the_other():
    ring = primitives.circle(np.zeros(3), np.array([0.0, 0.0, 1.0]), 0.1)
    for normal, outward in (
        ((-1.0, np.zeros(3)), (0.0, np.array([0.0, 0.0, 1.0]))),
        ((0.0, np.array([0, 0, 1.0])), (1.0, np.zeros(3))),
    ):
        table, span, (near, away) = edge_table(ring, normal, outward)
        wall = normal[0] * ring[:, 10:13] + normal[1]
        left = np.cross(table[:, 4:7], table[:, 10:13])
        angle = np.arctan2((wall * left).sum(axis=1), (wall * table[:, 10:13]).sum(axis=1))
        assert angle == pytest.approx(span[near - 2], abs=1e-12)
        assert {near, away} == {2, 3}
        assert span[1] - span[0] == pytest.approx(math.pi)
