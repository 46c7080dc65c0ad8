"""Impulse at a touch-down: restitution along the normal, Coulomb along the wall.

Per mass, with v_n < 0 closing and u the slip velocity (Routh; the rule of two regimes):
    J_n = (1 + e)|v_n|,   J_t = min(k/(1+k)|u|, mu J_n) against u
    v += J,   w += (-r n x J_t)/(k r^2)
"""

import math

from engine.contact.surface import MU_KINETIC
from engine.kernel import kernel


@kernel
def strike(y, normal, ball, law, restitution):
    """Change the state by one impact on a wall with unit `normal`; return the energy lost per mass, J/kg.

    Nothing happens (0 returned) unless the ball closes on the wall.
    """
    nx, ny, nz = normal
    r, k = ball.radius, ball.inertia_factor
    vn = y[3] * nx + y[4] * ny + y[5] * nz
    if vn >= 0.0:
        return 0.0
    wx, wy, wz = y[6], y[7], y[8]
    ux = y[3] - vn * nx - r * (wy * nz - wz * ny)
    uy = y[4] - vn * ny - r * (wz * nx - wx * nz)
    uz = y[5] - vn * nz - r * (wx * ny - wy * nx)
    slip = math.sqrt(ux * ux + uy * uy + uz * uz)
    jn = -(1.0 + restitution) * vn
    jt = min(k / (1.0 + k) * slip, law[MU_KINETIC] * jn)
    scale = -jt / slip if slip > 0.0 else 0.0
    tx, ty, tz = scale * ux, scale * uy, scale * uz
    y[3] += jn * nx + tx
    y[4] += jn * ny + ty
    y[5] += jn * nz + tz
    y[6] -= (ny * tz - nz * ty) / (k * r)
    y[7] -= (nz * tx - nx * tz) / (k * r)
    y[8] -= (nx * ty - ny * tx) / (k * r)
    # kinetic energy lost: normal part, and J_t (|u| - (1+k)/(2k) J_t) along the wall
    return 0.5 * vn * vn * (1.0 - restitution * restitution) + jt * (slip - 0.5 * (1.0 + k) / k * jt)
