"""Closest points on curves and meridians, by Newton from a warm start.

Letters: c(q) the piece, q in [0, 1] its parameter, h its length, x the point sought from.
Stationary: g(q) = (c - x).c' = 0, g' = c'.c' + (c - x).c''. Inside a tube the distance to the centreline is
smaller than the radius of curvature, so g' > 0 and the step is safe; where it is not, the sign of g chooses a
quarter piece. Beyond the ends of the table the end piece is carried on, so that boundary functions stay smooth.
"""

from engine.constants import NEWTON_SETTLED, NEWTON_TURNS
from engine.kernel import kernel

REACH = 1.0
"""Pieces by which a foot may lie beyond the end of its table."""


@kernel
def nearest_knot(points, first, count, x, y, z):
    """Return the row of the knot (columns 1:4) nearest to (x, y, z)."""
    best, row = 1e300, first
    for i in range(first, first + count):
        dx, dy, dz = points[i, 1] - x, points[i, 2] - y, points[i, 3] - z
        square = dx * dx + dy * dy + dz * dz
        if square < best:
            best, row = square, i
    return row


@kernel
def nearest_meridian_knot(points, first, count, rho, z):
    """Return the row of the meridian knot (columns 1:3) nearest to (rho, z)."""
    best, row = 1e300, first
    for i in range(first, first + count):
        square = (points[i, 1] - rho) ** 2 + (points[i, 2] - z) ** 2
        if square < best:
            best, row = square, i
    return row


@kernel
def curve_at(pieces, i, q):
    """Return position, first and second derivative by q of piece i: nine numbers."""
    a = pieces[i]
    x = a[0, 0] + q * (a[1, 0] + q * (a[2, 0] + q * (a[3, 0] + q * (a[4, 0] + q * a[5, 0]))))
    y = a[0, 1] + q * (a[1, 1] + q * (a[2, 1] + q * (a[3, 1] + q * (a[4, 1] + q * a[5, 1]))))
    z = a[0, 2] + q * (a[1, 2] + q * (a[2, 2] + q * (a[3, 2] + q * (a[4, 2] + q * a[5, 2]))))
    dx = a[1, 0] + q * (2.0 * a[2, 0] + q * (3.0 * a[3, 0] + q * (4.0 * a[4, 0] + q * 5.0 * a[5, 0])))
    dy = a[1, 1] + q * (2.0 * a[2, 1] + q * (3.0 * a[3, 1] + q * (4.0 * a[4, 1] + q * 5.0 * a[5, 1])))
    dz = a[1, 2] + q * (2.0 * a[2, 2] + q * (3.0 * a[3, 2] + q * (4.0 * a[4, 2] + q * 5.0 * a[5, 2])))
    ex = 2.0 * a[2, 0] + q * (6.0 * a[3, 0] + q * (12.0 * a[4, 0] + q * 20.0 * a[5, 0]))
    ey = 2.0 * a[2, 1] + q * (6.0 * a[3, 1] + q * (12.0 * a[4, 1] + q * 20.0 * a[5, 1]))
    ez = 2.0 * a[2, 2] + q * (6.0 * a[3, 2] + q * (12.0 * a[4, 2] + q * 20.0 * a[5, 2]))
    return x, y, z, dx, dy, dz, ex, ey, ez


@kernel
def meridian_at(pieces, i, q):
    """Return rho, z and their first and second derivatives by q of meridian piece i: six numbers."""
    a = pieces[i]
    x = a[0, 0] + q * (a[1, 0] + q * (a[2, 0] + q * (a[3, 0] + q * (a[4, 0] + q * a[5, 0]))))
    y = a[0, 1] + q * (a[1, 1] + q * (a[2, 1] + q * (a[3, 1] + q * (a[4, 1] + q * a[5, 1]))))
    dx = a[1, 0] + q * (2.0 * a[2, 0] + q * (3.0 * a[3, 0] + q * (4.0 * a[4, 0] + q * 5.0 * a[5, 0])))
    dy = a[1, 1] + q * (2.0 * a[2, 1] + q * (3.0 * a[3, 1] + q * (4.0 * a[4, 1] + q * 5.0 * a[5, 1])))
    ex = 2.0 * a[2, 0] + q * (6.0 * a[3, 0] + q * (12.0 * a[4, 0] + q * 20.0 * a[5, 0]))
    ey = 2.0 * a[2, 1] + q * (6.0 * a[3, 1] + q * (12.0 * a[4, 1] + q * 20.0 * a[5, 1]))
    return x, y, dx, dy, ex, ey


@kernel
def newton_step(g, slope, speed):
    """Return a step of q against g: Newton where g rises, else a quarter piece downhill; half a piece at most."""
    if slope > 0.05 * speed:
        step = -g / slope
        return max(-0.75, min(0.75, step))
    return -0.25 if g > 0.0 else 0.25


@kernel
def settle(i, q, span, closed):
    """Move (i, q) to the piece that holds it. `span` = (first row, last piece); closed tables wrap."""
    first, last = span
    if q < 0.0:
        if i > first:
            return i - 1, q + 1.0
        if closed:
            return last, q + 1.0
        return i, max(q, -REACH)
    if q > 1.0:
        if i < last:
            return i + 1, q - 1.0
        if closed:
            return first, q - 1.0
        return i, min(q, 1.0 + REACH)
    return i, q


@kernel
def project_on_curve(pieces, span, closed, point, guess):
    """Return (piece, q) of the foot of `point` on a curve.

    Parameters
    ----------
    pieces : (m, 6, 3) float
    span : (int, int)
        First row and last piece.
    closed : bool
    point : three floats, m
    guess : (int, float)
        Piece and q to start from.
    """
    i, q = guess
    x, y, z = point
    for _ in range(NEWTON_TURNS):
        cx, cy, cz, dx, dy, dz, ex, ey, ez = curve_at(pieces, i, q)
        rx, ry, rz = cx - x, cy - y, cz - z
        speed = dx * dx + dy * dy + dz * dz
        step = newton_step(rx * dx + ry * dy + rz * dz, speed + rx * ex + ry * ey + rz * ez, speed)
        old = i
        i, q = settle(i, q + step, span, closed)
        if abs(step) < NEWTON_SETTLED and i == old:
            break
    return i, q


@kernel
def project_on_meridian(pieces, span, rho, z, guess):
    """Return (piece, q) of the foot of (rho, z) on a meridian; arguments as `project_on_curve`."""
    i, q = guess
    for _ in range(NEWTON_TURNS):
        cx, cy, dx, dy, ex, ey = meridian_at(pieces, i, q)
        rx, ry = cx - rho, cy - z
        speed = dx * dx + dy * dy
        step = newton_step(rx * dx + ry * dy, speed + rx * ex + ry * ey, speed)
        old = i
        i, q = settle(i, q + step, span, False)
        if abs(step) < NEWTON_SETTLED and i == old:
            break
    return i, q
