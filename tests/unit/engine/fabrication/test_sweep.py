"""Swept solids: exact volumes of the polyhedra, the surface within its tolerance, sections of troughs."""

import math

import numpy as np
import pytest

from engine.errors import PartRefusedError
from engine.fabrication.inspection import inspect
from engine.fabrication.sweep import (
    MOST_TRIANGLES,
    Profile,
    finest,
    ring_count,
    station_places,
    sweep,
    trough_profile,
    tube_profile,
)
from tests import curves

ROUNDING = 1e-12
"""Relative: the volume of a polyhedron, summed in double precision."""
TOLERANCE = 5e-5
BORE, WALL = 0.012, 0.003
LIP = (0.5 * math.pi, 0.001)


def area_of(profile: Profile) -> tuple[float, float, float]:
    """Area of a profile (m2) and its centroid along down and side (m), loop by loop."""
    area, first, second, start = 0.0, 0.0, 0.0, 0
    for size in profile.loops:
        x, y = profile.points[start : start + size].T
        cross = x * np.roll(y, -1) - np.roll(x, -1) * y
        area += 0.5 * cross.sum()
        first += ((x + np.roll(x, -1)) * cross).sum() / 6.0
        second += ((y + np.roll(y, -1)) * cross).sum() / 6.0
        start += size
    return area, first / area, second / area


def profiles() -> list[Profile]:
    """A tube and troughs with every kind of lip."""
    return [
        tube_profile(BORE, WALL, TOLERANCE),
        trough_profile(BORE, WALL, LIP, TOLERANCE),
        trough_profile(BORE, WALL, (1.2, 0.0), TOLERANCE),
        trough_profile(BORE, WALL, (2.4, 0.5 * WALL), TOLERANCE),
        trough_profile(BORE, WALL, (1.9, WALL), TOLERANCE),
        trough_profile(0.0119, 0.0012, (1.77, 0.0044), TOLERANCE),
        trough_profile(0.025, 0.0002, (1.6, 0.0049), TOLERANCE),
    ]


@pytest.mark.parametrize("profile", profiles())
def test_cap_fills_the_profile(profile):
    corner = profile.points[profile.cap]
    u, v = corner[:, 1] - corner[:, 0], corner[:, 2] - corner[:, 0]
    each = 0.5 * (u[:, 0] * v[:, 1] - u[:, 1] * v[:, 0])
    assert each.min() > 0.0
    assert each.sum() == pytest.approx(area_of(profile)[0], rel=ROUNDING)


@pytest.mark.parametrize("profile", profiles())
def test_straight_volume_is_area_times_length(profile):
    mesh = sweep(curves.line(0.3), profile, TOLERANCE)
    assert mesh.volume() == pytest.approx(area_of(profile)[0] * 0.3, rel=ROUNDING)


@pytest.mark.parametrize("profile", profiles())
def test_bend_volume_is_that_of_its_wedges(profile):
    """n equal steps d: each pair of wedges encloses sin d (R - y_c) A; y toward the centre of a bend to the left."""
    radius, turn = 0.08, 1.5 * math.pi
    mesh = sweep(curves.arc(radius, turn), profile, TOLERANCE)
    n = len(np.unique(mesh.places)) - 1
    area, _, across = area_of(profile)
    assert mesh.volume() == pytest.approx(n * math.sin(turn / n) * (radius - across) * area, rel=ROUNDING)


@pytest.mark.parametrize("table", [curves.line(0.3), curves.arc(0.08, 4.0), curves.helix(0.08, 15.0, 0.12)])
@pytest.mark.parametrize("profile", profiles())
def test_solid_is_closed_and_whole(table, profile):
    report = inspect(sweep(table, profile, TOLERANCE))
    assert report.problems == ()
    assert (report.euler, report.parts) == (0 if len(profile.loops) == 2 else 2, 1)


def test_bore_is_circumscribed_and_outside_inscribed():
    profile = tube_profile(BORE, WALL, TOLERANCE)
    m = profile.loops[0]
    for loop, flats in ((profile.points[:m], False), (profile.points[m:], True)):
        middle = np.hypot(*(0.5 * (loop + np.roll(loop, -1, axis=0))).T)
        corner = np.hypot(*loop.T)
        met = middle if flats else corner
        assert met == pytest.approx(np.full(m, BORE if flats else BORE + WALL), rel=ROUNDING)
        assert np.abs(corner - middle).max() <= 0.5 * TOLERANCE


def test_ring_count_by_hand():
    """Chord error 0.05 mm on radius 50 mm: pi / acos(50/50.05) = 70.28, so 71 chords."""
    assert ring_count(0.05, 5e-5) == 71


def deviation_from_helix(mesh, radius: float, climb: float, ring: float) -> float:
    """Largest distance of the middles of triangles' sides from a tube of radius `ring` about a helix, m."""
    pairs = np.concatenate([mesh.faces[:, [0, 1]], mesh.faces[:, [1, 2]], mesh.faces[:, [2, 0]]])
    point = 0.5 * (mesh.vertices[pairs[:, 0]] + mesh.vertices[pairs[:, 1]])
    angle = np.arctan2(point[:, 0], radius - point[:, 1])
    place = mesh.places[pairs].mean(axis=1) / math.hypot(radius, climb)
    angle += 2.0 * math.pi * np.round((place - angle) / (2.0 * math.pi))
    for _ in range(20):
        away = point - np.stack([radius * np.sin(angle), radius - radius * np.cos(angle), -climb * angle], axis=1)
        slope = np.stack([radius * np.cos(angle), radius * np.sin(angle), np.full_like(angle, -climb)], axis=1)
        angle += (away * slope).sum(axis=1) / (radius**2 + climb**2)
    return float(np.abs(np.linalg.norm(away, axis=1) - ring).max())


@pytest.mark.parametrize("climb", [0.0, 0.01, 0.05])
@pytest.mark.parametrize("tolerance", [1e-4, 1e-5])
def test_both_skins_lie_within_the_tolerance(climb, tolerance):
    radius, turn = 0.06, 5.0
    profile = tube_profile(BORE, WALL, tolerance)
    mesh = sweep(curves.helix(radius, turn, climb * turn), profile, tolerance)
    m = profile.loops[0]
    skin = (mesh.faces % (2 * m)) // m
    inside = (mesh.places[mesh.faces] > 0.0).any(axis=1) & (mesh.places[mesh.faces] < mesh.places[-1]).any(axis=1)
    for number, ring in ((0, BORE + WALL), (1, BORE)):
        chosen = inside & (skin == number).all(axis=1)
        part = type(mesh)(mesh.vertices, mesh.faces[chosen], mesh.places)
        missed = deviation_from_helix(part, radius, climb, ring)
        assert 0.2 * tolerance < missed <= tolerance


def test_skins_of_a_twisted_tube_lie_within_the_tolerance():
    """Twist slants the sides of the triangles: a slanted side spans more of the ring than a side of the profile."""
    profile = tube_profile(BORE, WALL, TOLERANCE)
    mesh = sweep(curves.twisted_line(0.05, 6.0), profile, TOLERANCE)
    m = profile.loops[0]
    for number, ring in ((0, BORE + WALL), (1, BORE)):
        faces = mesh.faces[((mesh.faces % (2 * m)) // m == number).all(axis=1)]
        pairs = np.concatenate([faces[:, [0, 1]], faces[:, [1, 2]], faces[:, [2, 0]]])
        middle = mesh.vertices[pairs].mean(axis=1)
        missed = np.abs(np.hypot(middle[:, 1], middle[:, 2]) - ring)
        assert 0.2 * TOLERANCE < missed.max() <= TOLERANCE


def test_half_the_tolerance_takes_about_twice_the_triangles():
    counts = [sweep(curves.arc(0.08, 2.0), tube_profile(BORE, WALL, t), t).triangles for t in (2e-5, 1e-5)]
    assert 1.8 < counts[1] / counts[0] < 2.2


def test_break_points_are_stations():
    table = curves.s_curve(0.08, 1.0)
    places = station_places(table, tube_profile(BORE, WALL, TOLERANCE), TOLERANCE)
    assert {0.0, 0.08, 0.16} <= set(np.round(places, 12))
    assert np.diff(places).min() > 0.0


def test_s_curve_does_not_turn_its_section_over():
    """A frame by the centre of curvature would jump by half a turn at the inflection: rings would cross."""
    profile = trough_profile(BORE, WALL, LIP, TOLERANCE)
    mesh = sweep(curves.s_curve(0.08, 1.0), profile, TOLERANCE)
    assert inspect(mesh).good
    rings = mesh.vertices.reshape(-1, len(profile.points), 3)
    assert np.linalg.norm(np.diff(rings, axis=0), axis=2).max() < 0.01


def test_pieces_without_length_are_passed_over():
    table = curves.line(0.3, pieces=3)
    doubled = np.repeat(table, [1, 3, 1, 2], axis=0)
    plain, repeated = (sweep(t, tube_profile(BORE, WALL, TOLERANCE), TOLERANCE) for t in (table, doubled))
    assert inspect(repeated).good
    assert repeated.volume() == pytest.approx(plain.volume(), rel=ROUNDING)


def test_curve_without_length_is_refused():
    with pytest.raises(PartRefusedError, match=r"its centreline has no length; give it a length\."):
        sweep(np.repeat(curves.line(0.3)[:1], 2, axis=0), tube_profile(BORE, WALL, TOLERANCE), TOLERANCE)


def test_too_many_triangles_are_refused_before_they_are_made():
    tolerance = 1e-9
    with pytest.raises(PartRefusedError, match="raise the tolerance of a chord") as caught:
        sweep(curves.helix(0.1, 100.0, 0.5), tube_profile(BORE, WALL, 1e-6), tolerance)
    assert f"{MOST_TRIANGLES:.3g}" in str(caught.value)


def test_thin_wall_makes_the_tolerance_finer():
    assert finest(1e-3, 2e-4) == pytest.approx(5e-5)
    profile = tube_profile(0.1, 2e-4, 1e-3)
    m = profile.loops[0]
    assert np.hypot(*profile.points[m:].T).max() < 0.1002 * math.cos(math.pi / m)


# -- troughs --------------------------------------------------------------------------------------
def test_trough_area_of_a_half_pipe_with_round_lips():
    """Half a ring pi/2 (R^2 - r^2), and two half discs of half the wall: the lips stand past the lip angle."""
    wall = 0.002
    profile = trough_profile(BORE, wall, (0.5 * math.pi, 0.5 * wall), 1e-7)
    smooth = 0.5 * math.pi * ((BORE + wall) ** 2 - BORE**2) + math.pi * (0.5 * wall) ** 2
    assert area_of(profile)[0] == pytest.approx(smooth, rel=1e-4)


@pytest.mark.parametrize("lip", [(1.0, 0.0), (0.5 * math.pi, 0.001), (2.4, 0.0015), (1.9, 0.003)])
def test_trough_leaves_the_bore_free_and_touches_it(lip):
    profile = trough_profile(BORE, WALL, lip, TOLERANCE)
    start, end = profile.points, np.roll(profile.points, -1, axis=0)
    along = end - start
    share = np.clip(-(start * along).sum(axis=1) / (along * along).sum(axis=1), 0.0, 1.0)
    nearest = np.hypot(*(start + share[:, None] * along).T)
    assert nearest.min() == pytest.approx(BORE, rel=ROUNDING)


@pytest.mark.parametrize("radius", [0.0005, 0.001, 0.003])
def test_lip_lies_on_the_rod_that_the_ball_meets(radius):
    """The ball meets a rod of the lip radius about a centre at bore radius + lip radius on the lip angle."""
    angle = 1.8
    profile = trough_profile(BORE, WALL, (angle, radius), TOLERANCE)
    centre = (BORE + radius) * np.array([math.cos(angle), math.sin(angle)])
    away = np.hypot(*(profile.points - centre).T)
    assert away.min() == pytest.approx(radius, rel=1e-9)
    assert (np.abs(away - radius) < 1e-12).sum() >= 3


def test_trough_is_its_own_mirror_image():
    points = trough_profile(BORE, WALL, (1.9, 0.003), TOLERANCE).points
    mirrored = points * (1.0, -1.0)
    gap = np.linalg.norm(points[:, None] - mirrored[None], axis=2).min(axis=1)
    assert gap.max() < 1e-15


@pytest.mark.parametrize(
    ("lip", "words"),
    [((3.1, 0.002), "close the mouth"), ((0.05, 0.004), "leave no trough between them")],
)
def test_lips_that_leave_no_mouth_or_no_trough_are_refused(lip, words):
    with pytest.raises(PartRefusedError, match=words) as caught:
        trough_profile(BORE, WALL, lip, TOLERANCE)
    assert "make the lip radius smaller" in str(caught.value)
