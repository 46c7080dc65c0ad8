"""Design to Layout: where every element stands.

Elements chain: each starts where the one before ends. Centrelines join, so two bores that differ leave a step at the
invert; a grade that differs from what arrives leaves a kink. Both are found later, not refused here.
"""

import math
from dataclasses import dataclass
from functools import cached_property
from typing import NamedTuple

import numpy as np

from engine import shapes, vessels
from engine.errors import UnknownNameError
from engine.geometry.pose import Array, Pose, cross, from_pose, pose_at, turned
from engine.geometry.tables import R, S, end_pose, moved
from engine.model.design import Design, FreeStart, Run
from engine.model.elements import (
    SEGMENTS,
    VESSELS,
    Deck,
    Dome,
    Element,
    Funnel,
    Gap,
    Segment,
    Tray,
    Vessel,
)

UP = np.array([0.0, 0.0, 1.0])


class Plate(NamedTuple):
    """Top face of a deck or tray: middle of its near edge, unit vectors along and to the left,
    true length and width, m.
    """

    origin: Array
    along: Array
    left: Array
    length: float
    width: float


@dataclass(frozen=True, eq=False)
class Placed:
    """One element where it stands.

    Attributes
    ----------
    index : int
        Place in `Layout.placed`; `Scene.owner` and `Trajectory.element` refer to it.
    run : str
        Id of its run.
    element : Element
    inlet, outlet : Pose
        Centreline where it starts and ends, `down` not banked. No outlet: nothing leaves (tray, vessel with a closed
        bottom).
    curve : (n, 16) or None
        Centreline of a segment, banked.
    meridian : (p, 7) or None
        Meridian of a vessel, z along `axis` from `origin`; at jumps of curvature two knots share one s.
    origin, axis : (3,) or None
        Vessel: middle of the rim plane (dome: its top) and unit axis pointing out of the mouth. Plate: middle of its
        near edge and its normal.
    side : int
        Vessel: +1 ball on the left of the meridian, -1 on the right; else 0.
    bore : float or None
        Inner radius at the inlet, m: of a segment its own, else that of the last segment before.
    start, length : float
        Developed length at the inlet, and of the element (vessel: of its meridian), m.
    plate : Plate or None
    """

    index: int
    run: str
    element: Element
    inlet: Pose
    outlet: Pose | None = None
    curve: Array | None = None
    meridian: Array | None = None
    origin: Array | None = None
    axis: Array | None = None
    side: int = 0
    bore: float | None = None
    start: float = 0.0
    length: float = 0.0
    plate: Plate | None = None

    def bounds(self) -> Array:
        """Low and high corner (2, 3) of the inner wall, m."""
        if self.curve is not None:
            points, room = self.curve[:, R], self.bore or 0.0
        elif self.meridian is not None and self.origin is not None and self.axis is not None:
            points, room = _rings(self.meridian, self.origin, self.axis), 0.0
        elif self.plate is not None:
            points, room = _corners(self.plate), 0.0
        else:
            points, room = self.inlet.position[None], 0.0
        return np.stack([points.min(axis=0) - room, points.max(axis=0) + room])


@dataclass(frozen=True, eq=False)
class Layout:
    """A design with every element placed, run after run."""

    design: Design
    placed: tuple[Placed, ...]

    @cached_property
    def _by_run(self) -> dict[str, tuple[Placed, ...]]:
        found: dict[str, list[Placed]] = {run.id: [] for run in self.design.runs}
        for entry in self.placed:
            found[entry.run].append(entry)
        return {key: tuple(entries) for key, entries in found.items()}

    def of_run(self, run_id: str) -> tuple[Placed, ...]:
        """Placed elements of one run, in order."""
        if run_id not in self._by_run:
            raise UnknownNameError("run", run_id, self._by_run)
        return self._by_run[run_id]

    def find(self, element_id: str) -> Placed:
        """Placed element by the id of the element."""
        for entry in self.placed:
            if entry.element.id == element_id:
                return entry
        raise UnknownNameError("element", element_id, [entry.element.id for entry in self.placed])

    def bounds(self) -> Array:
        """Low and high corner (2, 3) of everything placed, m; zeros when there is nothing."""
        if not self.placed:
            return np.zeros((2, 3))
        each = np.stack([entry.bounds() for entry in self.placed])
        return np.stack([each[:, 0].min(axis=0), each[:, 1].max(axis=0)])


class _Arrival(NamedTuple):
    """What an element finds where it starts: index, run, pose, inner radius before it (m), developed length (m)."""

    place: int
    run: str
    pose: Pose
    bore: float
    length: float


def lay_out(design: Design) -> Layout:
    """Place every element of every run; a run that starts from another run's outlet is placed after it."""
    chains: dict[str, list[Placed]] = {}
    first = _first_indices(design)
    for run in design.runs:
        _place_run(design, run, first, chains)
    return Layout(design, tuple(entry for run in design.runs for entry in chains[run.id]))


def _first_indices(design: Design) -> dict[str, int]:
    found, count = {}, 0
    for run in design.runs:
        found[run.id] = count
        count += len(run.elements)
    return found


def _place_run(design: Design, run: Run, first: dict[str, int], chains: dict[str, list[Placed]]) -> None:
    """Place one run into `chains`, the run it starts from before it (the document refuses circles)."""
    if run.id in chains:
        return
    pose, bore = _start_of(design, run, first, chains)
    arrival = _Arrival(first[run.id], run.id, pose, bore, 0.0)
    chain: list[Placed] = []
    for element in run.elements:
        entry = place(element, arrival)
        chain.append(entry)
        arrival = _Arrival(
            arrival.place + 1, run.id, onward(entry), _bore_after(entry, arrival.bore), entry.start + entry.length
        )
    chains[run.id] = chain


def _start_of(design: Design, run: Run, first: dict[str, int], chains: dict[str, list[Placed]]) -> tuple[Pose, float]:
    """Pose and inner radius at which a run starts."""
    start = run.start
    if isinstance(start, FreeStart):
        return pose_at(start.position, start.heading), 0.0
    _place_run(design, design.run(start.run), first, chains)
    source = next(entry for entry in chains[start.run] if entry.element.id == start.element)
    return onward(source), _bore_after(source, source.bore or 0.0)


def onward(entry: Placed) -> Pose:
    """Pose from which the next element is drawn: the outlet, or where nothing leaves the middle of the bottom."""
    if entry.outlet is not None:
        return entry.outlet
    if entry.meridian is not None and entry.origin is not None and entry.axis is not None:
        return vessels.throat_pose(entry.meridian, entry.origin, entry.axis, entry.inlet)
    return entry.inlet


def _bore_after(entry: Placed, bore: float) -> float:
    if isinstance(entry.element, Funnel):
        return entry.element.throat_radius
    return entry.bore if entry.curve is not None and entry.bore is not None else bore


def place(element: Element, arrival: _Arrival) -> Placed:
    """Place one element at what arrives."""
    if isinstance(element, SEGMENTS):
        return _place_segment(element, arrival)
    if isinstance(element, VESSELS):
        return _place_vessel(element, arrival)
    if isinstance(element, Gap):
        return _place_gap(element, arrival)
    return _place_plate(element, arrival)


def _place_segment(element: Segment, arrival: _Arrival) -> Placed:
    entry = shapes.entry_of(element, arrival.pose)
    plain = shapes.centreline(element, entry)
    table = shapes.banked_centreline(element, entry)
    curve = moved(table, arrival.pose)
    ends = plain[[0, -1]] if table is not plain else table[[0, -1]]
    ends = moved(ends, arrival.pose)
    return Placed(
        arrival.place,
        arrival.run,
        element,
        inlet=end_pose(ends[:1]),
        outlet=end_pose(ends),
        curve=curve,
        bore=0.5 * element.section.bore,
        start=arrival.length,
        length=float(curve[-1, S]),
    )


def _place_gap(element: Gap, arrival: _Arrival) -> Placed:
    step = (element.forward, element.left, -element.drop)
    landing = from_pose(arrival.pose, np.array(step)) - arrival.pose.position
    return Placed(
        arrival.place,
        arrival.run,
        element,
        inlet=arrival.pose,
        outlet=turned(arrival.pose, element.turn, landing),
        bore=arrival.bore,
        start=arrival.length,
        length=math.hypot(*step),
    )


# -- vessels --------------------------------------------------------------------------------------
def _place_vessel(element: Vessel, arrival: _Arrival) -> Placed:
    meridian, pose = shapes.meridian(element), arrival.pose
    axis = vessels.axis_of(element)
    if isinstance(element, Dome):
        origin = _invert(pose, arrival.bore)
        origin[2] = pose.position[2] - arrival.bore - vessels.ENTRY_CLEARANCE
        outlet: Pose | None = vessels.dome_outlet(meridian, origin, pose)
    else:
        origin = vessels.mouth(element, pose, arrival.bore, axis)
        closed = meridian[-1, 1] == 0.0
        outlet = None if closed else vessels.throat_pose(meridian, origin, axis, pose)
    return Placed(
        arrival.place,
        arrival.run,
        element,
        inlet=pose,
        outlet=outlet,
        meridian=meridian,
        origin=origin,
        axis=axis,
        side=shapes.side_of_wall(element),
        bore=arrival.bore,
        start=arrival.length,
        length=float(meridian[-1, 0]),
    )


# -- plates ---------------------------------------------------------------------------------------
def _place_plate(element: Deck | Tray, arrival: _Arrival) -> Placed:
    plate = _deck(element, arrival) if isinstance(element, Deck) else _tray(element, arrival)
    normal = cross(plate.along, plate.left)
    outlet = None
    if isinstance(element, Deck):
        end = plate.origin + plate.length * plate.along + arrival.bore * normal
        outlet = pose_at(end, arrival.pose.heading, element.grade)
    return Placed(
        arrival.place,
        arrival.run,
        element,
        inlet=arrival.pose,
        outlet=outlet,
        origin=plate.origin,
        axis=normal,
        bore=arrival.bore,
        start=arrival.length,
        length=plate.length,
        plate=plate,
    )


def _deck(element: Deck, arrival: _Arrival) -> Plate:
    """Deck whose top starts at the invert of what arrives; below a vertical outlet it stands centred."""
    pose, slant = arrival.pose, math.sqrt(1.0 + element.grade**2)
    along = (pose.forward - element.grade * UP) / slant
    return _plate(arrival, along, (element.length * slant, element.width), 0.0)


def _tray(element: Tray, arrival: _Arrival) -> Plate:
    return _plate(arrival, arrival.pose.forward, (element.length, element.width), element.drop)


def _plate(arrival: _Arrival, along: Array, size: tuple[float, float], drop: float) -> Plate:
    """Plate `drop` below the invert of what arrives, from there on; centred below an outlet that points down."""
    pose = arrival.pose
    origin = _invert(pose, arrival.bore) - drop * UP
    if points_down(pose):
        origin = origin - 0.5 * size[0] * along
    return Plate(origin, along, cross(UP, pose.forward), *size)


def _invert(pose: Pose, bore: float) -> Array:
    """Lowest point (3,) of the bore at a pose; its middle where it points down."""
    if points_down(pose):
        return pose.position.copy()
    return np.asarray(pose.position + bore * pose.down)


def points_down(pose: Pose) -> bool:
    """Whether a pose is so steep that what follows stands below it rather than ahead of it."""
    return math.hypot(pose.tangent[0], pose.tangent[1]) < 0.2


def _rings(meridian: Array, origin: Array, axis: Array) -> Array:
    """Extreme points (2 p, 3) of the parallel circles of a meridian along the world axes."""
    centre = origin + np.outer(meridian[:, 2], axis)
    reach = np.outer(meridian[:, 1], np.sqrt(np.maximum(0.0, 1.0 - axis**2)))
    return np.concatenate([centre - reach, centre + reach])


def _corners(plate: Plate) -> Array:
    half = 0.5 * plate.width * plate.left
    far = plate.origin + plate.length * plate.along
    return np.stack([plate.origin - half, plate.origin + half, far - half, far + half])
