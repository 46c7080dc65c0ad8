"""Guards and where they fall below zero: pure functions of the state, located on the dense output.

A guard is positive while the mode holds. Slots: 0 normal force, 1 friction cone, 2 slip, 3 rolling stop,
4 spin about the normal, 5 to 10 the six boundaries of the patch. A guard that does not apply is FAR.
"""

from typing import NamedTuple

import numpy as np

from engine.constants import NOISE_SHARE, ROOT_SETTLED, ROOT_TURNS, STOPPED_SLIP, YOUNG_SLIP
from engine.contact.query import ANYWHERE, FAR, boundary, foot_on
from engine.contact.surface import MU_KINETIC, MU_STATIC
from engine.dynamics.rates import rates
from engine.dynamics.state import FLIGHT, ROLLING, SLIPPING
from engine.integrate.step import dense_at
from engine.kernel import kernel

GUARDS = 11
LIFT, CONE, SLIP, STOP, SPIN, SIDE = 0, 1, 2, 3, 4, 5
BEHIND = 0.01
"""Share of its radius by which a ball is within a wall that it has come through from behind
(parts that cross each other).
"""
NOT_THERE = -1.0
"""Instead of a share of the step: the wall is not met."""
HALVINGS = 40
"""Times a step is halved in search of a hop."""
TURN_SHARE = 10.0
"""A velocity that has turned by a right angle within a step is stopped if it is below this many times `still`."""


class Heading(NamedTuple):
    """Directions at the start of a step, of the slip velocity and of the rolling spin (zero when there is none), and
    the speed below which either counts as stopped, m/s.
    """

    ux: float
    uy: float
    uz: float
    rx: float
    ry: float
    rz: float
    still: float


@kernel
def still_speed(tolerance, speed, r):
    """Return the speed that cannot be told from none at this tolerance, m/s."""
    noise = NOISE_SHARE * tolerance * max(speed, np.sqrt(10.0 * r))
    return min(0.1 * YOUNG_SLIP, max(STOPPED_SLIP, noise))


@kernel
def heading_of(contact, ball, still):
    """Return the unit slip and rolling directions of a contact. `still` m/s counts as stopped."""
    u = contact.slip
    ux, uy, uz = (contact.ux / u, contact.uy / u, contact.uz / u) if u > still else (0.0, 0.0, 0.0)
    size = np.sqrt(contact.rx * contact.rx + contact.ry * contact.ry + contact.rz * contact.rz)
    if size * ball.radius > still:
        return Heading(ux, uy, uz, contact.rx / size, contact.ry / size, contact.rz / size, still)
    return Heading(ux, uy, uz, 0.0, 0.0, 0.0, still)


@kernel
def fill_guards(walls, ball, mode, contact, heading, out):
    """Fill `out` (11,) with the guards of a mode."""
    for j in range(GUARDS):
        out[j] = FAR
    if mode.regime == FLIGHT:
        return
    law = walls.law[mode.patch]
    out[LIFT] = contact.force
    if mode.regime == ROLLING:
        out[CONE] = law[MU_STATIC] * contact.force - contact.need
        has_way = heading.rx != 0.0 or heading.ry != 0.0 or heading.rz != 0.0
        if contact.loss > 0.0 and has_way:
            along = contact.rx * heading.rx + contact.ry * heading.ry + contact.rz * heading.rz
            out[STOP] = along * ball.radius - heading.still
        if contact.hold > 0.0:
            out[SPIN] = contact.hold - abs(contact.feed) if mode.spin == 0 else mode.spin * contact.spin
    elif mode.regime == SLIPPING:
        fill_slip_guards(law, mode, contact, heading, out)
    for side in range(6):
        out[SIDE + side] = boundary(walls, mode.patch, contact.foot, side)


@kernel
def fill_slip_guards(law, mode, contact, heading, out):
    """Fill the guards of slipping: young slip ends when it is fast or no longer called for, grown slip at no slip."""
    if mode.young == 1:
        out[CONE] = contact.need - law[MU_KINETIC] * contact.force
        out[SLIP] = YOUNG_SLIP - contact.slip
    elif heading.ux != 0.0 or heading.uy != 0.0 or heading.uz != 0.0:
        along = contact.ux * heading.ux + contact.uy * heading.uy + contact.uz * heading.uz
        out[SLIP] = along - heading.still


@kernel
def guard_at(walls, ball, mode, work, place):
    """Return guard `slot` at the share theta of the step. `place` = (theta, slot, piece, q, heading)."""
    theta, slot, piece, q, heading = place
    dense_at(work, theta, work.trial)
    contact = rates(walls, ball, mode, work.trial, (piece, q), work.spare)
    fill_guards(walls, ball, mode, contact, heading, work.guards)
    return work.guards[slot]


@kernel
def last_above(walls, ball, mode, work, place):
    """Return (share, value) of a place in the step at which a guard that starts at zero is above it.

    Value 0 if there is none.
    """
    high, slot, piece, q, heading = place
    theta = high
    for _ in range(HALVINGS):
        theta *= 0.5
        value = guard_at(walls, ball, mode, work, (theta, slot, piece, q, heading))
        if value > 0.0:
            return theta, value
    return 0.0, 0.0


@kernel
def locate_guard(walls, ball, mode, work, place):
    """Return the share of the step at which a guard that ends below zero reaches zero (Illinois rule).

    `place` = (high, slot, value at the start, piece, q, heading), with the guard below zero at the share `high`.
    """
    high, slot, start, piece, q, heading = place
    low, f_low = 0.0, start
    if start <= 0.0:
        low, f_low = last_above(walls, ball, mode, work, (high, slot, piece, q, heading))
        if f_low <= 0.0:
            return 0.0
    f_high = guard_at(walls, ball, mode, work, (high, slot, piece, q, heading))
    if f_high >= 0.0:
        return high
    return illinois(walls, ball, mode, work, (low, f_low, high, f_high, slot, piece, q, heading))


@kernel
def illinois(walls, ball, mode, work, bracket):
    """Return the upper end of a bracket shrunk round the root: the guard is at or just below zero there."""
    low, f_low, high, f_high, slot, piece, q, heading = bracket
    true_high = f_high
    for turn in range(ROOT_TURNS):
        if high - low < ROOT_SETTLED or true_high == 0.0:
            break
        middle = high - f_high * (high - low) / (f_high - f_low)
        if turn % 8 == 7 or not low < middle < high:
            middle = 0.5 * (low + high)
        value = guard_at(walls, ball, mode, work, (middle, slot, piece, q, heading))
        if value > 0.0:
            low, f_low = middle, value
            f_high *= 0.5
        else:
            high, f_high, true_high = middle, value, value
            f_low *= 0.5
        if abs(value) < 1e-15 and value <= 0.0:
            break
    return high


@kernel
def gap_at(walls, ball, patch, work, theta):
    """Return the gap to a wall at the share theta of the step, m."""
    dense_at(work, theta, work.trial)
    y = work.trial
    return foot_on(walls, patch, (y[0], y[1], y[2]), ball.radius, ANYWHERE).gap


@kernel
def last_apart(walls, ball, patch, work, high):
    """Return (share, gap) of a place in the step at which the ball is off a wall that it starts on; gap 0 when there
    is none.

    Halving finds the hop however short it is: a place at most half as late as its end lies within it.
    """
    theta = high
    for _ in range(HALVINGS):
        theta *= 0.5
        gap = gap_at(walls, ball, patch, work, theta)
        if gap > 0.0:
            return theta, gap
    return 0.0, 0.0


@kernel
def never_apart(walls, ball, patch, work, place):
    """Return the share at which a ball that is nowhere off a wall in the step meets it, NOT_THERE when it came from
    behind.

    `place` = (gap at the start, share). A ball that closes on the wall meets it at once; one that only grazes it goes
    on to the end of the step, so that time passes.
    """
    gap, high = place
    if gap < -BEHIND * ball.radius:
        return NOT_THERE
    y = work.y0
    foot = foot_on(walls, patch, (y[0], y[1], y[2]), ball.radius, ANYWHERE)
    closing = y[3] * foot.nx + y[4] * foot.ny + y[5] * foot.nz < -STOPPED_SLIP
    return 0.0 if closing else high


@kernel
def locate_touch(walls, ball, patch, work, high):
    """Return the share of the step at which the gap to `patch`, below zero at `high`, last became zero.

    A ball that has just left this wall starts at a gap of zero: the start of the bracket is then sought inside the
    step.
    """
    low, f_low = 0.0, gap_at(walls, ball, patch, work, 0.0)
    if f_low <= 0.0:
        start = f_low
        low, f_low = last_apart(walls, ball, patch, work, high)
        if f_low <= 0.0:
            return never_apart(walls, ball, patch, work, (start, high))
    f_high = gap_at(walls, ball, patch, work, high)
    for turn in range(ROOT_TURNS):
        if high - low < ROOT_SETTLED:
            break
        middle = high - f_high * (high - low) / (f_high - f_low)
        if turn % 8 == 7 or not low < middle < high:
            middle = 0.5 * (low + high)
        value = gap_at(walls, ball, patch, work, middle)
        if value > 0.0:
            low, f_low = middle, value
            f_high *= 0.5
        else:
            high, f_high = middle, value
            f_low *= 0.5
    return high


@kernel
def is_end_of_turn(mode, contact, ball, slot, still):
    """Return whether a slip or stop guard marks a true end: the vector itself is near zero, not just turned round."""
    if slot == SLIP and mode.young == 0:
        return contact.slip < TURN_SHARE * still
    if slot == STOP:
        size2 = contact.rx * contact.rx + contact.ry * contact.ry + contact.rz * contact.rz
        return np.sqrt(size2) * ball.radius < TURN_SHARE * still
    return True


@kernel
def falls(work, slot):
    """Return whether a guard ends the step below zero; a boundary counts only when the foot moves outward."""
    value = work.after[slot]
    return value < 0.0 and (slot < SIDE or value < work.before[slot])


@kernel
def any_falls(work):
    """Return whether any guard ends the step below zero."""
    for slot in range(GUARDS):
        if falls(work, slot):
            return True
    return False


@kernel
def first_guard(walls, ball, mode, work, start):
    """Return (theta, slot) of the first guard that falls below zero in the step, (2, -1) if none truly does.

    `start` = (heading, piece, q); `work.before` and `work.after` hold the guards, `work.dense` the extension.
    """
    heading, piece, q = start
    theta, slot = 2.0, -1
    for j in range(GUARDS):
        if not falls(work, j):
            continue
        high = min(theta, 1.0)
        if high < 1.0 and guard_at(walls, ball, mode, work, (high, j, piece, q, heading)) >= 0.0:
            continue
        share = locate_guard(walls, ball, mode, work, (high, j, work.before[j], piece, q, heading))
        dense_at(work, share, work.trial)
        there = rates(walls, ball, mode, work.trial, (piece, q), work.spare)
        if is_end_of_turn(mode, there, ball, j, heading.still):
            theta, slot = share, j
    return theta, slot
