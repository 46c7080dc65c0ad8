"""What happens at an event: lift-off, slip, grip, stop, a boundary crossed, a wall met.

Every function changes the state `y` in place where the event does, and returns an `Outcome`.
"""

import math
from typing import NamedTuple

from engine.constants import IMPACT_ROUNDS, REST_IMPACT
from engine.contact.query import ANYWHERE, foot_on
from engine.contact.surface import EXIT, OPEN, RESTITUTION, ROLE_CATCH, ROLE_FLOOR
from engine.dynamics.impact import strike
from engine.dynamics.phases import holds_still, mode_on, put_back, rest_mode, spin_sign, still_spin, stop
from engine.dynamics.rates import contact_rates
from engine.dynamics.state import FLIGHT, ROLLING, SLIPPING, Mode
from engine.integrate.events import CONE, LIFT, SIDE, SLIP, STOP
from engine.kernel import kernel

SLIP_ONSET, GRIP, LIFT_OFF, TOUCH_DOWN, CROSSING, RESTING, ARRIVING, STOPPING, REVERSAL, SETTLED = range(1, 11)
"""Values of `result.EventKind`."""
QUIET = -1
"""An inner change of mode that is not an event for the reader."""
GOES_ON = -1
ARRIVED, RESTED, ESCAPED, CHATTER = 0, 1, 2, 4
"""Values of `result.Status`."""
STEP_DOWN = 1e-6
"""m. A next wall that lies farther below than this is left: the ball flies and lands."""
PARTING = 1e-4
"""m/s. A next wall that falls away faster than this is left at once."""

WEDGED = 0.02
"""m/s. A ball pressed into two walls slower than this is at rest between them: it would fall 20 micrometres
from that."""


class Outcome(NamedTuple):
    """New mode, event kind (or QUIET), status (or GOES_ON), patch of the event, its value, normal,
    energy lost per mass.
    """

    mode: Mode
    kind: int
    status: int
    patch: int
    value: float
    normal: tuple[float, float, float]
    lost: float


@kernel
def plain(mode, kind, patch, value):
    """Return an outcome without impact."""
    return Outcome(mode, kind, GOES_ON, patch, value, (0.0, 0.0, 0.0), 0.0)


@kernel
def after_guard(walls, ball, mode, y, event, out):
    """Return the outcome of a guard that fell to zero. `event` = (slot, slip speed there)."""
    slot, slip = event
    if slot == LIFT:
        return plain(Mode(-1, FLIGHT, 0, 0), LIFT_OFF, mode.patch, 0.0)
    if slot == CONE:
        if mode.regime == ROLLING:
            return plain(Mode(mode.patch, SLIPPING, 1, 1), SLIP_ONSET, mode.patch, 0.0)
        return plain(Mode(mode.patch, SLIPPING, 0, 1), QUIET, mode.patch, slip)
    if slot == SLIP:
        return after_slip(walls, ball, mode, y, slip, out)
    if slot == STOP:
        return after_stop(walls, ball, mode, y, out)
    if slot >= SIDE:
        return after_boundary(walls, ball, mode, y, slot - SIDE, out)
    return after_spin(walls, ball, mode, y, out)


@kernel
def after_spin(walls, ball, mode, y, out):
    """Return what follows when the spin about the normal comes to zero, or what feeds it outgrows spin friction.

    A spin that was held is let go the way it is fed, whatever rounding says of the two sizes: else it would be held
    again at once.
    """
    still_spin(walls, ball, mode.patch, y)
    contact = contact_rates(walls, ball, mode, y, ANYWHERE, out)
    if mode.spin != 0:
        return plain(Mode(mode.patch, ROLLING, 0, spin_sign(contact)), QUIET, mode.patch, 0.0)
    return plain(Mode(mode.patch, ROLLING, 0, 1 if contact.feed > 0.0 else -1), QUIET, mode.patch, 0.0)


@kernel
def after_slip(walls, ball, mode, y, slip, out):
    """Return what follows the end of young slip (grown slip) or of grown slip (grip, or slip the other way)."""
    if mode.young == 1:
        return plain(Mode(mode.patch, SLIPPING, 0, 1), QUIET, mode.patch, slip)
    put_back(walls, ball, Mode(mode.patch, ROLLING, 0, 1), y, ANYWHERE)
    new = mode_on(walls, ball, mode.patch, y, out)
    if new.regime == ROLLING:
        return plain(new, GRIP, mode.patch, 0.0)
    return plain(new, REVERSAL if new.regime == SLIPPING else LIFT_OFF, mode.patch, 0.0)


@kernel
def after_stop(walls, ball, mode, y, out):
    """Return what follows a stop: rest where rolling loss holds the ball, else it rolls on from rest."""
    if holds_still(walls, ball, mode, y, out):
        stop(y, ball)
        return Outcome(rest_mode(mode), RESTING, RESTED, mode.patch, 0.0, (0.0, 0.0, 0.0), 0.0)
    return plain(mode_on(walls, ball, mode.patch, y, out), STOPPING, mode.patch, 0.0)


@kernel
def after_boundary(walls, ball, mode, y, side, out):
    """Return what follows when the foot crosses a boundary: the linked wall, the way out, or nothing below the ball."""
    target = walls.link[mode.patch, side]
    if target == EXIT:
        return Outcome(mode, ARRIVING, ARRIVED, mode.patch, 0.0, (0.0, 0.0, 0.0), 0.0)
    flying = Mode(-1, FLIGHT, 0, 0)
    if target == OPEN:
        return plain(flying, LIFT_OFF, mode.patch, 0.0)
    foot = foot_on(walls, target, (y[0], y[1], y[2]), ball.radius, ANYWHERE)
    vn = y[3] * foot.nx + y[4] * foot.ny + y[5] * foot.nz
    if foot.gap > STEP_DOWN or vn > PARTING:
        return plain(flying, LIFT_OFF, mode.patch, 0.0)
    normal = (foot.nx, foot.ny, foot.nz)
    lost = strike(y, normal, ball, walls.law[target], walls.law[target, RESTITUTION]) if vn < -REST_IMPACT else 0.0
    y[0] -= foot.gap * foot.nx
    y[1] -= foot.gap * foot.ny
    y[2] -= foot.gap * foot.nz
    new = land(walls, ball, target, y, normal, out)
    kind = LIFT_OFF if new[0].regime == FLIGHT and lost == 0.0 else CROSSING
    return Outcome(new[0], kind, GOES_ON, target, max(0.0, -vn), normal, lost + new[1])


@kernel
def land(walls, ball, patch, y, normal, out):
    """Return (mode, energy lost per mass) on a wall just met: it flies off when it bounces, else stays."""
    nx, ny, nz = normal
    vn = y[3] * nx + y[4] * ny + y[5] * nz
    if vn > REST_IMPACT:
        return Mode(-1, FLIGHT, 0, 0), 0.0
    y[3] -= vn * nx
    y[4] -= vn * ny
    y[5] -= vn * nz
    return mode_on(walls, ball, patch, y, out), 0.5 * vn * vn


@kernel
def ended(walls, patch):
    """Return the status that a touch of this wall brings: arrived in a tray, escaped to the floor, or goes on."""
    if walls.role[patch] == ROLE_CATCH:
        return ARRIVED
    return ESCAPED if walls.role[patch] == ROLE_FLOOR else GOES_ON


@kernel
def after_touch(walls, ball, mode, y, patch, out):
    """Return the outcome of meeting `patch`, in flight or while on another wall."""
    foot = foot_on(walls, patch, (y[0], y[1], y[2]), ball.radius, ANYWHERE)
    normal = (foot.nx, foot.ny, foot.nz)
    closing = -(y[3] * foot.nx + y[4] * foot.ny + y[5] * foot.nz)
    status = ended(walls, patch)
    lost = strike(y, normal, ball, walls.law[patch], walls.law[patch, RESTITUTION])
    if mode.regime == FLIGHT or status != GOES_ON:
        new = land(walls, ball, patch, y, normal, out)
        return Outcome(new[0], TOUCH_DOWN, status, patch, closing, normal, lost + new[1])
    new, more, status = between(walls, ball, (mode.patch, patch), y, out)
    return Outcome(new, TOUCH_DOWN, status, patch, closing, normal, lost + more)


@kernel
def between(walls, ball, pair, y, out):
    """Return (mode, energy lost per mass, status) of a ball that meets a second wall while on a first.

    Impulses alternate, without bounce, until neither is closed on; then the ball stays on the wall that it presses,
    unless it presses both: that is for several contacts, and the run ends as chatter.
    """
    first, second = pair
    lost = 0.0
    point = (y[0], y[1], y[2])
    a = foot_on(walls, first, point, ball.radius, ANYWHERE)
    b = foot_on(walls, second, point, ball.radius, ANYWHERE)
    na, nb = (a.nx, a.ny, a.nz), (b.nx, b.ny, b.nz)
    for _ in range(IMPACT_ROUNDS):
        va, vb = along(y, na), along(y, nb)
        if va > -PARTING and vb > -PARTING:
            break
        lost += strike(y, na, ball, walls.law[first], 0.0) + strike(y, nb, ball, walls.law[second], 0.0)
    va, vb = along(y, na), along(y, nb)
    if va > REST_IMPACT and vb > REST_IMPACT:
        return Mode(-1, FLIGHT, 0, 0), lost, GOES_ON
    stay, leave, n = (first, nb, na) if va <= vb else (second, na, nb)
    vn = along(y, n)
    y[3] -= vn * n[0]
    y[4] -= vn * n[1]
    y[5] -= vn * n[2]
    lost += 0.5 * vn * vn
    other = second if stay == first else first
    new = mode_on(walls, ball, stay, y, out)
    if new.regime == FLIGHT:
        return mode_on(walls, ball, other, y, out), lost, GOES_ON
    if presses(walls, ball, new, y, leave, out):
        new = mode_on(walls, ball, other, y, out)
        if new.regime != FLIGHT and presses(walls, ball, new, y, n, out):
            return between_two(ball, new, y, lost)
    return new, lost, GOES_ON


@kernel
def between_two(ball, mode, y, lost):
    """Return the end of a ball that presses two walls: at rest when it has no speed left, else beyond one contact."""
    if math.sqrt(y[3] * y[3] + y[4] * y[4] + y[5] * y[5]) < WEDGED:
        stop(y, ball)
        return rest_mode(mode), lost, RESTED
    return mode, lost, CHATTER


@kernel
def along(y, n):
    """Return the velocity along a normal, m/s."""
    return y[3] * n[0] + y[4] * n[1] + y[5] * n[2]


@kernel
def presses(walls, ball, mode, y, normal, out):
    """Return whether motion on the wall of `mode` drives the ball into the wall with `normal` that it also touches."""
    from_wall = mode_on(walls, ball, mode.patch, y, out)
    speed = math.sqrt(y[3] * y[3] + y[4] * y[4] + y[5] * y[5])
    pull = out[3] * normal[0] + out[4] * normal[1] + out[5] * normal[2]
    return from_wall.regime != FLIGHT and along(y, normal) < PARTING * max(1.0, speed) and pull < 0.0
