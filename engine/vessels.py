"""How a vessel stands: its axis, where its mouth is for a bore that arrives, where its throat leads."""

import math
from functools import lru_cache

import numpy as np

from engine import shapes
from engine.geometry import profiles
from engine.geometry.pose import Array, Pose, cross, pose_at, pose_pointing_down
from engine.model.elements import Dome, Funnel, Vessel, Well

ENTRY_CLEARANCE = 5e-4
"""m. An inlet ends this far off the wall of the vessel it leads into, measured from the bore:
the ball is set down, not jammed.
"""
VERTICAL = 1e-9
"""Plan part of a unit tangent below which it has no heading of its own."""
UP = np.array([0.0, 0.0, 1.0])


def axis_of(element: Vessel) -> Array:
    """Unit axis out of the mouth: up, for a tilted well leaning toward its heading."""
    if not isinstance(element, Well):
        return UP
    level = math.sin(element.tilt)
    return np.array(
        [level * math.cos(element.tilt_heading), level * math.sin(element.tilt_heading), math.cos(element.tilt)]
    )


@lru_cache(maxsize=shapes.CACHE_SIZE)
def entry_length(element: Vessel, bore: float) -> float:
    """Profile length at which the ball meets the wall of a vessel, m."""
    table = shapes.meridian(element)
    if isinstance(element, Dome):
        return 0.0
    if isinstance(element, Funnel):
        return profiles.length_at_height(table, -element.inlet_drop)
    fillet = 0.5 * math.pi * element.rim_fillet if isinstance(element, Well) else 0.0
    return min(fillet + bore, 0.5 * float(table[-1, 0]))


def mouth(element: Vessel, pose: Pose, bore: float, axis: Array) -> Array:
    """Middle of the rim plane so that the bore stands inside, just off the wall, heading along the parallel circle.

    With e the unit vector from the axis to the inlet: inlet = origin + rho e + z axis, where (rho, z) lies off the
    meridian by the bore's radius and a clearance. A dip of the path below level by angle i, in a wall whose meridian
    has the plan share cos b, turns the heading inward by atan(tan i cos b).
    """
    s = np.array([entry_length(element, bore)])
    point, slope, _ = profiles.at_length(shapes.meridian(element), s)
    normal = np.array([slope[0, 1], -slope[0, 0]])
    rho, z = point[0] + (bore + ENTRY_CLEARANCE) * normal
    dip = element.inlet_angle if isinstance(element, Funnel) else 0.0
    hand = getattr(element, "hand", 1)
    inward = _towardaxis_of(pose, axis, hand)
    turn = math.atan2(math.sin(dip) * abs(slope[0, 0]), math.cos(dip))
    ahead = hand * cross(inward, axis)
    inward = math.cos(turn) * inward + math.sin(turn) * ahead
    return np.asarray(pose.position + rho * inward - z * axis)


def _towardaxis_of(pose: Pose, axis: Array, hand: int) -> Array:
    """Unit vector across `axis` from the inlet to it: hand (axis x t),
    or where t runs along the axis the left of travel.
    """
    upright = abs(axis[2]) > 1.0 - 1e-12
    across = cross(axis, pose.forward if upright else pose.tangent)
    size = math.sqrt(across @ across)
    if size < 1e-6:
        across = cross(UP, pose.forward)
        across = across - (across @ axis) * axis
        size = math.sqrt(across @ across)
    return np.asarray(hand * across / size)


def throat_pose(meridian: Array, origin: Array, axis: Array, inlet: Pose) -> Pose:
    """Pose at the middle of the lower end of a vessel, along its axis and away from the mouth."""
    position = origin + meridian[-1, 2] * axis
    level = math.hypot(axis[0], axis[1])
    if level < VERTICAL:
        return pose_pointing_down(position, inlet.heading)
    return pose_at(position, math.atan2(-axis[1], -axis[0]), axis[2] / level)


def dome_outlet(meridian: Array, origin: Array, inlet: Pose) -> Pose:
    """Pose at the rim of a dome, straight ahead, along its wall."""
    _, rho, z, slope, fall = meridian[-1, :5]
    position = origin + rho * inlet.forward + z * UP
    if slope < VERTICAL:
        return pose_pointing_down(position, inlet.heading)
    return pose_at(position, inlet.heading, -fall / slope)
