"""Inspection: each fault is found, and no other; the searches against exact arithmetic and against all pairs."""

import math
from fractions import Fraction

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from engine.fabrication.inspection import (
    Expected,
    bend_problems,
    crossings,
    edges_of,
    inspect,
    loose_parts,
    meeting_problems,
)
from engine.fabrication.mesh import Mesh
from engine.fabrication.sweep import sweep, trough_profile, tube_profile
from tests import curves

TOLERANCE = 1e-4
OUTER = 0.015
TUBE = tube_profile(0.012, 0.003, TOLERANCE)


def tube(table) -> Mesh:
    return sweep(table, TUBE, TOLERANCE)


def changed(mesh: Mesh, *, vertices=None, faces=None) -> Mesh:
    return Mesh(mesh.vertices if vertices is None else vertices, mesh.faces if faces is None else faces, mesh.places)


def two(first: Mesh, second: Mesh) -> Mesh:
    faces = np.concatenate([first.faces, second.faces + np.int32(len(first.vertices))])
    return Mesh(np.concatenate([first.vertices, second.vertices]), faces, np.concatenate([first.places, second.places]))


def test_good_tube_has_no_problem():
    report = inspect(tube(curves.line(0.1)), Expected(euler=0))
    assert report.good and report.finite and report.closed and report.consistent
    assert (report.euler, report.parts, report.crossings) == (0, 1, 0)


def test_numbers_that_are_none_are_found():
    mesh = tube(curves.line(0.1))
    broken = mesh.vertices.copy()
    broken[7, 1] = math.nan
    assert inspect(changed(mesh, vertices=broken)).problems == (
        "it has coordinates that are not numbers; check the sizes of the element.",
    )


def test_missing_triangle_is_found():
    mesh = tube(curves.line(0.1))
    report = inspect(changed(mesh, faces=mesh.faces[1:]))
    assert not report.closed and report.problems[0].startswith("its surface has a gap")


def test_turned_triangle_is_found():
    mesh = tube(curves.line(0.1))
    faces = mesh.faces.copy()
    faces[3] = faces[3, ::-1]
    report = inspect(changed(mesh, faces=faces))
    assert report.closed and not report.consistent
    assert report.problems[0].startswith("its triangles do not all face outward")


def test_doubled_triangle_is_found():
    mesh = tube(curves.line(0.1))
    assert not inspect(changed(mesh, faces=np.concatenate([mesh.faces, mesh.faces[:1]]))).closed


def test_solid_turned_inside_out_is_found():
    mesh = tube(curves.line(0.1))
    report = inspect(changed(mesh, faces=mesh.faces[:, ::-1].copy()))
    assert report.volume < 0.0 and "inside out" in report.problems[0]


def test_loose_parts_and_euler_number_are_counted():
    mesh = two(tube(curves.line(0.1)), tube(curves.line(0.1, (0.0, 0.1, 0.0))))
    assert loose_parts(mesh) == 2
    report = inspect(mesh, Expected(euler=2))
    assert len(report.problems) == 2
    assert report.problems[0].startswith("it falls into 2 pieces where 1 should be")
    assert report.problems[1].startswith("its Euler number is 0 where 2 should be")


def test_edge_too_short_for_a_file_is_found():
    mesh = tube(curves.line(0.1))
    squeezed = mesh.vertices.copy()
    quarter = TUBE.loops[0] // 4
    squeezed[quarter + 1] = squeezed[quarter] + (0.0, 1e-12, 1e-12)
    assert any(
        "too short for the file at s = 0.0 mm" in said for said in inspect(changed(mesh, vertices=squeezed)).problems
    )


def test_two_solids_through_each_other_are_found_where_they_meet():
    mesh = two(tube(curves.line(0.1)), tube(curves.line(0.1, (0.05, 0.02, 0.0))))
    report = inspect(mesh, Expected(parts=2))
    assert report.closed and report.consistent and report.crossings > 0
    assert "cuts through itself: the wall at s = " in report.problems[0]


# -- parts that pass the usual tests --------------------------------------------------------------
def test_bend_tighter_than_the_tube_passes_the_usual_tests_and_is_found():
    table = curves.arc(0.010, 2.0)
    report = inspect(tube(table), Expected(euler=0))
    assert report.closed and report.consistent and report.euler == 0 and report.volume > 0.0
    (said,) = bend_problems(table, TUBE)
    assert "radius of 10.0 mm and the section reaches 15.0 mm toward its centre" in said
    assert "make the radius larger than 15.0 mm" in said


def test_bend_just_wide_enough_is_good():
    table = curves.arc(0.0152, 2.0)
    assert bend_problems(table, TUBE) == [] and inspect(tube(table)).good


def test_trough_may_bend_as_tight_as_its_own_reach_allows():
    """Upright half pipe: it reaches R + wall to the side at the lip, less than that up to the mouth when narrower."""
    narrow = trough_profile(0.012, 0.003, (0.5, 0.001), TOLERANCE)
    table = curves.arc(0.010, 2.0)
    assert np.abs(narrow.points[:, 1]).max() < 0.010
    assert bend_problems(table, narrow) == [] and inspect(sweep(table, narrow, TOLERANCE)).good


def test_helix_with_too_little_pitch_passes_the_usual_tests_and_is_found():
    turn = 4.0 * math.pi
    table = curves.helix(0.08, turn, 2.0 * 0.029)
    report = inspect(tube(table), Expected(euler=0))
    assert report.closed and report.consistent and report.euler == 0 and report.crossings > 0
    (said,) = meeting_problems(table, OUTER)
    assert "it is 30.0 mm wide" in said and "more drop per turn" in said


def test_helix_with_enough_pitch_is_good():
    """Centrelines of neighbouring turns stand pitch cos(slope) apart: 30.2 mm of pitch leave 30.15 mm."""
    table = curves.helix(0.08, 4.0 * math.pi, 2.0 * 0.0302)
    assert meeting_problems(table, OUTER) == [] and inspect(tube(table)).good


def test_distance_of_a_helix_from_itself_is_its_closest_pair():
    table = curves.helix(0.08, 4.0 * math.pi, 2.0 * 0.029)
    angle = np.linspace(1.5 * math.pi, 2.5 * math.pi, 20001)
    exact = np.sqrt((2.0 * 0.08 * np.sin(0.5 * angle)) ** 2 + (0.029 * angle / (2.0 * math.pi)) ** 2).min()
    (said,) = meeting_problems(table, OUTER)
    assert f"pass {exact * 1e3:.1f} mm apart" in said


def test_ring_with_its_ends_face_to_face_is_good_and_a_full_ring_is_not():
    open_ring, full = curves.arc(0.08, math.radians(350.0)), curves.arc(0.08, 2.0 * math.pi)
    assert meeting_problems(open_ring, OUTER) == [] and inspect(tube(open_ring)).good
    assert not inspect(tube(full)).good


# -- searches -------------------------------------------------------------------------------------
def test_each_edge_is_listed_once():
    mesh = tube(curves.line(0.1))
    edges, closed, consistent = edges_of(mesh)
    expected = {
        tuple(sorted(pair))
        for face in mesh.faces.tolist()
        for pair in ((face[0], face[1]), (face[1], face[2]), (face[2], face[0]))
    }
    assert closed and consistent
    assert len(edges) == len(expected) and {tuple(edge) for edge in edges.tolist()} == expected


CORNER = st.tuples(*[st.integers(-6, 6)] * 3)


def exactly_crosses(p, q, a, b, c) -> bool | None:
    """Whether the segment pq passes through the inside of abc, in exact arithmetic; None when it only touches."""
    p, q, a, b, c = ([Fraction(x) for x in point] for point in (p, q, a, b, c))

    def minus(u, v):
        return [x - y for x, y in zip(u, v, strict=True)]

    def six_volumes(u, v, w, x):
        (a0, a1, a2), (b0, b1, b2), (c0, c1, c2) = minus(v, u), minus(w, u), minus(x, u)
        return a0 * (b1 * c2 - b2 * c1) - a1 * (b0 * c2 - b2 * c0) + a2 * (b0 * c1 - b1 * c0)

    sides = six_volumes(a, b, c, p), six_volumes(a, b, c, q)
    turns = six_volumes(p, q, a, b), six_volumes(p, q, b, c), six_volumes(p, q, c, a)
    if 0 in sides or 0 in turns:
        return None
    return sides[0] * sides[1] < 0 and (min(turns) > 0 or max(turns) < 0)


@given(*[CORNER] * 5)
def test_edge_against_triangle_agrees_with_exact_arithmetic(p, q, a, b, c):
    wanted = exactly_crosses(p, q, a, b, c)
    if wanted is None:
        return
    vertices = np.array([p, q, a, b, c], dtype=np.float64)
    hits = crossings(vertices, np.array([[2, 3, 4]], dtype=np.int32), np.array([[0, 1]], dtype=np.int32))
    assert (len(hits) > 0) == wanted


@given(st.integers(0, 2**32 - 1))
def test_grid_finds_what_comparing_all_pairs_finds(seed):
    """Long and short triangles together: whether any meet must not depend on the cells they lie in."""
    chance = np.random.default_rng(seed)
    sizes = chance.choice([0.02, 0.1, 0.6], size=(12, 1, 1))
    corners = chance.uniform(-1.0, 1.0, (12, 1, 3)) + sizes * chance.uniform(-1.0, 1.0, (12, 3, 3))
    vertices, faces = corners.reshape(-1, 3), np.arange(36, dtype=np.int32).reshape(12, 3)
    edges = np.concatenate([faces[:, [0, 1]], faces[:, [1, 2]], faces[:, [2, 0]]])
    together = len(crossings(vertices, faces, edges)) > 0
    single = any(
        len(crossings(vertices, face[None], edge[None])) > 0
        for face in faces
        for edge in edges
        if not set(edge.tolist()) & set(face.tolist())
    )
    assert together == single
