"""Solids swept along a curve: tube and trough.

Profile axes: x along `down`, y along side = t x down; seen from ahead (against t) counter-clockwise runs from x to y.
With c the centreline and r'' its curvature vector, a point of the profile moves along p(s) = c + x down + y side.

Tolerance: the surface is met within `tolerance`, half of it spent between stations, half round the ring. With steps
ds and da (rad) a pair of triangles misses the surface by at most (|p_ss| ds^2 + 2 |p_sa| ds da + |p_aa| da^2)/8,
where across the surface |p_ss| <= k + r (k^2 + w^2) + r |w'|, p_sa = r w, p_aa = r (k curvature, w twist of `down`
about t, r radius). A bore is circumscribed, so that its flats touch the true circle and never stand in the way of a
ball; an outside is inscribed. Between stations the bore is a chord: on the outer side of a bend it stands inside the
true bore by up to tolerance/2.
"""

import math
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from engine.errors import PartRefusedError
from engine.fabrication.mesh import Array, Faces, Mesh, band
from engine.geometry.tables import D1, DOWN, DOWN1, S, down_at, interpolate, unit

RING_SHARE = 0.5
"""Share of the tolerance spent round the ring; the rest is spent between stations."""
LEAST_RING = 12
"""Fewest vertices of a full ring: fewer no longer look round, even on a coarse view."""
WALL_SHARE = 0.25
"""The tolerance is at most this share of the wall and of a mouth, so that skins cannot meet (at 1 they do)."""
LEAST_MOUTH = 2e-4
"""m. A trough whose lips come nearer to each other than this is a tube with a scratch; it is refused."""
SAMPLES_PER_PIECE = 4
"""Places per piece of the table where curvature and twist are read."""
MOST_TRIANGLES = 5_000_000
"""A part of more triangles is refused: its file would take 250 MB and its inspection a gigabyte of memory."""
ROUNDING = 1e-9
"""Share of a step by which a count may exceed a whole number and still be rounded down."""


class Profile(NamedTuple):
    """Cross section of a sweep.

    `points` (k, 2) along down and side, m; `loops` sizes of its closed loops in turn, material to the left of each;
    `cap` (c, 3) triangles that fill it, counter-clockwise; `reach` largest distance of a point from the centreline, m.
    """

    points: Array
    loops: tuple[int, ...]
    cap: Faces
    reach: float


class Stations(NamedTuple):
    """Where rings stand: `s` (n,), `position`, `down`, `side` and `bend` = r'', each (n, 3)."""

    s: Array
    position: Array
    down: Array
    side: Array
    bend: Array


# -- cross sections -------------------------------------------------------------------------------
def ring_count(radius: float, tolerance: float) -> int:
    """Vertices of a full ring whose chords miss a circle by at most `tolerance`, inscribed or circumscribed.

    m = pi / acos(r / (r + tol)): the corner of the circumscribed polygon stands off by r (1/cos(pi/m) - 1) = tol; the
    inscribed one misses by less.
    """
    return max(LEAST_RING, math.ceil(math.pi / math.acos(radius / (radius + tolerance))))


def finest(tolerance: float, wall: float) -> float:
    """Tolerance (m) that is used for a wall: the given one, or a share of the wall when that is less."""
    return min(tolerance, WALL_SHARE * wall)


def tube_profile(bore_radius: float, wall: float, tolerance: float) -> Profile:
    """Ring between a circumscribed bore and an inscribed outside, m."""
    outer = bore_radius + wall
    m = ring_count(outer, RING_SHARE * finest(tolerance, wall))
    angle = 2.0 * math.pi * np.arange(m) / m
    spoke = np.stack([np.cos(angle), np.sin(angle)], axis=1)
    bore = bore_radius / math.cos(math.pi / m)
    points = np.concatenate([outer * spoke, bore * spoke[::-1]])
    out = np.arange(m, dtype=np.int64)[None]
    cap = band(2 * m - 1 - out, out, closed=True)
    return Profile(points, (m, m), cap[:, ::-1].copy(), outer)


def trough_profile(bore_radius: float, wall: float, lip: tuple[float, float], tolerance: float) -> Profile:
    """C-shaped section from lip to lip, m.

    The bore arc runs between the wall angles -lip angle and +lip angle and starts on the true circle, its other corners
    circumscribed; each edge is rounded by the lip radius as the ball meets it: about a centre at bore radius + lip
    radius.

    Parameters
    ----------
    bore_radius, wall : float
        m.
    lip : (angle, radius)
        Wall angle of the lips (rad) and their rounding (m). Rounding beyond half the wall makes a bead.
    tolerance : float
        m.

    Raises
    ------
    PartRefusedError
        When the two lips would touch or a bead would swallow the trough.
    """
    angle, radius = lip
    small = RING_SHARE * finest(tolerance, wall)
    _check_lips(bore_radius, wall, angle, radius)
    inner_lip, outer_lip, outer_angle = _lip(bore_radius, wall, lip, small)
    steps = max(2, math.ceil(angle / math.pi * ring_count(bore_radius + wall, small) - ROUNDING))
    turn = angle * (1.0 - (2.0 * np.arange(steps) + 1.0) / steps)
    beside = np.abs(turn) < outer_angle * (1.0 - ROUNDING)
    bore = bore_radius / math.cos(angle / steps) * _on_circle(turn)
    mirror = np.array([1.0, -1.0])
    inner = np.concatenate([inner_lip, bore, inner_lip[::-1] * mirror])
    outer = np.concatenate([outer_lip, (bore_radius + wall) * _on_circle(turn[beside]), outer_lip[::-1] * mirror])
    return _filled(inner, outer, _rungs(len(inner_lip), turn, beside))


def _on_circle(turn: Array) -> Array:
    """Points (n, 2) of the unit circle at wall angles (n,)."""
    return np.stack([np.cos(turn), np.sin(turn)], axis=1)


def _rungs(lip: int, turn: Array, beside: NDArray[np.bool_]) -> NDArray[np.int64]:
    """Pairs (n, 2) of places on the inner and outer chain that are joined across the wall, from one tip to the other.

    Lips are joined point by point; a point of the bore with the outside point at its own wall angle, or where a bead
    takes that place with the end of the bead.
    """
    half, steps, kept = np.arange(lip, dtype=np.int64), len(turn), int(beside.sum())
    across = lip - 1 + np.cumsum(beside) + (~beside & (turn < 0.0))
    inner = np.concatenate([half, lip + np.arange(steps), lip + steps + half])
    return np.stack([inner, np.concatenate([half, across, lip + kept + half])], axis=1)


def mouth_width(bore_radius: float, lip: tuple[float, float]) -> float:
    """Clear width (m) between the lips of a trough; the bore where they do not lean toward each other."""
    angle, radius = lip
    if angle <= 0.5 * math.pi:
        return 2.0 * bore_radius
    return 2.0 * ((bore_radius + radius) * math.sin(angle) - radius)


def _check_lips(bore_radius: float, wall: float, angle: float, radius: float) -> None:
    """Refuse a mouth that its own lips close, or beads that meet under the trough."""
    half_mouth, clear = math.pi - angle, mouth_width(bore_radius, (angle, radius))
    bead = math.asin(min(1.0, radius / (bore_radius + radius)))
    if bead >= half_mouth or clear < LEAST_MOUTH:
        raise PartRefusedError(
            f"its lips, rounded by {radius * 1e3:.2f} mm, close the mouth of {math.degrees(2.0 * half_mouth):.1f} deg "
            f"to less than {LEAST_MOUTH * 1e3:g} mm; make the lip radius smaller or the opening wider than "
            f"{math.degrees(2.0 * bead + LEAST_MOUTH / bore_radius):.1f} deg."
        )
    if radius > 0.5 * wall and bead >= angle:
        raise PartRefusedError(
            f"its lips, rounded by {radius * 1e3:.2f} mm, leave no trough between them at a lip angle of "
            f"{math.degrees(angle):.1f} deg; make the lip radius smaller than half the wall or the opening narrower."
        )


def _lip(bore_radius: float, wall: float, lip: tuple[float, float], small: float) -> tuple[Array, Array, float]:
    """Inner and outer half, each (k, 2) from the tip, of the lip at +angle, and the wall angle where the outer ends.

    Points about a centre at distance b on the lip's spoke: (b - r cos t) e + r sin t a, with a across the spoke; t =
    0 touches the bore. Up to half the wall: a quarter turn at each corner. Beyond: one bead until it meets the
    outside circle R, at cos t = (b^2 + r^2 - R^2)/(2 b r), t > pi.
    """
    angle, radius = lip
    outer = bore_radius + wall
    spoke, across = np.array([math.cos(angle), math.sin(angle)]), np.array([-math.sin(angle), math.cos(angle)])
    if radius == 0.0:
        return (bore_radius * spoke)[None], (outer * spoke)[None], angle
    centre, last = bore_radius + radius, math.pi
    if 2.0 * radius > wall:
        last = 2.0 * math.pi - math.acos((centre**2 + radius**2 - outer**2) / (2.0 * centre * radius))
    count = max(4, math.ceil(0.5 * last / math.acos(1.0 - min(1.0, small / radius))))
    turn = np.linspace(0.0, last, 2 * (count // 2) + 2)
    split = len(turn) // 2
    base = np.where(turn <= 0.5 * math.pi, centre, max(centre, outer - radius))[:, None]
    rim = (base - radius * np.cos(turn)[:, None]) * spoke + radius * np.sin(turn)[:, None] * across
    end = rim[-1]
    return rim[:split][::-1], rim[split:], math.atan2(end[1], end[0])


def _filled(inner: Array, outer: Array, rungs: NDArray[np.int64]) -> Profile:
    """Profile between two chains, filled from rung to rung: two triangles, or one where a rung keeps an end."""
    points = np.concatenate([inner, outer[::-1]])
    here, there = rungs[:, 0], len(points) - 1 - rungs[:, 1]
    first = np.stack([here[:-1], here[1:], there[1:]], axis=1)[np.diff(here) != 0]
    second = np.stack([here[:-1], there[1:], there[:-1]], axis=1)[np.diff(there) != 0]
    cap = np.concatenate([first, second])
    x, y = points[:, 0], points[:, 1]
    if float((x * np.roll(y, -1) - np.roll(x, -1) * y).sum()) < 0.0:
        points, cap = points[::-1].copy(), len(points) - 1 - cap
    corner = points[cap]
    first, second = corner[:, 1] - corner[:, 0], corner[:, 2] - corner[:, 0]
    if float((first[:, 0] * second[:, 1] - first[:, 1] * second[:, 0]).sum()) < 0.0:
        cap = cap[:, ::-1]
    reach = float(np.sqrt((points * points).sum(axis=1)).max())
    return Profile(points, (len(points),), np.ascontiguousarray(cap, dtype=np.int32), reach)


# -- stations -------------------------------------------------------------------------------------
def smooth_tables(table: Array) -> list[Array]:
    """The parts (n, 16) of a table between repeated knots; pieces of no length are dropped."""
    parts = np.split(table, np.flatnonzero(np.diff(table[:, S]) <= 0.0) + 1)
    return [part for part in parts if len(part) > 1]


def station_places(table: Array, profile: Profile, tolerance: float) -> Array:
    """Arc lengths (n,) of the rings: every break point, between them as close as the tolerance asks."""
    found = [_places_on(part, profile, tolerance) for part in smooth_tables(table)]
    if not found:
        raise PartRefusedError("its centreline has no length; give it a length.")
    return np.concatenate([found[0], *(places[1:] for places in found[1:])])


def _places_on(table: Array, profile: Profile, tolerance: float) -> Array:
    """Ring places on one smooth part: the integral of the density wanted, cut into equal shares."""
    s = sample_places(table)
    density = _density(table, s, profile, (1.0 - RING_SHARE) * tolerance)
    total = np.concatenate([[0.0], np.cumsum(0.5 * (density[1:] + density[:-1]) * np.diff(s))])
    count = max(1.0, np.ceil(total[-1] - ROUNDING))
    if count * len(profile.points) * 2.0 > MOST_TRIANGLES:
        raise PartRefusedError(
            f"it needs {count * len(profile.points) * 2.0:.3g} triangles, more than {MOST_TRIANGLES:.3g}; "
            "raise the tolerance of a chord or make the part shorter."
        )
    places = np.interp(np.linspace(0.0, total[-1], int(count) + 1), total, s)
    places[0], places[-1] = s[0], s[-1]
    return places


def sample_places(table: Array) -> Array:
    """Arc lengths at which a smooth part of a table is read: several in each of its pieces."""
    knots = table[:, S]
    share = np.arange(SAMPLES_PER_PIECE) / SAMPLES_PER_PIECE
    inside = knots[:-1, None] + np.diff(knots)[:, None] * share
    return np.append(inside.ravel(), knots[-1])


def _density(table: Array, s: Array, profile: Profile, small: float) -> Array:
    """Rings per m (n,) at places s: the larger root 1/ds of |p_ss| ds^2 + 2 r w da ds = 8 `small`."""
    bend = interpolate(table, s)[2]
    curvature = np.sqrt((bend * bend).sum(axis=1))
    side = np.cross(table[:, D1], table[:, DOWN])
    at_knots = (table[:, DOWN1] * side).sum(axis=1)
    twist = np.interp(s, table[:, S], at_knots)
    change = np.interp(s, table[:, S], np.gradient(at_knots, table[:, S]))
    reach = profile.reach
    second = curvature + reach * (curvature**2 + twist**2 + np.abs(change))
    mixed = reach * np.abs(twist) * _ring_step(profile)
    floor = 1e-6 / (s[-1] - s[0])
    return np.asarray((mixed + np.sqrt(mixed**2 + 8.0 * small * second)) / (8.0 * small) + floor)


def _ring_step(profile: Profile) -> float:
    """Longest side of the profile as an angle seen from the centreline, rad."""
    ends = np.split(profile.points, np.cumsum(profile.loops)[:-1])
    longest = max(float(np.hypot(*(np.roll(loop, -1, axis=0) - loop).T).max()) for loop in ends)
    return longest / profile.reach


def stations_at(table: Array, s: Array) -> Stations:
    """Centreline and frame at arc lengths (n,) that rise; repeated knots of the table are passed over."""
    table = table[np.append(np.diff(table[:, S]) > 0.0, True)]
    position, first, bend = interpolate(table, s)
    down = down_at(table, s)
    return Stations(s, position, down, np.cross(unit(first), down), bend)


# -- solid ----------------------------------------------------------------------------------------
def sweep(table: Array, profile: Profile, tolerance: float) -> Mesh:
    """Solid of a profile swept along a curve, closed by flat ends.

    Parameters
    ----------
    table : (n, 16)
        Curve knots, m.
    profile : Profile
    tolerance : float
        Largest distance between solid and surface, m.

    Raises
    ------
    PartRefusedError
        When the curve has no length or the tolerance asks for too many triangles.
    """
    s = station_places(table, profile, tolerance)
    stations = stations_at(table, s)
    n, k = len(s), len(profile.points)
    x, y = profile.points[:, 0, None], profile.points[:, 1, None]
    vertices = np.empty((n, k, 3))
    np.multiply(stations.down[:, None], x, out=vertices)
    vertices += stations.side[:, None] * y
    vertices += stations.position[:, None]
    return Mesh(vertices.reshape(-1, 3), _sweep_faces(n, profile), np.repeat(s, k))


def _sweep_faces(n: int, profile: Profile) -> Faces:
    """Triangles of n rings: the two ends, then a strip per pair of rings and loop."""
    k = len(profile.points)
    ring = np.arange(n * k, dtype=np.int64).reshape(n, k)
    parts = [profile.cap[:, ::-1], profile.cap + np.int32((n - 1) * k)]
    start = 0
    for size in profile.loops:
        rows = ring[:, start : start + size]
        parts.append(band(rows[:-1], rows[1:], closed=True))
        start += size
    faces = np.empty((sum(len(part) for part in parts), 3), dtype=np.int32)
    return np.concatenate(parts, out=faces)
