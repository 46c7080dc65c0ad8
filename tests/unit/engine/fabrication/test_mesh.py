"""Meshes: volume, areas, strips, blocks."""

import numpy as np
import pytest

from engine.fabrication.inspection import inspect
from engine.fabrication.mesh import Mesh, band, blocks

ROUNDING = 1e-12
"""Relative: sums of a few products in double precision."""


def cube(size: float = 1.0, at: tuple[float, float, float] = (0.0, 0.0, 0.0)) -> Mesh:
    edges = [np.array([start, start + size]) for start in at]
    return blocks(edges, np.ones((1, 1, 1), dtype=np.bool_))


def test_volume_and_area_of_a_cube():
    mesh = cube(0.2)
    assert mesh.triangles == 12
    assert mesh.volume() == pytest.approx(0.008, rel=ROUNDING)
    assert mesh.areas() == pytest.approx(np.full(12, 0.02), rel=ROUNDING)


def test_volume_keeps_its_digits_far_from_the_origin():
    assert cube(0.0078125, (512.0, -512.0, 256.0)).volume() == pytest.approx(0.0078125**3, rel=ROUNDING)


def test_volume_is_negative_inside_out():
    mesh = cube()
    assert Mesh(mesh.vertices, mesh.faces[:, ::-1], mesh.places).volume() == pytest.approx(-1.0, rel=ROUNDING)


def test_box_is_the_low_and_high_corner():
    assert cube(2.0, (1.0, 2.0, 3.0)).box().tolist() == [[1.0, 2.0, 3.0], [3.0, 4.0, 5.0]]


def test_strip_is_counter_clockwise_seen_with_low_below():
    faces = band(np.array([[0, 1, 2]]), np.array([[3, 4, 5]]), closed=False)
    flat = np.array([[0, 0], [1, 0], [2, 0], [0, 1], [1, 1], [2, 1]], dtype=float)
    a, b, c = (flat[faces[:, i]] for i in range(3))
    doubled = (b - a)[:, 0] * (c - a)[:, 1] - (b - a)[:, 1] * (c - a)[:, 0]
    assert doubled.tolist() == [1.0, 1.0, 1.0, 1.0]


def test_closed_strip_joins_its_ends():
    faces = band(np.array([[0, 1, 2]]), np.array([[3, 4, 5]]), closed=True)
    assert len(faces) == 6
    assert {tuple(face) for face in faces.tolist()} >= {(2, 0, 3), (2, 3, 5)}


def test_blocks_with_a_hole_are_a_ring():
    filled = np.ones((3, 3, 1), dtype=np.bool_)
    filled[1, 1] = False
    mesh = blocks([np.arange(4.0), np.arange(4.0), np.arange(2.0)], filled)
    report = inspect(mesh)
    assert report.good and report.euler == 0
    assert report.volume == pytest.approx(8.0, rel=ROUNDING)
    assert mesh.areas().sum() == pytest.approx(2 * 8 + 12 + 4, rel=ROUNDING)
