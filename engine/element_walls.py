"""The walls of one placed element as patches, and what each boundary of theirs leads to.

An element adds its patches in a fixed order (wall, lips, edges), so an edit further down does not renumber what comes
before.
"""

import math
from itertools import pairwise
from typing import NamedTuple

import numpy as np

from engine import shapes
from engine.contact.patches import (
    DISC,
    END,
    HOLE,
    PHI_MAX,
    PHI_MIN,
    START,
    U_MAX,
    V_MAX,
    V_MIN,
    PatchList,
    Rectangle,
    Revolution,
    Tag,
)
from engine.contact.surface import EXIT, ROLE_CATCH
from engine.geometry.offsets import edge_table
from engine.geometry.pose import Array, cross
from engine.geometry.primitives import circle, circle_arc, straight_between
from engine.geometry.profiles import smooth_parts
from engine.geometry.tables import D1, DOWN, R, moved
from engine.model.elements import SEGMENTS, Deck, Dome, Segment, Trough, Vessel
from engine.placement import Placed, Plate, points_down
from engine.vessels import entry_length

ALIGNED = 0.05
"""rad. A tube leaves a throat straight on when its tangent is this near the axis."""
SAME_BORE = 1e-6
"""m. A bore narrower than a throat by more than this is a ledge."""
NO_KINK = 1e-6
"""rad. A wall that turns less than this at a joint goes on without an edge."""
CLEAR_OF_END = 1e-4
"""m. The catching disc behind a last outlet stands this much further off than a ball as wide as the bore would need."""
HALF_TURN = math.pi


class Walls(NamedTuple):
    """Patches of one element: those that carry the ball in order, lips (right, left), all of them.

    `mouth` is the edge at the inlet, `end` the edge at the outlet (-1: none); `way_on` is the link slot of `end` that
    leads on.
    """

    parts: tuple[int, ...]
    lips: tuple[int, ...]
    patches: tuple[int, ...]
    mouth: int = -1
    end: int = -1
    way_on: int = PHI_MAX


class Neighbours(NamedTuple):
    """The placed elements before and after, where there are any."""

    before: Placed | None
    after: Placed | None


def is_segment(entry: Placed | None) -> bool:
    """Whether a placed element is a piece of track."""
    return entry is not None and isinstance(entry.element, SEGMENTS)


def add_walls(patches: PatchList, entry: Placed, near: Neighbours, tag: Tag) -> Walls:
    """Add the patches of one element with all links among themselves."""
    if entry.curve is not None:
        return _add_segment(patches, entry, near, tag)
    if entry.meridian is not None:
        return _add_vessel(patches, entry, near, tag)
    if entry.plate is not None:
        return _add_plate(patches, entry, near, tag)
    return Walls((), (), ())


# -- tubes and troughs ----------------------------------------------------------------------------
def _add_segment(patches: PatchList, entry: Placed, near: Neighbours, tag: Tag) -> Walls:
    table, radius = _placed_curve(entry)
    first = len(patches)
    reach = lip_angle(entry)
    inside = patches.add_swept_inside(table, radius, (-reach, reach), False, tag)
    edges = _add_lips(patches, entry, inside, tag) if reach < HALF_TURN else ()
    mouth = end = -1
    if near.before is not None and _stands_out(entry, near.before):
        mouth = _add_ring(patches, entry, inside, START, tag)
    if near.after is not None and (not goes_on(near.after) or is_narrower(entry, near.after)):
        end = _add_ring(patches, entry, inside, END, tag)
    elif near.after is None:
        for patch in (inside, *edges):
            patches.set_link(patch, END, EXIT)
        _add_way_out(patches, (table[-1, R], table[-1, D1]), radius, tag)
    return Walls((inside,), edges, tuple(range(first, len(patches))), mouth, end)


def is_narrower(entry: Placed, other: Placed) -> bool:
    """Whether a segment has a smaller bore than the segment beside it: its end stands out as a ledge."""
    if not is_segment(entry) or not is_segment(other):
        return False
    return (entry.bore or 0.0) < (other.bore or 0.0) - SAME_BORE


def _stands_out(entry: Placed, before: Placed) -> bool:
    """Whether the inlet of a segment has an edge: after a wider segment,
    or after anything that does not end flush with it.
    """
    return is_narrower(entry, before) if is_segment(before) else not _flush(before, entry)


def _placed_curve(entry: Placed) -> tuple[Array, float]:
    if entry.curve is None or entry.bore is None:
        raise TypeError("only a segment has a curve")
    return entry.curve, entry.bore


def lip_angle(entry: Placed) -> float:
    """Wall angle up to which the section of a segment reaches, rad; half a turn for a tube."""
    section = getattr(entry.element, "section", None)
    return section.lip_angle if isinstance(section, Trough) else HALF_TURN


def goes_on(after: Placed) -> bool:
    """Whether the wall of a segment goes on into what follows it: another segment, or a deck level with its invert."""
    if isinstance(after.element, Deck):
        return not points_down(after.inlet)
    return is_segment(after)


def _add_lips(patches: PatchList, entry: Placed, inside: int, tag: Tag) -> tuple[int, int]:
    """Add the rounded edges of a trough and link them with it both ways."""
    element: Segment = entry.element  # type: ignore[assignment]
    section = element.section
    radius = section.lip_radius if isinstance(section, Trough) else 0.0
    tables = shapes.lips(element, shapes.entry_of(element, entry.inlet))
    found = []
    for table, own, limit in zip(tables, (PHI_MIN, PHI_MAX), (PHI_MIN, PHI_MAX), strict=True):
        lip = patches.add_swept_outside(
            moved(table, entry.inlet), radius, (-0.5 * math.pi, 0.5 * math.pi), False, tag
        )
        patches.set_link(inside, own, lip)
        patches.set_link(lip, limit, inside)
        found.append(lip)
    return found[0], found[1]


def _add_ring(patches: PatchList, entry: Placed, inside: int, which: int, tag: Tag) -> int:
    """Add the sharp edge round a free end of a bore, over which a slow ball tips."""
    curve, radius = _placed_curve(entry)
    row = curve[0] if which == START else curve[-1]
    ahead = -row[D1] if which == START else row[D1]
    reach = lip_angle(entry)
    table = circle_arc(row[R], (row[DOWN], cross(row[D1], row[DOWN])), radius, (-reach, reach))
    shape, span, (low, _) = edge_table(table, (-1.0, np.zeros(3)), (0.0, ahead))
    ring = patches.add_swept_outside(shape, 0.0, span, reach >= HALF_TURN, tag)
    patches.set_link(inside, which, ring)
    patches.set_link(ring, low, inside)
    return ring


def _add_way_out(patches: PatchList, outlet: tuple[Array, Array], radius: float, tag: Tag) -> None:
    """Add a catching disc beyond the last outlet, for a ball that leaves it in flight.

    It stands one radius of the bore further on: a ball that rolls has crossed the end of its wall before it touches
    the disc.
    """
    position, ahead = outlet
    u = cross(ahead, np.eye(3)[int(np.argmin(np.abs(ahead)))])
    u = u / math.sqrt(u @ u)
    disc = Rectangle(position + (radius + CLEAR_OF_END) * ahead, u, cross(u, ahead), disc=radius)
    patches.add_plane(disc, tag._replace(role=ROLE_CATCH))


# -- vessels --------------------------------------------------------------------------------------
def _add_vessel(patches: PatchList, entry: Placed, near: Neighbours, tag: Tag) -> Walls:
    if entry.meridian is None or entry.origin is None or entry.axis is None:
        raise TypeError("only a vessel has a meridian")
    first = len(patches)
    pieces = smooth_parts(entry.meridian)
    parts = [patches.add_revolved(Revolution(piece, entry.origin, entry.axis, entry.side), tag) for piece in pieces]
    for upper, lower in pairwise(parts):
        patches.set_link(upper, END, lower)
        patches.set_link(lower, START, upper)
    end, way_on = -1, PHI_MAX
    if near.after is None:
        patches.set_link(parts[-1], END, EXIT)
        if entry.outlet is not None and not isinstance(entry.element, Dome):
            _add_way_out(patches, (entry.outlet.position, entry.outlet.tangent), float(entry.meridian[-1, 1]), tag)
    elif entry.outlet is not None:
        end, way_on = _add_throat(patches, entry, near.after, parts[-1], tag)
    return Walls(tuple(parts), (), tuple(range(first, len(patches))), -1, end, way_on)


def _add_throat(patches: PatchList, entry: Placed, after: Placed, wall: int, tag: Tag) -> tuple[int, int]:
    """Add the edge at the lower end of a vessel; up to the wall of a tube that takes it up flush, else half a turn."""
    if entry.meridian is None or entry.origin is None or entry.axis is None:
        raise TypeError("only a vessel has a throat")
    _, rho, z, slope, fall = entry.meridian[-1, :5]
    flush = _flush(entry, after)
    kink = math.atan2(-slope, -fall)
    if flush and kink < NO_KINK:
        return -1, PHI_MAX
    ring = circle(entry.origin + z * entry.axis, entry.axis, rho)
    normal = (-entry.side * fall, entry.side * slope * entry.axis)
    table, span, (near_wall, away) = edge_table(
        ring, normal, (slope, fall * entry.axis), kink if flush else HALF_TURN
    )
    edge = patches.add_swept_outside(table, 0.0, span, True, tag)
    patches.set_link(wall, END, edge)
    patches.set_link(edge, near_wall, wall)
    return edge, away


def _flush(vessel: Placed, after: Placed) -> bool:
    """Whether a segment takes up the throat of the vessel before it: along its axis and no narrower."""
    if vessel.meridian is None or vessel.axis is None or after.curve is None or isinstance(vessel.element, Dome):
        return False
    straight = -float(after.curve[0, D1] @ vessel.axis) > math.cos(ALIGNED)
    return straight and (after.bore or 0.0) > vessel.meridian[-1, 1] - SAME_BORE


def entry_parts(entry: Placed, walls: Walls) -> tuple[int, ...]:
    """The one or two patches of a vessel through which its inlet passes: where the ball meets it, and the one above."""
    if entry.meridian is None:
        return ()
    element: Vessel = entry.element  # type: ignore[assignment]
    s = entry_length(element, entry.bore or 0.0)
    ends = [float(piece[-1, 0]) for piece in smooth_parts(entry.meridian)]
    met = next((place for place, end in enumerate(ends) if s <= end), len(ends) - 1)
    return walls.parts[max(0, met - 1) : met + 1]


# -- plates ---------------------------------------------------------------------------------------
def _add_plate(patches: PatchList, entry: Placed, near: Neighbours, tag: Tag) -> Walls:
    plate = entry.plate
    if plate is None:
        raise TypeError("only a deck or a tray has a plate")
    first = len(patches)
    half = 0.5 * plate.width
    top = patches.add_plane(Rectangle(plate.origin, plate.along, plate.left, (0.0, plate.length, -half, half)), tag)
    end = -1
    if isinstance(entry.element, Deck):
        _add_edge(patches, plate, top, V_MIN, tag)
        _add_edge(patches, plate, top, V_MAX, tag)
        if near.after is None:
            patches.set_link(top, U_MAX, EXIT)
        else:
            end = _add_edge(patches, plate, top, U_MAX, tag)
    return Walls((top,), (), tuple(range(first, len(patches))), -1, end)


def _add_edge(patches: PatchList, plate: Plate, top: int, side: int, tag: Tag) -> int:
    """Add the sharp edge on one side of a plate."""
    half = 0.5 * plate.width * plate.left
    far = plate.length * plate.along
    ends, outward = {
        V_MIN: ((-half, far - half), -plate.left),
        V_MAX: ((half, far + half), plate.left),
        U_MAX: ((far - half, far + half), plate.along),
    }[side]
    line = straight_between(plate.origin + ends[0], plate.origin + ends[1])
    normal = cross(plate.along, plate.left)
    table, span, (near_wall, _) = edge_table(line, (0.0, normal), (0.0, outward))
    edge = patches.add_swept_outside(table, 0.0, span, False, tag)
    patches.set_link(top, side, edge)
    patches.set_link(edge, near_wall, top)
    return edge


# -- joints ---------------------------------------------------------------------------------------
def join(patches: PatchList, first: tuple[Placed, Walls], second: tuple[Placed, Walls]) -> None:
    """Link the walls of two elements that follow each other."""
    (entry, walls), (after, beyond) = first, second
    if entry.curve is not None and after.curve is not None:
        _join_segments(patches, walls, beyond)
    elif entry.curve is not None and isinstance(after.element, Deck) and goes_on(after):
        patches.set_link(walls.parts[0], END, beyond.parts[0])
    elif entry.curve is not None and after.meridian is not None:
        _let_through(patches, walls, entry_parts(after, beyond))
    elif entry.meridian is not None and _flush(entry, after):
        last, slot = (walls.end, walls.way_on) if walls.end >= 0 else (walls.parts[-1], END)
        patches.set_link(last, slot, beyond.parts[0])
        patches.set_link(beyond.parts[0], START, last)


def _join_segments(patches: PatchList, walls: Walls, beyond: Walls) -> None:
    if walls.end >= 0 or beyond.mouth >= 0:
        return  # a step in the bore: the edge on it leads on, the wider wall just ends there
    patches.set_link(walls.parts[0], END, beyond.parts[0])
    patches.set_link(beyond.parts[0], START, walls.parts[0])
    for lip, following in zip(walls.lips, beyond.lips, strict=False):
        patches.set_link(lip, END, following)
        patches.set_link(following, START, lip)


def _let_through(patches: PatchList, walls: Walls, passed: tuple[int, ...]) -> None:
    """Let an inlet pass through the wall of the vessel it leads into.

    What is linked to a patch is not in the way of a ball on it; the links of hole and disc mean nothing on a swept
    patch, so they hold the walls to be passed.
    """
    for patch in walls.patches:
        for slot, wall in zip((HOLE, DISC), passed, strict=False):
            patches.set_link(patch, slot, wall)
