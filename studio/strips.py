"""Walls cut into short pieces, drawn one over the other: pieces of centreline, circles of vessels, plates."""

import math
from functools import lru_cache
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from engine.geometry.tables import D1, S, down_at, interpolate
from engine.model.elements import SegmentBase, Tray, Trough
from engine.placement import Layout, Placed

Array = NDArray[np.float64]

PIECE_LENGTH = 0.12
"""m. Longest piece."""
PIECE_TURN = 0.8
"""rad. Most turning within a piece."""
PIECE_POINTS = 3
"""Fewest points of a piece."""
ROUND = 72
"""Corners of a circle of a vessel."""
PIECES = 100_000
"""Owner of a piece of element i: i * PIECES + its place within the element."""
KEPT = 4096
"""Pieces of this many placed elements are kept for the next drawing."""


class Strip(NamedTuple):
    """Piece of a segment: centreline, outer and inner radius, lips of a trough; from arc length `low` to `high`, m."""

    element: int
    place: int
    """Number of the piece within its element."""
    centre: Array
    """(k, 3) m"""
    outer: float
    bore: float
    lips: tuple[Array, ...]
    """Two lines (k, 3) for a trough, none for a tube."""
    low: float
    high: float

    @property
    def owner(self) -> int:
        """Number by which the part of the path that lies in it is known."""
        return self.element * PIECES + self.place


class Rings(NamedTuple):
    """Vessel: circles (m, ROUND, 3) from the rim to the throat, m."""

    element: int
    circles: Array

    @property
    def owner(self) -> int:
        """Number by which the part of the path that lies in it is known."""
        return self.element * PIECES


class Slab(NamedTuple):
    """Deck or tray: corners (4, 3) of its top face in order round it, and how deep it is below, m (a tray: above)."""

    element: int
    corners: Array
    depth: float

    @property
    def owner(self) -> int:
        """Number by which the part of the path that lies on it is known."""
        return self.element * PIECES


class Cut(NamedTuple):
    """All pieces of a layout, in its order."""

    strips: tuple[Strip, ...]
    rings: tuple[Rings, ...]
    slabs: tuple[Slab, ...]


def cut(layout: Layout) -> Cut:
    """Pieces of everything placed."""
    strips: list[Strip] = []
    rings: list[Rings] = []
    slabs: list[Slab] = []
    for entry in layout.placed:
        if entry.curve is not None:
            strips += strips_of(Shape(entry))
        elif entry.meridian is not None:
            rings.append(rings_of(Shape(entry)))
        elif entry.plate is not None:
            slabs.append(slab_of(entry))
    return Cut(tuple(strips), tuple(rings), tuple(slabs))


class Shape:
    """A placed element as a key: equal when the element is the same and stands at the same place."""

    def __init__(self, placed: Placed) -> None:
        self.placed = placed
        inlet, origin = placed.inlet, placed.origin
        self._at = (
            placed.index,
            inlet.position.tobytes(),
            inlet.tangent.tobytes(),
            inlet.down.tobytes(),
            b"" if origin is None else origin.tobytes(),
        )
        self._hash = hash((id(placed.element), self._at))

    def __hash__(self) -> int:
        return self._hash

    def __eq__(self, other: object) -> bool:
        return isinstance(other, Shape) and other.placed.element is self.placed.element and other._at == self._at


# -- segments -------------------------------------------------------------------------------------
@lru_cache(maxsize=KEPT)
def strips_of(shape: Shape) -> tuple[Strip, ...]:
    """Pieces of a segment."""
    placed = shape.placed
    element, table = placed.element, placed.curve
    assert isinstance(element, SegmentBase) and table is not None
    s = stations(table, PIECE_LENGTH / (PIECE_POINTS - 1))
    centre = interpolate(table, s)[0]
    bore = 0.5 * element.section.bore
    lips = lip_lines(element, table, s, centre)
    ends = _ends(table, s)
    return tuple(
        Strip(
            placed.index,
            place,
            centre[a : b + 1],
            bore + element.section.wall,
            bore,
            tuple(line[a : b + 1] for line in lips),
            float(s[a]),
            float(s[b]),
        )
        for place, (a, b) in enumerate(zip(ends, ends[1:], strict=False))
    )


def stations(table: Array, spacing: float, turn: float = 0.0) -> Array:
    """Arc lengths at which to draw: knots (those closer than `turn` rad left out), long gaps filled to `spacing`, m."""
    knots = table[:, S]
    if turn > 0.0 and len(knots) > 2:
        bend = np.sqrt((np.diff(table[:, D1], axis=0) ** 2).sum(axis=1))
        bins = np.floor(np.concatenate([[0.0], np.cumsum(bend)]) / turn)
        keep = np.concatenate([[True], np.diff(bins) != 0])
        keep[-1] = True
        knots = knots[keep]
    counts = np.maximum(1, np.ceil(np.diff(knots) / spacing - 1e-9).astype(np.int64))
    parts = [np.linspace(a, b, n, endpoint=False) for a, b, n in zip(knots, knots[1:], counts, strict=False)]
    return np.concatenate([*parts, knots[-1:]])


def _ends(table: Array, s: Array) -> list[int]:
    """Places in `s` at which pieces end."""
    tangent = interpolate(table, s)[1]
    bend = np.concatenate([[0.0], np.cumsum(np.sqrt((np.diff(tangent, axis=0) ** 2).sum(axis=1)))])
    count = max(1, math.ceil(float(bend[-1]) / PIECE_TURN), math.ceil(float(s[-1] - s[0]) / PIECE_LENGTH))
    effort = bend / max(float(bend[-1]), 1e-9) + (s - s[0]) / max(float(s[-1] - s[0]), 1e-9)
    places = np.searchsorted(effort, np.linspace(0.0, float(effort[-1]), count + 1)[1:-1])
    return sorted({0, len(s) - 1, *places.tolist()})


def lip_lines(element: SegmentBase, table: Array, s: Array, centre: Array) -> tuple[Array, ...]:
    """Inner edges (n, 3) of a trough's lips, right and left; nothing for a tube."""
    section = element.section
    if not isinstance(section, Trough):
        return ()
    down = down_at(table, s)
    tangent = interpolate(table, s)[1]
    side = np.cross(tangent / np.sqrt((tangent**2).sum(axis=1, keepdims=True)), down)
    angle = section.lip_angle
    return tuple(centre + 0.5 * section.bore * (math.cos(a) * down + math.sin(a) * side) for a in (-angle, angle))


# -- vessels and plates ---------------------------------------------------------------------------
def frame_of(axis: Array) -> tuple[Array, Array]:
    """Two unit vectors that make a right-handed frame with an axis."""
    aside = np.array([1.0, 0.0, 0.0]) if abs(axis[0]) < 0.9 else np.array([0.0, 1.0, 0.0])
    first = np.cross(aside, axis)
    first /= math.sqrt(float(first @ first))
    return first, np.cross(axis, first)


@lru_cache(maxsize=KEPT)
def rings_of(shape: Shape) -> Rings:
    """Circles of a vessel at its profile points, thinned."""
    placed = shape.placed
    assert placed.meridian is not None and placed.origin is not None and placed.axis is not None
    profile = profile_points(placed.meridian)
    turn = np.linspace(0.0, 2.0 * math.pi, ROUND, endpoint=False)
    first, second = frame_of(placed.axis)
    around = np.cos(turn)[:, None] * first + np.sin(turn)[:, None] * second
    circles = placed.origin + profile[:, 0, None, None] * around + (profile[:, 1, None] * placed.axis)[:, None, :]
    return Rings(placed.index, circles)


def profile_points(meridian: Array, turn: float = 0.15, most: int = 14) -> Array:
    """Points (m, 2) of rho, z along a meridian from rim to throat: where it has turned, and at even lengths."""
    s, slope = meridian[:, 0], meridian[:, 3:5]
    bend = np.concatenate([[0.0], np.cumsum(np.sqrt((np.diff(slope, axis=0) ** 2).sum(axis=1)))])
    effort = bend / turn + 4.0 * s / max(float(s[-1]), 1e-9)
    count = int(np.clip(math.ceil(float(effort[-1])), 3, most))
    wanted = np.linspace(0.0, float(effort[-1]), count + 1)
    places = sorted(set(np.clip(np.searchsorted(effort, wanted), 0, len(s) - 1).tolist()) | {0, len(s) - 1})
    return np.asarray(meridian[places, 1:3])


def slab_of(placed: Placed) -> Slab:
    """Corners of a plate; a tray's rim stands `depth` above its floor."""
    plate, element = placed.plate, placed.element
    assert plate is not None
    half, along = 0.5 * plate.width * plate.left, plate.length * plate.along
    corners = np.stack(
        [plate.origin - half, plate.origin + along - half, plate.origin + along + half, plate.origin + half]
    )
    depth = element.depth if isinstance(element, Tray) else -getattr(element, "thickness", 0.0)
    return Slab(placed.index, corners, depth)


# -- path within the pieces ------------------------------------------------------------------------
def owners_of(strips: tuple[Strip, ...], element: NDArray[np.int64], s: Array) -> NDArray[np.int64]:
    """Owner of each sample: the piece of its segment that holds its arc length; of other elements one for all."""
    owners = element.astype(np.int64) * PIECES
    highs: dict[int, list[float]] = {}
    for strip in strips:
        highs.setdefault(strip.element, []).append(strip.high)
    for index, ends in highs.items():
        rows = np.flatnonzero(element == index)
        if len(rows):
            owners[rows] += np.minimum(np.searchsorted(np.array(ends), s[rows], side="left"), len(ends) - 1)
    return owners
