import math

import numpy as np
import pytest

from engine.model.design import Design, OutletStart, Run
from engine.model.elements import Deck, Easing, FreeLine, Gap, Straight, Transition
from engine.placement import lay_out
from studio.dragging import Grip, dragged, grips_of, raised, rounded
from tests.designs import bend_run, funnel_run, helix_run, single_run

STEP = 0.001
NOWHERE = np.zeros(3)


def grip(element, role, number=0):
    return Grip(element, role, number, NOWHERE)


def element_of(design, key):
    return design.runs[0].element(key)


def test_outlet_of_a_straight_changes_its_length_only():
    layout = lay_out(bend_run())
    changed = dragged(layout, grip("s1", "outlet"), np.array([0.3004, 0.2]), STEP)
    assert element_of(changed, "s1").length == 0.3
    assert element_of(changed, "b1") == element_of(layout.design, "b1")


def test_nothing_is_dragged_to_nothing_or_behind_its_inlet():
    layout = lay_out(bend_run())
    for x in (0.0, -0.4):
        assert element_of(dragged(layout, grip("s1", "outlet"), np.array([x, 0.0]), STEP), "s1").length == STEP


def test_inlet_is_the_outlet_of_the_one_before_and_the_first_one_the_start():
    layout = lay_out(bend_run())
    place = np.array([0.25, 0.0])
    assert dragged(layout, grip("b1", "inlet"), place, STEP) == dragged(layout, grip("s1", "outlet"), place, STEP)
    moved = dragged(layout, grip("s1", "inlet"), np.array([-0.1, 0.0502]), STEP)
    assert moved.runs[0].start.position == (-0.1, 0.05, 1.0)


@pytest.mark.parametrize("turn", [30, 90, 170, 200, 330])
@pytest.mark.parametrize("sense", [1, -1])
def test_outlet_of_a_bend_is_turned_to_the_place(turn, sense):
    design = bend_run(radius=0.15)
    bend = element_of(design, "b1")
    wide = design.model_copy(
        update={
            "runs": (
                design.runs[0].model_copy(
                    update={
                        "elements": tuple(
                            bend.model_copy(update={"turn": sense * math.radians(150)}) if each is bend else each
                            for each in design.runs[0].elements
                        )
                    }
                ),
            )
        }
    )
    layout = lay_out(wide)
    inlet = layout.find("b1").inlet.position
    angle = math.radians(turn)
    place = inlet[:2] + 0.4 * np.array([math.sin(angle), -sense * math.cos(angle)]) + np.array([0.0, sense * 0.15])
    found = element_of(dragged(layout, grip("b1", "outlet"), place, STEP), "b1").turn
    assert found == pytest.approx(sense * angle, abs=math.radians(0.51))


def test_centre_of_a_bend_changes_its_radius_and_its_side():
    layout = lay_out(bend_run(radius=0.15))
    centre = next(each for each in grips_of(layout.find("b1")) if each.role == "centre")
    wider = dragged(layout, centre, centre.place[:2] + np.array([0.07, 0.05]), STEP)
    assert element_of(wider, "b1").radius == 0.2
    other = dragged(layout, centre, layout.find("b1").inlet.position[:2] - np.array([0.0, 0.1]), STEP)
    assert element_of(other, "b1").radius == 0.1 and element_of(other, "b1").turn == -math.pi / 2


def test_outlet_of_a_helix_keeps_its_full_turns():
    layout = lay_out(helix_run(turns=2.0))
    entry = layout.find("h1")
    beside = entry.inlet.position[:2] + np.array([0.1, 0.1])
    assert element_of(dragged(layout, grip("h1", "outlet"), beside, STEP), "h1").turns == pytest.approx(2.25)


def test_point_of_a_free_line_goes_to_the_place_at_its_height():
    layout = lay_out(single_run(Straight(id="s1", length=0.2), FreeLine(id="l1")))
    entry = layout.find("l1")
    target = entry.inlet.position[:2] + np.array([0.13, -0.04])
    changed = element_of(dragged(layout, grip("l1", "point", 1), target, STEP), "l1").points
    assert changed[1] == (0.13, -0.04, entry.element.points[1][2])
    assert changed[0] == entry.element.points[0]
    ended = element_of(dragged(layout, grip("l1", "outlet"), target, STEP), "l1").points
    assert ended[-1][:2] == (0.13, -0.04)


def test_gap_transition_and_deck_follow_their_outlets():
    layout = lay_out(single_run(Gap(id="g1"), Transition(id="t1", length=0.15), Deck(id="d1", length=0.3)))
    gap = element_of(dragged(layout, grip("g1", "outlet"), np.array([0.2, 0.03]), STEP), "g1")
    assert (gap.forward, gap.left) == (0.2, 0.03)
    entry = layout.find("t1")
    twice = entry.inlet.position[:2] + 2.0 * (entry.outlet.position - entry.inlet.position)[:2]
    assert element_of(dragged(layout, grip("t1", "outlet"), twice, STEP), "t1").length == pytest.approx(0.3)
    ahead = layout.find("d1").inlet.position[:2] + 0.4 * layout.find("d1").inlet.forward[:2]
    assert element_of(dragged(layout, grip("d1", "outlet"), ahead, STEP), "d1").length == pytest.approx(0.4)


def test_what_cannot_follow_stays_the_same_design():
    layout = lay_out(funnel_run())
    assert dragged(layout, grip("f1", "centre"), np.array([5.0, 5.0]), STEP) is layout.design
    branch = Run(id="r2", start=OutletStart(run="r1", element="s1"), elements=(Straight(id="s9"),))
    forked = Design(runs=(layout.design.runs[0], branch), pairs=layout.design.pairs)
    assert dragged(lay_out(forked), grip("s9", "inlet"), np.array([5.0, 5.0]), STEP) is forked


@pytest.mark.parametrize("key", ["s1", "b1", "s2"])
def test_raised_outlet_stands_at_the_height(key):
    layout = lay_out(bend_run())
    wanted = float(layout.find(key).outlet.position[2]) - 0.03
    outlet = lay_out(raised(layout, key, wanted)).find(key).outlet
    assert outlet.position[2] == pytest.approx(wanted, abs=0.0005 * 0.25)


@pytest.mark.parametrize("element", [Easing(id="x"), Gap(id="x"), FreeLine(id="x"), Deck(id="x"), Transition(id="x")])
def test_other_kinds_are_raised_alike(element):
    layout = lay_out(single_run(Straight(id="s1", length=0.2), element))
    wanted = float(layout.find("x").outlet.position[2]) - 0.02
    outlet = lay_out(raised(layout, "x", wanted)).find("x").outlet
    assert outlet.position[2] == pytest.approx(wanted, abs=6e-4)


def test_raised_helix_gets_another_drop():
    layout = lay_out(helix_run())
    height = float(layout.find("h1").inlet.position[2]) - 0.2
    assert element_of(raised(layout, "h1", height), "h1").drop == 0.2


def test_vessel_cannot_be_raised_by_its_outlet():
    layout = lay_out(funnel_run())
    assert raised(layout, "f1", 0.3) is layout.design


def test_rounding_leaves_no_noise():
    assert rounded(0.30049, 0.001) == 0.3
    assert rounded(-0.0126, 0.005) == -0.015
