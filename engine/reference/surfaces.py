"""Plain surfaces of a reference case to patches, the same that a design is made of.

A bounded plane ("x <= 0 only", "outside the hole rho >= radius"), a cylinder that ends ("z <= 0") and an edge are
given in words; here they become bounds and links. A hole has one rim, a sharp circle, whatever else is said of it.
"""

import math
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from engine.contact.patches import END, HOLE, U_MAX, Law, PatchList, Rectangle, Revolution, Tag
from engine.contact.surface import Scene
from engine.errors import CasesFileError
from engine.geometry import primitives, profiles
from engine.geometry.pose import pose_at

Array = NDArray[np.float64]
LONG = 100.0
"""m. Half length of cylinders and edges that are meant to be endless."""
NO_SLIP = 1e9
"""Friction that is never used up."""
TURNS_BEFORE, TURNS_AFTER = 2.0, 60.0
"""Turns of a helical tube before and after the place q = 0 of the case."""
RHO_LEAST, RHO_MOST = 0.004, 4.0
"""m. Range of the hyperbolic funnel, which has no end of its own."""


@dataclass(frozen=True)
class Setting:
    """Scene of a case and the friction it was set up with."""

    scene: Scene


def law_of(contact: dict[str, Any], radius: float) -> Law:
    """Return the contact law of a case."""
    name = contact.get("law", "no_slip")
    mu = {"no_slip": NO_SLIP, "frictionless": 0.0, "none": 0.0}.get(name, contact.get("mu"))
    if not isinstance(mu, int | float):
        mu = 0.0
    return Law(
        static_friction=float(mu),
        kinetic_friction=float(mu),
        rolling_loss=float(contact.get("rolling_b", 0.0)) / radius,
        loss_speed=math.inf,
        restitution=float(contact.get("restitution", 0.5)),
        spin_arm=float(contact.get("drilling_c", 0.0)),
        contact_modulus=0.0,
    )


def scene_of(case: dict[str, Any], mu: float | None = None) -> Scene:
    """Return the scene of a case; `mu` overrides the friction (rows of a map).

    Raises
    ------
    CasesFileError
        When a surface is of an unknown type.
    """
    contact = dict(case.get("contact") or {})
    if mu is not None:
        contact.update(law="coulomb", mu=mu)
    tag = Tag(law_of(contact, float(case["ball"]["r"])))
    surfaces = case.get("surfaces") or []
    patches = PatchList()
    holes = _holes(surfaces)
    edges: list[int] = []
    planes: list[int] = []
    for surface in surfaces:
        kind = surface["type"]
        if kind == "plane":
            planes.append(_plane(patches, surface, holes, tag))
        elif kind == "edge" and not holes:
            edges.append(_edge(patches, surface, tag))
        elif kind == "cylinder" and "quarter" in surface.get("extent", ""):
            edges.append(_edge(patches, dict(surface, direction=surface["axis"]), tag, float(surface["radius"])))
        elif kind != "edge":
            _add(patches, surface, tag)
    for hole in holes:
        _rim(patches, hole, surfaces, tag)
    for plane in planes[: len(edges)]:
        patches.set_link(plane, U_MAX, edges[0])
    drag = contact.get("drag") or {}
    return patches.to_scene(air=(float(drag.get("rho", 0.0)), 1.8e-5))


def _holes(surfaces: list[dict[str, Any]]) -> list[dict[str, Any]]:
    """Return the cylinders that make a hole in a plane."""
    pierced = any("hole" in surface.get("extent", "") for surface in surfaces)
    return [s for s in surfaces if pierced and s["type"] == "cylinder" and s.get("side") == "inside"]


def _plane(patches: PatchList, surface: dict[str, Any], holes: list[dict[str, Any]], tag: Tag) -> int:
    """Add a plane: u along world x as far as the plane allows, so that "x <= a" is a bound of u."""
    point, normal = _vector(surface["point"]), _unit(surface["normal"])
    u = np.array([1.0, 0.0, 0.0]) - normal[0] * normal
    u = np.array([0.0, 1.0, 0.0]) if np.linalg.norm(u) < 1e-9 else u / np.linalg.norm(u)
    extent = surface.get("extent", "")
    bounds, hole = [-math.inf, math.inf, -math.inf, math.inf], 0.0
    if extent.startswith("x <="):
        bounds[1] = (float(extent.split()[2]) - point[0]) / u[0]
    if "hole" in extent:
        axis, centre = _unit(holes[0]["axis"]), _vector(holes[0]["point"])
        point = centre + axis * float((point - centre) @ normal) / float(axis @ normal)
        hole = float(holes[0]["radius"])
    low, high, near, far = bounds
    return patches.add_plane(Rectangle(point, u, np.cross(normal, u), (low, high, near, far), hole), tag)


def _edge(patches: PatchList, surface: dict[str, Any], tag: Tag, radius: float = 0.0) -> int:
    """Add an edge: a straight rod of this radius (0: sharp), LONG to either side."""
    point, way = _vector(surface["point"]), _unit(surface["direction"])
    return patches.add_swept_outside(primitives.straight_between(point - LONG * way, point + LONG * way), radius, tag=tag)


def _rim(patches: PatchList, hole: dict[str, Any], surfaces: list[dict[str, Any]], tag: Tag) -> None:
    """Add the rim of a hole and link plane and cylinder to it (the plane is patch order, the cylinder found by kind)."""
    centre, axis = _vector(hole["point"]), _unit(hole["axis"])
    rim = patches.add_swept_outside(primitives.circle(centre, axis, float(hole["radius"])), 0.0, closed=True, tag=tag)
    index = 0
    for surface in surfaces:
        if surface["type"] == "edge":
            continue
        if surface["type"] == "plane" and "hole" in surface.get("extent", ""):
            patches.set_link(index, HOLE, rim)
        if surface is hole:
            patches.set_link(index, END, rim)
        index += 1


def _add(patches: PatchList, surface: dict[str, Any], tag: Tag) -> int:
    """Add a surface of revolution or a tube."""
    kind = surface["type"]
    if kind == "torus":
        ring = primitives.circle(_vector(surface["centre"]), _unit(surface["axis"]), float(surface["bend_radius"]))
        return patches.add_swept_inside(ring, float(surface["tube_radius"]), closed=True, tag=tag)
    if kind == "helical_tube":
        return patches.add_swept_inside(_helix(surface), float(surface["tube_radius"]), tag=tag)
    return patches.add_revolved(_revolution(surface), tag)


def _helix(surface: dict[str, Any]) -> Array:
    """Return the centreline C(q) = (R cos q, hand R sin q, -pitch q/2pi), begun TURNS_BEFORE turns before q = 0."""
    radius, pitch, hand = (float(surface[key]) for key in ("helix_radius", "pitch", "hand"))
    total = TURNS_BEFORE + TURNS_AFTER
    start = pose_at((radius, 0.0, TURNS_BEFORE * pitch), hand * 0.5 * math.pi, pitch / (2.0 * math.pi * radius))
    return primitives.helix(start, radius, hand * total, pitch * total)


def _revolution(surface: dict[str, Any]) -> Revolution:
    """Return the meridian, origin, axis and side of a surface of revolution."""
    kind = surface["type"]
    origin, axis, side = np.zeros(3), np.array([0.0, 0.0, 1.0]), 1
    if kind == "cylinder":
        origin, axis = _vector(surface["point"]), _unit(surface["axis"])
        top = 0.0 if surface.get("extent", "").startswith("z <=") else LONG
        radius = float(surface["radius"])
        side = 1 if surface.get("side", "inside") == "inside" else -1
        return Revolution(profiles.line((radius, -LONG), (radius, top)), origin, axis, side)
    if kind == "sphere":
        side = 1 if surface.get("side", "inside") == "inside" else -1
        table = profiles.arc((0.0, 0.0), float(surface["radius"]), (-0.5 * math.pi, 0.5 * math.pi))
        return Revolution(table, _vector(surface["centre"]), axis, side)
    if kind == "cone":
        slope = 1.0 / math.tan(float(surface["half_angle"]))
        return Revolution(profiles.line((0.0, 0.0), (20.0, 20.0 * slope)), origin, axis, side)
    if kind == "paraboloid":
        return Revolution(profiles.parabola((0.0, 4.0), 0.5 / float(surface["focal_length"])), origin, axis, side)
    if kind == "hyperbolic_funnel":
        return Revolution(profiles.hyperbola((RHO_LEAST, RHO_MOST), float(surface["c"])), origin, axis, side)
    raise CasesFileError(f'Surface type "{kind}" is not known; give plane, cylinder, sphere, torus, helical_tube, cone, '
                         "paraboloid, hyperbolic_funnel or edge.")


def _vector(values: Any) -> Array:
    return np.array(values, dtype=np.float64)


def _unit(values: Any) -> Array:
    vector = _vector(values)
    return vector / float(np.linalg.norm(vector))
