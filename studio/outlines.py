"""Elements seen from above, to scale: walls and bores, rims and throats, ordered by height. Arrays only, no Qt.

A tube of radius R about a line c(s) shows from above where its normal is level: c + R m and c - R m with m the level
unit vector across the tangent. That is exact for any slope.
"""

from dataclasses import dataclass

import numpy as np

from engine.geometry.tables import D1, DOWN, R
from engine.model.elements import SegmentBase, Trough, VesselBase
from engine.placement import Layout, Placed
from studio.display import Array

MOST_TURN = 2.2
"""rad. A stretch of track that turns more than this in plan is drawn in pieces: a helix passes over itself."""
MOST_FALL = 0.03
"""m. Likewise a stretch that falls by more than this."""
STEEP = 0.05
"""Plan part of a unit tangent below which its direction in plan is not used."""
RING = np.linspace(0.0, 2.0 * np.pi, 97)
UPRIGHT = 1.0 - 1e-9


@dataclass(frozen=True, eq=False)
class Outline:
    """One stretch of one element from above, m.

    Attributes
    ----------
    index : int
        Place in the layout.
    element : str
        Id.
    height : float
        Mean height, for the order of drawing.
    fill : (n, 2)
        Closed outline of the whole.
    outward : (n, 2) or None
        Unit vectors across the track at the corners of `fill`; None for shapes that stand alone.
    edges, fine : tuple of (m, 2)
        Outer edges; edges of the bore, lips, rings.
    hole : (n, 2) or None
        Opening to see through (throat).
    """

    index: int
    element: str
    height: float
    fill: Array
    outward: Array | None
    edges: tuple[Array, ...]
    fine: tuple[Array, ...]
    hole: Array | None = None


def outlines_of(layout: Layout) -> list[Outline]:
    """Every element from above, lowest first."""
    found: list[Outline] = []
    for entry in layout.placed:
        if entry.curve is not None:
            found.extend(_track(entry))
        elif entry.meridian is not None:
            found.append(_vessel(entry))
        elif entry.plate is not None:
            found.append(_plate(entry))
        elif entry.outlet is not None:
            found.append(_jump(entry))
    return sorted(found, key=lambda outline: outline.height)


# -- track ----------------------------------------------------------------------------------------
def across_of(curve: Array) -> Array:
    """Level unit vectors (n, 2) across a curve, keeping to one side even where it stands upright or turns over."""
    tangent = curve[:, D1]
    across = np.stack([-tangent[:, 1], tangent[:, 0]], axis=1)
    side = np.cross(tangent, curve[:, DOWN])[:, :2]
    level = np.hypot(across[:, 0], across[:, 1])
    across[level < STEEP] = side[level < STEEP]
    across = across / np.maximum(np.hypot(across[:, 0], across[:, 1]), 1e-9)[:, None]
    agrees = np.sign((across[1:] * across[:-1]).sum(axis=1))
    agrees[agrees == 0.0] = 1.0
    across[1:] *= np.cumprod(agrees)[:, None]
    return across


def _track(entry: Placed) -> list[Outline]:
    """Stretches of one segment."""
    curve, element = entry.curve, entry.element
    if curve is None or not isinstance(element, SegmentBase):
        return []
    bore = 0.5 * element.section.bore
    outside, inside = bore + element.section.wall, bore
    across, centre = across_of(curve), curve[:, R][:, :2]
    outer = (centre + outside * across, centre - outside * across)
    if isinstance(element.section, Trough):
        outer, inner = _trough_edges(curve, element.section, outer)
    else:
        inner = (centre + inside * across, centre - inside * across)
    return [_stretch(entry, outer, inner, across, piece) for piece in stretches(curve)]


def _trough_edges(
    curve: Array, section: Trough, silhouette: tuple[Array, Array]
) -> tuple[tuple[Array, Array], tuple[Array, Array]]:
    """Outer edges (left, right) of a trough from above and those of its mouth; wide open ones end at their lips."""
    down, side = curve[:, DOWN], np.cross(curve[:, D1], curve[:, DOWN])
    angle = section.lip_angle

    def lip(radius: float, sense: float) -> Array:
        spoke = np.cos(angle) * down + sense * np.sin(angle) * side
        return np.asarray((curve[:, R] + radius * spoke)[:, :2])

    bore = 0.5 * section.bore
    inner = (lip(bore, 1.0), lip(bore, -1.0))
    if angle < 0.5 * np.pi:
        return (lip(bore + section.wall, 1.0), lip(bore + section.wall, -1.0)), inner
    return silhouette, inner


def stretches(curve: Array) -> list[slice]:
    """Pieces of a curve that neither turn nor fall much; neighbours share a piece, so that no seam shows."""
    heading = np.unwrap(np.arctan2(curve[:, D1][:, 1], curve[:, D1][:, 0]))
    turned = np.abs(np.cumsum(np.abs(np.diff(heading, prepend=heading[0]))))
    fallen = np.cumsum(np.abs(np.diff(curve[:, R][:, 2], prepend=curve[0, R][2])))
    bins = np.floor(np.maximum(turned / MOST_TURN, np.minimum(fallen / MOST_FALL, turned / 0.2)))
    first = np.concatenate([[0], np.flatnonzero(np.diff(bins)) + 1])
    last = np.concatenate([first[1:], [len(curve) - 1]])
    return [slice(int(max(a - 1, 0)), int(b) + 1) for a, b in zip(first, last, strict=True) if b > a]


def _stretch(
    entry: Placed, outer: tuple[Array, Array], inner: tuple[Array, Array], across: Array, piece: slice
) -> Outline:
    left, right = outer[0][piece], outer[1][piece]
    height = float(entry.curve[piece, R][:, 2].mean()) if entry.curve is not None else 0.0
    ends = [np.stack([left[0], right[0]])] if piece.start == 0 else []
    ends += [np.stack([left[-1], right[-1]])] if piece.stop == len(across) else []
    return Outline(
        entry.index,
        entry.element.id,
        height,
        np.concatenate([left, right[::-1]]),
        np.concatenate([across[piece], -across[piece][::-1]]),
        (left, right),
        (inner[0][piece], inner[1][piece], *ends),
    )


# -- vessels, plates, jumps -----------------------------------------------------------------------
def _vessel(entry: Placed) -> Outline:
    """Rim, inner edge of the rim, throat; a tilted vessel shows the hull of its rings."""
    meridian, origin, axis = entry.meridian, entry.origin, entry.axis
    if meridian is None or origin is None or axis is None:
        raise TypeError("only a vessel has a meridian")
    wall = entry.element.wall if isinstance(entry.element, VesselBase) else 0.0
    rings = [ring(origin, axis, row[1] + wall, row[2]) for row in meridian]
    mouth, end = ring(origin, axis, *meridian[0, 1:3]), ring(origin, axis, *meridian[-1, 1:3])
    if axis[2] > UPRIGHT:
        outer = max(rings, key=lambda points: float(np.abs(points - origin[:2]).max()))
    else:
        outer = hull(np.concatenate(rings))
    open_end = meridian[-1, 1] > 1e-9 and axis[2] > UPRIGHT and entry.side < 0
    fine = tuple(points for points, row in ((mouth, meridian[0]), (end, meridian[-1])) if row[1] > 1e-9)
    height = float(origin[2] + 0.5 * meridian[-1, 2])
    return Outline(entry.index, entry.element.id, height, outer, None, (outer,), fine, end if open_end else None)


def ring(origin: Array, axis: Array, radius: float, along: float) -> Array:
    """Parallel circle (97, 2) of a vessel from above, closed."""
    reference = np.array([0.0, 0.0, 1.0]) if abs(axis[2]) < 0.9 else np.array([1.0, 0.0, 0.0])
    first = np.cross(axis, reference)
    first = first / np.sqrt(first @ first)
    second = np.cross(axis, first)
    circle = np.outer(np.cos(RING), first) + np.outer(np.sin(RING), second)
    return np.asarray((origin + along * axis + radius * circle)[:, :2])


def hull(points: Array) -> Array:
    """Convex hull (n, 2) of points in the plane, counter-clockwise, closed (monotone chain)."""
    rows = sorted(map(tuple, np.round(points, 9).tolist()))

    def half(ordered: list[tuple[float, ...]]) -> list[tuple[float, ...]]:
        kept: list[tuple[float, ...]] = []
        for p in ordered:
            while len(kept) > 1 and _turn(kept[-2], kept[-1], p) <= 0.0:
                kept.pop()
            kept.append(p)
        return kept[:-1]

    corners = half(rows) + half(rows[::-1])
    return np.array([*corners, corners[0]])


def _turn(a: tuple[float, ...], b: tuple[float, ...], c: tuple[float, ...]) -> float:
    return (b[0] - a[0]) * (c[1] - a[1]) - (b[1] - a[1]) * (c[0] - a[0])


def _plate(entry: Placed) -> Outline:
    if entry.plate is None:
        raise TypeError("only a deck or tray has a plate")
    origin, along, left, length, width = entry.plate
    half, far = 0.5 * width * left, length * along
    corners = np.stack([origin - half, origin + half, origin + far + half, origin + far - half, origin - half])
    outline = corners[:, :2]
    return Outline(entry.index, entry.element.id, float(corners[:, 2].mean()), outline, None, (outline,), ())


def _jump(entry: Placed) -> Outline:
    start, end = entry.inlet.position, entry.outlet.position if entry.outlet is not None else entry.inlet.position
    line = np.stack([start[:2], end[:2]])
    return Outline(entry.index, entry.element.id, float(max(start[2], end[2])), line, None, (), (line,))


# -- what is where --------------------------------------------------------------------------------
def nearest_outline(outlines: list[Outline], point: Array, reach: float) -> Outline | None:
    """Topmost outline that holds a point (2,), else the nearest one within `reach` (m)."""
    for outline in reversed(outlines):
        if outline.edges and inside(outline.fill, point):
            return outline
    best, found = reach, None
    for outline in outlines:
        distance = distance_to_line(outline.fill, point)
        if distance <= best:
            best, found = distance, outline
    return found


def inside(corners: Array, point: Array) -> bool:
    """Whether a closed outline (n, 2) holds a point (even-odd rule)."""
    x, y = corners[:, 0] - point[0], corners[:, 1] - point[1]
    x2, y2 = np.roll(x, -1), np.roll(y, -1)
    crosses = (y > 0.0) != (y2 > 0.0)
    at = x[crosses] + (x2[crosses] - x[crosses]) * y[crosses] / (y[crosses] - y2[crosses])
    return bool(np.count_nonzero(at > 0.0) % 2)


def distance_to_line(corners: Array, point: Array) -> float:
    """Distance of a point from a line through points (n, 2), m."""
    start, step = corners[:-1], np.diff(corners, axis=0)
    size = np.maximum((step * step).sum(axis=1), 1e-18)
    share = np.clip(((point - start) * step).sum(axis=1) / size, 0.0, 1.0)
    away = start + share[:, None] * step - point
    return float(np.sqrt((away * away).sum(axis=1).min()))
