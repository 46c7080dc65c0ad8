"""Meridians: plane curves turned about an axis, as tables (p, 7): s, rho, z, rho', z', rho'', z''.

rho is the distance from the axis, z the height along it. A profile runs the way the ball goes: inward and down in a
funnel. The normal used for offsets is the tangent turned left, (-z', rho'); a positive distance goes that way.
Between knots the quintic polynomial holds, as for curves.
"""

import math
from collections.abc import Callable, Sequence

import numpy as np

from engine.geometry.pose import Array
from engine.geometry.primitives import spline_at, spline_bends
from engine.geometry.tables import PIECE_TURN, interpolate, tabulate

Profile = Callable[[Array], tuple[Array, Array, Array]]
"""Points (n, 2) of rho and z, and the first two derivatives by the parameter, at parameters (n,)."""


def line(first: tuple[float, float], last: tuple[float, float]) -> Array:
    """Straight from one point (rho, z) to another, m: cone, cylinder or flat floor."""
    start, chord = np.array(first), np.subtract(last, first)
    length = math.hypot(chord[0], chord[1])
    table = np.zeros((2, 7))
    table[1, 0] = length
    table[:, 1:3] = start, start + chord
    table[:, 3:5] = chord / length
    return table


def arc(centre: tuple[float, float], radius: float, angles: tuple[float, float]) -> Array:
    """Circular arc (rho, z) = centre + radius (cos a, sin a) from the first angle to the second, rad."""
    first, last = angles
    sense = math.copysign(1.0, last - first)
    angle = np.linspace(first, last, max(2, 1 + math.ceil(abs(last - first) / PIECE_TURN)))
    spoke = np.stack([np.cos(angle), np.sin(angle)], axis=1)
    ahead = sense * np.stack([-spoke[:, 1], spoke[:, 0]], axis=1)
    length = radius * np.abs(angle - first)
    return np.concatenate([length[:, None], np.array(centre) + radius * spoke, ahead, -spoke / radius], axis=1)


def power(ends: tuple[tuple[float, float], tuple[float, float]], exponent: float) -> Array:
    """z = a + b rho^exponent through two points (rho, z) with rho > 0, m.

    Exponent -1 hyperbola, 1 cone, 2 parabola, 0 the logarithm.
    """
    (rho0, z0), (rho1, z1) = ends
    span = math.log(rho1 / rho0)
    factor = (z1 - z0) / (math.expm1(exponent * span) / exponent if exponent else span)

    def at(u: Array) -> tuple[Array, Array, Array]:
        log = np.log(u / rho0)
        height = z0 + factor * (np.expm1(exponent * log) / exponent if exponent else log)
        slope = factor * np.exp(exponent * log) / u
        bend = (exponent - 1.0) * slope / u
        return _columns(u, height), _columns(u / u, slope), _columns(0.0 * u, bend)

    return _tabulated(at, np.geomspace(rho0, rho1, 9))


def hyperbola(rho: tuple[float, float], strength: float, level: float = 0.0) -> Array:
    """z = level - strength / rho between two radii (m); `strength` in m2."""

    def at(u: Array) -> tuple[Array, Array, Array]:
        return (
            _columns(u, level - strength / u),
            _columns(u / u, strength / u**2),
            _columns(0.0 * u, -2.0 * strength / u**3),
        )

    return _tabulated(at, np.geomspace(rho[0], rho[1], 9))


def parabola(rho: tuple[float, float], curvature: float, level: float = 0.0) -> Array:
    """z = level + curvature rho^2 / 2 between two radii (m); `curvature` at the axis in 1/m."""

    def at(u: Array) -> tuple[Array, Array, Array]:
        height = level + 0.5 * curvature * u * u
        return _columns(u, height), _columns(1.0 + 0.0 * u, curvature * u), _columns(0.0 * u, curvature + 0.0 * u)

    return _tabulated(at, np.linspace(rho[0], rho[1], 9))


def through(points: Sequence[Sequence[float]]) -> Array:
    """Smooth line (C2, natural cubic spline by chord) through points (rho, z), m, in the order given."""
    values = np.array(points, dtype=np.float64)
    knots = np.concatenate([[0.0], np.cumsum(np.hypot(*np.diff(values, axis=0).T))])
    bends = spline_bends(knots, values)
    return _tabulated(lambda u: spline_at(knots, values, bends, u), knots)


def _columns(rho: Array, z: Array) -> Array:
    return np.stack([rho, z], axis=1)


def _tabulated(profile: Profile, breaks: Array) -> Array:
    """Meridian of a parametrised profile; `breaks` may rise or fall, the profile runs in their order."""
    first, last = float(breaks[0]), float(breaks[-1])
    sense = math.copysign(1.0, last - first)

    def at(u: Array) -> tuple[Array, Array, Array]:
        position, slope, bend = profile(first + sense * u)
        level = np.zeros((len(u), 1))
        return (
            np.concatenate([position, level], axis=1),
            np.concatenate([sense * slope, level], axis=1),
            np.concatenate([bend, level], axis=1),
        )

    rows = tabulate(at, sense * (np.asarray(breaks) - first))
    return rows[:, [0, 1, 2, 4, 5, 7, 8]]


def joined(parts: Sequence[Array]) -> Array:
    """One meridian from parts that meet end to end.

    At each joint both knots are kept at the same s (a piece of no length), because curvature jumps there;
    `smooth_parts` takes them apart again.
    """
    length, rows = 0.0, []
    for part in parts:
        shifted = part.copy()
        shifted[:, 0] += length
        length = float(shifted[-1, 0])
        rows.append(shifted)
    return np.concatenate(rows)


def smooth_parts(meridian: Array) -> list[Array]:
    """The parts of a joined meridian between jumps of curvature,
    each a table of its own whose s goes on from the last.
    """
    return np.split(meridian, np.flatnonzero(np.diff(meridian[:, 0]) <= 0.0) + 1)


def filleted(corners: Sequence[tuple[float, float]], radii: Sequence[float]) -> Array:
    """Straights through corner points (rho, z) with an arc of the given radius > 0 at each inner corner, m."""
    points = np.array(corners, dtype=np.float64)
    parts, start = [], points[0]
    for i, radius in enumerate(radii, start=1):
        before, after = _direction(points[i] - points[i - 1]), _direction(points[i + 1] - points[i])
        turn = math.atan2(before[0] * after[1] - before[1] * after[0], float(before @ after))
        cut = radius * math.tan(0.5 * abs(turn))
        begin = points[i] - cut * before
        left = np.array([-before[1], before[0]]) * math.copysign(1.0, turn)
        centre = begin + radius * left
        angle = math.atan2(-left[1], -left[0])
        if (begin - start) @ before > 1e-12:
            parts.append(line(_pair(start), _pair(begin)))
        parts.append(arc(_pair(centre), radius, (angle, angle + turn)))
        start = points[i] + cut * after
    parts.append(line(_pair(start), _pair(points[-1])))
    return joined(parts)


def _direction(chord: Array) -> Array:
    return np.asarray(chord / math.hypot(chord[0], chord[1]))


def _pair(point: Array) -> tuple[float, float]:
    return float(point[0]), float(point[1])


def at_length(meridian: Array, s: Array) -> tuple[Array, Array, Array]:
    """Point, first and second derivative by s, each (n, 2), at profile lengths (n,)."""
    rows = np.zeros((len(meridian), 10))
    rows[:, [0, 1, 2, 4, 5, 7, 8]] = meridian
    position, first, second = interpolate(rows, np.atleast_1d(np.asarray(s, dtype=np.float64)))
    return position[:, :2], first[:, :2], second[:, :2]


def length_at_height(meridian: Array, z: float) -> float:
    """Profile length at which a profile that falls all the way passes height z, m.

    Its nearer end where it never does.
    """
    heights = meridian[:, 2]
    if z >= heights[0]:
        return 0.0
    below = np.flatnonzero(heights <= z)
    if len(below) == 0:
        return float(meridian[-1, 0])
    low, high = float(meridian[below[0] - 1, 0]), float(meridian[below[0], 0])
    for _ in range(60):
        middle = 0.5 * (low + high)
        if at_length(meridian, np.array([middle]))[0][0, 1] > z:
            low = middle
        else:
            high = middle
    return 0.5 * (low + high)


def offset(meridian: Array, distance: float) -> Array:
    """Points (p, 2) at `distance` m along the left normal (-z', rho') of every knot: the other face of a wall."""
    return meridian[:, 1:3] + distance * np.stack([-meridian[:, 4], meridian[:, 3]], axis=1)


def area(meridian: Array) -> float:
    """Area of the surface of revolution, m2: 2 pi times the integral of rho over s."""
    nodes, weights = np.polynomial.legendre.leggauss(6)
    half = 0.5 * np.diff(meridian[:, 0])[:, None]
    s = meridian[:-1, 0:1] + half + half * nodes
    rho = at_length(meridian, s.ravel())[0][:, 0].reshape(s.shape)
    return float(2.0 * math.pi * (half * rho * weights).sum())
