"""Elements in space as triangles to look at: coarse, with analytic normals, kept per element until it changes or moves.

Made for the eye only: a tube is its outer face, a vessel its inner face. Parts for the bench: `engine.fabrication`.
"""

import math
from functools import lru_cache
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from engine.geometry.tables import down_at, interpolate
from engine.model.elements import SegmentBase, Trough
from engine.placement import Placed
from studio.display import LEVELS, BallPath, levels_of
from studio.strips import KEPT, Shape, frame_of, profile_points, rings_of, slab_of, stations

Array = NDArray[np.float64]
Single = NDArray[np.float32]
Corners = NDArray[np.uint32]

SIDES = 14
"""Faces round a tube."""
ARC_SIDES = 10
"""Faces along the inner and the outer arc of a trough."""
STATION_TURN = 0.16
"""rad between cross sections in a bend."""
STATION_SPACING = 0.2
"""m between cross sections of a straight piece (a banked one twists between them)."""
VESSEL_SIDES = 48
BALL_RINGS, BALL_SIDES = 14, 24
BAND = 0.24
"""Half width of the light band round the ball, over its radius: it shows how the ball turns."""
PATH_SIDES = 5
PATH_STEP = 0.0025
"""m between drawn points of the path, so that a long roll stays light to draw."""
HIT_MARGIN = 1e-9


class Mesh(NamedTuple):
    """Triangles: vertices and unit normals (n, 3), corners (m, 3); lines (k, 3), two points for each."""

    vertices: Single
    normals: Single
    faces: Corners
    lines: Single


class Solid(NamedTuple):
    """Mesh of one placed element; `kind`: tube, trough, vessel or plate."""

    element: int
    kind: str
    mesh: Mesh


def solid_of(placed: Placed) -> Solid | None:
    """Mesh of an element, kept from last time when neither it nor its place has changed; None for a free jump."""
    shape = Shape(placed)
    if placed.curve is not None and isinstance(placed.element, SegmentBase):
        trough = isinstance(placed.element.section, Trough)
        return Solid(placed.index, "trough" if trough else "tube", segment_mesh(shape))
    if placed.meridian is not None:
        return Solid(placed.index, "vessel", vessel_mesh(shape))
    return Solid(placed.index, "plate", plate_mesh(shape)) if placed.plate is not None else None


# -- segments -------------------------------------------------------------------------------------
class Arc(NamedTuple):
    """Part of a cross section: radius (m), wall angles (k,), +1 for a face that looks outward, -1 inward."""

    radius: float
    angles: Array
    outward: float


@lru_cache(maxsize=KEPT)
def segment_mesh(shape: Shape) -> Mesh:
    """Sweep of the cross section along the centreline."""
    placed = shape.placed
    element, table = placed.element, placed.curve
    assert isinstance(element, SegmentBase) and table is not None
    s = stations(table, STATION_SPACING, STATION_TURN)
    centre, tangent, _ = interpolate(table, s)
    down = down_at(table, s)
    side = np.cross(tangent / np.sqrt((tangent**2).sum(axis=1, keepdims=True)), down)
    section = element.section
    inner, outer = 0.5 * section.bore, 0.5 * section.bore + section.wall
    if isinstance(section, Trough):
        angles = np.linspace(-section.lip_angle, section.lip_angle, ARC_SIDES + 1)
        arcs = [Arc(inner, angles, -1.0), Arc(outer, angles, 1.0)]
    else:
        arcs = [Arc(outer, np.linspace(-math.pi, math.pi, SIDES + 1), 1.0)]
    sheets = [_sheet(centre, down, side, arc) for arc in arcs]
    points = [sheet[0] for sheet in sheets]
    grids = [grid(vertices, normals) for vertices, normals in sheets]
    if isinstance(section, Trough):
        grids += [_lip(points[0][:, edge], points[1][:, edge], tangent) for edge in (0, -1)]
    return joined(grids, _section_lines(points, isinstance(section, Trough)))


def _sheet(centre: Array, down: Array, side: Array, arc: Arc) -> tuple[Array, Array]:
    """Vertices and normals (n, k, 3): r(s) + a (cos phi d + sin phi side), normal along the spoke (exact)."""
    spoke = np.cos(arc.angles)[:, None] * down[:, None, :] + np.sin(arc.angles)[:, None] * side[:, None, :]
    return centre[:, None, :] + arc.radius * spoke, arc.outward * spoke


def _lip(inner: Array, outer: Array, tangent: Array) -> tuple[Array, Array, Corners]:
    """Flat face (n, 2) between inner and outer edge of a trough."""
    vertices = np.stack([inner, outer], axis=1)
    normal = np.cross(tangent, outer - inner)
    normal /= np.maximum(np.sqrt((normal**2).sum(axis=1, keepdims=True)), 1e-12)
    return grid(vertices, np.stack([normal, normal], axis=1))


def _section_lines(points: list[Array], trough: bool) -> Array:
    """Outline at both ends; of a trough also its edges."""
    found = [pairs(rows[end]) for rows in points for end in (0, -1)]
    if trough:
        found += [pairs(rows[:, edge]) for rows in points for edge in (0, -1)]
        found += [np.stack([points[0][end, edge], points[1][end, edge]]) for end in (0, -1) for edge in (0, -1)]
    return np.concatenate(found)


# -- vessels, plates, ball ------------------------------------------------------------------------
@lru_cache(maxsize=KEPT)
def vessel_mesh(shape: Shape) -> Mesh:
    """Meridian turned round its axis; normal (-z', rho') of the meridian carried round."""
    placed = shape.placed
    assert placed.meridian is not None and placed.origin is not None and placed.axis is not None
    profile = profile_points(placed.meridian)
    rows = np.searchsorted(placed.meridian[:, 0], _lengths(placed.meridian, profile))
    slope = placed.meridian[np.minimum(rows, len(placed.meridian) - 1), 3:5]
    turn = np.linspace(0.0, 2.0 * math.pi, VESSEL_SIDES + 1)
    first, second = frame_of(placed.axis)
    around = np.cos(turn)[:, None] * first + np.sin(turn)[:, None] * second
    vertices = placed.origin + profile[:, 0, None, None] * around + (profile[:, 1, None] * placed.axis)[:, None, :]
    normals = -slope[:, 1, None, None] * around + (slope[:, 0, None] * placed.axis)[:, None, :]
    circles = rings_of(shape).circles
    ends = [np.concatenate([circles[end], circles[end][:1]]) for end in (0, -1)]
    return joined([grid(vertices, normals)], np.concatenate([pairs(line) for line in ends]))


def _lengths(meridian: Array, profile: Array) -> Array:
    """Profile length of points that are rows of the meridian."""
    away = np.abs(meridian[None, :, 1:3] - profile[:, None, :]).sum(axis=2)
    return np.asarray(meridian[away.argmin(axis=1), 0])


@lru_cache(maxsize=KEPT)
def plate_mesh(shape: Shape) -> Mesh:
    """Deck as a plate of its thickness; tray as a floor with four walls."""
    slab, axis = slab_of(shape.placed), shape.placed.axis
    assert axis is not None
    top = slab.corners
    other = top + slab.depth * axis
    walls = [np.stack([top[[i, (i + 1) % 4]], other[[i, (i + 1) % 4]]]) for i in range(4)]
    floors = [np.stack([top[[0, 1]], top[[3, 2]]])]
    if slab.depth < 0.0:
        floors.append(np.stack([other[[0, 1]], other[[3, 2]]]))
    grids = []
    for face in floors + walls:
        normal = np.cross(face[0, 1] - face[0, 0], face[1, 0] - face[0, 0])
        normal /= max(math.sqrt(float(normal @ normal)), 1e-12)
        grids.append(grid(face, np.broadcast_to(normal, face.shape)))
    loops = [pairs(np.concatenate([line, line[:1]])) for line in (top, other)]
    return joined(grids, np.concatenate([*loops, np.stack([top, other], axis=1).reshape(-1, 3)]))


def ball_mesh() -> tuple[Mesh, NDArray[np.bool_]]:
    """Unit ball, and which vertices lie on its light band (about the x axis) or on its two caps."""
    polar = np.linspace(0.0, math.pi, BALL_RINGS + 1)
    polar = np.sort(np.concatenate([polar, *(np.arccos([c, c * 0.999, -c, -c * 0.999]) for c in (BAND, 0.93))]))
    turn = np.linspace(0.0, 2.0 * math.pi, BALL_SIDES + 1)
    height = np.cos(polar)
    ring = np.sin(polar)
    x = np.broadcast_to(height[:, None], (len(polar), len(turn)))
    vertices = np.stack([x, ring[:, None] * np.cos(turn), ring[:, None] * np.sin(turn)], axis=2)
    light = (np.abs(x) <= BAND * 0.9995) | (np.abs(x) >= 0.93)
    return joined([grid(vertices, vertices)], np.zeros((0, 3))), light.ravel()


# -- path -----------------------------------------------------------------------------------------
class PathMesh(NamedTuple):
    """Thin tube along the path and the colour level (n,) of each of its vertices."""

    mesh: Mesh
    level: NDArray[np.int64]


def path_mesh(path: BallPath, radius: float, levels: NDArray[np.int64] | None = None) -> PathMesh:
    """Tube of some radius along the way of the ball, by colour level (speed when none are given)."""
    chosen = levels_of(path.speed, path.top_speed, LEVELS) if levels is None else levels
    bins = np.floor(path.developed / PATH_STEP)
    keep = np.concatenate([[True], np.diff(bins) != 0])
    keep[-1] = True
    points, level = path.place[keep], chosen[keep]
    distinct = np.concatenate([[True], (np.diff(points, axis=0) ** 2).sum(axis=1) > 1e-14])
    points, level = points[distinct], level[distinct]
    if len(points) < 2:
        return PathMesh(joined([], np.zeros((0, 3))), np.zeros(0, dtype=np.int64))
    step = np.gradient(points, axis=0)
    tangent = step / np.maximum(np.sqrt((step**2).sum(axis=1, keepdims=True)), 1e-12)
    aside = np.cross(tangent, np.array([0.31, 0.47, 0.83]))
    aside /= np.maximum(np.sqrt((aside**2).sum(axis=1, keepdims=True)), 1e-9)
    down = np.cross(tangent, aside)
    vertices, normals = _sheet(points, down, aside, Arc(radius, np.linspace(-math.pi, math.pi, PATH_SIDES + 1), 1.0))
    mesh = joined([grid(vertices, normals)], np.zeros((0, 3)))
    return PathMesh(mesh, np.repeat(level, PATH_SIDES + 1))


# -- triangles ------------------------------------------------------------------------------------
def grid(vertices: Array, normals: Array) -> tuple[Array, Array, Corners]:
    """Vertices and normals (n, k, 3) flat, and the two triangles of each cell."""
    n, k = vertices.shape[:2]
    place = np.arange(n * k, dtype=np.uint32).reshape(n, k)
    a, b, c, d = place[:-1, :-1], place[1:, :-1], place[1:, 1:], place[:-1, 1:]
    faces = np.stack([a, b, c, a, c, d], axis=-1).reshape(-1, 3)
    return vertices.reshape(-1, 3), normals.reshape(-1, 3), faces


def joined(grids: list[tuple[Array, Array, Corners]], lines: Array) -> Mesh:
    """One mesh of several, triangles turned so that their winding agrees with the normals."""
    if not grids:
        empty = np.zeros((0, 3), dtype=np.float32)
        return Mesh(empty, empty, np.zeros((0, 3), dtype=np.uint32), np.asarray(lines, dtype=np.float32))
    starts = np.cumsum([0, *(len(vertices) for vertices, _, _ in grids)])
    vertices = np.concatenate([part[0] for part in grids])
    normals = np.concatenate([part[1] for part in grids])
    faces = np.concatenate([part[2] + np.uint32(start) for part, start in zip(grids, starts, strict=False)])
    a, b, c = (vertices[faces[:, corner]] for corner in range(3))
    wrong = (np.cross(b - a, c - a) * normals[faces].sum(axis=1)).sum(axis=1) < 0.0
    faces[wrong] = faces[wrong][:, [0, 2, 1]]
    rows = (np.ascontiguousarray(array, dtype=np.float32) for array in (vertices, normals))  # OpenGL takes rows only
    return Mesh(*rows, faces, np.asarray(lines, dtype=np.float32))


def pairs(line: Array) -> Array:
    """Polyline (n, 3) as separate pieces (2 n - 2, 3)."""
    return np.stack([line[:-1], line[1:]], axis=1).reshape(-1, 3)


def hit(solids: list[Solid], start: Array, ray: Array) -> int | None:
    """Element first met by a ray (3,) from a point (3,); None when it meets none.

    Distance t and weights u, v of the corner by Möller and Trumbore, Journal of Graphics Tools 2 (1997) 21-28.
    """
    nearest, found = math.inf, None
    for solid in solids:
        corners = solid.mesh.vertices[solid.mesh.faces].astype(np.float64)
        a, e1, e2 = corners[:, 0], corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]
        p = np.cross(ray, e2)
        det = (e1 * p).sum(axis=1)
        scale = np.where(np.abs(det) > 1e-30, 1.0 / np.where(det == 0.0, 1.0, det), np.inf)
        away = start - a
        with np.errstate(invalid="ignore"):
            u = (away * p).sum(axis=1) * scale
            q = np.cross(away, e1)
            v = (q * ray).sum(axis=1) * scale
            t = (q * e2).sum(axis=1) * scale
            inside = (u >= -HIT_MARGIN) & (v >= -HIT_MARGIN) & (u + v <= 1.0 + HIT_MARGIN) & (t > 0.0)
        if inside.any() and float(t[inside].min()) < nearest:
            nearest, found = float(t[inside].min()), solid.element
    return found
