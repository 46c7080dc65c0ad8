import math

import numpy as np
import pytest

from engine.model.edits import set_field
from engine.placement import lay_out
from studio.meshes import ball_mesh, hit, solid_of
from tests.designs import bend_run, desk_run, every_kind, funnel_run, helix_run, straight_run

ROUNDING = 1e-6
"""Vertices are kept in single precision; a metre is held to a tenth of a micrometre, normals to 1e-7."""


def solids(design):
    return [solid for entry in lay_out(design).placed if (solid := solid_of(entry)) is not None]


def test_tube_vertices_stand_off_the_centreline_by_the_outer_radius():
    layout = lay_out(straight_run(length=0.5, grade=0.1))
    entry = layout.placed[0]
    mesh = solid_of(entry).mesh
    along = entry.inlet.tangent
    away = mesh.vertices - entry.inlet.position
    radial = away - (away @ along)[:, None] * along
    section = entry.element.section
    outer = 0.5 * section.bore + section.wall
    assert np.abs(np.linalg.norm(radial, axis=1) - outer).max() < ROUNDING
    assert np.abs(radial / outer - mesh.normals).max() < 1e-4


@pytest.mark.parametrize("design", [helix_run(), bend_run(), funnel_run(), desk_run(), every_kind()])
def test_normals_are_unit_and_agree_with_the_winding(design):
    for solid in solids(design):
        mesh = solid.mesh
        assert np.abs(np.linalg.norm(mesh.normals, axis=1) - 1.0).max() < ROUNDING
        a, b, c = (mesh.vertices[mesh.faces[:, k]].astype(np.float64) for k in range(3))
        turn = (np.cross(b - a, c - a) * mesh.normals[mesh.faces].mean(axis=1)).sum(axis=1)
        assert turn.min() >= -1e-12


def test_helix_area_is_close_to_the_closed_form():
    layout = lay_out(helix_run(turns=2.0))
    entry = layout.placed[1]
    mesh = solid_of(entry).mesh
    a, b, c = (mesh.vertices[mesh.faces[:, k]].astype(np.float64) for k in range(3))
    area = 0.5 * np.linalg.norm(np.cross(b - a, c - a), axis=1).sum()
    outer = 0.5 * entry.element.section.bore + entry.element.section.wall
    # a canal surface has the area 2 pi R L (Pappus); a 14-gon is shorter than its circle by 0.8 %
    assert area == pytest.approx(2.0 * math.pi * outer * entry.length, rel=0.015)


def test_unchanged_elements_keep_their_mesh_and_moved_ones_do_not():
    design = bend_run()
    before = solids(design)
    after = solids(set_field(design, "runs[0].elements[1].radius", 0.2))
    assert after[0].mesh is before[0].mesh
    assert after[1].mesh is not before[1].mesh
    assert after[2].mesh is not before[2].mesh


def test_ray_finds_the_nearer_of_two_elements():
    layout = lay_out(bend_run())
    found = solids(bend_run())
    middle = 0.5 * (layout.placed[0].inlet.position + layout.placed[0].outlet.position)
    above = middle + np.array([0.0, 0.0, 1.0])
    assert hit(found, above, np.array([0.0, 0.0, -1.0])) == 0
    assert hit(found, above, np.array([0.0, 0.0, 1.0])) is None


def test_ball_mesh_is_a_unit_ball_with_both_tones():
    mesh, light = ball_mesh()
    assert np.abs(np.linalg.norm(mesh.vertices, axis=1) - 1.0).max() < ROUNDING
    assert 0 < light.sum() < len(light)
