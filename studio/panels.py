"""Elements as flat panels for a drawing without OpenGL: seen from a direction, sorted by depth. Arrays only, no Qt.

A tube is drawn by its silhouette: from a direction e it shows where its normal is square to e, at c + R m and
c - R m with m = t x e / |t x e|. Troughs, vessels and plates are drawn as the panels they are made of.
"""

import math
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from engine.geometry.tables import D1, DOWN, R
from engine.model.elements import SegmentBase, Trough
from engine.placement import Layout, Placed
from studio.display import Array

STATION_TURN = 0.15
"""rad. Panels of a bend turn this much."""
LONGEST = 0.12
"""m. A straight is cut into panels of at most this length, so that sorting by depth works."""
TROUGH_PANELS, VESSEL_PANELS, VESSEL_ROWS = 4, 40, 12
NONE = -1


class Panels(NamedTuple):
    """Panels (n) of a layout.

    Attributes
    ----------
    corners : (n, 4, 3)
        Corners; for a tube the two ends of its centreline, each twice.
    tangent : (n, 4, 3)
        Tangent at the corners of a tube's panel; zero for others.
    reach : (n, 4)
        Signed radius by which a tube's corner stands off its centreline, m; zero for others.
    normal : (n, 3)
        Normal of a flat panel; zero for tubes.
    edges : (n, 4) int
        Sides that are drawn (side k runs from corner k to k + 1), filled up with -1.
    element : (n,) int
        Index in the layout.
    middle : (n, 3)
    outline : (m, 3)
        Points that hold everything, for fitting.
    """

    corners: Array
    tangent: Array
    reach: Array
    normal: Array
    edges: NDArray[np.int64]
    element: NDArray[np.int64]
    middle: Array
    outline: Array

    def seen(self, eye: Array) -> tuple[Array, Array, Array]:
        """Corners (n, 4, 3) as seen from a direction, light (n,) from 0 to 1, depth (n,) growing toward the eye."""
        across = np.cross(self.tangent, eye)
        size = np.sqrt((across * across).sum(axis=-1, keepdims=True))
        corners = self.corners + self.reach[..., None] * across / np.maximum(size, 1e-9)
        flat = (self.normal * self.normal).sum(axis=1) > 0.5
        facing = np.abs(self.normal @ (0.55 * eye + np.array([0.0, 0.0, 0.6])))
        light = np.where(flat, np.clip(facing, 0.0, 1.0), 0.75)
        return corners, light, self.middle @ eye


def panels_of(layout: Layout) -> Panels:
    """Panels of every element."""
    parts = [part for entry in layout.placed for part in _parts(entry)]
    if not parts:
        none = np.zeros((0, 4, 3))
        flat = np.zeros((0, 3))
        return Panels(none, none, np.zeros((0, 4)), flat, np.zeros((0, 4), np.int64), np.zeros(0, np.int64), flat, flat)
    return Panels(*(np.concatenate(columns) for columns in zip(*parts, strict=True)))


def _parts(entry: Placed) -> list[Panels]:
    """Panels of one element."""
    if entry.curve is not None and isinstance(entry.element, SegmentBase):
        rows = _cut(stations(entry.curve), entry.curve)
        if isinstance(entry.element.section, Trough):
            return [_trough(entry, rows, entry.element.section)]
        return [_tube(entry, rows, 0.5 * entry.element.section.bore + entry.element.section.wall)]
    if entry.meridian is not None:
        return [_vessel(entry)]
    return [_plate(entry)] if entry.plate is not None else []


def stations(curve: Array) -> Array:
    """Rows of a curve table no further apart than can be seen."""
    turn = np.sqrt((np.diff(curve[:, D1], axis=0) ** 2).sum(axis=1))
    bins = np.floor(np.concatenate([[0.0], np.cumsum(turn)]) / STATION_TURN)
    kept = np.concatenate([[True], bins[1:] != bins[:-1]])
    kept[-1] = True
    return curve[kept]


def _cut(rows: Array, curve: Array) -> Array:
    """Rows with long pieces cut up; they are straight, so reading between the ends is exact enough."""
    step = np.diff(rows[:, 0])
    parts = np.maximum(1, np.ceil(step / LONGEST)).astype(np.int64)
    if parts.max(initial=1) == 1:
        return rows
    s = np.concatenate(
        [np.linspace(a, b, n, endpoint=False) for a, b, n in zip(rows[:-1, 0], rows[1:, 0], parts, strict=True)]
    )
    s = np.append(s, rows[-1, 0])
    return np.stack([np.interp(s, curve[:, 0], curve[:, column]) for column in range(curve.shape[1])], axis=1)


def _tube(entry: Placed, rows: Array, radius: float) -> Panels:
    """Silhouette strips of a tube; their long sides are drawn, and the ends of the whole."""
    place, tangent = rows[:, R], rows[:, D1]
    n = len(rows) - 1
    corners = np.stack([place[:-1], place[1:], place[1:], place[:-1]], axis=1)
    tangents = np.stack([tangent[:-1], tangent[1:], tangent[1:], tangent[:-1]], axis=1)
    reach = np.tile([radius, radius, -radius, -radius], (n, 1))
    edges = np.tile([0, 2, NONE, NONE], (n, 1)).astype(np.int64)
    edges[0, 2] = 3
    edges[-1, 3] = 1
    outline = np.concatenate([place - radius, place + radius])
    return _made(entry, corners, edges, outline)._replace(tangent=tangents, reach=reach)


def _made(entry: Placed, corners: Array, edges: NDArray[np.int64], outline: Array) -> Panels:
    """Flat panels of an element."""
    n = len(corners)
    normal = np.cross(corners[:, 2] - corners[:, 0], corners[:, 3] - corners[:, 1])
    size = np.sqrt((normal * normal).sum(axis=1, keepdims=True))
    normal = np.where(size > 1e-15, normal / np.maximum(size, 1e-15), 0.0)
    return Panels(
        corners,
        np.zeros((n, 4, 3)),
        np.zeros((n, 4)),
        normal,
        edges,
        np.full(n, entry.index, dtype=np.int64),
        corners.mean(axis=1),
        outline,
    )


def _cells(points: Array) -> Array:
    """Cells (n, 4, 3) of a grid of points (a, b, 3): corners along the first axis, then across."""
    quads = np.stack([points[:-1, :-1], points[1:, :-1], points[1:, 1:], points[:-1, 1:]], axis=2)
    return np.asarray(quads.reshape(-1, 4, 3))


def _trough(entry: Placed, rows: Array, section: Trough) -> Panels:
    """Panels of a trough from lip to lip; the lips and the ends are drawn."""
    turn = np.linspace(-section.lip_angle, section.lip_angle, TROUGH_PANELS + 1)
    down, side = rows[:, DOWN], np.cross(rows[:, D1], rows[:, DOWN])
    spokes = np.cos(turn)[None, :, None] * down[:, None] + np.sin(turn)[None, :, None] * side[:, None]
    points = rows[:, None, R] + (0.5 * section.bore + section.wall) * spokes
    edges = np.full((len(rows) - 1, TROUGH_PANELS, 4), NONE, dtype=np.int64)
    edges[:, 0, 0] = 0
    edges[:, -1, 1] = 2
    edges[0, :, 2] = 3
    edges[-1, :, 3] = 1
    return _made(entry, _cells(points), edges.reshape(-1, 4), points.reshape(-1, 3))


def _vessel(entry: Placed) -> Panels:
    """Panels of a vessel; rim and throat are drawn."""
    meridian, origin, axis = entry.meridian, entry.origin, entry.axis
    if meridian is None or origin is None or axis is None:
        raise TypeError("only a vessel has a meridian")
    s = np.linspace(0.0, meridian[-1, 0], VESSEL_ROWS + 1)
    rho, z = (np.interp(s, meridian[:, 0], meridian[:, column]) for column in (1, 2))
    reference = np.array([0.0, 0.0, 1.0]) if abs(axis[2]) < 0.9 else np.array([1.0, 0.0, 0.0])
    first = np.cross(axis, reference)
    first = first / math.sqrt(first @ first)
    azimuth = np.linspace(0.0, 2.0 * math.pi, VESSEL_PANELS + 1)
    circle = np.outer(np.cos(azimuth), first) + np.outer(np.sin(azimuth), np.cross(axis, first))
    points = origin + rho[:, None, None] * circle[None] + z[:, None, None] * axis
    edges = np.full((VESSEL_ROWS, VESSEL_PANELS, 4), NONE, dtype=np.int64)
    edges[0, :, 0] = 3
    edges[-1, :, 1] = 1
    return _made(entry, _cells(points), edges.reshape(-1, 4), points.reshape(-1, 3))


def _plate(entry: Placed) -> Panels:
    """Top of a deck or tray."""
    if entry.plate is None:
        raise TypeError("only a deck or tray has a plate")
    origin, along, left, length, width = entry.plate
    near = np.stack([origin - 0.5 * width * left, origin + 0.5 * width * left])
    shares = np.linspace(0.0, 1.0, max(2, math.ceil(length / LONGEST) + 1))
    points = near[None] + shares[:, None, None] * (length * along)
    edges = np.tile([0, 2, NONE, NONE], (len(shares) - 1, 1)).astype(np.int64)
    edges[0, 2] = 3
    edges[-1, 3] = 1
    return _made(entry, _cells(points), edges, points.reshape(-1, 3))


def rotated(points: Array, quaternion: Array) -> Array:
    """Points (n, 3) turned by a quaternion (w, x, y, z): p + 2 w (v x p) + 2 v x (v x p)."""
    w, v = quaternion[0], quaternion[1:]
    once = np.cross(v, points)
    return np.asarray(points + 2.0 * w * once + 2.0 * np.cross(v, once))
