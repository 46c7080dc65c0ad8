"""Builder of a `Scene`: patches added one by one, linked, then packed into flat arrays.

It knows no document. Reference cases and the bridge from a layout to the kernels both use it.
A range of wall angle of 2 pi or more is the full circle.
"""

import math
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from engine.contact.surface import OPEN, PLANE, REVOLVED, ROLE_WALL, SWEPT_INSIDE, SWEPT_OUTSIDE, Scene

Array = NDArray[np.float64]
FULL_CIRCLE = (-math.pi, math.pi)
START, END, PHI_MIN, PHI_MAX = 0, 1, 2, 3
"""Columns of `Scene.link` of a swept patch; START and END also of a revolved one."""
U_MIN, U_MAX, V_MIN, V_MAX, HOLE, DISC = range(6)
"""Columns of `Scene.link` of a plane patch."""
STANDARD_GRAVITY_VECTOR = (0.0, 0.0, -9.80665)
BOX_MARGIN = 1e-6
"""Every box is this much larger than the wall, m, so that rounding cannot cut a wall out of its own box."""


_LATER = np.zeros(6)
"""Box of a swept patch until all are found at once."""


class Law(NamedTuple):
    """Contact law of the ball on one wall.

    `loss_speed` inf: none, `spin_arm` negative: by Hertz, `contact_modulus` Pa.
    """

    static_friction: float = 0.5
    kinetic_friction: float = 0.4
    rolling_loss: float = 0.0
    loss_speed: float = math.inf
    restitution: float = 0.5
    spin_arm: float = 0.0
    contact_modulus: float = 0.0


class Tag(NamedTuple):
    """What a patch carries beside its shape: law, role, index of the placed element (-1: the site)."""

    law: Law = Law()
    role: int = ROLE_WALL
    owner: int = -1


UNTAGGED = Tag()


class Rectangle(NamedTuple):
    """Plane patch: origin (3,), unit u and v (3,), bounds (u_min, u_max, v_min, v_max),
    radius of hole and of disc, m.
    """

    origin: Array
    u: Array
    v: Array
    bounds: tuple[float, float, float, float] = (-math.inf, math.inf, -math.inf, math.inf)
    hole: float = 0.0
    disc: float = math.inf


class Revolution(NamedTuple):
    """Revolved patch: meridian (p, 7), origin (3,), unit axis (3,), side +1 or -1 (see `Scene.number`)."""

    meridian: Array
    origin: Array
    axis: Array
    side: int


class PatchList:
    """Patches in the order they were added; every `add_` returns the index of the new patch."""

    def __init__(self) -> None:
        self._kind: list[int] = []
        self._span: list[tuple[int, int]] = []
        self._number: list[Array] = []
        self._link: list[list[int]] = []
        self._tag: list[Tag] = []
        self._box: list[Array] = []
        self._knots: list[Array] = []
        self._meridian: list[Array] = []
        self._knot_count = 0
        self._meridian_count = 0

    def __len__(self) -> int:
        return len(self._kind)

    def add_swept_inside(
        self,
        table: Array,
        radius: float,
        phi_range: tuple[float, float] = FULL_CIRCLE,
        closed: bool = False,
        tag: Tag = UNTAGGED,
    ) -> int:
        """Tube or trough: circle of `radius` (m) along `table` (n, 16), ball inside."""
        return self._add_swept(SWEPT_INSIDE, table, (radius, *phi_range, float(closed)), tag)

    def add_swept_outside(
        self,
        table: Array,
        radius: float,
        phi_range: tuple[float, float] = FULL_CIRCLE,
        closed: bool = False,
        tag: Tag = UNTAGGED,
    ) -> int:
        """Rod, lip or edge: circle of `radius` >= 0 (m) along `table` (n, 16), ball outside."""
        return self._add_swept(SWEPT_OUTSIDE, table, (radius, *phi_range, float(closed)), tag)

    def add_revolved(self, shape: Revolution, tag: Tag = UNTAGGED) -> int:
        """Surface of revolution of a meridian."""
        number = np.zeros(16)
        number[0:3], number[3:6], number[6] = shape.origin, shape.axis, shape.side
        span = (self._meridian_count, len(shape.meridian))
        self._meridian.append(shape.meridian)
        self._meridian_count += len(shape.meridian)
        return self._add(REVOLVED, span, number, tag, revolved_box(shape))

    def add_plane(self, shape: Rectangle, tag: Tag = UNTAGGED) -> int:
        """Rectangle or disc with normal u x v."""
        number = np.zeros(16)
        number[0:3], number[3:6], number[6:9] = shape.origin, shape.u, shape.v
        number[9:13], number[13], number[14] = shape.bounds, shape.hole, shape.disc
        return self._add(PLANE, (0, 0), number, tag, plane_box(shape))

    def set_link(self, patch: int, boundary: int, target: int) -> None:
        """Name what lies beyond `boundary` (START, PHI_MAX, U_MIN, ...) of `patch`: a patch, OPEN or EXIT."""
        self._link[patch][boundary] = target

    def to_scene(
        self, gravity: tuple[float, float, float] = STANDARD_GRAVITY_VECTOR, air: tuple[float, float] = (0.0, 1.8e-5)
    ) -> Scene:
        """Pack everything; `gravity` m/s2, `air` density kg/m3 (0: none) and viscosity Pa s."""
        span = np.array(self._span, dtype=np.int64).reshape(-1, 2)
        knots = np.concatenate([*self._knots, np.zeros((0, 16))])
        kind, number = np.array(self._kind, dtype=np.int64), np.array(self._number).reshape(-1, 16)
        box = np.array(self._box, dtype=np.float64).reshape(-1, 6)
        swept = kind <= SWEPT_OUTSIDE
        if swept.any():
            box[swept] = swept_boxes(knots, span[swept, 0], number[swept, 0])
        law = np.zeros((len(self), 8))
        law[:, :7] = [tag.law for tag in self._tag] or np.zeros((0, 7))
        return Scene(
            kind=kind,
            first=np.ascontiguousarray(span[:, 0]),
            count=np.ascontiguousarray(span[:, 1]),
            number=number,
            link=np.array(self._link, dtype=np.int64).reshape(-1, 6),
            law=law,
            role=np.array([tag.role for tag in self._tag], dtype=np.int64),
            owner=np.array([tag.owner for tag in self._tag], dtype=np.int64),
            box=box,
            knots=knots,
            meridian=np.concatenate([*self._meridian, np.zeros((0, 7))]),
            gravity=np.array(gravity, dtype=np.float64),
            air=np.array(air, dtype=np.float64),
        )

    def _add_swept(self, kind: int, table: Array, head: tuple[float, float, float, float], tag: Tag) -> int:
        number = np.zeros(16)
        number[:4] = head
        span = (self._knot_count, len(table))
        self._knots.append(table)
        self._knot_count += len(table)
        return self._add(kind, span, number, tag, _LATER)

    def _add(self, kind: int, span: tuple[int, int], number: Array, tag: Tag, box: Array) -> int:
        self._kind.append(kind)
        self._span.append(span)
        self._number.append(number)
        self._link.append([OPEN] * 6)
        self._tag.append(tag)
        self._box.append(box)
        return len(self._kind) - 1


def swept_boxes(knots: Array, first: NDArray[np.int64], radius: Array) -> Array:
    """Bounds (n, 6) of n swept circles whose knots follow each other from rows `first`: knots,
    a chord's sagitta and the radius, m.
    """
    step = np.diff(knots[:, 0], append=0.0)
    longest = np.maximum.reduceat(np.maximum(step, 0.0), first)
    bend = np.sqrt(np.maximum.reduceat(np.einsum("ij,ij->i", knots[:, 7:10], knots[:, 7:10]), first))
    room = (radius + 0.25 * bend * longest**2 + BOX_MARGIN)[:, None]
    low, high = np.minimum.reduceat(knots[:, 1:4], first), np.maximum.reduceat(knots[:, 1:4], first)
    return np.concatenate([low - room, high + room], axis=1)


def revolved_box(shape: Revolution) -> Array:
    """Bounds (6,) of a surface of revolution, m: every knot's parallel circle, and a chord's sagitta."""
    table = shape.meridian
    step = np.diff(table[:, 0])
    room = 0.25 * float(step.max()) ** 2 * float(np.hypot(table[:, 5], table[:, 6]).max()) + BOX_MARGIN
    axis = np.asarray(shape.axis, dtype=np.float64)
    centre = shape.origin + np.outer(table[:, 2], axis)
    reach = np.outer(np.abs(table[:, 1]), np.sqrt(np.maximum(0.0, 1.0 - axis**2)))
    return np.concatenate([(centre - reach).min(axis=0) - room, (centre + reach).max(axis=0) + room])


def plane_box(shape: Rectangle) -> Array:
    """Bounds (6,) of a plane patch, m; infinite where the patch is."""
    bounds = np.clip(np.array(shape.bounds), -shape.disc, shape.disc)
    box = np.concatenate([shape.origin, shape.origin]).astype(np.float64)
    for direction, low, high in ((shape.u, bounds[0], bounds[1]), (shape.v, bounds[2], bounds[3])):
        for axis in range(3):
            if direction[axis] != 0.0:
                ends = (direction[axis] * low, direction[axis] * high)
                box[axis] += min(ends)
                box[axis + 3] += max(ends)
    box[:3] -= BOX_MARGIN
    box[3:] += BOX_MARGIN
    return box
