"""Walls as flat tables: the kinds of patch, the scene, the record of one contact.

A patch is a bounded smooth piece of wall. It answers only for its interior; what lies beyond each
boundary is named by `Scene.link`. Variants are chosen by integer kind, never by passing functions:
a kernel that takes a function is compiled anew in every process (measured).
"""

from typing import NamedTuple

import numpy as np

SWEPT_INSIDE = 0
"""Circle of radius R swept along a curve, ball inside: tube, trough."""
SWEPT_OUTSIDE = 1
"""Circle of radius R >= 0 swept along a curve, ball outside: rod, lip, sharp edge (R = 0)."""
REVOLVED = 2
"""Planar profile turned about an axis: funnel, well, bowl, dome, fillet."""
PLANE = 3
"""Rectangle or disc, with or without a round hole: deck, tray, floor."""

OPEN = -1
"""Link: nothing beyond this boundary, the wall just ends (contact is lost)."""
EXIT = -2
"""Link: the way out of the run; crossing it ends the run as arrived."""

ROLE_WALL = 0
ROLE_CATCH = 1
"""A touch ends the run as arrived (catch tray)."""
ROLE_FLOOR = 2
"""A touch ends the run as escaped (floor of the site)."""

MU_STATIC, MU_KINETIC, ROLLING_LOSS, LOSS_SPEED, RESTITUTION, SPIN_ARM, CONTACT_MODULUS = range(7)
"""Columns of `Scene.law`: -, -, - (energy form), m/s (inf: none), -, m (negative: by Hertz),
Pa (0: no spin friction).
"""


class Scene(NamedTuple):
    """Every wall of a design as numbers (n patches, m curve knots, p meridian knots).

    Attributes
    ----------
    kind : (n,) int64
        SWEPT_INSIDE, SWEPT_OUTSIDE, REVOLVED or PLANE.
    first, count : (n,) int64
        Slice of `knots` (swept) or `meridian` (revolved) that belongs to the patch.
    number : (n, 16) float64
        Swept: 0 radius R, 1 phi_min, 2 phi_max (rad, about `down`; a range >= 2 pi is the full circle),
        3 closed curve (0 or 1).
        Revolved: 0:3 origin, 3:6 unit axis, 6 side (+1: n is the profile tangent turned left, (-z', rho');
        -1: the other).
        Plane: 0:3 origin, 3:6 unit u, 6:9 unit v (n = u x v), 9:13 u_min, u_max, v_min, v_max (may be inf),
        13 hole radius about the origin (0: none), 14 disc radius about the origin (inf: none).
    link : (n, 6) int64
        Patch beyond each boundary, or OPEN, or EXIT. Swept: start, end, phi_min, phi_max. Revolved: profile start, end.
        Plane: u_min, u_max, v_min, v_max, hole, disc.
    law : (n, 8) float64
        Contact law of ball on this wall, columns MU_STATIC ... CONTACT_MODULUS.
    role : (n,) int64
        ROLE_WALL, ROLE_CATCH, ROLE_FLOOR.
    owner : (n,) int64
        Index of the placed element the patch belongs to (-1: the site).
    box : (n, 6) float64
        Bounds of the wall, m: low x, y, z, high x, y, z (may be inf).
    knots : (m, 16) float64
        Curve knots: s, r, r', r'', down, down'.
    meridian : (p, 7) float64
        Meridian knots: s, rho, z, rho', z', rho'', z''.
    gravity : (3,) float64
        m/s2.
    air : (2,) float64
        Density kg/m3, viscosity Pa s.
    """

    kind: np.ndarray
    first: np.ndarray
    count: np.ndarray  # type: ignore[assignment]  # hides tuple.count, which nobody calls on a scene
    number: np.ndarray
    link: np.ndarray
    law: np.ndarray
    role: np.ndarray
    owner: np.ndarray
    box: np.ndarray
    knots: np.ndarray
    meridian: np.ndarray
    gravity: np.ndarray
    air: np.ndarray


class Foot(NamedTuple):
    """Where a ball centre stands against one patch.

    `gap` m; `n` unit normal; `w` upper triangle (xx, xy, xz, yy, yz, zz) of W = dn/dx, 1/m;
    `s` arc length or plane u; `angle` wall angle phi, azimuth or plane v; `piece` warm start for the next query.
    """

    gap: float
    nx: float
    ny: float
    nz: float
    wxx: float
    wxy: float
    wxz: float
    wyy: float
    wyz: float
    wzz: float
    s: float
    angle: float
    piece: int
