"""The ball, its state vector and its mode, as the kernels see them.

State y, 13 numbers: x (0:3), v (3:6), w (6:9), energy lost so far per mass to slip, rolling, spin, air (9:13).
The orientation is only for drawing; it is integrated from the recorded w.
"""

from typing import NamedTuple

import numpy as np

from engine.kernel import kernel

STATE = 13
X, V, W, LOST = 0, 3, 6, 9

ROLLING, SLIPPING, FLIGHT, REST = 0, 1, 2, 3


class BallParams(NamedTuple):
    """Radius m, mass kg, k = I/(m r2), drag coefficient (negative: by Reynolds number, 0: none), lift (0 or 1)."""

    radius: float
    mass: float
    inertia_factor: float
    drag_coefficient: float
    lift: float


class Start(NamedTuple):
    """Where a run starts: time s, x m, v m/s, w rad/s, patch (-1: in flight), arc length there m,
    regime (-1: decide).
    """

    t: float
    x: np.ndarray
    v: np.ndarray
    w: np.ndarray
    patch: int
    s: float
    regime: int


class Mode(NamedTuple):
    """What stays fixed during a step.

    `patch` -1 in flight; `regime`; `young` 1 just after slip onset (friction along the needed rolling force);
    `spin` sign of the spin about the normal that spin friction acts against, 0 held at none.
    """

    patch: int
    regime: int
    young: int
    spin: int


@kernel
def kinetic_per_mass(y, ball):
    """Return kinetic energy over mass, J/kg: v2/2 + k r2 w2/2."""
    v2 = y[3] * y[3] + y[4] * y[4] + y[5] * y[5]
    w2 = y[6] * y[6] + y[7] * y[7] + y[8] * y[8]
    return 0.5 * v2 + 0.5 * ball.inertia_factor * ball.radius * ball.radius * w2
