"""Volumes of solids against closed forms of the smooth bodies.

Pappus and Guldin: a section of area A swept along a curve whose curvature its centroid does not feel encloses A times
the length (torus, helix); off the centre line V = integral of A (1 - k x_c) ds. Shells: cone frustum 2 pi (r_mean + w
n_r/2) w s; sphere zones by the difference of two zones, 2 pi/3 (b^3 - a^3) times the difference of the sines of
latitude.

A polyhedron whose surface keeps within a tolerance of the smooth one differs in volume by at most tolerance times
surface; halving a chord quarters its sagitta, so the error falls in proportion to the tolerance.
"""

import math

import numpy as np
import pytest

from engine.fabrication.revolve import Stand, wall_of_revolution
from engine.fabrication.sweep import sweep, trough_profile, tube_profile
from engine.geometry import profiles
from tests import curves

BORE, WALL = 0.012, 0.003
OUTER = BORE + WALL
RING = math.pi * (OUTER**2 - BORE**2)
TOLERANCES = [2e-4, 5e-5, 1.25e-5]
STAND = Stand(np.array([0.1, -0.2, 0.3]), np.array([0.48, -0.36, 0.8]))
ORDER_ROOM = 0.25
"""Error falls with the tolerance to the power 1, give or take this: counts of chords are whole numbers."""


def tube_error(table, smooth: float, tolerance: float) -> float:
    return abs(sweep(table, tube_profile(BORE, WALL, tolerance), tolerance).volume() - smooth)


TORUS = curves.arc(0.08, 4.0), RING * 0.08 * 4.0
HELIX = curves.helix(0.08, 15.0, 0.3), RING * math.hypot(0.08 * 15.0, 0.3)


@pytest.mark.parametrize(("table", "smooth"), [TORUS, HELIX], ids=["torus", "helix"])
@pytest.mark.parametrize("tolerance", TOLERANCES)
def test_tube_keeps_within_the_chord_bound_of_pappus_and_guldin(table, smooth, tolerance):
    surface = 2.0 * math.pi * (BORE + OUTER) * table[-1, 0]
    assert 0.0 < tube_error(table, smooth, tolerance) <= tolerance * surface


@pytest.mark.parametrize(("table", "smooth"), [TORUS, HELIX], ids=["torus", "helix"])
def test_error_falls_in_proportion_to_the_tolerance(table, smooth):
    errors = [tube_error(table, smooth, tolerance) for tolerance in TOLERANCES]
    orders = np.diff(np.log(errors)) / np.diff(np.log(TOLERANCES))
    assert np.abs(orders - 1.0).max() < ORDER_ROOM


def test_banked_trough_takes_its_centroid_round_the_bend():
    """Half pipe with sharp lips lying on its side, mouth toward the centre of the bend: V = (R + y_c) turn A.

    Centroid of a half ring: y_c = 4/(3 pi) (b^3 - a^3)/(b^2 - a^2) from its centre, here outward.
    """
    radius, turn, tolerance = 0.08, 3.0, 1e-6
    table = curves.arc(radius, turn)
    outward = -table[:, 7:10] * radius
    table[:, 10:13], table[:, 13:16] = outward, table[:, 4:7] / radius
    area = 0.5 * RING
    centroid = 4.0 / (3.0 * math.pi) * (OUTER**3 - BORE**3) / (OUTER**2 - BORE**2)
    mesh = sweep(table, trough_profile(BORE, WALL, (0.5 * math.pi, 0.0), tolerance), tolerance)
    smooth = (radius + centroid) * turn * area
    surface = (math.pi * OUTER + math.pi * BORE + 2 * WALL) * (radius + OUTER) * turn
    assert abs(mesh.volume() - smooth) < tolerance * surface
    assert abs(mesh.volume() - radius * turn * area) > 100.0 * tolerance * surface


@pytest.mark.parametrize("tolerance", TOLERANCES)
def test_cone_shell(tolerance):
    rim, throat, depth, wall = 0.2, 0.02, 0.1, 0.0024
    mesh = wall_of_revolution(profiles.line((rim, 0.0), (throat, -depth)), STAND, -1, wall, tolerance)
    slant = math.hypot(rim - throat, depth)
    mean = 0.5 * (rim + throat) + 0.5 * wall * depth / slant
    smooth = 2.0 * math.pi * mean * wall * slant
    assert 0.0 < abs(mesh.volume() - smooth) <= tolerance * 4.0 * math.pi * mean * slant


@pytest.mark.parametrize("tolerance", TOLERANCES)
@pytest.mark.parametrize("side", [-1, 1], ids=["ball inside", "ball outside"])
def test_sphere_shell(side, tolerance):
    """Zone of a sphere from latitude -20 to -60 degrees; a ball inside is on the right of the meridian."""
    size, wall, low, high = 0.25, 0.003, math.radians(-60.0), math.radians(-20.0)
    mesh = wall_of_revolution(profiles.arc((0.0, 0.0), size, (high, low)), STAND, side, wall, tolerance)
    other = size - side * wall
    smooth = 2.0 * math.pi / 3.0 * abs(other**3 - size**3) * (math.sin(high) - math.sin(low))
    surface = 4.0 * math.pi * (size + wall) ** 2 * (math.sin(high) - math.sin(low))
    assert 0.0 < abs(mesh.volume() - smooth) <= tolerance * surface


def test_closed_hemisphere_shell():
    size, wall, tolerance = 0.1, 0.004, 1e-5
    meridian = profiles.arc((0.0, 0.0), size, (0.0, -0.5 * math.pi))
    meridian[-1, 1] = 0.0
    mesh = wall_of_revolution(meridian, STAND, -1, wall, tolerance)
    smooth = 2.0 * math.pi / 3.0 * ((size + wall) ** 3 - size**3)
    assert abs(mesh.volume() - smooth) <= tolerance * 4.0 * math.pi * (size + wall) ** 2
    assert mesh.volume() == pytest.approx(smooth, rel=2e-3)
