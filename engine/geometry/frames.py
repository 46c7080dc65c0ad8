"""The lowest line of the section along a curve: gravity frame, transported frame, bank.

Open sections need the gravity frame, else they roll over on a helix; where the tangent comes near the vertical that
frame spins without limit. A curve that stays clear of the vertical therefore takes the gravity frame; one that does
not (a loop, a drop) carries its inlet's `down` along without turning it about the tangent, and what is left over at a
free end is turned away smoothly over the whole curve.
"""

import math

import numpy as np
from numpy.typing import NDArray

from engine.geometry.pose import Array
from engine.geometry.tables import D1, D2, DOWN, DOWN1, PIECE_TURN, S, interpolate, unit

STEEP = 0.2
"""Plan part of a unit tangent below which the gravity frame is not used (steeper than 78 degrees)."""


def with_gravity_down(rows: Array) -> Array:
    """Table (n, 16) from rows (n, 10): `down` is -z projected into the normal plane.

    q = -z + (z . t) t, q' = (z . t') t + (z . t) t', down = q / |q|, down' = (q' - (q' . down) down) / |q|
    """
    tangent, bend = rows[:, D1], rows[:, D2]
    raw = tangent[:, 2:3] * tangent - (0.0, 0.0, 1.0)
    change = bend[:, 2:3] * tangent + tangent[:, 2:3] * bend
    size = np.sqrt((raw * raw).sum(axis=1, keepdims=True))
    down = raw / size
    return np.concatenate([rows, down, (change - (change * down).sum(axis=1, keepdims=True) * down) / size], axis=1)


def with_down(rows: Array, start: Array) -> Array:
    """Table (n, 16) from rows (n, 10): gravity frame, or where the curve comes near the vertical `start`
    (3,) carried along.
    """
    level = np.hypot(rows[:, 4], rows[:, 5])
    if level.min() >= STEEP:
        return with_gravity_down(rows)
    table = with_transported_down(rows, start)
    if level[-1] < STEEP:
        return table
    wanted = with_gravity_down(rows[-1:])[0, DOWN]
    side = np.cross(table[-1, D1], table[-1, DOWN])
    rest = math.atan2(float(wanted @ side), float(wanted @ table[-1, DOWN]))
    return banked(table, 0.0, rest)


def with_transported_down(rows: Array, start: Array) -> Array:
    """Table (n, 16): `start` carried along without turning about the tangent, down' = -(t' . down) t.

    The frame is carried from half piece to half piece by two reflections (the double-reflection method), exact on
    circles and fourth order elsewhere.
    """
    path = _halved(rows)
    carried = np.empty((len(path), 3))
    first = start - (start @ rows[0, D1]) * rows[0, D1]
    carried[0] = first / math.sqrt(first @ first)
    for i in range(len(path) - 1):
        carried[i + 1] = _reflected_twice(path[i], path[i + 1], carried[i])
    down = carried[::2]
    change = -(rows[:, D2] * down).sum(axis=1, keepdims=True) * rows[:, D1]
    return np.concatenate([rows, down, change], axis=1)


def _halved(rows: Array) -> Array:
    """Columns s, r, r' (2 n - 1, 7) at the knots and half-way between them."""
    middle = 0.5 * (rows[1:, S] + rows[:-1, S])
    position, tangent, _ = interpolate(rows, middle)
    out = np.empty((2 * len(rows) - 1, 7))
    out[::2] = rows[:, :7]
    out[1::2] = np.concatenate([middle[:, None], position, unit(tangent)], axis=1)
    return out


def _reflected_twice(low: Array, high: Array, down: Array) -> Array:
    """`down` (3,) at the next knot: mirrored in the chord's bisecting plane, then so that the tangents agree."""
    chord = high[1:4] - low[1:4]
    scale = 2.0 / (chord @ chord)
    mirrored = down - scale * (chord @ down) * chord
    tangent = low[D1] - scale * (chord @ low[D1]) * chord
    across = high[D1] - tangent
    size = across @ across
    if size > 1e-30:
        mirrored = mirrored - 2.0 / size * (across @ mirrored) * across
    exact = mirrored - (mirrored @ high[D1]) * high[D1]
    return np.asarray(exact / math.sqrt(exact @ exact))


def banked(table: Array, start: float, end: float) -> Array:
    """Table with `down` turned toward side = t x down by an angle going smoothly
    (3u^2 - 2u^3) from `start` to `end`, rad.
    """
    if start == 0.0 and end == 0.0:
        return table
    length = table[-1, S]
    table = refined(table, max(1, math.ceil(1.5 * abs(end - start) / PIECE_TURN)))
    u = table[:, S] / length
    angle = start + (end - start) * u * u * (3.0 - 2.0 * u)
    rate = (end - start) * 6.0 * u * (1.0 - u) / length
    return turned_about_tangent(table, angle, rate)


def turned_about_tangent(table: Array, angle: Array, rate: Array) -> Array:
    """Table with `down` turned toward side by `angle` (n,) whose derivative by s is `rate` (n,)."""
    side, side_change = side_of(table)
    cosine, sine = np.cos(angle)[:, None], np.sin(angle)[:, None]
    out = table.copy()
    out[:, DOWN] = cosine * table[:, DOWN] + sine * side
    across = cosine * side - sine * table[:, DOWN]
    out[:, DOWN1] = cosine * table[:, DOWN1] + sine * side_change + rate[:, None] * across
    return out


def side_of(table: Array) -> tuple[Array, Array]:
    """side = t x down and its derivative by s, each (n, 3)."""
    change = np.cross(table[:, D2], table[:, DOWN]) + np.cross(table[:, D1], table[:, DOWN1])
    return np.cross(table[:, D1], table[:, DOWN]), change


def refined(table: Array, pieces: int) -> Array:
    """Table with knots added so that no piece is longer than length / `pieces`.

    Exact on straights, within the table's own error elsewhere.
    """
    step = np.diff(table[:, S])
    parts = np.maximum(1, np.ceil(step / (table[-1, S] / pieces) - 1e-9)).astype(np.int64)
    if parts.max() == 1:
        return table
    start = np.repeat(np.arange(len(step)), parts)
    share = (np.arange(len(start)) - np.repeat(np.cumsum(parts) - parts, parts)) / np.repeat(parts, parts)
    s = np.append(table[start, S] + share * step[start], table[-1, S])
    rows = np.concatenate([s[:, None], *interpolate(table, s)], axis=1)
    rows[:, D1] = unit(rows[:, D1])
    kept: NDArray[np.bool_] = np.append(share == 0.0, True)
    rows[kept] = table[:, :10]
    return _with_down_between(table, rows, kept)


def _with_down_between(table: Array, rows: Array, kept: NDArray[np.bool_]) -> Array:
    """The refined rows (n, 10) with `down`: by the gravity frame where the table used it,
    else as the table turns it.
    """
    by_gravity = with_gravity_down(table[:, :10]) if np.hypot(table[:, 4], table[:, 5]).min() >= STEEP else None
    if by_gravity is not None and np.abs(by_gravity[:, DOWN] - table[:, DOWN]).max() < 1e-9:
        full = with_gravity_down(rows)
    else:
        full = _twisted_alike(table, with_transported_down(rows, table[0, DOWN]), kept)
    full[kept] = table
    return full


def _twisted_alike(table: Array, carried: Array, kept: NDArray[np.bool_]) -> Array:
    """The transported frame `carried` turned about the tangent as the frame of `table` is,
    cubic between the knots of `table`.
    """
    side, own_side = side_of(carried[kept])[0], side_of(table)[0]
    sine, cosine = (table[:, DOWN] * side).sum(axis=1), (table[:, DOWN] * carried[kept][:, DOWN]).sum(axis=1)
    angle = np.unwrap(np.arctan2(sine, cosine))
    rate = (table[:, DOWN1] * own_side).sum(axis=1)
    s = carried[:, S]
    piece = np.clip(np.searchsorted(table[:, S], s, side="right") - 1, 0, len(table) - 2)
    h = table[piece + 1, S] - table[piece, S]
    x = (s - table[piece, S]) / h
    rise = angle[piece + 1] - angle[piece]
    first, last = h * rate[piece], h * rate[piece + 1]
    bend, twist = 3.0 * rise - 2.0 * first - last, first + last - 2.0 * rise
    between = angle[piece] + x * (first + x * (bend + x * twist))
    return turned_about_tangent(carried, between, (first + x * (2.0 * bend + 3.0 * x * twist)) / h)
