"""One step of an embedded Runge-Kutta pair, its error and its dense output.

The method is data: `tableau` holds the coefficients, the algorithm here reads them. The last stage of a step is the
first of the next. The continuous extension costs three more stages and is made only for a step that needs it.
"""

import math
from typing import NamedTuple

import numpy as np

from engine.constants import STEP_GROW, STEP_SAFETY, STEP_SHRINK
from engine.dynamics.rates import rates
from engine.dynamics.state import STATE
from engine.integrate.tableau import EXTENDED, ORDER, STAGES, A, D, E
from engine.kernel import allocating, kernel

COEFFICIENTS = 7
"""Rows of the continuous extension."""


class Work(NamedTuple):
    """Scratch arrays of one run: `k` (16, 13) stages; `y0`, `y1`, `trial`, `spare` (13,) states and rates; `dense` (7,
    13) coefficients; `guards`, `before`, `after` (11,) guard values.
    """

    k: np.ndarray
    y0: np.ndarray
    y1: np.ndarray
    trial: np.ndarray
    spare: np.ndarray
    dense: np.ndarray
    guards: np.ndarray
    before: np.ndarray
    after: np.ndarray


@allocating
def new_work():
    """Return scratch arrays for one run."""
    return Work(
        np.zeros((EXTENDED, STATE)),
        np.zeros(STATE),
        np.zeros(STATE),
        np.zeros(STATE),
        np.zeros(STATE),
        np.zeros((COEFFICIENTS, STATE)),
        np.zeros(11),
        np.zeros(11),
        np.zeros(11),
    )


@kernel
def warm_start(walls, mode, foot):
    """Return (piece, q) of a foot, to start the next search from."""
    if mode.patch < 0:
        return np.int64(-1), 0.0
    i = foot.piece
    kind = walls.kind[mode.patch]
    if kind == 3:
        return np.int64(0), 0.0
    table = walls.meridian if kind == 2 else walls.knots
    return i, (foot.s - table[i, 0]) / (table[i + 1, 0] - table[i, 0])


@kernel
def stage_state(work, stage, h):
    """Fill `work.trial` with the state at which a stage evaluates its rates."""
    k, y0, trial = work.k, work.y0, work.trial
    for j in range(STATE):
        trial[j] = 0.0
    for i in range(stage):
        weight = A[stage, i]
        if weight != 0.0:
            for j in range(STATE):
                trial[j] += weight * k[i, j]
    for j in range(STATE):
        trial[j] = y0[j] + h * trial[j]


@kernel
def try_step(walls, ball, mode, work, plan):
    """Advance `work.y0` by h into `work.y1`; `work.k[0]` holds the rates at the start.

    `plan` = (h, tolerance, guess piece, guess q). Returns (scaled error, Contact at the end).
    """
    h, tolerance, piece, q = plan
    guess = (piece, q)
    for stage in range(1, STAGES):
        stage_state(work, stage, h)
        contact = rates(walls, ball, mode, work.trial, guess, work.k[stage])
        guess = warm_start(walls, mode, contact.foot)
    stage_state(work, STAGES, h)
    for j in range(STATE):
        work.y1[j] = work.trial[j]
    contact = rates(walls, ball, mode, work.y1, guess, work.k[STAGES])
    return step_error(ball, work, h, tolerance), contact


@kernel
def step_error(ball, work, h, tolerance):
    """Return the local error over what is allowed: a share of r, of the speed scale and of the spin scale.

    The two estimates are combined as in DOP853: e5^2 / sqrt(e5^2 + e3^2/100).
    """
    k, y1 = work.k, work.y1
    r = ball.radius
    floor = math.sqrt(10.0 * r)
    speed = max(floor, math.sqrt(y1[3] * y1[3] + y1[4] * y1[4] + y1[5] * y1[5]))
    spin = max(floor, r * math.sqrt(y1[6] * y1[6] + y1[7] * y1[7] + y1[8] * y1[8])) / r
    third, fifth = 0.0, 0.0
    for j in range(9):
        low, high = 0.0, 0.0
        for i in range(STAGES + 1):
            low += E[0, i] * k[i, j]
            high += E[1, i] * k[i, j]
        scale = tolerance * (r if j < 3 else (speed if j < 6 else spin))
        third += (low / scale) ** 2
        fifth += (high / scale) ** 2
    if not math.isfinite(third + fifth):
        return 1e30
    if fifth == 0.0 and third == 0.0:
        return 0.0
    return h * fifth / math.sqrt((fifth + 0.01 * third) * 9.0)


@kernel
def next_size(h, error):
    """Return the step size that would bring the error to its allowance."""
    if error <= 0.0:
        return h * STEP_GROW
    factor = STEP_SAFETY * error ** (-1.0 / ORDER)
    return h * max(STEP_SHRINK, min(STEP_GROW, factor))


@kernel
def fill_dense(walls, ball, mode, work, plan):
    """Fill `work.dense` with the coefficients of the continuous extension of the step just made.

    `plan` as `try_step`.
    """
    h, _, piece, q = plan
    guess = (piece, q)
    k, dense = work.k, work.dense
    for stage in range(STAGES + 1, EXTENDED):
        stage_state(work, stage, h)
        contact = rates(walls, ball, mode, work.trial, guess, k[stage])
        guess = warm_start(walls, mode, contact.foot)
    for j in range(STATE):
        rise = work.y1[j] - work.y0[j]
        dense[0, j] = rise
        dense[1, j] = h * k[0, j] - rise
        dense[2, j] = 2.0 * rise - h * (k[STAGES, j] + k[0, j])
        for row in range(4):
            total = 0.0
            for i in range(EXTENDED):
                total += D[row, i] * k[i, j]
            dense[3 + row, j] = h * total


@kernel
def dense_at(work, theta, y):
    """Fill `y` with the state at the share `theta` of the step."""
    back, dense = 1.0 - theta, work.dense
    for j in range(STATE):
        value = dense[6, j] * theta
        value = (value + dense[5, j]) * back
        value = (value + dense[4, j]) * theta
        value = (value + dense[3, j]) * back
        value = (value + dense[2, j]) * theta
        value = (value + dense[1, j]) * back
        value = (value + dense[0, j]) * theta
        y[j] = work.y0[j] + value
