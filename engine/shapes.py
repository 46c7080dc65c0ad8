"""From one element of the document to its curve or meridian, in its own axes.

A segment is drawn from the origin with heading +x and only turned about the vertical when it is placed, so what is
kept in the caches below stays valid while the rest of the run is edited. Arrays that come from here are shared and
must not be written to.
"""

import math
from functools import lru_cache

import numpy as np

from engine.errors import DesignError
from engine.geometry import primitives, profiles
from engine.geometry.frames import banked
from engine.geometry.offsets import offset_curve
from engine.geometry.pose import Array, Pose, pose_at, yaw_matrix
from engine.geometry.spirals import clothoid
from engine.model.elements import (
    Bend,
    Bowl,
    Cone,
    Dome,
    Easing,
    FreeLine,
    Funnel,
    Helix,
    Hyperbolic,
    Loop,
    Parabolic,
    Points,
    Power,
    Segment,
    Straight,
    Transition,
    Trough,
    Vessel,
    Well,
)

SHARP = 1e-6
"""m. A fillet of a smaller radius is drawn as a sharp edge: it is far below what a printer or a lathe leaves."""

CACHE_SIZE = 4096
"""Shapes kept: some ten edits of a design of 400 elements. A curve takes about 10 kB."""
ENTRY_DIGITS = 13
"""Directions at an inlet are rounded to this many decimals before they name a shape, so that rounding noise of a
turned copy does not make a new one; it moves the end of a 10 m element by 1e-12 m at most."""

Entry = tuple[float, ...]
"""Tangent and `down` at an inlet, turned so that the heading is +x; empty for elements that bring their own grade."""


def entry_of(element: Segment, inlet: Pose) -> Entry:
    """What the shape of a segment depends on besides itself."""
    if not isinstance(element, FreeLine | Loop):
        return ()
    turn = yaw_matrix(-inlet.heading)
    local = np.concatenate([turn @ inlet.tangent, turn @ inlet.down])
    return tuple(float(number) for number in np.round(local, ENTRY_DIGITS) + 0.0)


def _start(entry: Entry) -> Pose:
    if not entry:
        return pose_at((0.0, 0.0, 0.0), 0.0)
    return Pose(np.zeros(3), np.array(entry[:3]), np.array(entry[3:]))


@lru_cache(maxsize=CACHE_SIZE)
def centreline(element: Segment, entry: Entry) -> Array:
    """Table (n, 16) of a segment's centreline before banking, from the origin with heading +x."""
    return _shared(_centreline(element, _start(entry)))


@lru_cache(maxsize=CACHE_SIZE)
def banked_centreline(element: Segment, entry: Entry) -> Array:
    """Table (n, 16) of a segment's centreline with its bank."""
    return _shared(banked(centreline(element, entry), element.bank_start, element.bank_end))


def _centreline(element: Segment, start: Pose) -> Array:
    match element:
        case Straight():
            return primitives.straight(start, element.length, element.grade)
        case Bend():
            return primitives.arc(start, element.radius, element.turn, element.grade)
        case Helix():
            return primitives.helix(start, element.radius, element.turns, element.drop)
        case Transition():
            return clothoid(start, element.length, (element.curvature_start, element.curvature_end), element.grade)
        case Easing():
            return primitives.easing(start, element.length, element.grade_start, element.grade_end)
        case FreeLine():
            return primitives.free_line(start, np.array(element.points))
        case Loop():
            return primitives.loop(start, element.radius, element.shift)


@lru_cache(maxsize=CACHE_SIZE)
def lips(element: Segment, entry: Entry) -> tuple[Array, Array]:
    """Tables of a trough's lips, right (negative wall angle) and left.

    The trough lies at wall angle -pi/2 and +pi/2 of them.
    """
    section = element.section
    if not isinstance(section, Trough):
        raise DesignError(f'"{element.title}" is a tube and has no lips; ask only troughs for them.')
    table = banked_centreline(element, entry)
    distance = 0.5 * section.bore + section.lip_radius
    return (
        _shared(offset_curve(table, -section.lip_angle, distance, -0.5 * math.pi)),
        _shared(offset_curve(table, section.lip_angle, distance, 0.5 * math.pi)),
    )


def _shared(table: Array) -> Array:
    table.flags.writeable = False
    return table


# -- vessels: z along the axis from the rim plane (dome: from its top), negative below
# ------------------------------------------
@lru_cache(maxsize=CACHE_SIZE)
def meridian(element: Vessel) -> Array:
    """Meridian (p, 7) of a vessel, the way the ball goes.

    At jumps of curvature two knots share one s (`smooth_parts`).
    """
    match element:
        case Funnel():
            return _shared(_funnel(element))
        case Well():
            return _shared(_well(element))
        case Bowl():
            return _shared(_bowl(element))
        case Dome():
            return _shared(_dome(element))


def side_of_wall(element: Vessel) -> int:
    """Which side of the meridian the ball is on: +1 left of the way it runs (dome), -1 right of it."""
    return 1 if isinstance(element, Dome) else -1


def _funnel(element: Funnel) -> Array:
    rim, throat = (element.rim_radius, 0.0), (element.throat_radius, -element.depth)
    match element.profile:
        case Cone():
            return profiles.line(rim, throat)
        case Power():
            return profiles.power((rim, throat), element.profile.exponent)
        case Hyperbolic():
            return profiles.power((rim, throat), -1.0)
        case Parabolic():
            return profiles.power((rim, throat), 2.0)
        case Points():
            return profiles.through(_stretched(element.profile.points, rim, throat).tolist())


def _stretched(points: tuple[tuple[float, float], ...], rim: tuple[float, float], throat: tuple[float, float]) -> Array:
    """Points from rim to throat, each axis stretched so that the last given lies on the rim and the first on the
    throat.
    """
    drawn = np.array(points)[::-1]
    share = (drawn - drawn[-1]) / (drawn[0] - drawn[-1])
    return np.asarray(np.array(throat) + share * (np.array(rim) - np.array(throat)))


def _well(element: Well) -> Array:
    radius, depth = element.radius, element.depth
    top = element.rim_fillet if element.rim_fillet > SHARP else 0.0
    fillet = element.floor_fillet if element.floor and element.floor_fillet > SHARP else 0.0
    parts = []
    if top > 0.0:
        parts.append(profiles.arc((radius + top, -top), top, (0.5 * math.pi, math.pi)))
    if depth - top - fillet > 0.0:
        parts.append(profiles.line((radius, -top), (radius, fillet - depth)))
    if fillet > 0.0:
        parts.append(profiles.arc((radius - fillet, fillet - depth), fillet, (0.0, -0.5 * math.pi)))
    if element.floor and radius > fillet:
        parts.append(profiles.line((radius - fillet, -depth), (0.0, -depth)))
    return profiles.joined(parts)


def _bowl(element: Bowl) -> Array:
    size, rim, hole = element.sphere_radius, element.rim_radius, element.hole_radius
    centre = math.sqrt(size * size - rim * rim)
    angles = (math.atan2(-centre, rim), -math.acos(hole / size))
    table = profiles.arc((0.0, centre), size, angles)
    if hole == 0.0:
        table[-1, 1] = 0.0
    return table


def _dome(element: Dome) -> Array:
    size = element.sphere_radius
    table = profiles.arc((0.0, -size), size, (0.5 * math.pi, math.acos(element.rim_radius / size)))
    table[0, 1] = 0.0
    return table
