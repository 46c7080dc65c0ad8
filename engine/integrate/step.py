"""One step of an embedded Runge-Kutta pair, its error and its dense output.

Dormand and Prince 5(4), J. Comput. Appl. Math. 6, 19 (1980); coefficients and the fourth-order continuous extension as
in Hairer, Norsett, Wanner, Solving Ordinary Differential Equations I, II.5 and II.6. The last stage is the first of the
next step. The method is data: the algorithm reads the tableau.
"""

import math
from typing import NamedTuple

import numpy as np

from engine.constants import STEP_GROW, STEP_SAFETY, STEP_SHRINK
from engine.dynamics.rates import rates
from engine.dynamics.state import STATE
from engine.kernel import allocating, kernel

ORDER = 5
STAGES = 7
A = np.array(
    [
        [0.0, 0.0, 0.0, 0.0, 0.0, 0.0],
        [1 / 5, 0.0, 0.0, 0.0, 0.0, 0.0],
        [3 / 40, 9 / 40, 0.0, 0.0, 0.0, 0.0],
        [44 / 45, -56 / 15, 32 / 9, 0.0, 0.0, 0.0],
        [19372 / 6561, -25360 / 2187, 64448 / 6561, -212 / 729, 0.0, 0.0],
        [9017 / 3168, -355 / 33, 46732 / 5247, 49 / 176, -5103 / 18656, 0.0],
        [35 / 384, 0.0, 500 / 1113, 125 / 192, -2187 / 6784, 11 / 84],
    ]
)
E = np.array([71 / 57600, 0.0, -71 / 16695, 71 / 1920, -17253 / 339200, 22 / 525, -1 / 40])
D = np.array(
    [
        -12715105075 / 11282082432,
        0.0,
        87487479700 / 32700410799,
        -10690763975 / 1880347072,
        701980252875 / 199316789632,
        -1453857185 / 822651844,
        69997945 / 29380423,
    ]
)


class Work(NamedTuple):
    """Scratch arrays of one run: `k` (7, 13) stages; `y0`, `y1`, `trial`, `spare` (13,) states and rates; `dense` (5, 13)
    coefficients; `guards`, `before`, `after` (11,) guard values."""

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
        np.zeros((STAGES, STATE)),
        np.zeros(STATE),
        np.zeros(STATE),
        np.zeros(STATE),
        np.zeros(STATE),
        np.zeros((5, STATE)),
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
def try_step(walls, ball, mode, work, plan):
    """Advance `work.y0` by h into `work.y1`; `work.k[0]` holds the rates at the start.

    `plan` = (h, tolerance, guess piece, guess q). Returns (scaled error, Contact at the end).
    """
    h, tolerance, piece, q = plan
    k, y0, trial = work.k, work.y0, work.trial
    guess = (piece, q)
    for stage in range(1, STAGES):
        for j in range(STATE):
            total = 0.0
            for i in range(stage):
                total += A[stage, i] * k[i, j]
            trial[j] = y0[j] + h * total
        contact = rates(walls, ball, mode, trial, guess, k[stage])
        guess = warm_start(walls, mode, contact.foot)
    for j in range(STATE):
        work.y1[j] = trial[j]
    return step_error(ball, work, h, tolerance), contact


@kernel
def step_error(ball, work, h, tolerance):
    """Return the largest local error over what is allowed: a share of r, of the speed scale and of the spin scale."""
    k, y0, y1 = work.k, work.y0, work.y1
    r = ball.radius
    floor = math.sqrt(10.0 * r)
    speed = max(floor, math.sqrt(y1[3] * y1[3] + y1[4] * y1[4] + y1[5] * y1[5]))
    spin = max(floor, r * math.sqrt(y1[6] * y1[6] + y1[7] * y1[7] + y1[8] * y1[8])) / r
    worst = 0.0
    for j in range(9):
        total = 0.0
        for i in range(STAGES):
            total += E[i] * k[i, j]
        scale = r if j < 3 else (speed if j < 6 else spin)
        worst = max(worst, abs(h * total) / (tolerance * scale))
    if not math.isfinite(worst) or not math.isfinite(y0[0]):
        return 1e30
    return worst


@kernel
def next_size(h, error):
    """Return the step size that would bring the error to its allowance."""
    if error <= 0.0:
        return h * STEP_GROW
    factor = STEP_SAFETY * error ** (-1.0 / ORDER)
    return h * max(STEP_SHRINK, min(STEP_GROW, factor))


@kernel
def fill_dense(work, h):
    """Fill `work.dense` with the coefficients of the continuous extension of the step just made."""
    k, dense = work.k, work.dense
    for j in range(STATE):
        rise = work.y1[j] - work.y0[j]
        bend = h * k[0, j] - rise
        total = 0.0
        for i in range(STAGES):
            total += D[i] * k[i, j]
        dense[0, j] = work.y0[j]
        dense[1, j] = rise
        dense[2, j] = bend
        dense[3, j] = rise - h * k[STAGES - 1, j] - bend
        dense[4, j] = h * total


@kernel
def dense_at(dense, theta, y):
    """Fill `y` with the state at the share `theta` of the step."""
    back = 1.0 - theta
    for j in range(STATE):
        inner = dense[3, j] + back * dense[4, j]
        y[j] = dense[0, j] + theta * (dense[1, j] + back * (dense[2, j] + theta * inner))
