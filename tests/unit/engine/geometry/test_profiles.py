"""Meridians against their formulas and the areas of known bodies."""

import math
from itertools import pairwise

import numpy as np
import pytest
from scipy.integrate import quad

from engine.geometry import profiles


def between(table):
    return 0.5 * (table[1:, 0] + table[:-1, 0])


def test_cone_area_and_length():
    cone = profiles.line((0.3, 0.0), (0.1, -0.15))
    assert cone[-1, 0] == pytest.approx(0.25)
    assert profiles.area(cone) == pytest.approx(math.pi * 0.4 * 0.25, rel=1e-14)


def test_arc_area_is_that_of_a_spherical_zone():
    """Zone of a sphere: 2 pi R h."""
    table = profiles.arc((0.0, 0.0), 0.2, (-0.3, -1.2))
    height = 0.2 * (math.sin(1.2) - math.sin(0.3))
    assert profiles.area(table) == pytest.approx(2 * math.pi * 0.2 * height, rel=1e-10)
    assert table[-1, 0] == pytest.approx(0.18)
    assert table[0, 3] < 0 and table[0, 4] < 0


@pytest.mark.parametrize("exponent", [-2.0, -1.0, 0.0, 0.5, 1.0, 2.0, 3.0])
def test_power_profile_between_knots(exponent):
    table = profiles.power(((0.2, 0.0), (0.02, -0.1)), exponent)
    point, slope, _ = profiles.at_length(table, between(table))
    rho = point[:, 0]
    if exponent:
        exact = -0.1 * (0.2**exponent - rho**exponent) / (0.2**exponent - 0.02**exponent)
    else:
        exact = -0.1 * np.log(0.2 / rho) / math.log(10)
    assert point[:, 1] == pytest.approx(exact, abs=1e-10)
    assert np.hypot(*slope.T) == pytest.approx(1.0, abs=1e-6)
    assert table[-1, 1:3] == pytest.approx([0.02, -0.1], abs=1e-15)


def test_hyperbola_curvature_and_length():
    strength = 0.005
    table = profiles.hyperbola((0.3, 0.03), strength)
    point, slope, bend = profiles.at_length(table, between(table))
    rho = point[:, 0]
    assert point[:, 1] == pytest.approx(-strength / rho, abs=1e-10)
    steep = strength / rho**2
    exact = 2 * strength / rho**3 / (1 + steep**2) ** 1.5
    assert np.abs(slope[:, 0] * bend[:, 1] - slope[:, 1] * bend[:, 0]) == pytest.approx(exact, abs=1e-6 * exact.max())
    length = quad(lambda r: math.sqrt(1 + (strength / r**2) ** 2), 0.03, 0.3, epsabs=1e-13)[0]
    assert table[-1, 0] == pytest.approx(length, rel=1e-10)


def test_parabola_passes_the_axis():
    table = profiles.parabola((0.2, 0.0), 3.0)
    point, _, _ = profiles.at_length(table, between(table))
    assert point[:, 1] == pytest.approx(1.5 * point[:, 0] ** 2, abs=1e-10)
    assert table[-1, 1:3] == pytest.approx([0, 0], abs=1e-15)


def test_spline_passes_its_points():
    points = [(0.2, 0.1), (0.15, 0.07), (0.08, 0.02), (0.02, 0.0)]
    table = profiles.through(points)
    for point in points:
        assert np.hypot(*(table[:, 1:3] - point).T).min() < 1e-12


def test_fillets_are_tangent_and_keep_their_radius():
    table = profiles.filleted([(0.2, 0.0), (0.1, 0.0), (0.1, -0.2), (0.0, -0.2)], [0.01, 0.03])
    parts = profiles.smooth_parts(table)
    assert len(parts) == 5
    for before, after in pairwise(parts):
        assert before[-1, :5] == pytest.approx(after[0, :5], abs=1e-12)
    assert np.hypot(parts[1][:, 5], parts[1][:, 6]) == pytest.approx(1 / 0.01)
    assert np.hypot(parts[3][:, 5], parts[3][:, 6]) == pytest.approx(1 / 0.03)
    straight = 0.09 + (0.2 - 0.01 - 0.03) + 0.07
    assert table[-1, 0] == pytest.approx(straight + 0.5 * math.pi * 0.04, rel=1e-12)


def test_offset_goes_to_the_left_of_travel():
    cone = profiles.line((0.3, 0.0), (0.1, -0.2))
    moved = profiles.offset(cone, 0.01)
    assert moved[0] == pytest.approx([0.3 + 0.01 / math.sqrt(2), -0.01 / math.sqrt(2)])


def test_length_at_height():
    table = profiles.power(((0.2, 0.0), (0.02, -0.1)), -1.0)
    s = profiles.length_at_height(table, -0.03)
    assert profiles.at_length(table, np.array([s]))[0][0, 1] == pytest.approx(-0.03, abs=1e-14)
    assert profiles.length_at_height(table, 0.5) == 0.0
    assert profiles.length_at_height(table, -0.5) == table[-1, 0]
