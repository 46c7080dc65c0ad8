"""Which mode follows: what the ball does on a wall it is on, and the state put back on its constraints."""

import math

from engine.constants import STOPPED_SPIN
from engine.contact.query import ANYWHERE, foot_on
from engine.contact.surface import MU_STATIC
from engine.dynamics.rates import contact_rates
from engine.dynamics.state import FLIGHT, LOST, REST, ROLLING, SLIPPING, Mode, kinetic_per_mass
from engine.kernel import kernel

STUCK_SLIP = 1e-7
"""m/s. Slip below this after an impact or at a new wall is rounding, not slip."""


@kernel
def put_back(walls, ball, mode, y, guess):
    """Put the state back on gap = 0, n.v = 0 and, rolling, u = 0; return the correction of the position, m."""
    if mode.regime == FLIGHT:
        return 0.0
    r = ball.radius
    foot = foot_on(walls, mode.patch, (y[0], y[1], y[2]), r, guess)
    nx, ny, nz = foot.nx, foot.ny, foot.nz
    y[0] -= foot.gap * nx
    y[1] -= foot.gap * ny
    y[2] -= foot.gap * nz
    vn = y[3] * nx + y[4] * ny + y[5] * nz
    y[3] -= vn * nx
    y[4] -= vn * ny
    y[5] -= vn * nz
    if mode.regime == ROLLING:
        spin = y[6] * nx + y[7] * ny + y[8] * nz
        if mode.spin == 0:
            spin = 0.0  # held: what is there is error
        y[6] = (ny * y[5] - nz * y[4]) / r + spin * nx
        y[7] = (nz * y[3] - nx * y[5]) / r + spin * ny
        y[8] = (nx * y[4] - ny * y[3]) / r + spin * nz
    return abs(foot.gap)


@kernel
def still_spin(walls, ball, patch, y):
    """Take the spin about the normal out of the state: it has come to zero."""
    foot = foot_on(walls, patch, (y[0], y[1], y[2]), ball.radius, ANYWHERE)
    spin = y[6] * foot.nx + y[7] * foot.ny + y[8] * foot.nz
    y[6] -= spin * foot.nx
    y[7] -= spin * foot.ny
    y[8] -= spin * foot.nz


@kernel
def spin_sign(contact):
    """Return the sign that spin friction works against: of the spin, or held at 0, or of what feeds it."""
    if contact.hold <= 0.0 or contact.spin > STOPPED_SPIN:
        return 1
    if contact.spin < -STOPPED_SPIN:
        return -1
    if abs(contact.feed) <= contact.hold:
        return 0
    return 1 if contact.feed > 0.0 else -1


@kernel
def mode_on(walls, ball, patch, y, out):
    """Return the mode of a ball that is on `patch` without closing on it.

    N < 0: flight. No slip and the needed force within the cone: rolling. Else slipping, `young` when it starts from
    no slip at all.
    """
    trial = Mode(patch, ROLLING, 0, 1)
    contact = contact_rates(walls, ball, trial, y, ANYWHERE, out)
    if not contact.force > 0.0:
        return Mode(-1, FLIGHT, 0, 0)
    if contact.slip > STUCK_SLIP:
        return Mode(patch, SLIPPING, 0, 1)
    if contact.need <= walls.law[patch, MU_STATIC] * contact.force:
        return Mode(patch, ROLLING, 0, spin_sign(contact))
    return Mode(patch, SLIPPING, 1, 1)


@kernel
def stop(y, ball):
    """Set velocity and spin to zero; what was left of their energy is booked as lost to spin friction."""
    y[LOST + 2] += kinetic_per_mass(y, ball)
    for j in range(3, 9):
        y[j] = 0.0


@kernel
def halt(y, ball, normal):
    """Set velocity and rolling to zero, keep the spin about the normal."""
    before = kinetic_per_mass(y, ball)
    spin = y[6] * normal[0] + y[7] * normal[1] + y[8] * normal[2]
    for j in range(3):
        y[3 + j] = 0.0
        y[6 + j] = spin * normal[j]
    y[LOST + 1] += before - kinetic_per_mass(y, ball)


@kernel
def holds_still(walls, ball, mode, y, out):
    """Halt the ball and return whether it stays: the pull along the wall is within what rolling loss resists, |f_t| <=
    (b/r) N.

    A ball on a plane stays where tan(slope) <= b/r = c_rr.
    """
    foot = foot_on(walls, mode.patch, (y[0], y[1], y[2]), ball.radius, ANYWHERE)
    halt(y, ball, (foot.nx, foot.ny, foot.nz))
    frictionless = Mode(mode.patch, SLIPPING, 0, 1)
    contact = contact_rates(walls, ball, frictionless, y, ANYWHERE, out)
    # without slip velocity the slipping force is zero, so the acceleration is the pull along the wall
    pull = math.sqrt(out[3] * out[3] + out[4] * out[4] + out[5] * out[5])
    return pull <= contact.loss / ball.radius * contact.force


@kernel
def rest_mode(mode):
    """Return the mode of a ball at rest on its wall."""
    return Mode(mode.patch, REST, 0, 0)
