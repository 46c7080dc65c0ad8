"""Curve knot tables: making them from a parametrised curve, reading between the knots, moving them.

A table has one row per knot (see DEVELOPERS.md): s, r, r', r'', down, down'. Between knots the position is the quintic
polynomial that takes r, r', r'' of both ends. Its error is h^6/46080 |r^(6)|: a circle cut into pieces of 0.07 rad is
met within 3e-12 of its radius.
"""

import math
from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

from engine.geometry.pose import Array, Pose, yaw_matrix

PIECE_TURN = 0.07
"""Largest turning of the tangent within one piece, rad."""
POSITION_ERROR = 2e-11
"""Largest distance between a curve and its table at the middle of a piece, m, where pieces are halved until it fits."""
BEND_ERROR = 1e-7
"""Likewise for the second derivative, relative to the largest curvature of the curve."""
MOST_HALVINGS = 7
"""Pieces are halved at most this often; a curve with a corner would never fit."""

S, R, D1, D2, DOWN, DOWN1 = 0, slice(1, 4), slice(4, 7), slice(7, 10), slice(10, 13), slice(13, 16)
"""Columns of a table."""

Curve = Callable[[Array], tuple[Array, Array, Array]]
"""Position and its first two derivatives by the parameter, each (n, 3), at parameters (n,)."""

_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(10)


def piece_lengths(curve: Curve, u: Array) -> Array:
    """Arc length (n-1,) between successive parameters by 10-point Gauss quadrature, m."""
    half = 0.5 * np.diff(u)
    nodes = (u[:-1] + half)[:, None] + half[:, None] * _NODES
    speed = np.sqrt((curve(nodes.ravel())[1] ** 2).sum(axis=1)).reshape(nodes.shape)
    return np.asarray(half * (speed @ _WEIGHTS))


def rows_at(curve: Curve, u: Array) -> Array:
    """Rows (n, 10) of s, r, r', r'' at parameters (n,).

    r' = r_u / |r_u|, r'' = (r_uu - (r_uu . r') r') / |r_u|^2
    """
    position, first, second = curve(u)
    speed = np.sqrt((first * first).sum(axis=1, keepdims=True))
    tangent = first / speed
    bend = (second - (second * tangent).sum(axis=1, keepdims=True) * tangent) / speed**2
    length = np.concatenate([[0.0], np.cumsum(piece_lengths(curve, u))])
    return np.concatenate([length[:, None], position, tangent, bend], axis=1)


def tabulate(curve: Curve, breaks: Array) -> Array:
    """Rows (n, 10) of a curve, each span between `breaks` halved until the table follows it (see the limits above)."""
    u = np.asarray(breaks, dtype=np.float64)
    for _ in range(MOST_HALVINGS + 1):
        rows = rows_at(curve, u)
        coarse = _coarse_pieces(curve, u, rows)
        if not coarse.any():
            break
        u = np.sort(np.concatenate([u, 0.5 * (u[:-1] + u[1:])[coarse]]))
    return rows


def _coarse_pieces(curve: Curve, u: Array, rows: Array) -> NDArray[np.bool_]:
    """Which pieces (n-1,) turn too much or miss the curve at their middle parameter."""
    half = np.empty(2 * len(u) - 1)
    half[0::2], half[1::2] = u, 0.5 * (u[:-1] + u[1:])
    exact = rows_at(curve, half)[1::2]
    found = interpolate(rows, exact[:, S])
    turn = np.abs(np.diff(rows[:, D1], axis=0)).max(axis=1) * math.sqrt(2.0)
    miss = np.abs(found[0] - exact[:, R]).max(axis=1)
    scale = max(float(np.abs(rows[:, D2]).max()), 1e-9)
    bend = np.abs(found[2] - exact[:, D2]).max(axis=1) / scale
    return np.asarray((turn > PIECE_TURN) | (miss > POSITION_ERROR) | (bend > BEND_ERROR))


def interpolate(table: Array, s: Array) -> tuple[Array, Array, Array]:
    """Position, first and second derivative by s, each (n, 3), at arc lengths (n,) (quintic Hermite)."""
    piece = np.clip(np.searchsorted(table[:, S], s, side="right") - 1, 0, len(table) - 2)
    low, high = table[piece], table[piece + 1]
    h = (high[:, S] - low[:, S])[:, None]
    x = (s - low[:, S])[:, None] / h
    a0, a1, a2 = low[:, R], h * low[:, D1], 0.5 * h * h * low[:, D2]
    gap = high[:, R] - a0 - a1 - a2
    slope = h * high[:, D1] - a1 - 2.0 * a2
    bend = h * h * high[:, D2] - 2.0 * a2
    a3 = 10.0 * gap - 4.0 * slope + 0.5 * bend
    a4 = -15.0 * gap + 7.0 * slope - bend
    a5 = 6.0 * gap - 3.0 * slope + 0.5 * bend
    position = a0 + x * (a1 + x * (a2 + x * (a3 + x * (a4 + x * a5))))
    first = (a1 + x * (2.0 * a2 + x * (3.0 * a3 + x * (4.0 * a4 + x * 5.0 * a5)))) / h
    second = (2.0 * a2 + x * (6.0 * a3 + x * (12.0 * a4 + x * 20.0 * a5))) / (h * h)
    return position, first, second


def down_at(table: Array, s: Array) -> Array:
    """Unit `down` (n, 3) at arc lengths (n,): cubic Hermite, then made normal to the tangent."""
    piece = np.clip(np.searchsorted(table[:, S], s, side="right") - 1, 0, len(table) - 2)
    low, high = table[piece], table[piece + 1]
    h = (high[:, S] - low[:, S])[:, None]
    x = (s - low[:, S])[:, None] / h
    rise = high[:, DOWN] - low[:, DOWN]
    a1, end = h * low[:, DOWN1], h * high[:, DOWN1]
    raw = low[:, DOWN] + x * (a1 + x * (3.0 * rise - 2.0 * a1 - end + x * (a1 + end - 2.0 * rise)))
    tangent = unit(interpolate(table, s)[1])
    return unit(raw - (raw * tangent).sum(axis=1, keepdims=True) * tangent)


def unit(vectors: Array) -> Array:
    """Rows (n, 3) divided by their length."""
    return np.asarray(vectors / np.sqrt((vectors * vectors).sum(axis=1, keepdims=True)))


def moved(table: Array, pose: Pose) -> Array:
    """A table made at the origin with heading +x, carried to the place and heading of `pose`
    (turned about the vertical only).
    """
    out = np.empty_like(table)
    out[:, S] = table[:, S]
    out[:, 1:] = (table[:, 1:].reshape(-1, 3) @ yaw_matrix(pose.heading).T).reshape(-1, 15)
    out[:, R] += pose.position
    return out


def end_pose(table: Array) -> Pose:
    """Pose at the last knot, with the table's own `down` (right only before banking)."""
    return Pose(table[-1, R].copy(), table[-1, D1].copy(), table[-1, DOWN].copy())
