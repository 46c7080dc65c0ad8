"""A ball in a helical tube in plain numpy and scipy: what the kernels are timed against.

The same closed form of one contact (see `dynamics.rates`) without slip or losses, written for one helix
C(q) = (R cos q, R sin q, -p q/2 pi), its closest point found by Newton; state x, v, w; scipy's DOP853.
"""

import math

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
HELIX, PITCH, BORE, BALL, INERTIA = 0.15, 0.08, 0.022, 0.0125, 0.4
GRAVITY = np.array([0.0, 0.0, -9.80665])
TOLERANCE = 3e-7
"""Relative and absolute tolerance of scipy's solver: a path error of about 2e-10 m after a second, which is what the
kernels make there too (their step is bounded by the sampling, not by the error)."""


def closest(x: Array) -> float:
    """Return the parameter of the closest point on the helix."""
    c = PITCH / (2.0 * math.pi)
    q = math.atan2(x[1], x[0])
    q += 2.0 * math.pi * round((-x[2] / c - q) / (2.0 * math.pi))
    for _ in range(20):
        point = np.array([HELIX * math.cos(q), HELIX * math.sin(q), -c * q])
        first = np.array([-HELIX * math.sin(q), HELIX * math.cos(q), -c])
        second = np.array([-HELIX * math.cos(q), -HELIX * math.sin(q), 0.0])
        off = point - x
        step = (off @ first) / (first @ first + off @ second)
        q -= step
        if abs(step) < 1e-12:
            break
    return float(q)


def rates(_: float, y: Array) -> Array:
    """Return the rates of x, v, w of a ball that rolls without slip."""
    x, v, w = y[0:3], y[3:6], y[6:9]
    q, c = closest(x), PITCH / (2.0 * math.pi)
    point = np.array([HELIX * math.cos(q), HELIX * math.sin(q), -c * q])
    first = np.array([-HELIX * math.sin(q), HELIX * math.cos(q), -c])
    second = np.array([-HELIX * math.cos(q), -HELIX * math.sin(q), 0.0])
    tangent = first / np.linalg.norm(first)
    off = x - point
    rho = float(np.linalg.norm(off))
    e = off / rho
    bend = float(second @ e) / float(first @ first)
    hessian = (np.eye(3) - np.outer(e, e) - np.outer(tangent, tangent)) / rho
    hessian = hessian - bend / (1.0 - rho * bend) * np.outer(tangent, tangent)
    n, turn = -e, -hessian @ v
    force = -float(v @ turn) - float(n @ GRAVITY)
    pull = GRAVITY - (GRAVITY @ n) * n
    swing = np.cross(w, turn)
    swing = swing - (swing @ n) * n
    friction = INERTIA / (1.0 + INERTIA) * (-pull + BALL * swing)
    spin = -np.cross(n, friction) / (INERTIA * BALL)
    return np.concatenate([v, GRAVITY + force * n + friction, spin])


def start() -> Array:
    """Return the state at rest on the lowest line of the tube at q = 0."""
    c = PITCH / (2.0 * math.pi)
    tangent = np.array([0.0, HELIX, -c]) / math.hypot(HELIX, c)
    down = np.array([0.0, 0.0, -1.0])
    down = down - (down @ tangent) * tangent
    down /= np.linalg.norm(down)
    x = np.array([HELIX, 0.0, 0.0]) + (BORE - BALL) * down
    return np.concatenate([x, np.zeros(6)])


def roll_plainly(span: float) -> Array:
    """Return the state after `span` seconds."""
    from scipy.integrate import solve_ivp

    solution = solve_ivp(rates, (0.0, span), start(), method="DOP853", rtol=TOLERANCE, atol=TOLERANCE)
    return np.asarray(solution.y[:, -1])
