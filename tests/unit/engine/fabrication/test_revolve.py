"""Walls of revolution and plates: exact volumes of the polyhedra, thickness, what is refused."""

import math

import numpy as np
import pytest

from engine.errors import PartRefusedError
from engine.fabrication.inspection import inspect
from engine.fabrication.revolve import Face, Stand, plate, revolve, tray, wall_of_revolution, wall_outline
from engine.geometry import profiles
from engine.model.elements import Bowl, Dome, Funnel, Hyperbolic, Parabolic, Points, Well
from engine.shapes import meridian, side_of_wall

ROUNDING = 1e-12
"""Relative: the volume of a polyhedron, summed in double precision."""
TOLERANCE = 5e-5
UPRIGHT = Stand(np.zeros(3), np.array([0.0, 0.0, 1.0]))
TILTED = Stand(np.array([0.3, -0.2, 0.9]), np.array([0.48, -0.36, 0.8]))
VESSELS = {
    "cone": Funnel(id="f"),
    "hyperbolic": Funnel(id="f", profile=Hyperbolic()),
    "parabolic": Funnel(id="f", profile=Parabolic()),
    "points": Funnel(id="f", profile=Points()),
    "well": Well(id="w"),
    "well with corners": Well(id="w", rim_fillet=0.0, floor_fillet=0.0),
    "open well": Well(id="w", floor=False),
    "bowl": Bowl(id="b"),
    "closed bowl": Bowl(id="b", hole_radius=0.0),
    "dome": Dome(id="d"),
}
WITH_A_WAY_THROUGH = {"cone", "hyperbolic", "parabolic", "points", "open well", "bowl"}
FACE = Face(np.array([1.0, 2.0, 3.0]), np.array([0.8, 0.0, -0.6]), np.array([0.0, 1.0, 0.0]), 0.3, 0.2)


def built(element, stand=UPRIGHT, tolerance=TOLERANCE):
    return wall_of_revolution(meridian(element), stand, side_of_wall(element), element.wall, tolerance)


def turned_volume(points: np.ndarray, m: int) -> float:
    """m sin(2 pi/m) times the first moment of a polygon (rho, z) about the axis, m3."""
    x, y = points.T
    after = np.roll(x, -1)
    return m * math.sin(2.0 * math.pi / m) * float(((x + after) * (x * np.roll(y, -1) - after * y)).sum()) / 6.0


@pytest.mark.parametrize("name", VESSELS)
def test_wall_is_closed_and_whole(name):
    report = inspect(built(VESSELS[name], TILTED))
    assert report.problems == ()
    assert (report.euler, report.parts) == (0 if name in WITH_A_WAY_THROUGH else 2, 1)


@pytest.mark.parametrize("name", VESSELS)
def test_volume_is_that_of_the_polygon_turned_in_steps(name):
    element = VESSELS[name]
    fine = min(TOLERANCE, 0.25 * element.wall)
    outline = wall_outline(meridian(element), side_of_wall(element), element.wall, fine)
    mesh = revolve(outline, UPRIGHT, fine)
    poles = int((outline.points[:, 0] == 0.0).sum())
    m = (len(mesh.vertices) - poles) // (len(outline.points) - poles)
    rings = outline.points.copy()
    rings[outline.faces_axis, 0] /= math.cos(math.pi / m)
    assert mesh.volume() == pytest.approx(turned_volume(rings, m), rel=ROUNDING)


@pytest.mark.parametrize("name", VESSELS)
def test_stand_moves_and_tilts_without_changing_the_volume(name):
    assert built(VESSELS[name], TILTED).volume() == pytest.approx(built(VESSELS[name]).volume(), rel=ROUNDING)


def test_cone_wall_is_measured_normal_to_the_meridian():
    """Laid off along the radius a wall of 2.4 mm would be w cos(slope) thick."""
    line, wall = profiles.line((0.2, 0.0), (0.02, -0.1)), 0.0024
    outline = wall_outline(line, -1, wall, TOLERANCE)
    chord = np.array([-0.18, -0.1]) / math.hypot(0.18, 0.1)
    away = (outline.points - (0.2, 0.0)) @ np.array([chord[1], -chord[0]])
    assert np.sort(np.abs(away)) == pytest.approx([0.0, 0.0, wall, wall], abs=1e-15)


@pytest.mark.parametrize("name", ["hyperbolic", "parabolic", "points", "bowl"])
def test_wall_has_its_thickness_everywhere(name):
    element = VESSELS[name]
    points = wall_outline(meridian(element), -1, element.wall, TOLERANCE).points
    half = len(points) // 2
    thickness = np.linalg.norm(points[:half] - points[: half - 1 : -1], axis=1)
    assert thickness == pytest.approx(np.full(half, element.wall), rel=1e-6)


def test_wall_grows_away_from_the_ball():
    inside, outside = built(VESSELS["bowl"]), built(VESSELS["dome"])
    low = meridian(VESSELS["bowl"])[:, 2].min()
    assert inside.vertices[:, 2].min() < low - 0.9 * VESSELS["bowl"].wall
    assert outside.vertices[:, 2].max() == pytest.approx(0.0, abs=1e-15)


def test_bore_of_a_well_keeps_its_true_circle_free():
    element = VESSELS["open well"]
    mesh = built(element)
    pairs = np.concatenate([mesh.faces[:, [0, 1]], mesh.faces[:, [1, 2]], mesh.faces[:, [2, 0]]])
    middle = mesh.vertices[pairs].mean(axis=1)
    assert np.hypot(middle[:, 0], middle[:, 1]).min() == pytest.approx(element.radius, rel=ROUNDING)


def test_running_surface_of_a_dome_lies_within_the_tolerance():
    element = VESSELS["dome"]
    mesh = built(element)
    top = mesh.vertices - (0.0, 0.0, -element.sphere_radius)
    on_top = np.abs(np.linalg.norm(top, axis=1) - element.sphere_radius) < 1e-9
    faces = mesh.faces[on_top[mesh.faces].all(axis=1)]
    missed = element.sphere_radius - np.linalg.norm(top[faces].mean(axis=1), axis=1)
    assert 0.2 * TOLERANCE < missed.max() <= TOLERANCE
    assert missed.min() > -1e-12


def test_corner_of_a_well_is_filled_to_a_sharp_edge():
    element = VESSELS["well with corners"]
    outline = wall_outline(meridian(element), -1, element.wall, TOLERANCE)
    corner = (element.radius + element.wall, -element.depth - element.wall)
    assert np.abs(outline.points - corner).max(axis=1).min() < 1e-12


@pytest.mark.parametrize(
    ("element", "words"),
    [
        (
            Well(id="w", rim_fillet=0.002),
            r"wall of 3\.00 mm folds over itself at s = .* radius of 2\.00 mm; make the wall",
        ),
        (Bowl(id="b", sphere_radius=0.05, rim_radius=0.049, wall=0.003), None),
        (Dome(id="d", sphere_radius=0.05, rim_radius=0.04, wall=0.06), r"folds over itself"),
    ],
)
def test_wall_thicker_than_the_radius_it_bends_round_is_refused(element, words):
    if words is None:
        assert inspect(built(element)).good
        return
    with pytest.raises(PartRefusedError, match=words):
        built(element)


def test_wall_that_reaches_past_the_axis_is_refused():
    inward = profiles.line((0.05, 0.0), (0.002, -0.1))
    with pytest.raises(PartRefusedError, match=r"past the axis at s = .* mm; make the wall thinner than 10\.00 mm"):
        wall_outline(inward, 1, 0.01, TOLERANCE)


def test_profile_that_turns_back_on_itself_is_refused():
    back = profiles.joined([profiles.line((0.1, 0.0), (0.1, -0.1)), profiles.line((0.1, -0.1), (0.101, 0.0))])
    with pytest.raises(PartRefusedError, match="turns back on itself at s = 100.0 mm"):
        wall_outline(back, -1, 0.002, TOLERANCE)


def test_wall_that_meets_itself_is_refused():
    hook = profiles.joined(
        [
            profiles.line((0.1, 0.0), (0.1, -0.1)),
            profiles.line((0.1, -0.1), (0.11, -0.1)),
            profiles.line((0.11, -0.1), (0.11, 0.0)),
        ]
    )
    with pytest.raises(PartRefusedError, match=r"meets itself between the corners at s = 100\.0 mm and s = 110\.0 mm"):
        wall_outline(hook, -1, 0.008, TOLERANCE)


def test_wall_that_meets_itself_further_on_is_refused():
    """A cone that opens, then a lid that comes down into the wall: no corner is near, the sides still cross."""
    spike = profiles.joined(
        [
            profiles.line((0.1, 0.0), (0.1, -0.1)),
            profiles.line((0.1, -0.1), (0.15, -0.1)),
            profiles.line((0.15, -0.1), (0.104, -0.03)),
        ]
    )
    with pytest.raises(PartRefusedError, match="its wall meets itself at s = "):
        wall_outline(spike, -1, 0.006, TOLERANCE)


def test_profile_of_too_many_rings_is_refused():
    with pytest.raises(PartRefusedError, match="rings, more than 4000; raise the tolerance"):
        built(Bowl(id="b", sphere_radius=500.0, rim_radius=400.0), tolerance=1e-6)


# -- plates ---------------------------------------------------------------------------------------
def test_plate_hangs_below_its_top_face():
    mesh = plate(FACE, 0.004)
    assert inspect(mesh).good
    assert mesh.volume() == pytest.approx(0.3 * 0.2 * 0.004, rel=ROUNDING)
    height = (mesh.vertices - FACE.origin) @ np.cross(FACE.along, FACE.left)
    assert np.sort(height) == pytest.approx([-0.004] * 4 + [0.0] * 4, abs=1e-15)


def test_hole_of_a_plate_is_circumscribed():
    radius = 0.015
    mesh = plate(FACE, 0.004, (0.1, 0.02, radius), TOLERANCE)
    report = inspect(mesh)
    assert report.good and report.euler == 0
    m = len(mesh.vertices) // 2 - 4
    hole = m * radius**2 * math.tan(math.pi / m)
    assert mesh.volume() == pytest.approx((0.3 * 0.2 - hole) * 0.004, rel=ROUNDING)
    assert 0.0 < math.sqrt(hole / math.pi) - radius < TOLERANCE


@pytest.mark.parametrize("hole", [(0.01, 0.0, 0.015), (0.1, 0.09, 0.015), (0.35, 0.0, 0.001)])
def test_hole_that_reaches_the_edge_is_refused(hole):
    with pytest.raises(PartRefusedError, match="reaches past the edge.* make the hole smaller or move it inward"):
        plate(FACE, 0.004, hole)


@pytest.mark.parametrize(("drop", "near"), [(0.02, 0.01), (0.1, 0.04), (0.0, 0.0)])
def test_tray_volume_and_near_wall(drop, near):
    wall, depth = 0.0016, 0.04
    mesh = tray(FACE, depth, drop, wall)
    assert inspect(mesh).problems == ()
    length, width = 0.3, 0.2
    floor = (length + 2 * wall) * (width + 2 * wall) * wall
    walls = (width + 2 * wall) * wall * (depth + near) + 2 * length * wall * depth
    assert mesh.volume() == pytest.approx(floor + walls, rel=1e-11)
