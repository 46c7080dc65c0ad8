"""Rates of the state in contact and in flight: the closed form of one contact.

f smooth accelerations (gravity, drag, lift), u = v - r w x n slip velocity, W = dn/dx, P = I - n n^T, all per mass:

    n.v = 0 along the path    =>  N = -v.Wv - n.f
    u = 0, its rate along P    =>  F = k/(1+k) (-f_t + r P(w x Wv) + (tau_r x n)/(k r))        rolling
    slipping                   :   F = -mu_k N u/|u|;  just after onset along the needed rolling force
    v' = f + N n + F,   w' = (-r n x F + tau)/(k r^2)

tau_r = -b N w_t/|w_t| (rolling loss), tau_s = -c N sign(w_n) n (spin friction); see `contact.laws`. While the ball
slips, spin friction fades as w_n/(|w_n| + |u|/a_c): the friction circle is shared. n.w' - n.tau/(k r^2) = w.Wv is what
curvature feeds into the spin about the normal.
"""

import math
from typing import NamedTuple

from engine.contact.laws import contact_radius, drag_per_speed, lift_per_mass, rolling_lever, spin_lever
from engine.contact.query import foot_on
from engine.contact.surface import MU_KINETIC, Foot
from engine.dynamics.state import FLIGHT, ROLLING
from engine.kernel import kernel


class Contact(NamedTuple):
    """One contact at one instant, per mass: what the guards and the record read.

    `foot`; `force` N/m m/s2; `need` |F_roll|/m of rolling; `friction` |F|/m acting; `ux uy uz` slip velocity;
    `slip` its size; `spin` w.n rad/s; `feed` w.Wv rad/s2; `hold` largest spin rate that spin friction can cancel,
    rad/s2; `loss` rolling lever b m; `roll` three components of w_t.
    """

    foot: Foot
    force: float
    need: float
    friction: float
    ux: float
    uy: float
    uz: float
    slip: float
    spin: float
    feed: float
    hold: float
    loss: float
    rx: float
    ry: float
    rz: float


@kernel
def smooth_acceleration(walls, ball, v, w):
    """Return gravity + drag + lift accelerations and the power lost to air per mass."""
    speed = math.sqrt(v[0] * v[0] + v[1] * v[1] + v[2] * v[2])
    c = drag_per_speed(ball, walls.air, speed)
    lx, ly, lz = lift_per_mass(ball, walls.air, v, w)
    g = walls.gravity
    return g[0] - c * v[0] + lx, g[1] - c * v[1] + ly, g[2] - c * v[2] + lz, c * speed * speed


@kernel
def flight_rates(walls, ball, y, out):
    """Fill `out` with the rates of free flight; the spin keeps."""
    v, w = (y[3], y[4], y[5]), (y[6], y[7], y[8])
    ax, ay, az, lost = smooth_acceleration(walls, ball, v, w)
    out[0], out[1], out[2] = v
    out[3], out[4], out[5] = ax, ay, az
    for k in range(6, 13):
        out[k] = 0.0
    out[12] = lost


@kernel
def rolling_torque(lever, force, roll, pull, n):
    """Return the torque of rolling loss per mass: against w_t, or at rest against where the pull f_t would roll it."""
    x, y, z = roll
    size = math.sqrt(x * x + y * y + z * z)
    if size * lever == 0.0 and lever > 0.0:
        x = n[1] * pull[2] - n[2] * pull[1]
        y = n[2] * pull[0] - n[0] * pull[2]
        z = n[0] * pull[1] - n[1] * pull[0]
        size = math.sqrt(x * x + y * y + z * z)
    if size == 0.0 or lever == 0.0:
        return 0.0, 0.0, 0.0
    scale = -lever * force / size
    return scale * x, scale * y, scale * z


@kernel
def friction_force(mode, mu_force, need, slip):
    """Return F per mass from the needed rolling force and the slip velocity (both three numbers and a size)."""
    if mode.regime == ROLLING:
        return need[0], need[1], need[2]
    if mode.young == 1 and need[3] > 0.0:
        scale = mu_force / need[3]
        return scale * need[0], scale * need[1], scale * need[2]
    if slip[3] == 0.0:
        return 0.0, 0.0, 0.0
    scale = -mu_force / slip[3]
    return scale * slip[0], scale * slip[1], scale * slip[2]


@kernel
def spin_torque(law, mode, contact):
    """Return the spin torque along n, N m, and `hold`.

    `contact` = (force N, r, k m r2, curvature, spin, slip, feed).
    """
    force, r, inertia, curvature, spin, slip, feed = contact
    lever = spin_lever(law, force, r, curvature)
    if lever == 0.0:
        return 0.0, 0.0
    hold = lever * force
    if mode.regime != ROLLING:
        radius = contact_radius(law, force, r, curvature)
        share = abs(spin) + (slip / radius if radius > 0.0 else 0.0)
        return (-hold * spin / share if share > 0.0 else 0.0), hold / inertia
    if mode.spin == 0:
        return max(-hold, min(hold, -inertia * feed)), hold / inertia
    return -hold * mode.spin, hold / inertia


@kernel
def contact_rates(walls, ball, mode, y, guess, out):
    """Fill `out` with the rates of rolling or slipping on one wall.

    Parameters
    ----------
    walls : Walls
    ball : BallParams
    mode : Mode
    y : (13,) float
        State, see `dynamics.state`.
    guess : (int, float)
        Warm start of the foot.
    out : (13,) float
        Rates, filled.

    Returns
    -------
    Contact
    """
    r, k = ball.radius, ball.inertia_factor
    foot = foot_on(walls, mode.patch, (y[0], y[1], y[2]), r, guess)
    law = walls.law[mode.patch]
    nx, ny, nz = foot.nx, foot.ny, foot.nz
    vx, vy, vz = y[3], y[4], y[5]
    wx, wy, wz = y[6], y[7], y[8]
    fx, fy, fz, lost_air = smooth_acceleration(walls, ball, (vx, vy, vz), (wx, wy, wz))
    px = foot.wxx * vx + foot.wxy * vy + foot.wxz * vz
    py = foot.wxy * vx + foot.wyy * vy + foot.wyz * vz
    pz = foot.wxz * vx + foot.wyz * vy + foot.wzz * vz
    fn = fx * nx + fy * ny + fz * nz
    force = -(vx * px + vy * py + vz * pz) - fn
    spin = wx * nx + wy * ny + wz * nz
    rx, ry, rz = wx - spin * nx, wy - spin * ny, wz - spin * nz
    vn = vx * nx + vy * ny + vz * nz
    ux = vx - vn * nx - r * (wy * nz - wz * ny)
    uy = vy - vn * ny - r * (wz * nx - wx * nz)
    uz = vz - vn * nz - r * (wx * ny - wy * nx)
    slip = math.sqrt(ux * ux + uy * uy + uz * uz)
    pressed = max(force, 0.0)
    gx, gy, gz = fx - fn * nx, fy - fn * ny, fz - fn * nz
    lever = rolling_lever(law, r, math.sqrt(vx * vx + vy * vy + vz * vz))
    tx, ty, tz = rolling_torque(lever, pressed, (rx, ry, rz), (gx, gy, gz), (nx, ny, nz))
    cx, cy, cz = wy * pz - wz * py, wz * px - wx * pz, wx * py - wy * px
    cn = cx * nx + cy * ny + cz * nz
    share = k / (1.0 + k)
    hx = share * (-gx + r * (cx - cn * nx) + (ty * nz - tz * ny) / (k * r))
    hy = share * (-gy + r * (cy - cn * ny) + (tz * nx - tx * nz) / (k * r))
    hz = share * (-gz + r * (cz - cn * nz) + (tx * ny - ty * nx) / (k * r))
    need = math.sqrt(hx * hx + hy * hy + hz * hz)
    qx, qy, qz = friction_force(mode, law[MU_KINETIC] * pressed, (hx, hy, hz, need), (ux, uy, uz, slip))
    feed = wx * px + wy * py + wz * pz
    inertia = k * r * r
    bulge = 0.5 * (foot.wxx + foot.wyy + foot.wzz)
    wall = bulge / max(1.0 - r * bulge, 1e-3)
    st, hold = spin_torque(law, mode, (pressed * ball.mass, r, inertia * ball.mass, wall, spin, slip, feed))
    st /= ball.mass
    out[0], out[1], out[2] = vx, vy, vz
    out[3], out[4], out[5] = fx + force * nx + qx, fy + force * ny + qy, fz + force * nz + qz
    out[6] = (-r * (ny * qz - nz * qy) + tx + st * nx) / inertia
    out[7] = (-r * (nz * qx - nx * qz) + ty + st * ny) / inertia
    out[8] = (-r * (nx * qy - ny * qx) + tz + st * nz) / inertia
    out[9] = -(qx * ux + qy * uy + qz * uz)
    out[10] = -(tx * rx + ty * ry + tz * rz)
    out[11] = -st * spin
    out[12] = lost_air
    friction = math.sqrt(qx * qx + qy * qy + qz * qz)
    return Contact(foot, force, need, friction, ux, uy, uz, slip, spin, feed, hold, lever, rx, ry, rz)


@kernel
def rates(walls, ball, mode, y, guess, out):
    """Fill `out` with the rates of the present mode; return the `Contact` (all zero in flight)."""
    if mode.regime == FLIGHT:
        flight_rates(walls, ball, y, out)
        foot = Foot(0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0)
        return Contact(foot, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0)
    return contact_rates(walls, ball, mode, y, guess, out)
