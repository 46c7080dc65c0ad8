"""The root of the document: site, materials, balls, pairs, process, runs, stations."""

import math
from collections.abc import Iterable
from typing import Annotated, Literal, TypeVar

from pydantic import Field, model_validator

from engine.errors import UnknownNameError
from engine.model.ball import Ball, Material, Pair
from engine.model.base import (
    Coordinate,
    Frozen,
    Identifier,
    Note,
    Point2,
    Point3,
    Text,
    labelled,
    metres,
    named,
    quantity,
    radians,
    several,
)
from engine.model.catalogue import ball_table, material_table, pair_table
from engine.model.elements import FULL_TURN, Element, ElementBase
from engine.model.references import ReferenceProblemsError, cross_problems

SCHEMA_VERSION = 1
ENTRY_LIMIT = 500
"""Most materials, balls, pairs, runs, stations, keep-outs, corners of an outline."""
ELEMENT_LIMIT = 2000
"""Most elements of one run."""
FASTEST = 100.0
"""m/s. Speed of a release."""
SPIN_LIMIT = 1e4
"""rad/s. Spin of a release."""

LengthUnit = Literal["mm", "cm", "m", "in"]


class KeepOut(Frozen):
    """Box that no part may enter, from its corner `min` to its corner `max`, m."""

    id: Identifier = named("Id")
    name: Text = labelled("", "Name")
    min: Point3 = labelled((0.0, 0.0, 0.0), "Low corner", unit="m")
    max: Point3 = labelled((0.1, 0.1, 0.1), "High corner", unit="m")

    @model_validator(mode="after")
    def _check_corners(self) -> "KeepOut":
        """Refuse a box turned inside out."""
        if any(high <= low for low, high in zip(self.min, self.max, strict=True)):
            raise ValueError("max must be larger than min in x, y and z")
        return self


class Site(Frozen):
    """Space to build in: plan outline, height of the floor and of the space over it, keep-outs, reach band.

    `reach` is the band of heights, m, that hands must be able to get at.
    """

    outline: tuple[Point2, ...] = several(
        "Outline", ENTRY_LIMIT, ((-1.0, -1.0), (1.0, -1.0), (1.0, 1.0), (-1.0, 1.0)), least=3
    )
    floor: float = metres(0.0, "Floor", -1e4, 1e4)
    height: float = metres(2.5, "Height")
    keep_outs: tuple[KeepOut, ...] = several("Keep-outs", ENTRY_LIMIT)
    reach: tuple[Coordinate, Coordinate] | None = labelled(None, "Reach band", unit="m")

    @model_validator(mode="after")
    def _check_reach(self) -> "Site":
        """Refuse a band turned upside down."""
        if self.reach is not None and self.reach[1] <= self.reach[0]:
            raise ValueError("reach must be given as [low, high] with high above low")
        return self


class Process(Frozen):
    """How parts are made: tolerance of a chord (m), build volume (m), clearance per side of a joint (m), wall (m)."""

    chord_tolerance: float = metres(1e-4, "Tolerance of chord", 1e-6, 0.01)
    build_volume: Point3 = labelled((0.22, 0.22, 0.25), "Build volume", unit="m")
    clearance: float = metres(2.5e-4, "Clearance per side", 0.0, 0.01)
    default_wall: float = metres(0.0016, "Wall")

    @model_validator(mode="after")
    def _check_volume(self) -> "Process":
        """Refuse a printer without room."""
        if min(self.build_volume) <= 0.0:
            raise ValueError("build_volume must be three lengths larger than 0")
        return self


class FreeStart(Frozen):
    """Run that begins at a place of its own: position of the inlet (m) and heading (rad, from +x toward +y)."""

    kind: Literal["free"] = "free"
    position: Point3 = labelled((0.0, 0.0, 1.0), "Position", unit="m")
    heading: float = radians(0.0, "Heading", -FULL_TURN, FULL_TURN)


class OutletStart(Frozen):
    """Run that begins at the outlet of an element of another run."""

    kind: Literal["outlet"] = "outlet"
    run: Identifier = named("Run", reference="run")
    element: Identifier = named("Element", reference="element")


Start = Annotated[FreeStart | OutletStart, Field(discriminator="kind")]


class Release(Frozen):
    """How the ball is let go, at the inlet of the first element.

    `offset` is the distance downstream of the inlet (m), `speed` along the track (m/s), `climb` the wall angle where
    the ball stands (rad, positive on the left wall), `spin` about the normal from wall to ball (rad/s). `direction`
    turns the velocity from the line of travel toward the left, in the plane of the wall (rad); left out, it goes
    along the track.
    """

    offset: float = metres(0.0, "Offset", 0.0)
    speed: float = quantity(0.0, "m/s", "Speed", 0.0, FASTEST)
    climb: float = radians(0.0, "Climb", -math.pi, math.pi)
    spin: float = quantity(0.0, "rad/s", "Spin about the normal", -SPIN_LIMIT, SPIN_LIMIT)
    direction: float | None = radians(None, "Direction", -math.pi, math.pi)
    place: Literal["inlet"] = labelled("inlet", "Place")


class Run(Frozen):
    """Elements that one ball follows, from its release on."""

    id: Identifier = named("Id")
    name: Text = labelled("", "Name")
    ball: Identifier = labelled("steel-16", "Ball", reference="ball")
    pair: Identifier = labelled("steel-pmma", "Contact pair", reference="pair")
    start: Start = labelled(FreeStart(), "Start")
    release: Release = labelled(Release(), "Release")
    elements: tuple[Element, ...] = several("Elements", ELEMENT_LIMIT)

    def element(self, key: str) -> ElementBase:
        """Element by id."""
        return find("element", self.elements, key)

    def index(self, key: str) -> int:
        """Place of an element among the elements, by id."""
        return self.elements.index(self.element(key))


class Station(Frozen):
    """Timing point: `s` metres downstream of the inlet of an element."""

    id: Identifier = named("Id")
    name: Text = labelled("", "Name")
    run: Identifier = named("Run", reference="run")
    element: Identifier = named("Element", reference="element")
    s: float = metres(0.0, "Distance from inlet", 0.0)


class Design(Frozen):
    """Everything about one installation. `units` is how lengths are shown; inside, all is SI."""

    schema_version: Literal[1] = labelled(SCHEMA_VERSION, "Version of the file")
    id: Identifier = labelled("design", "Id")
    name: Text = labelled("", "Name")
    note: Note = labelled("", "Note")
    units: LengthUnit = labelled("mm", "Unit of length")
    site: Site | None = labelled(None, "Site")
    materials: tuple[Material, ...] = several("Materials", ENTRY_LIMIT)
    balls: tuple[Ball, ...] = several("Balls", ENTRY_LIMIT)
    pairs: tuple[Pair, ...] = several("Contact pairs", ENTRY_LIMIT)
    process: Process = labelled(Process(), "Process")
    runs: tuple[Run, ...] = several("Runs", ENTRY_LIMIT)
    stations: tuple[Station, ...] = several("Stations", ENTRY_LIMIT)

    @model_validator(mode="after")
    def _check_across(self) -> "Design":
        """Refuse ids given twice, references to nothing and runs that start from themselves."""
        problems = cross_problems(self)
        if problems:
            raise ReferenceProblemsError(problems)
        return self

    def run(self, key: str | None = None) -> Run:
        """Run by id; the first one when no id is given."""
        if key is None and self.runs:
            return self.runs[0]
        return find("run", self.runs, key or "")

    def run_of(self, element: str) -> Run:
        """Run that an element belongs to, by the id of the element."""
        for run in self.runs:
            if any(entry.id == element for entry in run.elements):
                return run
        raise UnknownNameError("element", element, [entry.id for run in self.runs for entry in run.elements])

    def material_table(self) -> dict[str, Material]:
        """Materials by id, built-in ones included."""
        return material_table(self.materials)

    def ball_of(self, run: Run) -> Ball:
        """Ball of a run."""
        return ball_table(self.balls)[run.ball]

    def pair_of(self, run: Run, element: ElementBase | None = None) -> Pair:
        """Contact pair of an element of a run: its own, else the run's."""
        own = element.pair if element is not None else None
        return pair_table(self.pairs)[own or run.pair]

    def mass_of(self, ball: Ball) -> float:
        """Mass of a ball, kg."""
        return ball.mass(self.material_table())

    def inertia_factor_of(self, ball: Ball) -> float:
        """Inertia factor k of a ball."""
        return ball.inertia_factor(self.material_table())


Entry = TypeVar("Entry", Run, Station, Ball, Material, Pair, KeepOut, ElementBase)


def find(what: str, entries: Iterable[Entry], key: str) -> Entry:
    """Entry with an id; raises UnknownNameError with the nearest id otherwise."""
    known = {entry.id: entry for entry in entries}
    if key not in known:
        raise UnknownNameError(what, key, known)
    return known[key]
