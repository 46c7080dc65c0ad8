"""Grips of an element, and what dragging one does to the design: a place in, an edited design out. No Qt.

Lengths are rounded to a step that suits the scale of the drawing, angles to whole degrees, so that what was dragged has
numbers one would have typed.
"""

import math
from typing import NamedTuple

import numpy as np

from engine.model.design import Design, FreeStart
from engine.model.edits import path_to_element, set_field
from engine.model.elements import Bend, Deck, Easing, FreeLine, Gap, Helix, Straight, Transition, Tray
from engine.placement import Layout, Placed
from engine.units import DEGREE
from studio.display import Array

LEAST_LENGTH = 1e-3
"""m. Nothing is dragged shorter than this."""
LEAST_TURN = DEGREE
LEAST_RADIUS = 5e-3
"""m."""


class Grip(NamedTuple):
    """A place that may be dragged: of which element, what (inlet, outlet, centre, point), its number, where (3,) m."""

    element: str
    role: str
    number: int
    place: Array


def grips_of(entry: Placed) -> list[Grip]:
    """Places of an element that may be dragged."""
    found, key = [], entry.element.id
    if entry.meridian is not None and entry.origin is not None:
        found.append(Grip(key, "centre", 0, entry.origin))
    centre = centre_of(entry)
    if centre is not None:
        found.append(Grip(key, "centre", 0, centre))
    found.append(Grip(key, "inlet", 0, entry.inlet.position))
    if entry.outlet is not None and entry.meridian is None:
        found.append(Grip(key, "outlet", 0, entry.outlet.position))
    points = getattr(entry.element, "points", ())
    if points and entry.curve is not None:
        level = entry.inlet.forward
        left = np.array([-level[1], level[0], 0.0])
        axes = np.stack([level, left, [0.0, 0.0, 1.0]])
        places = entry.inlet.position + np.array(points[:-1]).reshape(-1, 3) @ axes
        found.extend(Grip(key, "point", number, place) for number, place in enumerate(places))
    return found


def centre_of(entry: Placed) -> Array | None:
    """Centre (3,) of a bend or helix at the height of its inlet; None for others."""
    turn = getattr(entry.element, "turn", None) or getattr(entry.element, "turns", None)
    radius = getattr(entry.element, "radius", None)
    if entry.element.kind not in ("bend", "helix") or turn is None or radius is None:
        return None
    level = entry.inlet.forward
    left = np.array([-level[1], level[0], 0.0])
    return np.asarray(entry.inlet.position + math.copysign(radius, turn) * left)


# -- in the plan ----------------------------------------------------------------------------------
def rounded(value: float, step: float) -> float:
    """Value on a multiple of a step, without the noise of the division."""
    return round(round(value / step) * step, 9)


def dragged(layout: Layout, grip: Grip, place: Array, step: float) -> Design:
    """Design after a grip was dragged to a place in plan (2,), m; the same design when nothing follows from it.

    The inlet of an element is the outlet of the one before, that of the first one the start of its run.
    """
    entry = layout.find(grip.element)
    if grip.role == "inlet":
        chain = layout.of_run(entry.run)
        number = chain.index(entry)
        if number == 0:
            return _start_moved(layout.design, entry, place, step)
        return _outlet_moved(layout.design, chain[number - 1], place, step)
    if grip.role == "outlet":
        return _outlet_moved(layout.design, entry, place, step)
    if grip.role == "centre":
        return _centre_moved(layout.design, entry, place, step)
    return _point_moved(layout.design, entry, grip.number, (place, step))


def _set(design: Design, entry: Placed, name: str, value: object) -> Design:
    """Design with one field of an element set."""
    return set_field(design, (*path_to_element(design, entry.element.id), name), value)


def _local(entry: Placed, place: Array) -> tuple[float, float]:
    """Forward and left of a place in plan, seen from the inlet, m."""
    ahead = entry.inlet.forward[:2]
    away = place - entry.inlet.position[:2]
    return float(away @ ahead), float(away @ np.array([-ahead[1], ahead[0]]))


def _start_moved(design: Design, entry: Placed, place: Array, step: float) -> Design:
    run = design.run(entry.run)
    if not isinstance(run.start, FreeStart):
        return design
    x, y = (rounded(float(part), step) for part in place)
    number = design.runs.index(run)
    return set_field(design, ("runs", number, "start", "position"), (x, y, run.start.position[2]))


def _outlet_moved(design: Design, entry: Placed, place: Array, step: float) -> Design:
    """Outlet to a place, as far as the element can follow."""
    element = entry.element
    ahead, aside = _local(entry, place)
    if isinstance(element, (Straight, Easing, Deck, Tray)):
        return _set(design, entry, "length", max(rounded(ahead, step), LEAST_LENGTH))
    if isinstance(element, Transition) and entry.outlet is not None:
        before, after = (math.hypot(*_local(entry, spot)) for spot in (entry.outlet.position[:2], place))
        return _set(design, entry, "length", max(rounded(element.length * after / before, step), LEAST_LENGTH))
    if isinstance(element, Bend):
        return _set(design, entry, "turn", _turn_to(element.radius, element.turn, ahead, aside))
    if isinstance(element, Helix):
        turn = _turn_to(element.radius, 2.0 * math.pi * element.turns, ahead, aside)
        return _set(design, entry, "turns", round(turn / (2.0 * math.pi), 6))
    if isinstance(element, Gap):
        moved = _set(design, entry, "forward", rounded(ahead, step))
        return _set(moved, entry, "left", rounded(aside, step))
    if isinstance(element, FreeLine):
        return _point_moved(design, entry, len(element.points) - 1, (place, step))
    return design


def _turn_to(radius: float, turn: float, ahead: float, aside: float) -> float:
    """Turn (rad) that ends in the direction of a place seen from the centre, as near to the present turn as can be.

    The centre lies at (0, sense radius) from the inlet; the angle about it grows from 0 there in the sense of the turn.
    """
    sense = math.copysign(1.0, turn)
    angle = math.atan2(ahead, radius - sense * aside)
    whole = 2.0 * math.pi
    nearest = angle + whole * round((abs(turn) - angle) / whole)
    while nearest < LEAST_TURN:
        nearest += whole
    return sense * max(round(nearest / DEGREE), 1) * DEGREE


def _centre_moved(design: Design, entry: Placed, place: Array, step: float) -> Design:
    """Centre of a bend or helix across the inlet: its radius; over to the other side turns it round.

    A vessel stands where the run leads, so its centre moves only with the start of a run.
    """
    element = entry.element
    if not isinstance(element, (Bend, Helix)):
        return design
    aside = _local(entry, place)[1]
    name = "turn" if isinstance(element, Bend) else "turns"
    turn = float(getattr(element, name))
    moved = _set(design, entry, "radius", max(rounded(abs(aside), step), LEAST_RADIUS))
    return _set(moved, entry, name, math.copysign(turn, aside)) if abs(aside) > LEAST_RADIUS else moved


def _point_moved(design: Design, entry: Placed, number: int, target: tuple[Array, float]) -> Design:
    """One point of a free line, at its own height."""
    element = entry.element
    if not isinstance(element, FreeLine):
        return design
    place, step = target
    ahead, aside = (rounded(part, step) for part in _local(entry, place))
    points = list(element.points)
    points[number] = (ahead, aside, points[number][2])
    return _set(design, entry, "points", tuple(points))


# -- in the elevation -----------------------------------------------------------------------------
def raised(layout: Layout, element: str, height: float) -> Design:
    """Design after the outlet of an element was dragged to a height, m: its grade or drop follows."""
    entry = layout.find(element)
    fall = float(entry.inlet.position[2]) - height
    kind, design = entry.element, layout.design
    if isinstance(kind, (Straight, Bend, Transition)):
        return _set(design, entry, "grade", _grade(fall / _plan_length(kind)))
    if isinstance(kind, Deck):
        return _set(design, entry, "grade", _grade(fall / kind.length))
    if isinstance(kind, Easing):
        return _set(design, entry, "grade_end", _grade(2.0 * fall / kind.length - kind.grade_start))
    if isinstance(kind, (Helix, Gap)):
        return _set(design, entry, "drop", rounded(fall, 1e-3))
    if isinstance(kind, FreeLine):
        last = kind.points[-1]
        points = (*kind.points[:-1], (last[0], last[1], rounded(-fall, 1e-3)))
        return _set(design, entry, "points", points)
    return design


def _plan_length(element: Straight | Bend | Transition) -> float:
    """Length in plan, m."""
    return abs(element.turn) * element.radius if isinstance(element, Bend) else element.length


def _grade(value: float) -> float:
    """Grade on a tenth of a per cent."""
    return rounded(value, 1e-3)
