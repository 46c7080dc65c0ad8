"""Contact and air laws: rolling loss, spin friction, drag, lift.

Rolling loss, energy form: torque b N against the rolling part of the spin, b = c_rr r (1 + |v|/v_c).
Spin (drilling) friction: torque c N against the spin about the normal, c = (3 pi/16) mu_k a_c, with the
contact radius a_c = (3 N R* / 4 E*)^(1/3) (Hertz; Johnson, Contact Mechanics, 1985, from memory) and
1/R* = 1/r + mean wall curvature (positive where the wall bulges toward the ball).
Drag of a sphere: Cd = 24/Re (1 + 0.152 Re^0.677) + 0.417/(1 + 5070 Re^-0.94), Re < 3e5 (Clift and Gauvin 1971,
as tabulated in the open library `fluids`). Lift: C_L = 1.6 S below S = 0.1, 0.6 S^0.565 above, S = r w / v
(Sawicki, Hubbard and Stronge, Am. J. Phys. 71, 1152, 2003, from memory).
"""

import math

from engine.contact.surface import CONTACT_MODULUS, LOSS_SPEED, MU_KINETIC, ROLLING_LOSS, SPIN_ARM
from engine.kernel import kernel

DRILLING = 3.0 * math.pi / 16.0
TINY_REYNOLDS = 1e-9


@kernel
def rolling_lever(law, r, speed):
    """Return b, m: the lever of the rolling torque b N."""
    return law[ROLLING_LOSS] * r * (1.0 + speed / law[LOSS_SPEED])


@kernel
def contact_radius(law, force, r, curvature):
    """Return the Hertz contact radius, m, for a force N and the mean curvature of the wall (1/m, bulging positive)."""
    modulus = law[CONTACT_MODULUS]
    if modulus <= 0.0 or force <= 0.0:
        return 0.0
    relative = max(1.0 / r + curvature, 1e-3 / r)
    return (0.75 * force / (relative * modulus)) ** (1.0 / 3.0)


@kernel
def spin_lever(law, force, r, curvature):
    """Return c, m: the lever of the spin torque c N; a typed lever overrides Hertz."""
    if law[SPIN_ARM] >= 0.0:
        return law[SPIN_ARM]
    return DRILLING * law[MU_KINETIC] * contact_radius(law, force, r, curvature)


@kernel
def drag_coefficient(reynolds):
    """Return Cd of a smooth sphere at a Reynolds number below 3e5."""
    re = max(reynolds, TINY_REYNOLDS)
    return 24.0 / re * (1.0 + 0.152 * re**0.677) + 0.417 / (1.0 + 5070.0 * re**-0.94)


@kernel
def drag_per_speed(ball, air, speed):
    """Return D/(m v), 1/s: drag deceleration over speed."""
    area = math.pi * ball.radius * ball.radius
    cd = ball.drag_coefficient
    if cd == 0.0 or speed == 0.0 or air[0] == 0.0:
        return 0.0
    if cd < 0.0:
        cd = drag_coefficient(air[0] * speed * 2.0 * ball.radius / air[1])
    return 0.5 * air[0] * cd * area * speed / ball.mass


@kernel
def lift_per_mass(ball, air, v, w):
    """Return the lift acceleration, m/s2, along w x v."""
    speed = math.sqrt(v[0] * v[0] + v[1] * v[1] + v[2] * v[2])
    spin = math.sqrt(w[0] * w[0] + w[1] * w[1] + w[2] * w[2])
    cx, cy, cz = w[1] * v[2] - w[2] * v[1], w[2] * v[0] - w[0] * v[2], w[0] * v[1] - w[1] * v[0]
    size = math.sqrt(cx * cx + cy * cy + cz * cz)
    if ball.lift == 0.0 or size == 0.0:
        return 0.0, 0.0, 0.0
    ratio = ball.radius * spin / speed
    coefficient = 1.6 * ratio if ratio < 0.1 else 0.6 * ratio**0.565
    area = math.pi * ball.radius * ball.radius
    force = 0.5 * air[0] * area * coefficient * speed * speed / ball.mass
    return force * cx / size, force * cy / size, force * cz / size
