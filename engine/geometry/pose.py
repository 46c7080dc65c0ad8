"""Where a curve starts or ends: position, tangent and the lowest line of the section before banking.

Signs: heading from +x toward +y, grade positive downhill (fall over plan length), side = tangent x down (left of
travel). A pose whose tangent is vertical still has a heading: the plan direction from which it was pitched down (or
up).
"""

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]


def cross(a: Array, b: Array) -> Array:
    """Cross product of two vectors (3,); ten times faster than the general one of numpy."""
    ax, ay, az = a.tolist()
    bx, by, bz = b.tolist()
    return np.array([ay * bz - az * by, az * bx - ax * bz, ax * by - ay * bx])


@dataclass(frozen=True, eq=False)
class Pose:
    """Position (3,) m, unit tangent (3,), unit `down` (3,) normal to it and not banked."""

    position: Array
    tangent: Array
    down: Array

    @property
    def side(self) -> Array:
        """Unit vector to the left, (3,): tangent x down."""
        return cross(self.tangent, self.down)

    @property
    def forward(self) -> Array:
        """Plan direction of travel (3,), unit and level."""
        side = self.side
        size = math.hypot(side[0], side[1])
        if size < 1e-9:
            return np.array([1.0, 0.0, 0.0])
        return np.array([side[1] / size, -side[0] / size, 0.0])

    @property
    def heading(self) -> float:
        """Angle of travel in plan from +x toward +y, rad."""
        forward = self.forward
        return math.atan2(forward[1], forward[0])

    @property
    def grade(self) -> float:
        """Fall over plan length, positive downhill; infinite for a vertical tangent."""
        level = math.hypot(self.tangent[0], self.tangent[1])
        if level < 1e-12:
            return math.copysign(math.inf, -self.tangent[2])
        return -float(self.tangent[2]) / level


def pose_at(position: Array | Sequence[float], heading: float, grade: float = 0.0) -> Pose:
    """Pose from position (m), heading (rad) and grade.

    t = (cos h, sin h, -grade) / sqrt(1 + grade^2), down = (-grade cos h, -grade sin h, -1) / sqrt(1 + grade^2)
    """
    cosine, sine, slant = math.cos(heading), math.sin(heading), math.sqrt(1.0 + grade * grade)
    tangent = np.array([cosine, sine, -grade]) / slant
    down = np.array([-grade * cosine, -grade * sine, -1.0]) / slant
    return Pose(np.array(position, dtype=np.float64), tangent, down)


def pose_pointing_down(position: Array | Sequence[float], heading: float) -> Pose:
    """Pose straight down; a bend out of it toward `heading` presses the ball on the side away from `heading`."""
    down = np.array([-math.cos(heading), -math.sin(heading), 0.0])
    return Pose(np.array(position, dtype=np.float64), np.array([0.0, 0.0, -1.0]), down)


def regraded(pose: Pose, grade: float) -> Pose:
    """The same place and heading with another grade."""
    return pose_at(pose.position, pose.heading, grade)


def turned(pose: Pose, angle: float, shift: Array) -> Pose:
    """The pose turned about the vertical by `angle` (rad, positive to the left) where it stands,
    then moved by `shift` (3,) m.
    """
    turn = yaw_matrix(angle)
    return Pose(pose.position + shift, turn @ pose.tangent, turn @ pose.down)


def yaw_matrix(angle: float) -> Array:
    """Rotation (3, 3) about the vertical by `angle` (rad)."""
    cosine, sine = math.cos(angle), math.sin(angle)
    return np.array([[cosine, -sine, 0.0], [sine, cosine, 0.0], [0.0, 0.0, 1.0]])


def from_pose(pose: Pose, points: Array) -> Array:
    """World coordinates (n, 3) of points given as forward, left, up (level axes) from the pose."""
    forward = pose.forward
    left = np.array([-forward[1], forward[0], 0.0])
    up = np.array([0.0, 0.0, 1.0])
    return np.asarray(pose.position + np.asarray(points, dtype=np.float64) @ np.stack([forward, left, up]))
