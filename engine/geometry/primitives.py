"""Curves of which runs are made, each as a knot table (n, 16) that starts at a given pose.

Lengths called `length` are measured in plan unless said otherwise; s in the table is the true arc length. Straights,
arcs and helices take their knots from the closed form; the others from a parametrised curve whose pieces are halved
until they fit.
"""

import math

import numpy as np

from engine.geometry.frames import with_down, with_gravity_down
from engine.geometry.pose import Array, Pose, from_pose, regraded
from engine.geometry.tables import PIECE_TURN, rows_at, tabulate

FULL_TURN = 2.0 * math.pi


def line(start: Pose, length: float) -> Array:
    """Straight along the tangent of `start`; `length` is the true length, m."""
    return with_down(_straight_rows(start.position, start.tangent, length), start.down)


def straight(start: Pose, length: float, grade: float) -> Array:
    """Straight with plan `length` (m) and `grade`, in the heading of `start`."""
    return line(regraded(start, grade), length * math.sqrt(1.0 + grade * grade))


def straight_between(first: Array, last: Array) -> Array:
    """Straight from one point (3,) to another; `down` by gravity, or level when it is vertical."""
    chord = np.asarray(last, dtype=np.float64) - first
    length = math.sqrt(chord @ chord)
    return with_down(_straight_rows(first, chord / length, length), np.array([-1.0, 0.0, 0.0]))


def _straight_rows(position: Array, tangent: Array, length: float) -> Array:
    rows = np.zeros((2, 10))
    rows[1, 0] = length
    rows[:, 1:4] = position
    rows[1, 1:4] += length * tangent
    rows[:, 4:7] = tangent
    return rows


def arc(start: Pose, radius: float, turn: float, grade: float = 0.0) -> Array:
    """Circular in plan with constant grade: `radius` m in plan, `turn` rad (positive left, any number of turns).

    r = c + radius (cos a, sin a, 0) - grade l z with the plan length l = radius |turn|
    """
    sense = math.copysign(1.0, turn)
    angle = np.linspace(0.0, abs(turn), max(2, 1 + math.ceil(abs(turn) / PIECE_TURN)))
    heading = start.heading
    azimuth = heading - sense * 0.5 * math.pi + sense * angle
    spoke = np.stack([np.cos(azimuth), np.sin(azimuth), np.zeros(len(angle))], axis=1)
    ahead = sense * np.stack([-spoke[:, 1], spoke[:, 0], np.zeros(len(angle))], axis=1)
    slant = math.sqrt(1.0 + grade * grade)
    rows = np.empty((len(angle), 10))
    rows[:, 0] = radius * angle * slant
    rows[:, 1:4] = start.position + radius * (spoke - spoke[0])
    rows[:, 3] -= grade * radius * angle
    rows[:, 4:7] = (ahead - (0.0, 0.0, grade)) / slant
    rows[:, 7:10] = -spoke / (radius * slant * slant)
    return with_gravity_down(rows)


def helix(start: Pose, radius: float, turns: float, drop: float) -> Array:
    """Helix of plan `radius` (m), `turns` (positive left) and total `drop` (m)."""
    angle = FULL_TURN * turns
    return arc(start, radius, angle, drop / (radius * abs(angle)))


def circle(centre: Array, axis: Array, radius: float, towards: Array | None = None) -> Array:
    """Closed circle round `axis` (3,), anticlockwise seen from its tip; `down` points outward.

    `towards` (3,): direction from the centre to the first knot (any direction when left out).
    """
    return circle_arc(centre, _frame(axis, towards), radius, (0.0, FULL_TURN))


def circle_arc(centre: Array, frame: tuple[Array, Array], radius: float, angles: tuple[float, float]) -> Array:
    """Arc round `centre`: e = cos a u + sin a v with the unit vectors (u, v) = `frame`, a rising between `angles`.

    `down` = e.
    """
    u, v = frame
    span = angles[1] - angles[0]
    angle = np.linspace(angles[0], angles[1], max(2, 1 + math.ceil(span / PIECE_TURN)))[:, None]
    spoke = np.cos(angle) * u + np.sin(angle) * v
    ahead = np.cos(angle) * v - np.sin(angle) * u
    length = radius * (angle - angles[0])
    return np.concatenate([length, centre + radius * spoke, ahead, -spoke / radius, spoke, ahead / radius], axis=1)


def _frame(axis: Array, towards: Array | None) -> tuple[Array, Array]:
    """Unit vectors (u, v) with u x v = axis; u along `towards` where given."""
    axis = np.asarray(axis, dtype=np.float64) / math.sqrt(float(np.dot(axis, axis)))
    guess = np.eye(3)[int(np.argmin(np.abs(axis)))] if towards is None else np.asarray(towards, dtype=np.float64)
    u = guess - (guess @ axis) * axis
    u = u / math.sqrt(u @ u)
    return u, np.cross(axis, u)


def loop(start: Pose, radius: float, shift: float) -> Array:
    """Upright loop of `radius` (m) in the plane of tangent and -down, moved to the left by `shift` (m) over its one
    turn.

    r = p + radius (sin a t - (1 - cos a) down) + shift q(a / 2 pi) side, q = u^3 (10 - 15 u + 6 u^2)
    """
    frame = np.stack([start.tangent, -start.down, start.side])

    def at(a: Array) -> tuple[Array, Array, Array]:
        u = a / FULL_TURN
        sine, cosine = np.sin(a), np.cos(a)
        aside = shift * u**3 * (10.0 - 15.0 * u + 6.0 * u * u)
        slope = shift * 30.0 * u * u * (1.0 - u) ** 2 / FULL_TURN
        bend = shift * 60.0 * u * (1.0 - u) * (1.0 - 2.0 * u) / FULL_TURN**2
        position = np.stack([radius * sine, radius * (1.0 - cosine), aside], axis=1)
        first = np.stack([radius * cosine, radius * sine, slope], axis=1)
        second = np.stack([-radius * sine, radius * cosine, bend], axis=1)
        return start.position + position @ frame, first @ frame, second @ frame

    pieces = 1 + math.ceil(FULL_TURN / PIECE_TURN)
    return with_down(rows_at(at, np.linspace(0.0, FULL_TURN, pieces)), start.down)


def easing(start: Pose, length: float, grade_start: float, grade_end: float) -> Array:
    """Straight in plan over `length` (m), grade going smoothly from one value to the other; no curvature at either end.

    grade(x) = g0 + (g1 - g0) (3 u^2 - 2 u^3), u = x / length
    """
    forward, rise = start.forward, grade_end - grade_start

    def at(x: Array) -> tuple[Array, Array, Array]:
        u = (x / length)[:, None]
        fall = length * (grade_start * u + rise * u**3 * (1.0 - 0.5 * u))
        grade = grade_start + rise * u * u * (3.0 - 2.0 * u)
        change = rise * 6.0 * u * (1.0 - u) / length
        up = np.array([0.0, 0.0, 1.0])
        return start.position + u * length * forward - fall * up, forward - grade * up, -change * up

    pieces = 2 + math.ceil(1.5 * abs(rise) / PIECE_TURN)
    return with_gravity_down(tabulate(at, np.linspace(0.0, length, pieces)))


def free_line(start: Pose, points: Array) -> Array:
    """Smooth line (C2, cubic spline by chord) through points (n, 3) given forward, left, up from `start`.

    The first point is the inlet itself and is not given. It leaves along the tangent of `start` and ends without
    curvature.
    """
    through = np.concatenate([start.position[None], from_pose(start, np.atleast_2d(points))])
    knots = np.concatenate([[0.0], np.cumsum(np.sqrt((np.diff(through, axis=0) ** 2).sum(axis=1)))])
    bends = spline_bends(knots, through, start.tangent)

    def at(u: Array) -> tuple[Array, Array, Array]:
        return spline_at(knots, through, bends, u)

    return with_down(tabulate(at, knots), start.down)


def spline_bends(u: Array, values: Array, slope: Array | None = None) -> Array:
    """Second derivatives (n, k) at the knots of the cubic spline through values (n, k); `slope` (k,) at the start,
    else natural.

    h_i m_i + 2 (h_i + h_{i+1}) m_{i+1} + h_{i+1} m_{i+2} = 6 (d_{i+1} - d_i), d the slopes of the chords; natural at
    the end
    """
    h = np.diff(u)
    chord = np.diff(values, axis=0) / h[:, None]
    n = len(u)
    matrix, right = np.eye(n), np.zeros_like(values)
    if slope is not None:
        matrix[0, :2] = 2.0 * h[0], h[0]
        right[0] = 6.0 * (chord[0] - slope)
    for i in range(1, n - 1):
        matrix[i, i - 1 : i + 2] = h[i - 1], 2.0 * (h[i - 1] + h[i]), h[i]
        right[i] = 6.0 * (chord[i] - chord[i - 1])
    return np.asarray(np.linalg.solve(matrix, right), dtype=np.float64)


def spline_at(u: Array, values: Array, bends: Array, x: Array) -> tuple[Array, Array, Array]:
    """Value, first and second derivative, each (m, k), of the cubic spline at parameters (m,)."""
    piece = np.clip(np.searchsorted(u, x, side="right") - 1, 0, len(u) - 2)
    h = (u[piece + 1] - u[piece])[:, None]
    b = (x - u[piece])[:, None] / h
    a = 1.0 - b
    low, high = bends[piece], bends[piece + 1]
    first, last = values[piece], values[piece + 1]
    value = a * first + b * last + ((a**3 - a) * low + (b**3 - b) * high) * h * h / 6.0
    slope = (last - first) / h + ((3.0 * b * b - 1.0) * high - (3.0 * a * a - 1.0) * low) * h / 6.0
    return value, slope, a * low + b * high
