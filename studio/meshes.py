"""Light surfaces of the elements for a quick look in space, with exact normals; arrays only, no Qt.

What is made for files (`engine.fabrication`) is exact and closed; here a tube is its outside only, a vessel its running
surface, and the steps are as coarse as the eye allows.
"""

import math
from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from engine.errors import PartRefusedError
from engine.fabrication.solid import build_solid
from engine.geometry.tables import D1, DOWN, R
from engine.model.design import Process
from engine.model.elements import SegmentBase, Trough
from engine.placement import Layout, Placed
from studio.display import Array

Floats = NDArray[np.float32]
Triangles = NDArray[np.uint32]

STATION_TURN = 0.15
"""rad. Rings of a tube stand this far apart along a bend."""
RING_SIDES, TROUGH_SIDES, VESSEL_SIDES = 16, 12, 48
MERIDIAN_ROWS = 28
CACHE_SIZE = 4000


class Surface(NamedTuple):
    """Triangles with a normal at each corner.

    `vertices`, `normals` (n, 3) float32, m; `faces` (m, 3) uint32; `clear` whether one looks through it.
    """

    vertices: Floats
    normals: Floats
    faces: Triangles
    clear: bool


class Shape(NamedTuple):
    """An element in space: surfaces, and lines (k, 2, 3) float32 of its rims."""

    surfaces: tuple[Surface, ...]
    rims: Floats


class Stage(NamedTuple):
    """Everything to show: one opaque and one clear surface, the element (index in the layout) of each corner, rims."""

    solid: Surface
    solid_element: NDArray[np.int64]
    clear: Surface
    clear_element: NDArray[np.int64]
    rims: Floats
    rim_element: NDArray[np.int64]


NOTHING = Surface(np.zeros((0, 3), np.float32), np.zeros((0, 3), np.float32), np.zeros((0, 3), np.uint32), False)


class Meshes:
    """Shapes of elements, kept while neither they nor their places change."""

    def __init__(self) -> None:
        self._kept: dict[tuple[object, ...], Shape] = {}
        self.made = 0

    def shape(self, entry: Placed, process: Process) -> Shape:
        """Shape of one element."""
        key = (entry.element, process, entry.bore, *_numbers(entry))
        if key not in self._kept:
            if len(self._kept) > CACHE_SIZE:
                self._kept.clear()
            self._kept[key] = shape_of(entry, process)
            self.made += 1
        return self._kept[key]

    def stage(self, layout: Layout) -> Stage:
        """All shapes of a layout in one."""
        shapes = [(entry.index, self.shape(entry, layout.design.process)) for entry in layout.placed]
        pairs = [(index, surface) for index, shape in shapes for surface in shape.surfaces]
        solid, solid_element = merged([pair for pair in pairs if not pair[1].clear])
        clear, clear_element = merged([pair for pair in pairs if pair[1].clear])
        rims = [shape.rims for _, shape in shapes]
        counts = [len(part) for part in rims]
        return Stage(
            solid,
            solid_element,
            clear,
            clear_element,
            np.concatenate(rims) if rims else np.zeros((0, 2, 3), np.float32),
            np.repeat(np.array([index for index, _ in shapes], dtype=np.int64), counts),
        )


def _numbers(entry: Placed) -> tuple[bytes, ...]:
    """Where an element stands, as a key."""
    inlet = entry.inlet
    arrays = (inlet.position, inlet.tangent, inlet.down, entry.origin, entry.axis)
    return tuple(array.tobytes() for array in arrays if array is not None)


def merged(parts: Sequence[tuple[int, Surface]]) -> tuple[Surface, NDArray[np.int64]]:
    """Surfaces in one, and the element of each of its corners."""
    if not parts:
        return NOTHING, np.zeros(0, dtype=np.int64)
    surfaces = [surface for _, surface in parts]
    counts = np.array([len(surface.vertices) for surface in surfaces])
    starts = np.concatenate([[0], np.cumsum(counts)[:-1]])
    faces = [surface.faces + np.uint32(start) for surface, start in zip(surfaces, starts, strict=True)]
    whole = Surface(
        np.concatenate([surface.vertices for surface in surfaces]),
        np.concatenate([surface.normals for surface in surfaces]),
        np.concatenate(faces),
        surfaces[0].clear,
    )
    return whole, np.repeat(np.array([index for index, _ in parts], dtype=np.int64), counts)


# -- elements -------------------------------------------------------------------------------------
def shape_of(entry: Placed, process: Process) -> Shape:
    """Shape of one element where it stands."""
    if entry.curve is not None and isinstance(entry.element, SegmentBase):
        return _track(entry.curve, entry.element)
    if entry.meridian is not None:
        return _vessel(entry)
    if entry.plate is not None:
        return _plate(entry, process)
    return Shape((), np.zeros((0, 2, 3), np.float32))


def stations(curve: Array) -> Array:
    """Rows of a curve table no further apart than can be seen."""
    turn = np.sqrt((np.diff(curve[:, D1], axis=0) ** 2).sum(axis=1))
    bins = np.floor(np.concatenate([[0.0], np.cumsum(turn)]) / STATION_TURN)
    kept = np.concatenate([[True], bins[1:] != bins[:-1]])
    kept[-1] = True
    return curve[kept]


def _track(curve: Array, element: SegmentBase) -> Shape:
    rows, section = stations(curve), element.section
    inside, outside = 0.5 * section.bore, 0.5 * section.bore + section.wall
    if isinstance(section, Trough):
        reach = section.lip_angle
        turn = np.linspace(-reach, reach, TROUGH_SIDES + 1)
        inner, outer = _swept(rows, inside, turn, -1.0), _swept(rows, outside, turn, 1.0)
        lips = tuple(_lip(rows, (inside, outside), sense * reach, sense) for sense in (-1.0, 1.0))
        ends = [_arc(rows[place], radius, turn) for place in (0, -1) for radius in (inside, outside)]
        return Shape((inner, outer, *lips), polylines(ends))
    turn = np.linspace(0.0, 2.0 * math.pi, RING_SIDES + 1)
    ends = [_arc(rows[place], radius, turn) for place in (0, -1) for radius in (inside, outside)]
    return Shape((_swept(rows, outside, turn, 1.0)._replace(clear=True),), polylines(ends))


def _spokes(rows: Array, turn: Array) -> Array:
    """Unit vectors (n, k, 3) from the centreline at wall angles (k,)."""
    down, side = rows[:, DOWN], np.cross(rows[:, D1], rows[:, DOWN])
    return np.asarray(np.cos(turn)[None, :, None] * down[:, None] + np.sin(turn)[None, :, None] * side[:, None])


def _swept(rows: Array, radius: float, turn: Array, sense: float) -> Surface:
    """Part of a tube of one radius between wall angles; normals away from (+1) or toward (-1) the centreline."""
    spokes = _spokes(rows, turn)
    return grid(rows[:, None, R] + radius * spokes, sense * spokes, flip=sense < 0.0)


def _lip(rows: Array, radii: tuple[float, float], angle: float, sense: float) -> Surface:
    """Edge of a trough."""
    spokes = _spokes(rows, np.array([angle]))
    points = rows[:, None, R] + np.array(radii)[None, :, None] * spokes
    across = sense * _spokes(rows, np.array([angle + 0.5 * math.pi]))
    return grid(points, np.broadcast_to(across, points.shape), flip=sense > 0.0)


def _arc(row: Array, radius: float, turn: Array) -> Array:
    return np.asarray(row[R] + radius * _spokes(row[None], turn)[0])


def _vessel(entry: Placed) -> Shape:
    """Running surface of a vessel, looked through, with its rim and throat as lines."""
    meridian, origin, axis = entry.meridian, entry.origin, entry.axis
    if meridian is None or origin is None or axis is None:
        raise TypeError("only a vessel has a meridian")
    rows = meridian[np.unique(np.linspace(0, len(meridian) - 1, MERIDIAN_ROWS).round().astype(np.int64))]
    rows = rows[np.append(np.diff(rows[:, 0]) > 0.0, True)]
    first, second = _across(axis)
    azimuth = np.linspace(0.0, 2.0 * math.pi, VESSEL_SIDES + 1)
    circle = np.outer(np.cos(azimuth), first) + np.outer(np.sin(azimuth), second)
    points = origin + rows[:, None, 1:2] * circle[None] + rows[:, None, 2:3] * axis
    normals = entry.side * (-rows[:, None, 4:5] * circle[None] + rows[:, None, 3:4] * axis)
    surface = grid(points, normals, flip=entry.side > 0)._replace(clear=True)
    rims = [points[place] for place in (0, -1) if rows[place, 1] > 1e-6]
    return Shape((surface,), polylines(rims))


def _across(axis: Array) -> tuple[Array, Array]:
    """Two unit vectors (3,) across an axis."""
    reference = np.array([0.0, 0.0, 1.0]) if abs(axis[2]) < 0.9 else np.array([1.0, 0.0, 0.0])
    first = np.cross(axis, reference)
    first = first / math.sqrt(first @ first)
    return first, np.cross(axis, first)


def _plate(entry: Placed, process: Process) -> Shape:
    """Deck or tray, flat faces; what cannot be made is not shown."""
    try:
        mesh = build_solid(entry, process, coarse=True)
    except PartRefusedError:
        return Shape((), np.zeros((0, 2, 3), np.float32))
    corners = mesh.vertices[mesh.faces]
    normal = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    normal /= np.maximum(np.sqrt((normal * normal).sum(axis=1)), 1e-30)[:, None]
    flat = np.repeat(normal, 3, axis=0)
    faces = np.arange(3 * len(corners), dtype=np.uint32).reshape(-1, 3)
    surface = Surface(corners.reshape(-1, 3).astype(np.float32), flat.astype(np.float32), faces, False)
    plate = entry.plate
    if plate is None:
        return Shape((surface,), np.zeros((0, 2, 3), np.float32))
    half, far = 0.5 * plate.width * plate.left, plate.length * plate.along
    near = plate.origin
    return Shape((surface,), polylines([np.stack([near - half, near + half, near + far + half, near + far - half, near - half])]))


# -- pieces ---------------------------------------------------------------------------------------
def grid(points: Array, normals: Array, *, flip: bool = False) -> Surface:
    """Surface through a grid of points (n, k, 3) with normals alike, two triangles a cell."""
    n, k = points.shape[:2]
    number = np.arange(n * k, dtype=np.uint32).reshape(n, k)
    a, b, c, d = number[:-1, :-1], number[:-1, 1:], number[1:, 1:], number[1:, :-1]
    cells = np.stack([a, b, c, a, c, d], axis=-1).reshape(-1, 3)
    faces = cells[:, ::-1] if flip else cells
    return Surface(
        np.ascontiguousarray(points.reshape(-1, 3), dtype=np.float32),
        np.ascontiguousarray(normals.reshape(-1, 3), dtype=np.float32),
        np.ascontiguousarray(faces),
        False,
    )


def polylines(lines: Sequence[Array]) -> Floats:
    """Lines as pieces (m, 2, 3)."""
    pieces = [np.stack([line[:-1], line[1:]], axis=1) for line in lines]
    return np.concatenate(pieces).astype(np.float32) if pieces else np.zeros((0, 2, 3), np.float32)


def sphere(rows: int = 14, columns: int = 20) -> tuple[Surface, NDArray[np.bool_]]:
    """Unit sphere, and which corners are in the dark ones of eight sectors, so that one sees it turn."""
    polar = np.linspace(0.0, math.pi, rows + 1)[:, None]
    azimuth = np.linspace(0.0, 2.0 * math.pi, columns + 1)[None]
    points = np.stack([np.sin(polar) * np.cos(azimuth), np.sin(polar) * np.sin(azimuth), np.cos(polar) + 0.0 * azimuth], -1)
    corners = points.reshape(-1, 3)
    sectors = (corners > 1e-9).sum(axis=1) % 2 == 0
    return grid(points, points), sectors


def pick(origin: Array, ray: Array, surface: Surface) -> tuple[float, int]:
    """Distance (m) along a ray to the first triangle it meets and the corner it belongs to; inf and -1 for none.

    Moeller and Trumbore: solve origin + t ray = a + u (b - a) + v (c - a) for every triangle at once.
    """
    if len(surface.faces) == 0:
        return math.inf, -1
    a, b, c = (surface.vertices[surface.faces[:, corner]].astype(np.float64) for corner in range(3))
    one, two = b - a, c - a
    across = np.cross(ray, two)
    size = (one * across).sum(axis=1)
    size = np.where(np.abs(size) < 1e-15, np.inf, size)
    away = origin - a
    u = (away * across).sum(axis=1) / size
    turned = np.cross(away, one)
    v = (turned @ ray) / size
    t = (two * turned).sum(axis=1) / size
    met = (u >= 0.0) & (v >= 0.0) & (u + v <= 1.0) & (t > 1e-6)
    if not met.any():
        return math.inf, -1
    nearest = int(np.argmin(np.where(met, t, np.inf)))
    return float(t[nearest]), int(surface.faces[nearest, 0])
