"""Where elements stand."""

import math
from itertools import pairwise

import numpy as np
import pytest

from engine.errors import UnknownNameError
from engine.geometry.profiles import at_length
from engine.geometry.tables import down_at
from engine.model.design import Design, FreeStart, OutletStart, Run
from engine.model.elements import (
    Bend,
    Bowl,
    Cone,
    Deck,
    Dome,
    FreeLine,
    Funnel,
    Gap,
    Helix,
    Hyperbolic,
    Loop,
    Parabolic,
    Points,
    Power,
    Straight,
    Tray,
    Tube,
    Well,
)
from engine.placement import lay_out, onward
from engine.vessels import ENTRY_CLEARANCE
from tests import designs

BORE = 0.0105


def placed(*elements):
    return lay_out(designs.single_run(*elements)).placed


def test_elements_chain_and_lengths_add_up():
    chain = placed(Straight(id="a"), Bend(id="b"), Helix(id="c"), FreeLine(id="d"), Loop(id="e"), Gap(id="f"))
    for before, after in pairwise(chain):
        assert after.inlet.position == pytest.approx(before.outlet.position, abs=1e-14)
        assert after.start == pytest.approx(before.start + before.length)
    assert [entry.index for entry in chain] == list(range(6))
    assert chain[0].length == pytest.approx(0.3 * math.sqrt(1 + 0.03**2))


def test_grade_is_the_elements_own():
    chain = placed(Straight(id="a", grade=0.1), Straight(id="b", grade=0.3))
    assert chain[0].outlet.grade == pytest.approx(0.1)
    assert chain[1].inlet.grade == pytest.approx(0.3)


def test_outlet_is_not_banked_but_the_curve_is():
    entry = placed(Straight(id="a", grade=0.0, bank_end=0.4))[0]
    assert entry.outlet.down == pytest.approx([0, 0, -1], abs=1e-14)
    assert down_at(entry.curve, np.array([entry.length]))[0] == pytest.approx([0, math.sin(0.4), -math.cos(0.4)])


def test_moving_the_start_moves_everything_alike():
    elements = (Straight(id="a"), Bend(id="b"), FreeLine(id="c"), Funnel(id="d"), Gap(id="e"), Loop(id="f"))
    near, far = (
        lay_out(
            Design(id="d", runs=(Run(id="r", start=FreeStart(position=position, heading=heading), elements=elements),))
        )
        for position, heading in (((0, 0, 1), 0.0), ((0.5, -2.0, 1.5), 1.3))
    )
    turn = np.array([[math.cos(1.3), -math.sin(1.3), 0], [math.sin(1.3), math.cos(1.3), 0], [0, 0, 1]])
    for one, other in zip(near.placed, far.placed, strict=True):
        expected = turn @ (one.inlet.position - [0, 0, 1]) + [0.5, -2.0, 1.5]
        assert other.inlet.position == pytest.approx(expected, abs=1e-12)
        assert other.inlet.tangent == pytest.approx(turn @ one.inlet.tangent, abs=1e-12)


def test_gap_is_seen_from_its_inlet():
    entry = placed(
        Bend(id="b", turn=math.pi / 2, grade=0.0), Gap(id="g", forward=0.1, left=0.02, drop=0.05, turn=-0.5)
    )[1]
    assert entry.outlet.position - entry.inlet.position == pytest.approx([-0.02, 0.1, -0.05], abs=1e-14)
    assert entry.outlet.heading == pytest.approx(math.pi / 2 - 0.5)


@pytest.mark.parametrize("hand", [1, -1])
@pytest.mark.parametrize("profile", [Cone(), Power(exponent=1.5), Hyperbolic(), Parabolic(), Points()])
def test_funnel_is_entered_along_its_rim(hand, profile):
    tube, funnel = placed(
        Straight(id="a", grade=0.0), Funnel(id="f", profile=profile, hand=hand, inlet_drop=0.01)
    )
    away = tube.outlet.position - funnel.origin
    assert tube.outlet.tangent @ away == pytest.approx(0.0, abs=1e-13)
    assert hand * np.cross(away, tube.outlet.tangent)[2] > 0
    s = np.linspace(0, funnel.length, 4001)
    wall = at_length(funnel.meridian, s)[0]
    near = np.hypot(wall[:, 0] - np.hypot(*away[:2]), wall[:, 1] - away[2])
    assert near.min() == pytest.approx(BORE + ENTRY_CLEARANCE, abs=1e-6)
    assert wall[near.argmin(), 1] == pytest.approx(-0.01, abs=1e-4)
    assert funnel.outlet.tangent == pytest.approx([0, 0, -1])
    assert funnel.outlet.position == pytest.approx(funnel.origin - [0, 0, 0.1])
    assert funnel.outlet.heading == pytest.approx(tube.outlet.heading)


def test_funnel_profiles_run_from_rim_to_throat():
    for profile in (Cone(), Power(exponent=0.0), Hyperbolic(), Parabolic(), Points()):
        table = placed(Funnel(id="f", profile=profile))[0].meridian
        assert table[0, 1:3] == pytest.approx([0.2, 0.0], abs=1e-14)
        assert table[-1, 1:3] == pytest.approx([0.02, -0.1], abs=1e-14)
        assert (np.diff(table[:, 2]) < 0).all()


def test_inlet_angle_turns_the_path_inward():
    tube, funnel = placed(Straight(id="a", grade=0.0), Funnel(id="f", inlet_angle=0.3))
    inward = funnel.origin - tube.outlet.position
    inward[2] = 0
    share = tube.outlet.tangent @ inward / np.linalg.norm(inward)
    slope = 0.18 / math.hypot(0.18, 0.1)
    assert share == pytest.approx(math.sin(math.atan(math.tan(0.3) * slope)), abs=1e-12)


def test_well_stands_upright_lies_and_leads_on():
    _, upright = placed(Straight(id="a", grade=0.0), Well(id="w", floor=False))
    assert upright.outlet.position == pytest.approx(upright.origin - [0, 0, 0.2])
    _, lying = placed(
        Straight(id="a", grade=0.0), Well(id="w", floor=False, tilt=math.pi / 2, tilt_heading=math.pi / 2, hand=-1)
    )
    assert lying.axis == pytest.approx([0, 1, 0], abs=1e-15)
    assert lying.origin[2] > lying.inlet.position[2]
    assert lying.outlet.tangent == pytest.approx([0, -1, 0], abs=1e-15)
    axial = placed(Straight(id="a", grade=0.0), Well(id="w", floor=False, tilt=math.pi / 2, tilt_heading=0.0))[1]
    assert np.isfinite(axial.origin).all()


def test_nothing_leaves_a_closed_bottom_yet_the_rest_is_drawn():
    chain = placed(Straight(id="a"), Well(id="w"), Straight(id="b"), Bowl(id="o", hole_radius=0.0))
    assert chain[1].outlet is None and chain[3].outlet is None
    assert chain[2].inlet.position == pytest.approx(onward(chain[1]).position)


def test_well_profile_is_smooth():
    table = placed(Well(id="w"))[0].meridian
    repeated = np.flatnonzero(np.diff(table[:, 0]) == 0)
    assert len(repeated) == 3
    assert table[repeated, :5] == pytest.approx(table[repeated + 1, :5], abs=1e-13)
    assert table[-1, 1:3] == pytest.approx([0, -0.2], abs=1e-14)


def test_bowl_and_dome_are_spheres():
    bowl, dome = placed(Bowl(id="b"))[0], placed(Straight(id="a"), Dome(id="d"))[1]
    assert np.hypot(bowl.meridian[:, 1], bowl.meridian[:, 2] - 0.15) == pytest.approx(0.25, abs=1e-14)
    assert bowl.meridian[-1, 1] == pytest.approx(0.015)
    assert np.hypot(dome.meridian[:, 1], dome.meridian[:, 2] + 0.25) == pytest.approx(0.25, abs=1e-14)
    assert dome.origin[2] == pytest.approx(dome.inlet.position[2] - BORE - ENTRY_CLEARANCE)
    assert dome.side == 1 and bowl.side == -1


def test_deck_is_level_with_the_invert_and_passes_it_on():
    tube, deck, after = placed(Straight(id="a", grade=0.0), Deck(id="d", grade=0.0), Straight(id="b", grade=0.0))
    assert deck.origin == pytest.approx(tube.outlet.position - [0, 0, BORE])
    assert deck.axis == pytest.approx([0, 0, 1])
    assert after.inlet.position == pytest.approx(tube.outlet.position + [0.3, 0, 0])


def test_tray_lies_below_the_outlet():
    ahead = placed(Straight(id="a", grade=0.0), Tray(id="t", drop=0.05))[1]
    assert ahead.origin == pytest.approx(ahead.inlet.position - [0, 0, BORE + 0.05])
    below = placed(Funnel(id="f"), Tray(id="t", drop=0.05, length=0.2))[1]
    assert below.origin + 0.1 * below.plate.along == pytest.approx(below.inlet.position - [0, 0, 0.05])


def test_run_that_starts_at_another_runs_outlet():
    first = Run(id="r1", start=OutletStart(run="r2", element="x"), elements=(Straight(id="a"),))
    second = Run(id="r2", elements=(Bend(id="x"), Straight(id="y")))
    layout = lay_out(Design(id="d", runs=(first, second)))
    assert [entry.element.id for entry in layout.placed] == ["a", "x", "y"]
    assert [entry.index for entry in layout.placed] == [0, 1, 2]
    assert layout.find("a").inlet.position == pytest.approx(layout.find("x").outlet.position)


def test_layout_finds_and_bounds():
    layout = lay_out(designs.single_run(Straight(id="a", grade=0.0, section=Tube(bore=0.02)), height=1.0))
    assert layout.bounds() == pytest.approx(np.array([[-0.01, -0.01, 0.99], [0.31, 0.01, 1.01]]))
    assert layout.of_run("r1")[0] is layout.find("a")
    with pytest.raises(UnknownNameError, match="zz"):
        layout.find("zz")
    with pytest.raises(UnknownNameError):
        layout.of_run("zz")


def test_every_kind_is_placed():
    layout = lay_out(designs.every_kind())
    assert len(layout.placed) == 15
    assert np.isfinite(layout.bounds()).all()
