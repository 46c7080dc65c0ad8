"""Rows that a run leaves behind: samples and events, as growing arrays."""

import numpy as np

from engine.dynamics.state import STATE
from engine.kernel import allocating, kernel

T, Y, PATCH, REGIME, S, ANGLE, NORMAL, FORCE, SLIP, FRICTION, NEED, IMPACT, ASKED = (
    0,
    1,
    14,
    15,
    16,
    17,
    18,
    21,
    22,
    23,
    24,
    25,
    26,
)
"""Columns of a sample. `IMPACT` energy lost to impacts so far per mass; `ASKED` index of the asked time, else -1."""
SAMPLE = 27

KIND, MARK_T, MARK_Y, MARK_PATCH, VALUE, MARK_NORMAL, MARK_IMPACT, MODE = 0, 1, 2, 15, 16, 17, 20, 21
"""Columns of an event: kind, time, state after it, patch, value, normal, impact loss so far, mode after it
(4 numbers).
"""
MARK = 25


@allocating
def room(rows, count):
    """Return `rows` with room for one more."""
    if count < rows.shape[0]:
        return rows
    bigger = np.zeros((2 * rows.shape[0], rows.shape[1]))
    bigger[:count] = rows
    return bigger


@kernel
def write_sample(row, y, mode, contact, stamp):
    """Fill one sample row. `stamp` = (t, impact loss so far, index of the asked time)."""
    foot = contact.foot
    row[T], row[IMPACT], row[ASKED] = stamp
    for j in range(STATE):
        row[Y + j] = y[j]
    row[PATCH], row[REGIME] = mode.patch, mode.regime
    row[S], row[ANGLE] = foot.s, foot.angle
    row[NORMAL], row[NORMAL + 1], row[NORMAL + 2] = foot.nx, foot.ny, foot.nz
    row[FORCE], row[SLIP] = contact.force, contact.slip
    row[FRICTION], row[NEED] = contact.friction, contact.need


@kernel
def write_mark(row, y, mode, event, stamp):
    """Fill one event row. `event` = (kind, patch, value, normal); `stamp` = (t, impact loss so far)."""
    row[KIND], row[MARK_PATCH], row[VALUE] = event[0], event[1], event[2]
    row[MARK_NORMAL], row[MARK_NORMAL + 1], row[MARK_NORMAL + 2] = event[3]
    row[MARK_T], row[MARK_IMPACT] = stamp
    for j in range(STATE):
        row[MARK_Y + j] = y[j]
    row[MODE], row[MODE + 1], row[MODE + 2], row[MODE + 3] = mode.patch, mode.regime, mode.young, mode.spin
