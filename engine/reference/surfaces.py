"""Plain surfaces of a reference case to patches, the same that a design is made of.

A bounded plane ("x <= 0 only", "outside the hole rho >= radius"), a cylinder that ends ("z <= 0") and an edge are
given in words; here they become bounds and links. A hole has one rim, a sharp circle, whatever else is said of it.
"""

import math
import re
from collections.abc import Sequence

import numpy as np

from engine.contact.patches import END, HOLE, START, U_MAX, U_MIN, Law, PatchList, Rectangle, Revolution, Tag
from engine.contact.surface import Scene
from engine.geometry import primitives, profiles
from engine.geometry.pose import pose_at
from engine.reference.cases import Case, Contact
from engine.reference.reader import Array, Record

LONG = 100.0
"""m. Half length of cylinders and edges that are meant to be endless."""
NO_SLIP = 1e9
"""Friction that is never used up."""
TURNS_BEFORE, LEAST_TURNS = 2.0, 20.0
"""Turns of a helical tube before the place q = 0 of the case, and how many it has after it at least."""
FUNNEL_LEAST, FUNNEL_MOST = 0.04, 40.0
"""Range of the hyperbolic funnel, which has no end of its own, in units of sqrt(c)."""
BOWL_MOST = 40.0
"""Radius up to which the paraboloid reaches, in focal lengths: there it is 400 of them high."""
EXTENT = re.compile(r"([xyz])\s*(<=|>=)\s*([-+0-9.eE]+)")
UP = np.array([0.0, 0.0, 1.0])


def law_of(contact: Contact, radius: float, mu: float | None = None) -> Law:
    """Return the contact law of a case; `mu` overrides the friction (rows of a map)."""
    friction = {"no_slip": NO_SLIP, "coulomb": contact.mu}.get(contact.law, 0.0) if mu is None else mu
    return Law(
        static_friction=friction,
        kinetic_friction=friction,
        rolling_loss=contact.rolling / radius,
        restitution=contact.restitution,
        spin_arm=contact.drilling,
    )


def scene_of(case: Case, radius: float, fall: float, mu: float | None = None) -> Scene:
    """Return the scene of a case for a ball of `radius` m and a path of length `fall` m; `mu` replaces the friction."""
    tag = Tag(law_of(case.contact, radius, mu))
    hole = _hole(case.surfaces)
    patches = PatchList()
    added = [(surface, _add(patches, surface, hole, tag, fall)) for surface in case.surfaces]
    bounded = [index for surface, index in added if surface["type"] == "plane" and surface.get("extent")]
    if hole is not None:
        _add_rim(patches, hole, tag)
        rim = len(patches) - 1
        patches.set_link(next(i for s, i in added if s is hole), END if _is_topped(hole) else START, rim)
        for plane in bounded:
            patches.set_link(plane, HOLE, rim)
    for edge in [index for surface, index in added if index >= 0 and _is_edge(surface)]:
        for plane in bounded:
            patches.set_link(plane, U_MAX, edge)
            patches.set_link(plane, U_MIN, edge)
    return patches.to_scene((0.0, 0.0, -case.gravity), (case.contact.air, 1.8e-5))


def _is_edge(surface: Record) -> bool:
    """Whether a surface is the edge of a bounded plane, sharp or round."""
    return surface["type"] == "edge" or (surface["type"] == "cylinder" and "quarter" in surface.get("extent", ""))


def _hole(surfaces: Sequence[Record]) -> Record | None:
    """Return the cylinder that makes a hole in a plane."""
    if not any("hole" in surface.get("extent", "") for surface in surfaces):
        return None
    inside = [s for s in surfaces if s["type"] == "cylinder" and s.get("side", "inside") == "inside"]
    return inside[0] if inside else None


def _add(patches: PatchList, surface: Record, hole: Record | None, tag: Tag, fall: float) -> int:
    """Add one surface; -1 for an edge that is the rim of a hole, which is added with the hole."""
    kind = surface["type"]
    if kind == "plane":
        return patches.add_plane(_plane(surface, hole), tag)
    if kind == "edge":
        return -1 if hole else _add_rod(patches, surface["point"], surface["direction"], 0.0, tag)
    if _is_edge(surface):
        return _add_rod(patches, surface["point"], surface["axis"], surface["radius"], tag)
    if kind == "torus":
        ring = primitives.circle(surface["centre"], surface["axis"], surface["bend_radius"])
        return patches.add_swept_inside(ring, surface["tube_radius"], closed=True, tag=tag)
    if kind == "helical_tube":
        return patches.add_swept_inside(_helix(surface, fall), surface["tube_radius"], tag=tag)
    return patches.add_revolved(_revolution(surface), tag)


def _add_rod(patches: PatchList, point: Array, way: Array, radius: float, tag: Tag) -> int:
    """Add a straight rod of this radius (0: sharp edge), LONG to either side."""
    line = primitives.straight_between(point - LONG * way, point + LONG * way)
    return patches.add_swept_outside(line, radius, tag=tag)


def _add_rim(patches: PatchList, hole: Record, tag: Tag) -> None:
    """Add the rim of a hole: a sharp circle where its cylinder ends."""
    centre = hole["point"] + _end_height(hole) * hole["axis"]
    patches.add_swept_outside(primitives.circle(centre, hole["axis"], hole["radius"]), 0.0, closed=True, tag=tag)


def _plane(surface: Record, hole: Record | None) -> Rectangle:
    """Return a plane whose u runs along the world axis of its bound ("x <= 0"), else along x where it can."""
    point, normal, extent = surface["point"], surface["normal"], surface.get("extent", "")
    bound = EXTENT.search(extent)
    axis = "xyz".index(bound.group(1)) if bound else int(abs(normal[0]) > 0.999)
    u = np.eye(3)[axis] - normal[axis] * normal
    u = u / math.sqrt(u @ u)
    low, high, radius = -math.inf, math.inf, 0.0
    if bound:
        place = (float(bound.group(3)) - point[axis]) / u[axis]
        low, high = (low, place) if bound.group(2) == "<=" else (place, high)
    if "hole" in extent and hole is not None:
        point = hole["point"] + hole["axis"] * float((point - hole["point"]) @ normal) / float(hole["axis"] @ normal)
        radius = hole["radius"]
    return Rectangle(point, u, np.cross(normal, u), (low, high, -math.inf, math.inf), radius)


def _end_height(cylinder: Record) -> float:
    """Return the height along its axis at which a cylinder ends ("z <= 0"), +-LONG where it does not."""
    bound = EXTENT.search(cylinder.get("extent", ""))
    if not bound:
        return LONG
    axis = "xyz".index(bound.group(1))
    return float((float(bound.group(3)) - cylinder["point"][axis]) / cylinder["axis"][axis])


def _is_topped(cylinder: Record) -> bool:
    """Whether a bound of a cylinder lies at its end, seen along its axis, rather than at its start."""
    bound = EXTENT.search(cylinder.get("extent", ""))
    if not bound:
        return True
    return bool((bound.group(2) == "<=") == (cylinder["axis"]["xyz".index(bound.group(1))] > 0.0))


def _helix(surface: Record, fall: float) -> Array:
    """Return the centreline C(q) = (R cos q, hand R sin q, -pitch q/2pi), begun TURNS_BEFORE turns before q = 0."""
    radius, pitch, hand = surface["helix_radius"], surface["pitch"], math.copysign(1.0, surface["hand"])
    turn = math.hypot(2.0 * math.pi * radius, pitch)
    total = TURNS_BEFORE + max(LEAST_TURNS, math.ceil(fall / turn))
    start = pose_at((radius, 0.0, TURNS_BEFORE * pitch), hand * 0.5 * math.pi, pitch / (2.0 * math.pi * radius))
    return primitives.helix(start, radius, hand * total, pitch * total)


def _revolution(surface: Record) -> Revolution:
    """Return the meridian, origin, axis and side of a surface of revolution."""
    kind = surface["type"]
    side = -1 if surface.get("side") == "outside" else 1
    if kind == "cylinder":
        end, radius = _end_height(surface), surface["radius"]
        low, high = (-LONG, end) if _is_topped(surface) else (end, LONG)
        return Revolution(profiles.line((radius, low), (radius, high)), surface["point"], surface["axis"], side)
    if kind == "sphere":
        table = profiles.arc((0.0, 0.0), surface["radius"], (-0.5 * math.pi, 0.5 * math.pi))
        return Revolution(table, surface["centre"], UP, side)
    if kind == "cone":
        table = profiles.line((0.0, 0.0), (LONG, LONG / math.tan(surface["half_angle"])))
    elif kind == "paraboloid":
        table = profiles.parabola((0.0, BOWL_MOST * surface["focal_length"]), 0.5 / surface["focal_length"])
    else:
        scale = math.sqrt(surface["c"])
        table = profiles.hyperbola((FUNNEL_LEAST * scale, FUNNEL_MOST * scale), surface["c"])
    return Revolution(table, np.zeros(3), UP, side)
