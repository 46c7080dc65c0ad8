"""The demonstration designs, made in Python so that they stay valid: `python -m tests.examples_source` writes them.

The scenario is a hallway that tells of the sea: a desk-size printed starter, a wall of clear tube called Tideline, a
classroom cylinder that sends a ball back up.
"""

import math
from pathlib import Path

from engine.model.design import Design, FreeStart, Release, Run, Site
from engine.model.elements import (
    Bend,
    Easing,
    Element,
    FreeLine,
    Funnel,
    Gap,
    Helix,
    Power,
    Straight,
    Transition,
    Tray,
    Trough,
    Tube,
    Well,
)
from engine.model.storage import save
from engine.placement import lay_out

FOLDER = Path(__file__).parent.parent / "assets" / "examples"
CLEAR = Tube(bore=0.029, wall=0.003)
"""Clear acrylic tube 35/29."""
OPEN = Trough(bore=0.029, wall=0.003, opening=math.pi, lip_radius=0.0015)
PRINTED = Trough(bore=0.022, wall=0.0024, opening=2.6, lip_radius=0.0012)


class Chain:
    """Elements of one run, named and numbered as they are added."""

    def __init__(self, section: Tube | Trough, grade: float) -> None:
        self.section, self.grade = section, grade
        self.elements: list[Element] = []

    def _id(self, kind: str) -> dict[str, str]:
        number = len(self.elements) + 1
        return {"id": f"{kind}-{number}", "name": f"{kind} {number}"}

    def straight(self, length: float, section: Trough | Tube | None = None) -> None:
        """Add a straight of plan length m."""
        self.elements.append(
            Straight(**self._id("straight"), length=length, grade=self.grade, section=section or self.section)
        )

    def turn(self, radius: float, angle: float, ease: float) -> None:
        """Add a bend of `angle` rad in all (positive left), eased by a clothoid of plan length `ease` at either end."""
        curvature = math.copysign(1.0 / radius, angle)
        rest = angle - curvature * ease
        common = {"grade": self.grade, "section": self.section}
        self.elements.append(
            Transition(**self._id("ease"), length=ease, curvature_start=0.0, curvature_end=curvature, **common)
        )
        self.elements.append(Bend(**self._id("bend"), radius=radius, turn=rest, **common))
        self.elements.append(
            Transition(**self._id("ease"), length=ease, curvature_start=curvature, curvature_end=0.0, **common)
        )

    def regrade(self, length: float, grade: float) -> None:
        """Add a vertical easing to another grade."""
        self.elements.append(
            Easing(**self._id("easing"), length=length, grade_start=self.grade, grade_end=grade, section=self.section)
        )
        self.grade = grade

    def helix(self, radius: float, turns: float) -> None:
        """Add a helix that keeps the grade, eased in and out; `turns` counts the eased ends too."""
        ease = 0.12
        rest = abs(turns) - ease / (2.0 * math.pi * radius)
        drop = self.grade * 2.0 * math.pi * radius * rest
        curvature = math.copysign(1.0 / radius, turns)
        common = {"grade": self.grade, "section": self.section, "length": ease}
        self.elements.append(Transition(**self._id("ease"), curvature_start=0.0, curvature_end=curvature, **common))
        self.elements.append(
            Helix(
                **self._id("helix"), radius=radius, turns=math.copysign(rest, turns), drop=drop, section=self.section
            )
        )
        self.elements.append(Transition(**self._id("ease"), curvature_start=curvature, curvature_end=0.0, **common))

    def take_grade(self) -> None:
        """Go on with the grade at which the last element leaves."""
        run = Run(id="part", elements=tuple(self.elements))
        outlet = lay_out(Design(id="part", runs=(run,))).placed[-1].outlet
        assert outlet is not None
        self.grade = outlet.grade

    def add(self, kind: type, word: str, **fields: object) -> None:
        """Add any other element."""
        self.elements.append(kind(**self._id(word), **fields))


def desk() -> Design:
    """Printed starter run for a desk: two eased bends and a short helix, open all the way, into a tray."""
    chain = Chain(PRINTED, 0.05)
    chain.straight(0.10)
    chain.turn(0.07, math.pi, 0.05)
    chain.straight(0.08)
    chain.turn(0.07, -math.pi, 0.05)
    chain.straight(0.10)
    chain.add(Tray, "tray", length=0.16, width=0.12, drop=0.02)
    run = Run(
        id="run", name="Starter", ball="steel-16", pair="steel-pla", start=FreeStart(position=(0.0, 0.0, 0.14)),
        release=Release(offset=0.01), elements=tuple(chain.elements),
    )
    return Design(id="desk", name="Starter", units="mm", runs=(run,))


def wall() -> Design:
    """Tideline wall: 35/29 mm clear tube, 25.4 mm steel balls, a funnel, two helices, a jump, a well that sends the
    ball back up.
    """
    chain = Chain(CLEAR, 0.02)
    chain.straight(0.25)
    chain.turn(0.20, -0.5, 0.08)
    chain.turn(0.20, 0.5, 0.08)
    chain.straight(0.10)
    chain.turn(0.18, -math.pi, 0.16)
    chain.straight(0.20)
    chain.turn(0.20, 0.5, 0.08)
    chain.turn(0.20, -0.5, 0.08)
    chain.straight(0.15)
    chain.turn(0.18, math.pi, 0.16)
    chain.straight(0.12)
    chain.straight(0.15, OPEN)
    chain.add(Gap, "jump", forward=0.05, drop=0.022)
    chain.straight(0.15, OPEN)
    chain.straight(0.08)
    chain.add(
        Funnel, "funnel", profile=Power(exponent=0.9), rim_radius=0.12, throat_radius=0.0145, depth=0.12,
        inlet_drop=0.02, inlet_angle=0.7, hand=-1, pair="steel-pla",
    )
    chain.add(FreeLine, "drop", points=((0.0, 0.0, -0.05), (0.03, 0.0, -0.12), (0.12, 0.0, -0.17), (0.26, 0.0, -0.187)),
              section=CLEAR)
    chain.take_grade()
    chain.regrade(0.12, 0.045)
    chain.helix(0.16, 2.0)
    chain.straight(0.40)
    chain.turn(0.16, -math.pi, 0.14)
    chain.straight(0.30)
    chain.helix(0.16, -2.0)
    chain.straight(0.10)
    chain.regrade(0.15, 0.20)
    chain.straight(0.50)
    chain.regrade(0.20, 0.02)
    chain.add(Well, "well", radius=0.1, depth=0.6, rim_fillet=0.0, floor=False, hand=-1, pair="steel-glass")
    chain.add(Tray, "tray", length=0.3, width=0.3, drop=0.05)
    run = Run(
        id="run", name="Tideline", ball="steel-25.4", pair="steel-pmma",
        start=FreeStart(position=(-0.7, 0.7, 1.75)), release=Release(offset=0.02), elements=tuple(chain.elements),
    )
    site = Site(outline=((-1.2, -0.825), (1.2, -0.825), (1.2, 0.825), (-1.2, 0.825)), floor=0.0, height=2.0)
    return Design(id="wall", name="Tideline wall", units="mm", site=site, runs=(run,))


def cylinder() -> Design:
    """Classroom upright cylinder: the ball goes round and comes up again, 1.87 turns a bob."""
    chain = Chain(CLEAR, 0.01)
    chain.straight(0.15)
    chain.add(Well, "well", radius=0.1, depth=0.45, rim_fillet=0.0, floor_fillet=0.03)
    run = Run(
        id="run", name="Cylinder", ball="steel-25.4", pair="steel-pmma", start=FreeStart(position=(0.0, 0.0, 0.6)),
        release=Release(speed=1.9), elements=tuple(chain.elements),
    )
    return Design(id="cylinder", name="Upright cylinder", units="mm", runs=(run,))


DESIGNS = {"desk": desk, "wall": wall, "cylinder": cylinder}


def main() -> None:
    """Write every design."""
    FOLDER.mkdir(parents=True, exist_ok=True)
    for name, make in DESIGNS.items():
        save(make(), FOLDER / f"{name}.json")


if __name__ == "__main__":
    main()
