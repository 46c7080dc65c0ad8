"""Gap, normal and curvature of any patch for a ball centre; which walls are near.

Letters: x ball centre, r its radius, n unit normal from wall to centre, W = dn/dx the Hessian of the
distance. Every patch has W = k1 d1 d1^T + k2 d2 d2^T with d1, d2 unit tangents (W n = 0).

Swept circle, e = (x - c)/rho, T tangent, b = T x e, ke = c''.e with c'' the curvature vector:
    Hess rho = b b^T / rho - ke/(1 - rho ke) T T^T        (physics: distance to a curve)
    inside  n = -e, W = -Hess rho, gap = R - rho - r;  outside  n = e, W = Hess rho, gap = rho - R - r.
Surface of revolution, profile curvature kn toward n, d = gap + r:
    along the meridian -kn/(1 - d kn), round the axis n_rho / rho.
"""

import math

import numpy as np

from engine.constants import AXIS_SHARE
from engine.contact.surface import PLANE, REVOLVED, SWEPT_INSIDE, Foot
from engine.geometry.projection import (
    curve_at,
    meridian_at,
    nearest_knot,
    nearest_meridian_knot,
    project_on_curve,
    project_on_meridian,
)
from engine.kernel import kernel

ANYWHERE = (np.int64(-1), 0.0)
"""Warm start of a search that knows nothing. A plain -1 would be a type of its own to the compiler, and every kernel
that takes a guess would be compiled twice (75 s in all, with this 49 s)."""
FAR = 1e9
"""m. Gap of a wall that cannot be touched from here."""
FOOT_SPEED = 4.0
"""Times as fast as the ball its foot on a wall may move: a hollow of radius 4/3 r, tighter than any
a ball should roll in."""
FULL_CIRCLE = 2.0 * math.pi - 1e-9


@kernel
def hessian(k1, d1, k2, d2):
    """Return the upper triangle of k1 d1 d1^T + k2 d2 d2^T."""
    a, b, c = d1
    e, f, g = d2
    return (
        k1 * a * a + k2 * e * e,
        k1 * a * b + k2 * e * f,
        k1 * a * c + k2 * e * g,
        k1 * b * b + k2 * f * f,
        k1 * b * c + k2 * f * g,
        k1 * c * c + k2 * g * g,
    )


@kernel
def wall_angle(down, i, q, tangent, e):
    """Return the angle of the direction e from `down` toward side = t x down, rad."""
    a = down[i]
    ux = a[0, 0] + q * (a[1, 0] + q * (a[2, 0] + q * a[3, 0]))
    uy = a[0, 1] + q * (a[1, 1] + q * (a[2, 1] + q * a[3, 1]))
    uz = a[0, 2] + q * (a[1, 2] + q * (a[2, 2] + q * a[3, 2]))
    tx, ty, tz = tangent
    along = ux * tx + uy * ty + uz * tz
    ux, uy, uz = ux - along * tx, uy - along * ty, uz - along * tz
    sx, sy, sz = ty * uz - tz * uy, tz * ux - tx * uz, tx * uy - ty * ux
    ex, ey, ez = e
    return math.atan2(ex * sx + ey * sy + ez * sz, ex * ux + ey * uy + ez * uz)


@kernel
def swept_foot(walls, patch, point, r, guess):
    """Return the `Foot` on a swept circle, inside or outside."""
    x, y, z = point
    first, last = walls.first[patch], walls.first[patch] + walls.count[patch] - 2
    i, q = project_on_curve(walls.curve, (first, last), walls.number[patch, 3] > 0.5, point, guess)
    cx, cy, cz, dx, dy, dz, hx, hy, hz = curve_at(walls.curve, i, q)
    speed2 = dx * dx + dy * dy + dz * dz
    speed = math.sqrt(speed2)
    tx, ty, tz = dx / speed, dy / speed, dz / speed
    rx, ry, rz = x - cx, y - cy, z - cz
    off = rx * tx + ry * ty + rz * tz
    rx, ry, rz = rx - off * tx, ry - off * ty, rz - off * tz
    rho = math.sqrt(rx * rx + ry * ry + rz * rz)
    ex, ey, ez = rx / rho, ry / rho, rz / rho
    ke = (hx * ex + hy * ey + hz * ez) / speed2
    bx, by, bz = ty * ez - tz * ey, tz * ex - tx * ez, tx * ey - ty * ex
    sign = -1.0 if walls.kind[patch] == SWEPT_INSIDE else 1.0
    w = hessian(sign / rho, (bx, by, bz), -sign * ke / (1.0 - rho * ke), (tx, ty, tz))
    gap = sign * (rho - walls.number[patch, 0]) - r
    s0 = walls.knots[i, 0]
    s = s0 + q * (walls.knots[i + 1, 0] - s0)
    angle = wall_angle(walls.down, i, q, (tx, ty, tz), (ex, ey, ez))
    return Foot(gap, sign * ex, sign * ey, sign * ez, w[0], w[1], w[2], w[3], w[4], w[5], s, angle, i)


@kernel
def revolved_foot(walls, patch, point, r, guess):
    """Return the `Foot` on a surface of revolution; `angle` is the azimuth in an arbitrary fixed frame."""
    a = walls.number[patch]
    ax, ay, az = a[3], a[4], a[5]
    x, y, z = point[0] - a[0], point[1] - a[1], point[2] - a[2]
    height = x * ax + y * ay + z * az
    px, py, pz = x - height * ax, y - height * ay, z - height * az
    rho = math.sqrt(px * px + py * py + pz * pz)
    on_axis = rho < AXIS_SHARE * r
    if rho > 0.0:
        px, py, pz = px / rho, py / rho, pz / rho
    else:
        px, py, pz = across(ax, ay, az)
    first, last = walls.first[patch], walls.first[patch] + walls.count[patch] - 2
    i, q = project_on_meridian(walls.profile, (first, last), rho, height, guess)
    c, d, dc, dd, hc, hd = meridian_at(walls.profile, i, q)
    speed2 = dc * dc + dd * dd
    speed = math.sqrt(speed2)
    side = a[6]
    nr, nz = -side * dd / speed, side * dc / speed
    distance = (rho - c) * nr + (height - d) * nz
    kn = (hc * nr + hd * nz) / speed2
    k1 = -kn / (1.0 - distance * kn)
    k2 = k1 if on_axis else nr / rho
    tr, tz = dc / speed, dd / speed
    meridian = (tr * px + tz * ax, tr * py + tz * ay, tr * pz + tz * az)
    round_axis = (ay * pz - az * py, az * px - ax * pz, ax * py - ay * px)
    w = hessian(k1, meridian, k2, round_axis)
    nx, ny, nzz = nr * px + nz * ax, nr * py + nz * ay, nr * pz + nz * az
    s0 = walls.meridian[i, 0]
    s = s0 + q * (walls.meridian[i + 1, 0] - s0)
    return Foot(distance - r, nx, ny, nzz, w[0], w[1], w[2], w[3], w[4], w[5], s, math.atan2(py, px), i)


@kernel
def across(ax, ay, az):
    """Return a unit vector across (ax, ay, az)."""
    if abs(ax) < 0.7:
        length = math.sqrt(ay * ay + az * az)
        return 0.0, az / length, -ay / length
    length = math.sqrt(ax * ax + az * az)
    return -az / length, 0.0, ax / length


@kernel
def plane_foot(walls, patch, point, r):
    """Return the `Foot` on a plane: s and angle hold u and v."""
    a = walls.number[patch]
    x, y, z = point[0] - a[0], point[1] - a[1], point[2] - a[2]
    nx = a[4] * a[8] - a[5] * a[7]
    ny = a[5] * a[6] - a[3] * a[8]
    nz = a[3] * a[7] - a[4] * a[6]
    u = x * a[3] + y * a[4] + z * a[5]
    v = x * a[6] + y * a[7] + z * a[8]
    gap = x * nx + y * ny + z * nz - r
    return Foot(gap, nx, ny, nz, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, u, v, 0)


@kernel
def foot_on(walls, patch, point, r, guess):
    """Return the `Foot` of a ball centre on a patch, its boundaries ignored.

    Parameters
    ----------
    walls : Walls
    patch : int
    point : three floats, m
    r : float
        Ball radius, m.
    guess : (int, float)
        Piece and q to start from; (-1, 0) searches all knots first.
    """
    kind = walls.kind[patch]
    if kind == PLANE:
        return plane_foot(walls, patch, point, r)
    if kind == REVOLVED:
        if guess[0] < 0:
            guess = first_guess(walls, patch, point)
        return revolved_foot(walls, patch, point, r, guess)
    if guess[0] < 0:
        guess = first_guess(walls, patch, point)
    return swept_foot(walls, patch, point, r, guess)


@kernel
def first_guess(walls, patch, point):
    """Return (piece, q) of the nearest knot, or (0, 0) on a plane."""
    first, count = walls.first[patch], walls.count[patch]
    x, y, z = point
    if walls.kind[patch] == PLANE:
        return np.int64(0), 0.0
    if walls.kind[patch] == REVOLVED:
        a = walls.number[patch]
        x, y, z = x - a[0], y - a[1], z - a[2]
        height = x * a[3] + y * a[4] + z * a[5]
        rho = math.sqrt(max(0.0, x * x + y * y + z * z - height * height))
        row = nearest_meridian_knot(walls.meridian, first, count, rho, height)
    else:
        row = nearest_knot(walls.knots, first, count, x, y, z)
    if row == first + count - 1:
        return row - 1, 1.0
    return row, 0.0


@kernel
def boundary(walls, patch, foot, side):
    """Return how far inside boundary `side` a foot lies (negative: beyond); FAR where there is none."""
    a = walls.number[patch]
    kind = walls.kind[patch]
    if walls.link[patch, side] == patch:
        return FAR
    if kind == PLANE:
        return plane_boundary(a, foot, side)
    first = walls.first[patch]
    last = first + walls.count[patch] - 1
    if kind == REVOLVED:
        if side == 0:
            return foot.s - walls.meridian[first, 0]
        return walls.meridian[last, 0] - foot.s if side == 1 else FAR
    if side < 2:
        if a[3] > 0.5:
            return FAR
        return foot.s - walls.knots[first, 0] if side == 0 else walls.knots[last, 0] - foot.s
    if side > 3 or a[2] - a[1] >= FULL_CIRCLE:
        return FAR
    middle = 0.5 * (a[1] + a[2])
    turn = foot.angle - middle
    turn -= 2.0 * math.pi * math.floor(turn / (2.0 * math.pi) + 0.5)
    half = 0.5 * (a[2] - a[1])
    return turn + half if side == 2 else half - turn


@kernel
def plane_boundary(a, foot, side):
    """Return how far inside the boundary of a plane (u, v) lies: rectangle sides, hole, disc."""
    u, v = foot.s, foot.angle
    if side == 0:
        return u - a[9]
    if side == 1:
        return a[10] - u
    if side == 2:
        return v - a[11]
    if side == 3:
        return a[12] - v
    radius = math.sqrt(u * u + v * v)
    if side == 4:
        return radius - a[13] if a[13] > 0.0 else FAR
    return a[14] - radius


@kernel
def is_inside(walls, patch, foot):
    """Return whether a foot lies within every boundary of its patch."""
    for side in range(6):
        if boundary(walls, patch, foot, side) < 0.0:
            return False
    return True


@kernel
def side_beyond(walls, patch, foot):
    """Return the first boundary of its patch that a foot lies beyond, -1 when it is inside."""
    for side in range(6):
        if boundary(walls, patch, foot, side) < 0.0:
            return side
    return -1


@kernel
def box_distance(walls, patch, point):
    """Return the distance from a point to the bounds of a patch, m (0 inside)."""
    square = 0.0
    for k in range(3):
        low, high = walls.box[patch, k] - point[k], point[k] - walls.box[patch, k + 3]
        off = max(low, high)
        if off > 0.0:
            square += off * off
    return math.sqrt(square)


@kernel
def entry_distance(walls, patch, point):
    """Return the least way a point outside a closed tube has to one of its end discs, m."""
    first = walls.first[patch]
    last = first + walls.count[patch] - 1
    best = FAR
    for row in (first, last):
        x, y, z = walls.knots[row, 1] - point[0], walls.knots[row, 2] - point[1], walls.knots[row, 3] - point[2]
        best = min(best, math.sqrt(x * x + y * y + z * z) - walls.number[patch, 0])
    return best


@kernel
def is_full_tube(walls, patch):
    """Return whether a patch is a tube all round: it can only be entered through its ends."""
    a = walls.number[patch]
    return walls.kind[patch] == SWEPT_INSIDE and a[2] - a[1] >= FULL_CIRCLE and a[3] < 0.5


@kernel
def nearest_wall(walls, y, r, active, before):
    """Find the wall that a ball in state `y` touches next, other than `active` and what is linked to it.

    A wall within the ball counts only while the ball closes on it: one it is leaving must not hide another. Nor does
    one count that the mouth of the wall it was on last leads through, while it has not come out of it: `before` =
    (that wall, place at the start of the step).

    Returns
    -------
    gap : float
        Gap of the nearest wall that faces the ball, m (FAR if none).
    patch : int
        That wall, -1 if none.
    free : float
        Way the ball may travel before it can touch any of them, m. Walls are one-sided: one that the centre
        has passed by more than r is not there until the ball comes round.
    """
    best, found, free = FAR, -1, FAR
    point = (y[0], y[1], y[2])
    for patch in range(walls.kind.shape[0]):
        if patch == active or is_linked(walls, active, patch):
            continue
        off = box_distance(walls, patch, point) - r
        if off > max(free, 0.0):
            continue
        foot = foot_on(walls, patch, point, r, ANYWHERE)
        if foot.gap < 0.0 and leads_through(walls, before[0], patch) and is_within(walls, patch, before[1], r):
            free = min(free, max(off, 0.0))
            continue
        if foot.gap > -r and is_inside(walls, patch, foot):
            free = min(free, foot.gap)
            closing = y[3] * foot.nx + y[4] * foot.ny + y[5] * foot.nz < 0.0
            if foot.gap < best and (foot.gap >= 0.0 or closing):
                best, found = foot.gap, patch
        elif foot.gap < 0.0 and is_full_tube(walls, patch):
            free = min(free, max(off, entry_distance(walls, patch, point)))
        else:
            free = min(free, max(off, way_into(walls, patch, foot, r)))
    return best, found, free


@kernel
def way_into(walls, patch, foot, r):
    """Return a way that a ball must at least travel before its foot comes within the boundaries of a patch, m.

    Along a curve or profile the foot moves at most FOOT_SPEED times as fast as the ball. Round a curve the ball must
    reach the wedge of allowed angles: at distance rho and an angle d beyond it, rho sin d (rho from a right angle on).
    """
    way = 0.0
    kind = walls.kind[patch]
    for side in range(6):
        over = -boundary(walls, patch, foot, side)
        if over <= 0.0:
            continue
        if kind == PLANE:
            way = max(way, over)
        elif side < 2:
            way = max(way, over / FOOT_SPEED)
        else:
            sign = -1.0 if kind == SWEPT_INSIDE else 1.0
            rho = walls.number[patch, 0] + sign * (foot.gap + r)
            way = max(way, max(rho, 0.0) * math.sin(min(over, 0.5 * math.pi)))
    return way


@kernel
def is_within(walls, patch, point, r):
    """Return whether a ball at `point` lies within a wall."""
    return foot_on(walls, patch, point, r, ANYWHERE).gap < 0.0


@kernel
def leads_through(walls, left, patch):
    """Return whether a tube or its edge leads through `patch`: links 4 and 5 of a swept patch name such walls."""
    if left < 0 or walls.kind[left] == PLANE:
        return False
    return walls.link[left, 4] == patch or walls.link[left, 5] == patch


@kernel
def is_linked(walls, active, patch):
    """Return whether `patch` continues `active` smoothly beyond one of its boundaries."""
    if active < 0:
        return False
    for side in range(6):
        if walls.link[active, side] == patch and walls.smooth[active, side]:
            return True
    return False
