"""Small designs that the tests use; plain document objects, nothing computed."""

import math

from engine.model.ball import Ball, Layer, Pair
from engine.model.design import Design, FreeStart, KeepOut, OutletStart, Release, Run, Site, Station
from engine.model.elements import (
    Bend,
    Bowl,
    Deck,
    Dome,
    Easing,
    Element,
    FreeLine,
    Funnel,
    Gap,
    Helix,
    Loop,
    Points,
    Straight,
    Transition,
    Tray,
    Trough,
    Tube,
    Well,
)

LOSSLESS = Pair(
    id="lossless",
    name="Sticks without loss",
    ball_material="steel",
    wall_material="pmma",
    static_friction=10.0,
    kinetic_friction=10.0,
    rolling_loss=0.0,
    restitution=0.0,
    source="made up for tests",
)
"""Ideal rolling: nothing slips, nothing is lost."""


def single_run(
    *elements: Element, release: Release | None = None, pair: str = "steel-pmma", height: float = 1.0
) -> Design:
    """Return a design of one run, `r1`, of the given elements; a 16 mm steel ball let go at rest."""
    run = Run(
        id="r1",
        pair=pair,
        start=FreeStart(position=(0.0, 0.0, height)),
        release=release or Release(),
        elements=elements,
    )
    return Design(id="test", pairs=(LOSSLESS,), runs=(run,))


def straight_run(length: float = 1.0, grade: float = 0.1, pair: str = "lossless") -> Design:
    """Return one straight tube, `s1`."""
    return single_run(Straight(id="s1", length=length, grade=grade), pair=pair)


def level_run(speed: float = 0.5, length: float = 2.0, pair: str = "steel-pmma") -> Design:
    """Return one level straight trough, `s1`, that the ball enters with some speed."""
    trough = Straight(id="s1", length=length, grade=0.0, section=Trough())
    return single_run(trough, release=Release(speed=speed), pair=pair)


def bend_run(radius: float = 0.15, speed: float = 0.4, opening: float = math.pi) -> Design:
    """Return a straight, `s1`, a bend to the left, `b1`, and a straight, `s2`, as troughs."""
    section = Trough(opening=opening)
    return single_run(
        Straight(id="s1", length=0.2, section=section),
        Bend(id="b1", radius=radius, section=section),
        Straight(id="s2", length=0.2, section=section),
        release=Release(speed=speed),
    )


def helix_run(turns: float = 2.0) -> Design:
    """Return a straight tube, `s1`, and a helix, `h1`."""
    return single_run(Straight(id="s1", length=0.1), Helix(id="h1", radius=0.1, turns=turns, drop=0.12))


def funnel_run() -> Design:
    """Return a straight tube, `s1`, into a conical funnel, `f1`."""
    return single_run(
        Straight(id="s1", length=0.3, grade=0.1),
        Funnel(id="f1", rim_radius=0.2, throat_radius=0.02, depth=0.1),
        height=1.5,
    )


def desk_run() -> Design:
    """Return a run that fits on a desk: straight, transition, bend, transition, straight, catch tray."""
    return single_run(
        Straight(id="s1", name="Start", length=0.25, grade=0.04),
        Transition(id="t1", length=0.12, curvature_start=0.0, curvature_end=1 / 0.2, grade=0.03),
        Bend(id="b1", radius=0.2, turn=math.pi / 2, grade=0.03),
        Transition(id="t2", length=0.12, curvature_start=1 / 0.2, curvature_end=0.0, grade=0.03),
        Straight(id="s2", length=0.25, grade=0.03),
        Tray(id="tray1", drop=0.02),
        height=0.3,
    )


def crest_run() -> Design:
    """Return a level trough, `s1`, that falls away over `e1` too fast for the ball to follow, `s2` and a catch tray."""
    section = Trough()
    return single_run(
        Straight(id="s1", length=0.3, grade=0.0, section=section),
        Easing(id="e1", length=0.15, grade_start=0.0, grade_end=0.6, section=section),
        Straight(id="s2", length=0.3, grade=0.6, section=section),
        Tray(id="tray1", drop=0.05, length=0.6, width=0.3),
        release=Release(speed=1.5),
    )


def every_kind() -> Design:
    """Return a design with one of each kind of element, section and start; drawn up to be stored, not to be rolled."""
    first = Run(
        id="r1",
        name="All kinds",
        ball="shell",
        start=FreeStart(position=(0.1, -0.2, 1.9), heading=0.5),
        release=Release(offset=0.02, speed=0.3, climb=0.1, spin=-2.0, direction=0.05),
        elements=(
            Straight(id="s1", section=Tube(bore=0.026, wall=0.002), bank_end=0.1),
            Bend(id="b1", turn=-1.2, pair="lossless", note="turns right"),
            Helix(id="h1", turns=-1.5),
            Transition(id="t1"),
            Easing(id="e1"),
            FreeLine(id="l1"),
            Loop(id="o1", section=Trough(opening=1.0)),
            Gap(id="g1"),
            Funnel(id="f1", profile=Points(), hand=-1),
            Well(id="w1", tilt=0.2),
            Bowl(id="bowl1"),
            Dome(id="dome1"),
            Deck(id="d1"),
            Tray(id="tray1"),
        ),
    )
    second = Run(id="r2", start=OutletStart(run="r1", element="s1"), elements=(Straight(id="s9"),))
    return Design(
        id="every-kind",
        name="Jede Art, élément",
        units="in",
        site=Site(keep_outs=(KeepOut(id="pillar"),), reach=(0.4, 1.4)),
        balls=(Ball(id="shell", layers=(Layer(material="void", radius=0.009), Layer(material="brass", radius=0.01))),),
        pairs=(LOSSLESS,),
        runs=(first, second),
        stations=(Station(id="gate", run="r1", element="b1", s=0.05),),
    )
