"""Curve tables with analytic derivatives, written out by hand for tests of solids: line, arc, helix, S of two arcs."""

import numpy as np

from engine.geometry.pose import Array

KNOT_TURN = 0.05
"""rad of turning per piece of a table."""


def line(length: float, start: tuple[float, float, float] = (0.0, 0.0, 0.0), pieces: int = 1) -> Array:
    """Level straight along +x, `down` = -z."""
    table = np.zeros((pieces + 1, 16))
    table[:, 0] = np.linspace(0.0, length, pieces + 1)
    table[:, 1:4] = start
    table[:, 1] += table[:, 0]
    table[:, 4] = 1.0
    table[:, 12] = -1.0
    return table


def arc(radius: float, turn: float) -> Array:
    """Level arc to the left from the origin along +x, `down` = -z."""
    return helix(radius, turn, 0.0)


def helix(radius: float, turn: float, drop: float) -> Array:
    """Helix to the left through `turn` (rad), falling by `drop` (m) in all; `down` in the gravity frame.

    r = (R sin a, R - R cos a, -c a), c = drop/turn, s = q a with q = sqrt(R^2 + c^2);
    down = -z made normal to t and scaled: (-c cos a, -c sin a, -R)/q.
    """
    c = drop / turn
    q = float(np.hypot(radius, c))
    a = np.linspace(0.0, turn, int(np.ceil(turn / KNOT_TURN)) + 1)
    sine, cosine, one = np.sin(a), np.cos(a), np.ones_like(a)
    columns = [
        q * a,
        *(radius * sine, radius - radius * cosine, -c * a),
        *(radius * cosine / q, radius * sine / q, -c / q * one),
        *(-radius * sine / q**2, radius * cosine / q**2, 0.0 * a),
        *(-c * cosine / q, -c * sine / q, -radius / q * one),
        *(c * sine / q**2, -c * cosine / q**2, 0.0 * a),
    ]
    return np.stack(columns, axis=1)


def s_curve(radius: float, turn: float) -> Array:
    """Arc to the left, then the same to the right; the joint is a repeated knot, because curvature jumps there."""
    first = arc(radius, turn)
    second = arc(radius, turn)
    for column in (2, 5, 8, 11, 14):
        second[:, column] *= -1.0
    turned = np.array([[np.cos(turn), -np.sin(turn), 0.0], [np.sin(turn), np.cos(turn), 0.0], [0.0, 0.0, 1.0]])
    second[:, 1:] = (second[:, 1:].reshape(-1, 3) @ turned.T).reshape(-1, 15)
    second[:, 1:4] += first[-1, 1:4]
    second[:, 0] += first[-1, 0]
    return np.concatenate([first, second])


def twisted_line(length: float, twist: float, pieces: int = 200) -> Array:
    """Level straight along +x whose `down` turns evenly toward side through `twist` (rad)."""
    table = line(length, pieces=pieces)
    angle, rate = twist * table[:, 0] / length, twist / length
    table[:, 11], table[:, 12] = np.sin(angle), -np.cos(angle)
    table[:, 14], table[:, 15] = rate * np.cos(angle), rate * np.sin(angle)
    return table
