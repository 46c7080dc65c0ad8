"""What a run is built of: cross sections, segments, vessels, decks; every union is told apart by `kind`.

Lengths in m, angles in rad, grades as fall over plan length (positive downhill), turns positive to the left.
Every class can be made with an `id` alone. What cannot work is found later; refused here is only what has no shape.
"""

import math
from typing import Annotated, Literal

from pydantic import Field, model_validator

from engine.model.base import (
    LONGEST_LENGTH,
    Frozen,
    Identifier,
    Note,
    Point2,
    Point3,
    Text,
    graded,
    labelled,
    metres,
    named,
    quantity,
    radians,
    several,
)

FULL_TURN = 2.0 * math.pi
TURN_LIMIT = 200.0
"""rad or turns: more is a slip of the keyboard."""
SHARPEST = 1e4
"""1/m. Curvature: a bend of a tenth of a millimetre."""
POINT_LIMIT = 2000
Hand = Literal[1, -1]
"""+1: the ball goes to the left round the axis, seen from above; -1: to the right."""


# -- cross sections -------------------------------------------------------------------------------
class Tube(Frozen):
    """Round tube: inner diameter `bore`, wall thickness `wall`."""

    kind: Literal["tube"] = "tube"
    bore: float = metres(0.021, "Bore")
    wall: float = metres(0.002, "Wall")


class Trough(Frozen):
    """Tube cut open along its top: `opening` is the full angle of the open mouth, `lip_radius` rounds its edges."""

    kind: Literal["trough"] = "trough"
    bore: float = metres(0.024, "Bore")
    wall: float = metres(0.002, "Wall")
    opening: float = radians(math.pi, "Opening", 1e-3, FULL_TURN - 1e-3)
    lip_radius: float = metres(0.001, "Lip radius", 0.0)

    @property
    def lip_angle(self) -> float:
        """Wall angle of the lips, rad: half of what is left of the full circle."""
        return math.pi - 0.5 * self.opening


Section = Annotated[Tube | Trough, Field(discriminator="kind")]


# -- shapes of a funnel ---------------------------------------------------------------------------
# Height z over the throat at radius rho, for rim radius R, throat radius q, depth h: throat at (q, 0), rim at (R, h).
class Cone(Frozen):
    """Straight: z = h (rho - q)/(R - q)."""

    kind: Literal["cone"] = "cone"


class Power(Frozen):
    """z = h (rho^n - q^n)/(R^n - q^n) with exponent n; at n = 0 its limit, h ln(rho/q)/ln(R/q)."""

    kind: Literal["power"] = "power"
    exponent: float = quantity(2.0, "", "Exponent", -8.0, 8.0)


class Hyperbolic(Frozen):
    """z = h (1/q - 1/rho)/(1/q - 1/R): steep at the throat, flat at the rim."""

    kind: Literal["hyperbolic"] = "hyperbolic"


class Parabolic(Frozen):
    """z = h (rho^2 - q^2)/(R^2 - q^2)."""

    kind: Literal["parabolic"] = "parabolic"


class Points(Frozen):
    """Free shape through points (rho, z) from the throat out to the rim, rho growing.

    The first point is stretched onto the throat and the last onto the rim, each axis by itself, so that points drawn
    in any scale fit.
    """

    kind: Literal["points"] = "points"
    points: tuple[Point2, ...] = several(
        "Points (radius, height)", POINT_LIMIT, ((0.02, 0.0), (0.08, 0.05), (0.2, 0.1)), least=2
    )

    @model_validator(mode="after")
    def _check_points(self) -> "Points":
        """Refuse points that go back in radius, or that are all at one height: no profile can be fitted."""
        if any(outer[0] <= inner[0] for inner, outer in zip(self.points, self.points[1:], strict=False)):
            raise ValueError("points must run from the throat outward: each radius larger than the one before")
        if self.points[-1][1] <= self.points[0][1]:
            raise ValueError("points must end higher than they begin: the rim is above the throat")
        return self


Profile = Annotated[Cone | Power | Hyperbolic | Parabolic | Points, Field(discriminator="kind")]


# -- elements -------------------------------------------------------------------------------------
class ElementBase(Frozen):
    """What every element has: id, name, its own contact pair where it differs from the run's, a note."""

    kind: str
    id: Identifier = named("Id")
    name: Text = labelled("", "Name")
    pair: Identifier | None = labelled(None, "Contact pair", reference="pair")
    note: Note = labelled("", "Note")

    @property
    def title(self) -> str:
        """Name to show: the given one, else the id."""
        return self.name or self.id


class SegmentBase(ElementBase):
    """Piece of track with a centreline, a cross section and a bank that changes evenly from inlet to outlet."""

    section: Section = labelled(Tube(), "Cross section")
    bank_start: float = radians(0.0, "Bank at inlet", -math.pi, math.pi)
    bank_end: float = radians(0.0, "Bank at outlet", -math.pi, math.pi)


class Straight(SegmentBase):
    """Straight piece of plan length `length`."""

    kind: Literal["straight"] = "straight"
    length: float = metres(0.3, "Plan length")
    grade: float = graded(0.03, "Grade")


class Bend(SegmentBase):
    """Arc in plan of centreline radius `radius` through `turn` (positive left) at an even grade."""

    kind: Literal["bend"] = "bend"
    radius: float = metres(0.15, "Radius")
    turn: float = radians(math.pi / 2, "Turn", -TURN_LIMIT, TURN_LIMIT)
    grade: float = graded(0.03, "Grade")

    @model_validator(mode="after")
    def _check_turn(self) -> "Bend":
        """Refuse a turn of nothing: the bend would have no length."""
        if self.turn == 0.0:
            raise ValueError("turn must not be 0; give an angle, positive to the left, or use a straight")
        return self


class Helix(SegmentBase):
    """Helix of centreline radius `radius`, `turns` full turns (positive left), falling by `drop` in all."""

    kind: Literal["helix"] = "helix"
    radius: float = metres(0.1, "Radius")
    turns: float = quantity(2.0, "turns", "Turns", -TURN_LIMIT, TURN_LIMIT)
    drop: float = metres(0.12, "Drop", -LONGEST_LENGTH)

    @model_validator(mode="after")
    def _check_turns(self) -> "Helix":
        """Refuse a helix of no turns: it would have no length."""
        if self.turns == 0.0:
            raise ValueError("turns must not be 0; give a number of turns, positive to the left, or use a straight")
        return self


class Transition(SegmentBase):
    """Plan clothoid: curvature (1/m, positive left) changes evenly along plan length `length`."""

    kind: Literal["transition"] = "transition"
    length: float = metres(0.15, "Plan length")
    curvature_start: float = quantity(0.0, "1/m", "Curvature at inlet", -SHARPEST, SHARPEST)
    curvature_end: float = quantity(1 / 0.15, "1/m", "Curvature at outlet", -SHARPEST, SHARPEST)
    grade: float = graded(0.03, "Grade")


class Easing(SegmentBase):
    """Straight in plan; the grade goes smoothly from `grade_start` to `grade_end`."""

    kind: Literal["easing"] = "easing"
    length: float = metres(0.15, "Plan length")
    grade_start: float = graded(0.03, "Grade at inlet")
    grade_end: float = graded(0.1, "Grade at outlet")


class FreeLine(SegmentBase):
    """Free line with continuous curvature through points (forward, left, up) seen from the inlet.

    The inlet itself, (0, 0, 0), is not listed.
    """

    kind: Literal["free_line"] = "free_line"
    points: tuple[Point3, ...] = several(
        "Points (forward, left, up)",
        POINT_LIMIT,
        ((0.1, 0.0, -0.003), (0.2, 0.05, -0.008), (0.3, 0.1, -0.014)),
        least=1,
    )

    @model_validator(mode="after")
    def _check_points(self) -> "FreeLine":
        """Refuse two equal points in a row, the inlet counted as the first: the line would have no direction there."""
        path = ((0.0, 0.0, 0.0), *self.points)
        for index, (here, there) in enumerate(zip(path, path[1:], strict=False)):
            if here == there:
                raise ValueError(f"points[{index}] is the same place as the one before it; move or remove it")
        return self


class Loop(SegmentBase):
    """Upright loop of centreline radius `radius`, shifted to the left by `shift` on the way round to clear itself."""

    kind: Literal["loop"] = "loop"
    radius: float = metres(0.08, "Radius")
    shift: float = metres(0.04, "Sideways shift, left", -LONGEST_LENGTH)


class Gap(ElementBase):
    """Free jump: where the next inlet stands, seen from this one; its heading is turned by `turn`."""

    kind: Literal["gap"] = "gap"
    forward: float = metres(0.1, "Forward", -LONGEST_LENGTH)
    left: float = metres(0.0, "Left", -LONGEST_LENGTH)
    drop: float = metres(0.05, "Drop", -LONGEST_LENGTH)
    turn: float = radians(0.0, "Turn", -TURN_LIMIT, TURN_LIMIT)


class VesselBase(ElementBase):
    """Surface of revolution that the ball enters at the rim; its wall is `wall` thick."""

    wall: float = metres(0.003, "Wall")


class Funnel(VesselBase):
    """Funnel from rim to throat, `depth` high; the ball comes in along the rim, on the side given by `hand`.

    `inlet_drop` is how far below the rim the ball meets the wall, `inlet_angle` how far its path dips below level
    there.
    """

    kind: Literal["funnel"] = "funnel"
    profile: Profile = labelled(Cone(), "Profile")
    rim_radius: float = metres(0.2, "Rim radius")
    throat_radius: float = metres(0.02, "Throat radius")
    depth: float = metres(0.1, "Depth")
    inlet_drop: float = metres(0.005, "Inlet below rim", 0.0)
    inlet_angle: float = radians(0.0, "Inlet angle", -math.pi / 2, math.pi / 2)
    hand: Hand = labelled(1, "Hand")

    @model_validator(mode="after")
    def _check_radii(self) -> "Funnel":
        """Refuse a throat as wide as the rim: no profile goes from one to the other."""
        if self.throat_radius >= self.rim_radius:
            raise ValueError(
                f"throat_radius {self.throat_radius:g} m must be smaller than rim_radius {self.rim_radius:g} m"
            )
        return self


class Well(VesselBase):
    """Cylinder of inner radius `radius`, `tilt` 0 upright, pi/2 lying toward `tilt_heading`; fillets at rim, floor."""

    kind: Literal["well"] = "well"
    radius: float = metres(0.1, "Radius")
    depth: float = metres(0.2, "Depth")
    tilt: float = radians(0.0, "Tilt", 0.0, math.pi)
    tilt_heading: float = radians(0.0, "Heading of tilt", -FULL_TURN, FULL_TURN)
    rim_fillet: float = metres(0.005, "Rim fillet", 0.0)
    floor: bool = Field(default=True, strict=True, json_schema_extra={"label": "Floor"})
    floor_fillet: float = metres(0.02, "Floor fillet", 0.0)
    hand: Hand = labelled(1, "Hand")

    @model_validator(mode="after")
    def _check_fillets(self) -> "Well":
        """Refuse fillets that leave no room for each other or reach past the axis."""
        fillets = self.rim_fillet + (self.floor_fillet if self.floor else 0.0)
        if fillets > self.depth:
            raise ValueError(
                f"rim_fillet and floor_fillet take {fillets:g} m together, more than the depth {self.depth:g} m"
            )
        if self.floor and self.floor_fillet > self.radius:
            raise ValueError(
                f"floor_fillet {self.floor_fillet:g} m must not be larger than the radius {self.radius:g} m"
            )
        return self


class Bowl(VesselBase):
    """Part of a hollow sphere, open upward to `rim_radius`, with a hole at its lowest point (0: none)."""

    kind: Literal["bowl"] = "bowl"
    sphere_radius: float = metres(0.25, "Sphere radius")
    rim_radius: float = metres(0.2, "Rim radius")
    hole_radius: float = metres(0.015, "Hole radius", 0.0)

    @model_validator(mode="after")
    def _check_radii(self) -> "Bowl":
        """Refuse radii that no sphere has."""
        if self.rim_radius > self.sphere_radius:
            raise ValueError(
                f"rim_radius {self.rim_radius:g} m must not be larger than sphere_radius {self.sphere_radius:g} m"
            )
        if self.hole_radius >= self.rim_radius:
            raise ValueError(
                f"hole_radius {self.hole_radius:g} m must be smaller than rim_radius {self.rim_radius:g} m"
            )
        return self


class Dome(VesselBase):
    """Part of a sphere seen from outside: the ball rolls over its top and down to `rim_radius`."""

    kind: Literal["dome"] = "dome"
    sphere_radius: float = metres(0.25, "Sphere radius")
    rim_radius: float = metres(0.2, "Rim radius")

    @model_validator(mode="after")
    def _check_radii(self) -> "Dome":
        """Refuse a rim that no sphere has."""
        if self.rim_radius > self.sphere_radius:
            raise ValueError(
                f"rim_radius {self.rim_radius:g} m must not be larger than sphere_radius {self.sphere_radius:g} m"
            )
        return self


class Deck(ElementBase):
    """Flat plate, `length` along the way the ball arrives, falling by `grade`."""

    kind: Literal["deck"] = "deck"
    length: float = metres(0.3, "Plan length")
    width: float = metres(0.2, "Width")
    grade: float = graded(0.02, "Grade")
    thickness: float = metres(0.004, "Thickness")


class Tray(ElementBase):
    """Catch tray: the run ends where the ball touches it; its floor is `drop` below the last outlet."""

    kind: Literal["tray"] = "tray"
    length: float = metres(0.2, "Length")
    width: float = metres(0.15, "Width")
    depth: float = metres(0.04, "Depth")
    drop: float = metres(0.02, "Drop", 0.0)


SEGMENTS = (Straight, Bend, Helix, Transition, Easing, FreeLine, Loop)
VESSELS = (Funnel, Well, Bowl, Dome)
PLATES = (Deck, Tray)
Segment = Straight | Bend | Helix | Transition | Easing | FreeLine | Loop
Vessel = Funnel | Well | Bowl | Dome
Element = Annotated[Segment | Gap | Vessel | Deck | Tray, Field(discriminator="kind")]
ELEMENTS: dict[str, type[ElementBase]] = {
    str(entry.model_fields["kind"].default): entry for entry in (*SEGMENTS, Gap, *VESSELS, *PLATES)
}
"""Class of each kind of element."""
