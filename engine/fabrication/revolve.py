"""Solids of revolution (funnel, well, bowl, dome) and plates (deck, tray).

The wall is laid off normal to the meridian, away from the ball; at a corner both offset lines are drawn on to where
they meet. Whatever faces the axis is circumscribed, so that its flats touch the true circle and leave the full bore;
what faces away is inscribed. With m steps round the axis a polygon (rho, z) of area A and centroid rho_c encloses m
sin(2 pi/m) rho_c A.
"""

import math
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from engine.errors import PartRefusedError
from engine.fabrication.mesh import Array, Faces, Mesh, band, blocks
from engine.fabrication.sweep import MOST_TRIANGLES, RING_SHARE, ROUNDING, finest, ring_count
from engine.geometry.profiles import at_length, smooth_parts

SHARPEST_CORNER = 0.1
"""1 + cos of the turn at a corner below which its offset lines meet too far off (a turn of 154 degrees)."""
ON_AXIS = 1e-9
"""m. A point nearer to the axis than this lies on it."""
SHORTEST_PART = 1e-8
"""m. A smooth part of a meridian shorter than this (a fillet of nothing) is left out: what meets there is a corner."""
BEND_SAMPLES = 8
"""Places per piece of a meridian where its curvature is read."""
MOST_RINGS = 4000
"""Points of a profile at most; each side is compared with every other."""
NEAR_WALL_SHARE = 0.5
"""Height of a tray's near wall as a share of its drop: it stays below the outlet that the ball comes from."""


class Outline(NamedTuple):
    """Closed polygon in the half plane of the meridian, m.

    `points` (k, 2): rho and z, counter-clockwise; `places` (k,): profile length each belongs to, m;
    `faces_axis` (k,): whether the point is on the skin that faces the axis.
    """

    points: Array
    places: Array
    faces_axis: NDArray[np.bool_]


class Stand(NamedTuple):
    """Where a surface of revolution stands: `origin` (3,) m and unit `axis` (3,)."""

    origin: Array
    axis: Array


# -- outline --------------------------------------------------------------------------------------
def wall_outline(meridian: Array, side: int, wall: float, tolerance: float) -> Outline:
    """Cross section of a wall of thickness `wall` (m) along a meridian (p, 7).

    Parameters
    ----------
    meridian : (p, 7)
        Running surface, m.
    side : int
        +1: the ball is on the left of the meridian, -1: on its right. The wall grows the other way.
    wall, tolerance : float
        m.

    Raises
    ------
    PartRefusedError
        When the wall folds over at a tight bend, reaches past the axis or meets itself.
    """
    places, line, normals = _sampled(meridian, wall, RING_SHARE * finest(tolerance, wall))
    _check_bends(meridian, side, wall)
    before, after = normals
    spread = 1.0 + (before * after).sum(axis=1)
    if spread.min() < SHARPEST_CORNER:
        s = places[int(spread.argmin())]
        raise PartRefusedError(
            f"its profile turns back on itself at s = {s * 1e3:.1f} mm; round the corner or open it."
        )
    other = line - side * wall * (before + after) / spread[:, None]
    low = int(other[:, 0].argmin())
    if other[low, 0] < -ON_AXIS:
        raise PartRefusedError(
            f"its wall reaches {-other[low, 0] * 1e3:.2f} mm past the axis at s = {places[low] * 1e3:.1f} mm; "
            f"make the wall thinner than {wall * 1e3:.2f} mm or the profile wider there."
        )
    _check_folds(places, line, other)
    return _closed(places, line, other)


def _check_folds(places: Array, line: Array, other: Array) -> None:
    """Refuse a side whose offset runs backward: two corners nearer to each other than the wall is thick."""
    ahead = (np.diff(line, axis=0) * np.diff(other, axis=0)).sum(axis=1)
    worst = int(ahead.argmin())
    if ahead[worst] < 0.0:
        raise PartRefusedError(
            f"its wall meets itself between the corners at s = {places[worst] * 1e3:.1f} mm and "
            f"s = {places[worst + 1] * 1e3:.1f} mm; make the wall thinner or move the corners apart."
        )


def _sampled(meridian: Array, wall: float, small: float) -> tuple[Array, Array, tuple[Array, Array]]:
    """Profile lengths (n,), points (n, 2), left normals before and after each (n, 2); chords within `small`."""
    places, points, tangents = [], [], []
    for part in smooth_parts(meridian):
        if part[-1, 0] - part[0, 0] < SHORTEST_PART:
            continue
        s = _meridian_places(part, wall, small)
        point, slope, _ = at_length(part, s)
        places.append(s)
        points.append(point)
        tangents.append(slope / np.hypot(slope[:, 0], slope[:, 1])[:, None])
    if not places:
        raise PartRefusedError("its profile has no length; give it a depth or another radius.")
    s, line, tangent = np.concatenate(places), np.concatenate(points), np.concatenate(tangents)
    normal = np.stack([-tangent[:, 1], tangent[:, 0]], axis=1)
    first = np.concatenate([[True], np.diff(s) > 0.0])
    last = np.append(first[1:], True)
    line = line[first]
    line[np.abs(line[:, 0]) < ON_AXIS, 0] = 0.0
    return s[first], line, (normal[first], normal[last])


def _meridian_places(part: Array, wall: float, small: float) -> Array:
    """Profile lengths (n,) on one smooth part so that (k + w k^2) ds^2 / 8 <= `small`, steps of equal error."""
    s = _between_knots(part)
    bend = at_length(part, s)[2]
    curvature = np.hypot(bend[:, 0], bend[:, 1])
    density = np.sqrt((curvature + wall * curvature**2) / (8.0 * small)) + 1e-6 / (s[-1] - s[0])
    total = np.concatenate([[0.0], np.cumsum(0.5 * (density[1:] + density[:-1]) * np.diff(s))])
    count = max(1.0, np.ceil(total[-1] - ROUNDING))
    if count > MOST_RINGS:
        raise PartRefusedError(
            f"its profile needs {count:.3g} rings, more than {MOST_RINGS}; "
            "raise the tolerance of a chord or make it smaller."
        )
    places = np.interp(np.linspace(0.0, total[-1], int(count) + 1), total, s)
    places[0], places[-1] = s[0], s[-1]
    return places


def _between_knots(part: Array) -> Array:
    knots = part[:, 0]
    share = np.arange(BEND_SAMPLES) / BEND_SAMPLES
    return np.append((knots[:-1, None] + np.diff(knots)[:, None] * share).ravel(), knots[-1])


def _check_bends(meridian: Array, side: int, wall: float) -> None:
    """Refuse a wall thicker than the radius it bends round: J = 1 - k w > 0, k positive toward the wall."""
    for part in smooth_parts(meridian):
        if part[-1, 0] - part[0, 0] < SHORTEST_PART:
            continue
        s = _between_knots(part)
        _, slope, bend = at_length(part, s)
        toward = -side * (slope[:, 0] * bend[:, 1] - slope[:, 1] * bend[:, 0])
        worst = int(toward.argmax())
        if 1.0 - wall * toward[worst] <= 0.0:
            raise PartRefusedError(
                f"its wall of {wall * 1e3:.2f} mm folds over itself at s = {s[worst] * 1e3:.1f} mm, where the profile "
                f"bends round a radius of {1e3 / toward[worst]:.2f} mm; "
                "make the wall thinner than that or the radius larger."
            )


def _closed(places: Array, line: Array, other: Array) -> Outline:
    """Counter-clockwise polygon of a running surface and the other face of its wall."""
    other[np.abs(other[:, 0]) < ON_AXIS, 0] = 0.0
    points = np.concatenate([line, other[::-1]])
    along = np.concatenate([places, places[::-1]])
    facing = np.concatenate(
        [np.full(len(line), _nearer_axis(line, other)), np.full(len(line), not _nearer_axis(line, other))]
    )
    if _signed_area(points) < 0.0:
        points, along, facing = points[::-1].copy(), along[::-1].copy(), facing[::-1].copy()
    _check_simple(points, along)
    return Outline(points, along, facing)


def _nearer_axis(line: Array, other: Array) -> bool:
    """Whether a running surface is the skin that faces the axis."""
    return float((other[:, 0] - line[:, 0]).sum()) >= 0.0


def _signed_area(points: Array) -> float:
    x, y = points[:, 0], points[:, 1]
    return 0.5 * float((x * np.roll(y, -1) - np.roll(x, -1) * y).sum())


def _check_simple(points: Array, places: Array) -> None:
    """Refuse a polygon that crosses itself: each side against all later ones that it does not share a corner with."""
    start, end = points, np.roll(points, -1, axis=0)
    k = len(points)
    for i in range(k - 2):
        later = slice(i + 2, k - 1 if i == 0 else k)
        a, b = start[later], end[later]
        first, second = _turn(start[i], end[i], a), _turn(start[i], end[i], b)
        third, fourth = _turn_each(a, b, start[i]), _turn_each(a, b, end[i])
        crossed = (first * second < 0.0) & (third * fourth < 0.0)
        if crossed.any():
            raise PartRefusedError(
                f"its wall meets itself at s = {places[i] * 1e3:.1f} mm; "
                "make the wall thinner or the profile straighter there."
            )


def _turn(a: Array, b: Array, points: Array) -> Array:
    """Twice the signed area of (a, b, p) for points p (n, 2)."""
    return np.asarray((b[0] - a[0]) * (points[:, 1] - a[1]) - (b[1] - a[1]) * (points[:, 0] - a[0]))


def _turn_each(a: Array, b: Array, point: Array) -> Array:
    """Twice the signed area of (a_i, b_i, p) for sides (n, 2)."""
    along = b - a
    return np.asarray(along[:, 0] * (point[1] - a[:, 1]) - along[:, 1] * (point[0] - a[:, 0]))


# -- solid ----------------------------------------------------------------------------------------
def revolve(outline: Outline, stand: Stand, tolerance: float) -> Mesh:
    """Solid of an outline turned about an axis; points on the axis become single vertices.

    Parameters
    ----------
    outline : Outline
    stand : Stand
        Origin and axis.
    tolerance : float
        Largest distance between solid and surface, m; half of it is spent round the axis.
    """
    m = ring_count(float(outline.points[:, 0].max()), RING_SHARE * tolerance)
    if 2.0 * m * len(outline.points) > MOST_TRIANGLES:
        raise PartRefusedError("it needs too many triangles; raise the tolerance of a chord or make the wall thicker.")
    rho = np.where(outline.faces_axis, outline.points[:, 0] / math.cos(math.pi / m), outline.points[:, 0])
    pole = rho == 0.0
    count = np.where(pole, 1, m)
    first = np.cumsum(count) - count
    place = np.repeat(np.arange(len(rho)), count)
    angle = 2.0 * math.pi / m * (np.arange(len(place)) - first[place])
    across, ahead = _plane_axes(stand.axis)
    spoke = np.cos(angle)[:, None] * across + np.sin(angle)[:, None] * ahead
    vertices = stand.origin + rho[place, None] * spoke + outline.points[place, 1, None] * stand.axis
    return Mesh(vertices, _revolved_faces(first, pole, m), outline.places[place])


def wall_of_revolution(meridian: Array, stand: Stand, side: int, wall: float, tolerance: float) -> Mesh:
    """Solid wall of a vessel: `wall_outline` turned about its axis."""
    fine = finest(tolerance, wall)
    return revolve(wall_outline(meridian, side, wall, fine), stand, fine)


def _plane_axes(axis: Array) -> tuple[Array, Array]:
    """Two unit vectors (3,) normal to an axis, right-handed with it."""
    seed = np.zeros(3)
    seed[int(np.abs(axis).argmin())] = 1.0
    across = np.cross(axis, seed)
    across = across / math.sqrt(across @ across)
    return across, np.cross(axis, across)


def _revolved_faces(first: NDArray[np.int64], pole: NDArray[np.bool_], m: int) -> Faces:
    """Triangles between neighbouring rings, fans at poles, nothing between two poles."""
    following, pole_after = np.roll(first, -1), np.roll(pole, -1)
    round_ = np.arange(m, dtype=np.int64)
    both = ~pole & ~pole_after
    parts = [band(first[both, None] + round_, following[both, None] + round_, closed=True)]
    parts += [_fan(first[i] + round_, following[i], True) for i in np.flatnonzero(~pole & pole_after)]
    parts += [_fan(following[i] + round_, first[i], False) for i in np.flatnonzero(pole & ~pole_after)]
    return np.concatenate(parts)


def _fan(ring: NDArray[np.int64], tip: np.int64, above: bool) -> Faces:
    """Triangles between a ring and a tip that follows it in the outline (`above`) or comes before it."""
    after = np.roll(ring, -1)
    ends = (ring, after) if above else (after, ring)
    return np.stack([*ends, np.full(len(ring), tip)], axis=1).astype(np.int32)


# -- plates ---------------------------------------------------------------------------------------
class Face(NamedTuple):
    """Top of a plate: `origin` (3,) middle of its near edge, unit `along` and `left` (3,), `length` and `width`, m."""

    origin: Array
    along: Array
    left: Array
    length: float
    width: float


def plate(
    face: Face, thickness: float, hole: tuple[float, float, float] | None = None, tolerance: float = 1e-4
) -> Mesh:
    """Plate below its top face; `hole` = (along, left, radius) is round, circumscribed, and must lie inside, m."""
    half = 0.5 * face.width
    if hole is None:
        edges = [np.array([0.0, face.length]), np.array([-half, half]), np.array([-thickness, 0.0])]
        return _stood(blocks(edges, np.ones((1, 1, 1), dtype=np.bool_)), face)
    corners = np.array([[face.length, half], [0.0, half], [0.0, -half], [face.length, -half]])
    room = min(hole[0], face.length - hole[0], half - abs(hole[1]))
    quarter = math.ceil(ring_count(hole[2], RING_SHARE * tolerance) / 4)
    radius = hole[2] / math.cos(math.pi / (4 * quarter))
    if not 0.0 < radius < room:
        raise PartRefusedError(
            f"its hole of radius {hole[2] * 1e3:.2f} mm reaches past the edge, {room * 1e3:.2f} mm from its middle; "
            "make the hole smaller or move it inward."
        )
    angle = 0.5 * math.pi * np.arange(4 * quarter) / quarter
    ring = np.array(hole[:2]) + radius * np.stack([np.cos(angle), np.sin(angle)], axis=1)
    flat = np.concatenate([corners, ring])
    top = np.column_stack([flat, np.zeros(len(flat))])
    vertices = np.concatenate([top, top - (0.0, 0.0, thickness)])
    return _stood(Mesh(vertices, _holed_faces(quarter), np.zeros(len(vertices))), face)


def _holed_faces(quarter: int) -> Faces:
    """Triangles of a rectangle, corners counter-clockwise from +x +y, with a ring of 4 `quarter` points; its sides."""
    n = 4 + 4 * quarter
    ring = 4 + np.arange(4 * quarter, dtype=np.int64)
    corner = np.repeat(np.arange(4, dtype=np.int64), quarter)
    fans = np.stack([corner, np.roll(ring, -1), ring], axis=1)
    ends = np.arange(4, dtype=np.int64)
    sides = np.stack([ends, np.roll(ends, -1), ring[(ends + 1) % 4 * quarter]], axis=1)
    top = np.concatenate([fans, sides])
    outer = band((ends + n)[None], ends[None], closed=True)
    inner = band(ring[::-1][None] + n, ring[::-1][None], closed=True)
    return np.concatenate([top, top[:, ::-1] + n, outer, inner]).astype(np.int32)


def tray(face: Face, depth: float, drop: float, wall: float) -> Mesh:
    """Open box: walls `wall` thick outside the floor, `depth` high, the near one below the outlet (see the share)."""
    half, near = 0.5 * face.width, min(depth, NEAR_WALL_SHARE * drop)
    heights = np.unique([-wall, 0.0, near, depth])
    edges = [
        np.array([-wall, 0.0, face.length, face.length + wall]),
        np.array([-half - wall, -half, half, half + wall]),
        heights,
    ]
    height = np.full((3, 3), depth)
    height[0], height[1, 1] = near, 0.0
    return _stood(blocks(edges, heights[None, None, 1:] <= height[:, :, None]), face)


def _stood(mesh: Mesh, face: Face) -> Mesh:
    """A mesh drawn with x along, y left, z up, carried to where the face stands."""
    axes = np.stack([face.along, face.left, np.cross(face.along, face.left)])
    return Mesh(face.origin + mesh.vertices @ axes, mesh.faces, mesh.places)
