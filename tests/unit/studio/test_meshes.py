import math

import numpy as np
import pytest

from engine.model.edits import set_field
from engine.placement import lay_out
from studio.meshes import Meshes, pick, sphere
from tests.designs import bend_run, desk_run, every_kind, funnel_run, helix_run, straight_run

ROUNDING = 1e-6
"""Vertices are kept in single precision: a metre is held to a tenth of a micrometre, normals to 1e-7."""
SIDES_SHORT = 0.015
"""A polygon of 16 sides is shorter than its circle by 0.6 %, the chords of a bend add to that."""


def surfaces(design):
    layout = lay_out(design)
    kept = Meshes()
    return [surface for entry in layout.placed for surface in kept.shape(entry, design.process).surfaces]


def area(surface):
    a, b, c = (surface.vertices[surface.faces[:, k]].astype(np.float64) for k in range(3))
    return 0.5 * np.linalg.norm(np.cross(b - a, c - a), axis=1).sum()


def test_tube_vertices_stand_off_the_centreline_by_the_outer_radius():
    design = straight_run(length=0.5, grade=0.1)
    entry = lay_out(design).placed[0]
    (tube,) = surfaces(design)
    along = entry.inlet.tangent
    away = tube.vertices - entry.inlet.position
    radial = away - (away @ along)[:, None] * along
    outer = 0.5 * entry.element.section.bore + entry.element.section.wall
    assert np.abs(np.linalg.norm(radial, axis=1) - outer).max() < ROUNDING
    assert np.abs(radial / outer - tube.normals).max() < ROUNDING / outer


@pytest.mark.parametrize("make", [helix_run, bend_run, funnel_run, desk_run, every_kind])
def test_normals_are_unit_and_agree_with_the_winding(make):
    for surface in surfaces(make()):
        assert np.abs(np.linalg.norm(surface.normals, axis=1) - 1.0).max() < ROUNDING
        a, b, c = (surface.vertices[surface.faces[:, k]].astype(np.float64) for k in range(3))
        turn = np.cross(b - a, c - a)
        size = np.linalg.norm(turn, axis=1)
        real = size > 1e-10
        agree = (turn[real] * surface.normals[surface.faces[real]].mean(axis=1)).sum(axis=1) / size[real]
        assert agree.min() > 0.0


def test_helix_has_the_area_of_a_canal_surface():
    design = helix_run(turns=2.0)
    entry = lay_out(design).placed[1]
    outer = 0.5 * entry.element.section.bore + entry.element.section.wall
    # Pappus: a circle of radius a carried across its plane along a length L sweeps 2 pi a L, however the line bends
    assert area(surfaces(design)[1]) == pytest.approx(2.0 * math.pi * outer * entry.length, rel=SIDES_SHORT)


def test_only_what_changed_or_moved_is_made_anew():
    design = bend_run()
    kept = Meshes()
    kept.stage(lay_out(design))
    assert kept.made == 3
    kept.stage(lay_out(design))
    assert kept.made == 3
    kept.stage(lay_out(set_field(design, "runs[0].elements[1].radius", 0.2)))
    assert kept.made == 5


def test_ray_finds_the_element_under_it():
    layout = lay_out(bend_run())
    stage = Meshes().stage(layout)
    middle = 0.5 * (layout.placed[0].inlet.position + layout.placed[0].outlet.position)
    above = middle + np.array([0.0, 0.0, 1.0])
    away, corner = pick(above, np.array([0.0, 0.0, -1.0]), stage.solid)
    assert stage.solid_element[corner] == 0
    section = layout.placed[0].element.section
    assert away == pytest.approx(1.0 + 0.5 * section.bore, abs=1e-3)
    assert pick(above, np.array([0.0, 0.0, 1.0]), stage.solid) == (math.inf, -1)


def test_ball_is_a_unit_sphere_of_two_tones():
    ball, dark = sphere()
    assert np.abs(np.linalg.norm(ball.vertices, axis=1) - 1.0).max() < ROUNDING
    assert 0 < dark.sum() < len(dark)
