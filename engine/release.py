"""Where and how the ball of a run is let go: the state the kernels start from."""

import math
from collections.abc import Sequence
from typing import NamedTuple

import numpy as np

from engine.dynamics.state import Start
from engine.element_walls import Walls, is_segment
from engine.geometry.pose import Array, cross
from engine.geometry.profiles import at_length
from engine.geometry.tables import down_at, interpolate
from engine.model.design import Release
from engine.model.elements import Vessel
from engine.placement import Placed
from engine.vessels import entry_length

DECIDE = -1
"""Regime left to the kernels, which see whether the ball rolls or slips."""
AIRBORNE = -1


class _Stand(NamedTuple):
    """A ball on a wall: centre (3,) m, unit normal (3,), unit direction of travel (3,), patch, arc length there m."""

    centre: Array
    normal: Array
    ahead: Array
    patch: int
    s: float


def start_of(release: Release, chain: Sequence[Placed], walls: Sequence[Walls], radius: float) -> Start:
    """Start of a run: the ball (`radius` m) on the wall, rolling without slip, with the asked spin about the normal.

    v = speed (cos d t + sin d n x t), w = n x v / r + spin n, so that v - r w x n = 0.
    """
    stand = _stand(release, chain, walls, radius)
    turn = release.direction or 0.0
    left = cross(stand.normal, stand.ahead)
    v = release.speed * (math.cos(turn) * stand.ahead + math.sin(turn) * left)
    w = cross(stand.normal, v) / radius + release.spin * stand.normal
    return Start(0.0, stand.centre, v, w, stand.patch, stand.s, DECIDE)


def _stand(release: Release, chain: Sequence[Placed], walls: Sequence[Walls], radius: float) -> _Stand:
    first = chain[0]
    if first.curve is not None:
        return _in_bore(release, chain, walls, radius)
    if first.meridian is not None:
        return _in_vessel(release, first, walls[0], radius)
    if first.plate is not None:
        normal = cross(first.plate.along, first.plate.left)
        s = min(release.offset, first.plate.length)
        centre = first.plate.origin + s * first.plate.along + radius * normal
        return _Stand(centre, normal, first.plate.along, walls[0].parts[0], s)
    pose = first.inlet
    return _Stand(pose.position, -pose.down, pose.tangent, AIRBORNE, 0.0)


def _in_bore(release: Release, chain: Sequence[Placed], walls: Sequence[Walls], radius: float) -> _Stand:
    """In a tube or trough, `offset` downstream, at wall angle `climb`: centre = c + (R - r) e, n = -e."""
    place, s = 0, release.offset
    while s > chain[place].length and place + 1 < len(chain) and is_segment(chain[place + 1]):
        s -= chain[place].length
        place += 1
    entry = chain[place]
    s = min(s, entry.length)
    if entry.curve is None or entry.bore is None:
        raise TypeError("only a segment has a curve")
    at = np.array([s])
    position, tangent, _ = (row[0] for row in interpolate(entry.curve, at))
    down = down_at(entry.curve, at)[0]
    spoke = math.cos(release.climb) * down + math.sin(release.climb) * cross(tangent, down)
    ahead = tangent / math.sqrt(tangent @ tangent)
    return _Stand(position + (entry.bore - radius) * spoke, -spoke, ahead, walls[place].parts[0], s)


def _in_vessel(release: Release, entry: Placed, walls: Walls, radius: float) -> _Stand:
    """On the wall of a vessel where its inlet would be, `offset` further down the meridian, heading as the run does."""
    if entry.meridian is None or entry.origin is None or entry.axis is None:
        raise TypeError("only a vessel has a meridian")
    element: Vessel = entry.element  # type: ignore[assignment]
    s = min(entry_length(element, 0.0) + release.offset, float(entry.meridian[-1, 0]))
    point, slope, _ = (row[0] for row in at_length(entry.meridian, np.array([s])))
    away = entry.inlet.position - entry.origin
    away = away - (away @ entry.axis) * entry.axis
    size = math.sqrt(away @ away)
    spoke = away / size if size > radius * 1e-6 else entry.inlet.forward
    normal = entry.side * (-slope[1] * spoke + slope[0] * entry.axis)
    ahead = entry.inlet.tangent - (entry.inlet.tangent @ normal) * normal
    ahead = ahead / math.sqrt(ahead @ ahead)
    centre = entry.origin + point[0] * spoke + point[1] * entry.axis + radius * normal
    return _Stand(centre, normal, ahead, walls.parts[_part_at(entry.meridian, s)], s)


def _part_at(meridian: Array, s: float) -> int:
    """Which smooth part of a meridian holds profile length s."""
    joints = meridian[1:, 0][np.diff(meridian[:, 0]) <= 0.0]
    return int(np.searchsorted(joints, s, side="left"))
