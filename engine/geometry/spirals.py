"""Clothoid in plan with constant grade: plan curvature linear in length.

heading(l) = h0 + k0 l + (k1 - k0) l^2 / (2 L); the position is the integral of (cos, sin), taken piece by piece with
Gauss quadrature, which is exact to rounding at the piece lengths used.
"""

import math

import numpy as np

from engine.geometry.frames import with_gravity_down
from engine.geometry.pose import Array, Pose
from engine.geometry.tables import PIECE_TURN

SHARPNESS_STEP = 0.1
"""Largest piece in units of 1 / sqrt(change of curvature per length):
keeps the quintic within 3e-9 of the piece length.
"""

_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(10)


def clothoid(start: Pose, length: float, curvature: tuple[float, float], grade: float) -> Array:
    """Table (n, 16): plan `length` m, plan `curvature` (start, end) 1/m positive to the left, constant `grade`."""
    first, last = curvature
    sharpness = (last - first) / length
    turn = max(abs(first), abs(last)) * length
    pieces = max(1, math.ceil(turn / PIECE_TURN), math.ceil(length * math.sqrt(abs(sharpness)) / SHARPNESS_STEP))
    plan = np.linspace(0.0, length, pieces + 1)
    heading = start.heading + plan * (first + 0.5 * sharpness * plan)
    slant = math.sqrt(1.0 + grade * grade)
    ahead = np.stack([np.cos(heading), np.sin(heading), np.zeros(pieces + 1)], axis=1)
    rows = np.empty((pieces + 1, 10))
    rows[:, 0] = slant * plan
    rows[:, 1:4] = start.position
    rows[:, 1:3] += _travel(plan, start.heading, first, sharpness)
    rows[:, 3] -= grade * plan
    rows[:, 4:7] = (ahead - (0.0, 0.0, grade)) / slant
    left = np.stack([-ahead[:, 1], ahead[:, 0], ahead[:, 2]], axis=1)
    rows[:, 7:10] = (first + sharpness * plan)[:, None] * left / slant**2
    return with_gravity_down(rows)


def _travel(plan: Array, heading: float, curvature: float, sharpness: float) -> Array:
    """Plan displacement (n, 2) at plan lengths (n,), m."""
    half = 0.5 * np.diff(plan)[:, None]
    length = plan[:-1, None] + half + half * _NODES
    angle = heading + length * (curvature + 0.5 * sharpness * length)
    step = half * np.stack([np.cos(angle) @ _WEIGHTS, np.sin(angle) @ _WEIGHTS], axis=1)
    return np.concatenate([np.zeros((1, 2)), np.cumsum(step, axis=0)])
