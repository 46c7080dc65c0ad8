"""Curves that run beside a curve: lips, edges, rails.

The offset curve is o(s) = c + a e with e = cos phi down + sin phi side. Its first derivative is exact at the knots; its
second comes from the quintic through values and first derivatives at three neighbouring knots, fourth order in the
spacing.
"""

import math

import numpy as np
from numpy.typing import NDArray

from engine.geometry.frames import side_of
from engine.geometry.pose import Array
from engine.geometry.tables import D1, DOWN, DOWN1, R, S, interpolate

_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(6)


def offset_curve(table: Array, phi: float, distance: float, down_angle: float = 0.0) -> Array:
    """Table (n, 16) of the curve at `distance` (m) from the centreline at wall angle `phi` (rad), by its own arc
    length.

    `down_angle` turns the new `down` from e (0: away from the old centreline) toward T x e, T the new tangent: with
    +pi/2 the old centreline lies at wall angle +pi/2 of the new curve, with -pi/2 at -pi/2.
    """
    spoke, spoke_change = spoke_of(table, phi)
    place = table[:, R] + distance * spoke
    slope = table[:, D1] + distance * spoke_change
    rows = _by_arc_length(table[:, S], place, slope, second_derivative(table[:, S], place, slope))
    speed = np.sqrt((slope * slope).sum(axis=1, keepdims=True))
    return np.concatenate([rows, *_turned(rows, spoke, spoke_change / speed, down_angle)], axis=1)


def spoke_of(table: Array, phi: float) -> tuple[Array, Array]:
    """e = cos phi down + sin phi side and its derivative by s, each (n, 3)."""
    side, side_change = side_of(table)
    cosine, sine = math.cos(phi), math.sin(phi)
    return cosine * table[:, DOWN] + sine * side, cosine * table[:, DOWN1] + sine * side_change


def _turned(rows: Array, spoke: Array, change: Array, angle: float) -> tuple[Array, Array]:
    """cos(angle) e + sin(angle) T x e and its derivative by the new arc length."""
    tangent, bend = rows[:, 4:7], rows[:, 7:10]
    across = np.cross(tangent, spoke)
    across_change = np.cross(bend, spoke) + np.cross(tangent, change)
    cosine, sine = math.cos(angle), math.sin(angle)
    return np.asarray(cosine * spoke + sine * across), np.asarray(cosine * change + sine * across_change)


def second_derivative(s: Array, value: Array, slope: Array) -> Array:
    """Second derivative (n, k) from values and first derivatives (n, k) at knots (n,); fourth order.

    Newton's form of the quintic through (value, slope) at three neighbouring knots, differentiated twice at the knot
    asked for. Two knots only: the cubic through both.
    """
    if len(s) == 2:
        h = s[1] - s[0]
        chord = (value[1] - value[0]) / h
        ends = 6.0 * chord - 4.0 * slope[0] - 2.0 * slope[1], -6.0 * chord + 2.0 * slope[0] + 4.0 * slope[1]
        return np.asarray(np.stack(ends) / h)
    middle = np.clip(np.arange(len(s), dtype=np.intp), 1, len(s) - 2)
    nodes = s[middle[:, None] + np.array([-1, 0, 1])] - s[:, None]
    return _newton_second(np.repeat(nodes, 2, axis=1), value, slope, middle)


def _newton_second(z: Array, value: Array, slope: Array, middle: NDArray[np.intp]) -> Array:
    """Second derivative at 0 of the polynomial with doubled nodes z (n, 6): divided differences,
    then the product rule.
    """
    rows = middle[:, None] + np.array([-1, -1, 0, 0, 1, 1])
    level = value[rows]
    coefficients = []
    for order in range(1, 6):
        gap = z[:, order:] - z[:, :-order]
        safe = np.where(gap == 0.0, 1.0, gap)[:, :, None]
        level = np.diff(level, axis=1) / safe
        if order == 1:
            level[:, 0::2] = slope[rows[:, 0::2]]
        coefficients.append(level[:, 0])
    product, first, second = np.ones(len(z)), np.zeros(len(z)), np.zeros(len(z))
    total = np.zeros_like(value)
    for order, coefficient in enumerate(coefficients):
        root = -z[:, order]
        second = second * root + 2.0 * first
        first = first * root + product
        product = product * root
        total += coefficient * second[:, None]
    return total


def _by_arc_length(s: Array, place: Array, slope: Array, bend: Array) -> Array:
    """Rows (n, 10) by arc length from rows by any parameter.

    Lengths by Gauss quadrature on the quintic between knots.
    """
    raw = np.concatenate([s[:, None], place, slope, bend], axis=1)
    half = 0.5 * np.diff(s)[:, None]
    at = s[:-1, None] + half + half * _NODES
    speed_between = np.sqrt((interpolate(raw, at.ravel())[1] ** 2).sum(axis=1)).reshape(at.shape)
    length = np.concatenate([[0.0], np.cumsum((half * speed_between) @ _WEIGHTS)])
    speed = np.sqrt((slope * slope).sum(axis=1, keepdims=True))
    tangent = slope / speed
    curved = (bend - (bend * tangent).sum(axis=1, keepdims=True) * tangent) / speed**2
    return np.concatenate([length[:, None], place, tangent, curved], axis=1)


def edge_table(
    table: Array, normal: tuple[float, Array], outward: tuple[float, Array], span: float = math.pi
) -> tuple[Array, tuple[float, float], tuple[int, int]]:
    """Sharp edge along a table whose `down` is e: its table, its range of wall angle, and which limits face the wall
    and away from it.

    `normal` = (a, c) stands for the wall's unit normal a e + c at the edge, `outward` likewise for the unit direction
    that leads off the wall along it. The edge holds a ball from `normal` on, over `span` (rad) toward `outward`; half
    a turn is a thin plate. Limits are numbered as in `Scene.link`: 2 the low one, 3 the high one.
    """
    share = (normal[0] + outward[0]) / math.sqrt(2.0)
    fixed = (normal[1] + outward[1]) / math.sqrt(2.0)
    out = table.copy()
    out[:, DOWN] = share * table[:, DOWN] + fixed
    out[:, DOWN1] = share * table[:, DOWN1]
    wall_side = np.cross(out[0, D1], out[0, DOWN]) @ (normal[0] * table[0, DOWN] + normal[1])
    if wall_side > 0.0:
        return out, (0.25 * math.pi - span, 0.25 * math.pi), (3, 2)
    return out, (-0.25 * math.pi, span - 0.25 * math.pi), (2, 3)
