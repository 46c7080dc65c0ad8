"""Layout to scene: patches, links, laws, release; a ball sent through the joints."""

import itertools
import math

import numpy as np
import pytest

from engine.contact.patches import END, PHI_MAX, PHI_MIN, START, PatchList, Rectangle
from engine.contact.query import foot_on
from engine.contact.surface import (
    EXIT,
    OPEN,
    PLANE,
    REVOLVED,
    ROLE_CATCH,
    ROLE_FLOOR,
    SWEPT_INSIDE,
    SWEPT_OUTSIDE,
)
from engine.contact.walls import prepare
from engine.errors import DesignError
from engine.geometry.tables import interpolate
from engine.integrate.record import NEVER, Asked, roll_rows, start_row, trajectory
from engine.integrate.result import EventKind, Status
from engine.model.ball import Pair
from engine.model.design import Design, Release, Run, Site
from engine.model.elements import (
    Bend,
    Bowl,
    Deck,
    Dome,
    Easing,
    Funnel,
    Gap,
    Helix,
    Hyperbolic,
    Straight,
    Tray,
    Trough,
    Tube,
    Well,
)
from engine.placement import lay_out
from engine.scene import build, law_of
from tests import designs

RADIUS = 0.008


def built(*elements, **release):
    design = designs.single_run(*elements, release=Release(**release))
    return build(lay_out(design), "r1")


def rolled(*elements, **release):
    made = built(*elements, **release)
    return made, trajectory(
        made.scene, made.ball, roll_rows(prepare(made.scene), made.ball, start_row(made.start), Asked(), NEVER)
    )


def owners_met(made, track):
    """Placed elements in the order in which the ball touches them."""
    met = [int(made.scene.owner[event.patch]) for event in track.events if event.patch >= 0]
    return [owner for place, owner in enumerate(met) if place == 0 or owner != met[place - 1]]


def gap_at(scene, patch, centre):
    return foot_on(prepare(scene), patch, tuple(float(x) for x in centre), RADIUS, (-1, 0.0))


# -- patches and links ----------------------------------------------------------------------------
def test_tube_is_one_full_circle_and_the_last_end_leads_out():
    scene = built(Straight(id="a")).scene
    assert list(scene.kind) == [PLANE, SWEPT_INSIDE, PLANE]
    assert list(scene.role) == [ROLE_FLOOR, 0, ROLE_CATCH]
    assert scene.number[1, 2] - scene.number[1, 1] == pytest.approx(2 * math.pi)
    assert scene.number[1, 0] == pytest.approx(0.0105)
    assert scene.link[1, END] == EXIT and scene.link[1, START] == OPEN
    assert list(scene.owner) == [-1, 0, 0]


def test_trough_and_its_lips_name_each_other():
    section = Trough(bore=0.024, opening=2.4, lip_radius=0.001)
    scene = built(Bend(id="b", section=section), Straight(id="c", section=section)).scene
    inside, right, left = 1, 2, 3
    assert scene.number[inside, 1:3] == pytest.approx([1.2 - math.pi, math.pi - 1.2])
    assert (scene.link[inside, PHI_MIN], scene.link[inside, PHI_MAX]) == (right, left)
    assert scene.link[right, PHI_MIN] == inside and scene.link[right, PHI_MAX] == OPEN
    assert scene.link[left, PHI_MAX] == inside and scene.link[left, PHI_MIN] == OPEN
    assert [scene.link[patch, END] for patch in (inside, right, left)] == [4, 5, 6]
    assert [scene.link[patch, START] for patch in (4, 5, 6)] == [inside, right, left]
    assert list(scene.number[[right, left], 0]) == [0.001, 0.001]


@pytest.mark.parametrize("side", [-1, 1])
def test_wall_and_lip_agree_where_they_meet(side):
    """At the wall angle of the lip a ball touches both, with one normal, at the lip's own limit."""
    section = Trough(bore=0.024, opening=2.4, lip_radius=0.0015)
    made = built(Helix(id="h", section=section, bank_end=0.3))
    table = lay_out(designs.single_run(Helix(id="h", section=section, bank_end=0.3))).placed[0].curve
    row = table[len(table) // 2]
    left = np.cross(row[4:7], row[10:13])
    angle = side * section.lip_angle
    spoke = math.cos(angle) * row[10:13] + math.sin(angle) * left
    centre = row[1:4] + (0.012 - RADIUS) * spoke
    wall = gap_at(made.scene, 1, centre)
    lip = 2 if side < 0 else 3
    edge = gap_at(made.scene, lip, centre)
    assert wall.gap == pytest.approx(0, abs=1e-12) and edge.gap == pytest.approx(0, abs=1e-12)
    assert [edge.nx, edge.ny, edge.nz] == pytest.approx([wall.nx, wall.ny, wall.nz], abs=1e-9)
    assert edge.angle == pytest.approx(made.scene.number[lip, 1 if side < 0 else 2], abs=1e-7)
    assert wall.angle == pytest.approx(angle, abs=1e-7)


def test_free_end_has_an_edge_and_a_joint_has_none():
    joined = built(Straight(id="a"), Straight(id="b")).scene
    assert (joined.kind == SWEPT_OUTSIDE).sum() == 0
    apart = built(Straight(id="a"), Gap(id="g"), Straight(id="b")).scene
    edges = np.flatnonzero(apart.kind == SWEPT_OUTSIDE)
    assert len(edges) == 2
    assert apart.link[1, END] == edges[0] and apart.link[3, START] == edges[1]
    assert (apart.number[edges, 0] == 0).all() and (apart.number[edges, 3] == 1).all()


def test_vessel_parts_follow_each_other():
    scene = built(Straight(id="a"), Well(id="w")).scene
    parts = np.flatnonzero(scene.kind == REVOLVED)
    assert len(parts) == 4
    for upper, lower in itertools.pairwise(parts):
        assert scene.link[upper, END] == lower and scene.link[lower, START] == upper
    assert scene.link[parts[-1], END] == EXIT and scene.link[parts[0], START] == OPEN
    first = scene.first[parts]
    assert scene.meridian[first[1:], 0] == pytest.approx(scene.meridian[first[1:] - 1, 0])


def test_floor_is_the_sites_or_well_below():
    design = designs.single_run(Straight(id="a", grade=0.0))
    assert build(lay_out(design), "r1").scene.number[0, 2] == pytest.approx(1.0 - 0.0105 - 1.0)
    with_site = design.model_copy(update={"site": Site(floor=0.25)})
    assert build(lay_out(with_site), "r1").scene.number[0, 2] == 0.25


def test_boxes_hold_the_walls():
    made = built(Helix(id="h", section=Trough()), Gap(id="g"), Funnel(id="f", profile=Hyperbolic()), Bowl(id="b"))
    scene = made.scene
    for patch in np.flatnonzero(scene.kind != PLANE):
        span = slice(scene.first[patch], scene.first[patch] + scene.count[patch])
        if scene.kind[patch] == REVOLVED:
            continue
        table = scene.knots[span]
        points = interpolate(table, np.linspace(table[0, 0], table[-1, 0], 500))[0]
        room = scene.number[patch, 0]
        assert (points.min(axis=0) - room >= scene.box[patch, :3]).all()
        assert (points.max(axis=0) + room <= scene.box[patch, 3:]).all()


def test_laws_come_from_the_pair_of_the_element():
    own = Pair(id="own", static_friction=0.7, kinetic_friction=0.6, rolling_loss=0.01, loss_speed=2.0, spin_arm=1e-4)
    run = Run(id="r1", elements=(Straight(id="a", pair="own"), Straight(id="b")))
    design = Design(id="d", pairs=(own,), runs=(run,))
    scene = build(lay_out(design), "r1").scene
    assert scene.law[1, :6] == pytest.approx([0.7, 0.6, 0.01, 2.0, 0.6, 1e-4])
    assert scene.law[2, 3] == math.inf and scene.law[2, 5] == -1.0
    assert scene.law[2, 6] > 1e8


def test_contact_modulus_is_that_of_hertz_or_nothing():
    steel_glass = Pair(id="p", ball_material="steel", wall_material="glass")
    unknown = steel_glass.model_copy(update={"id": "q", "wall_material": "steel", "contact_modulus": 5e9})
    run = Run(id="r1", pair="p", elements=(Straight(id="a", pair="q"),))
    design = Design(id="d", pairs=(steel_glass, unknown), runs=(run,))
    table = design.material_table()
    steel, glass = table["steel"], table["glass"]
    expected = 1 / ((1 - steel.poisson**2) / steel.young + (1 - glass.poisson**2) / glass.young)
    assert law_of(design, run, None).contact_modulus == pytest.approx(expected)
    assert law_of(design, run, lay_out(design).placed[0]).contact_modulus == 5e9


def test_run_without_elements_is_refused_in_words():
    design = Design(id="d", runs=(Run(id="r1"),))
    with pytest.raises(DesignError, match="has no elements; add one"):
        build(lay_out(design), "r1")


def test_patches_are_told_by_element_and_keep_their_numbers():
    short = (Straight(id="a", section=Trough()), Bend(id="b"), Gap(id="g"), Straight(id="c"))
    one = build(lay_out(designs.single_run(*short)), "r1")
    more = build(lay_out(designs.single_run(*short[:3], Straight(id="c", length=0.5))), "r1")
    assert one.patches == more.patches
    for index, patches in enumerate(one.patches):
        assert all(one.scene.owner[patch] == index for patch in patches)


# -- release --------------------------------------------------------------------------------------
def test_release_stands_on_the_wall_and_rolls():
    made = built(Bend(id="b", radius=0.2, grade=0.1), offset=0.05, speed=0.8, climb=0.3, spin=2.0, direction=0.2)
    start = made.start
    foot = gap_at(made.scene, start.patch, start.x)
    n = np.array([foot.nx, foot.ny, foot.nz])
    assert foot.gap == pytest.approx(0, abs=1e-12)
    assert (foot.s, foot.angle) == pytest.approx((0.05, 0.3), abs=1e-9)
    assert start.v - RADIUS * np.cross(start.w, n) == pytest.approx(np.zeros(3), abs=1e-12)
    assert np.linalg.norm(start.v) == pytest.approx(0.8)
    assert start.w @ n == pytest.approx(2.0)
    tangent = interpolate(
        lay_out(designs.single_run(Bend(id="b", radius=0.2, grade=0.1))).placed[0].curve, np.array([0.05])
    )[1][0]
    assert start.v @ tangent == pytest.approx(0.8 * math.cos(0.2), abs=1e-9)
    assert start.v @ np.cross(n, tangent) == pytest.approx(0.8 * math.sin(0.2), abs=1e-9)


def test_release_reaches_into_the_second_segment():
    start = built(Straight(id="a", length=0.1, grade=0.0), Straight(id="b", grade=0.0), offset=0.15).start
    assert (start.patch, start.s) == (2, pytest.approx(0.05))
    assert start.x[0] == pytest.approx(0.15)


@pytest.mark.parametrize("vessel", [Funnel(id="f"), Well(id="w"), Bowl(id="b"), Dome(id="d")])
def test_release_on_a_vessel_touches_it(vessel):
    made = built(vessel, speed=0.3)
    foot = gap_at(made.scene, made.start.patch, made.start.x)
    assert foot.gap == pytest.approx(0, abs=1e-10)
    assert made.start.v @ [foot.nx, foot.ny, foot.nz] == pytest.approx(0, abs=1e-10)


def test_release_on_a_deck_and_over_a_gap():
    deck = built(Deck(id="d", grade=0.0), offset=0.1).start
    assert deck.x == pytest.approx([0.1, 0, 1 + RADIUS])
    assert built(Gap(id="g"), Straight(id="a")).start.patch == -1


# -- a ball through the joints ---------------------------------------------------------------------
def test_ball_rolls_through_a_joint_without_leaving_the_wall():
    made, track = rolled(Straight(id="a", grade=0.1), Bend(id="b", grade=0.1), Straight(id="c", grade=0.1))
    assert track.status == Status.ARRIVED
    assert owners_met(made, track) == [0, 1, 2]
    assert not any(event.kind == EventKind.LIFT_OFF for event in track.events)


def test_slow_ball_tips_over_a_free_end():
    made, track = rolled(Straight(id="a", length=0.1, grade=0.01), Tray(id="t"), offset=0.08)
    assert track.status == Status.ARRIVED
    assert owners_met(made, track) == [0, 1]
    edge = made.scene.link[1, END]
    assert any(event.kind == EventKind.PATCH and event.patch == edge for event in track.events)


def test_fast_ball_in_a_low_trough_goes_over_its_lip():
    section = Trough(opening=3.6)
    made, track = rolled(
        Straight(id="a", grade=0.1, section=section),
        Bend(id="b", radius=0.08, turn=3.0, grade=0.1, section=section),
        speed=0.9,
    )
    assert track.status == Status.ESCAPED
    right_lip = made.scene.link[made.patches[1][0], PHI_MIN]
    assert any(event.patch == right_lip for event in track.events)


@pytest.mark.parametrize(
    "vessel", [Funnel(id="f"), Bowl(id="f"), Well(id="f", floor=False, depth=0.1), Funnel(id="f", hand=-1)]
)
def test_vessel_is_entered_and_left_below(vessel):
    made, track = rolled(
        Straight(id="a", grade=0.05), vessel, Tray(id="t", drop=0.05, length=0.4, width=0.4), speed=0.3
    )
    assert track.status == Status.ARRIVED
    assert owners_met(made, track) == [0, 1, 2]


def test_throat_leads_into_a_tube_below_it():
    """A funnel emptied into a vertical tube as wide as its throat: the ball never reaches the floor."""
    made, track = rolled(
        Straight(id="a", grade=0.05),
        Funnel(id="f", depth=0.15),
        Easing(id="e", grade_start=20.0, grade_end=20.0, length=0.01, section=Tube(bore=0.04)),
        Tray(id="t", drop=0.05),
        speed=0.3,
    )
    assert track.status == Status.ARRIVED
    assert owners_met(made, track)[:2] == [0, 1] and owners_met(made, track)[-1] == 3


def test_dome_is_rolled_over():
    made, track = rolled(Straight(id="a", grade=0.05), Dome(id="d"), Tray(id="t", drop=0.3, length=1.0), speed=0.1)
    assert track.status == Status.ARRIVED
    assert owners_met(made, track) == [0, 1, 2]
    assert track.correction < 1e-9


def test_deck_takes_the_ball_over_level():
    made, track = rolled(Straight(id="a", grade=0.05), Deck(id="d", grade=0.05), Tray(id="t", drop=0.1))
    assert track.status == Status.ARRIVED
    assert not any(event.kind == EventKind.LIFT_OFF and event.t < 1.3 for event in track.events)
    assert owners_met(made, track) == [0, 1, 2]


def test_ball_that_leaves_the_last_bore_in_flight_has_arrived():
    """The ball still hops where the last trough ends; the disc behind the outlet takes it."""
    made, track = rolled(
        Straight(id="a", grade=0.05, section=Trough()),
        Gap(id="g", forward=0.03, drop=0.02),
        Straight(id="c", grade=0.1, section=Trough(bore=0.06)),
        speed=0.2,
    )
    assert track.status == Status.ARRIVED
    assert made.scene.role[track.events[-1].patch] == ROLE_CATCH


# -- the builder alone ----------------------------------------------------------------------------
def test_plane_box_is_endless_only_where_the_plane_is():
    patches = PatchList()
    patches.add_plane(Rectangle(np.zeros(3), np.array([1.0, 0, 0]), np.array([0, 1.0, 0]), (0.0, 2.0, -math.inf, 3.0)))
    box = patches.to_scene().box[0]
    assert box == pytest.approx([0, -math.inf, 0, 2, 3, 0], abs=1e-5)


def test_empty_list_packs():
    scene = PatchList().to_scene()
    assert scene.kind.shape == (0,) and scene.knots.shape == (0, 16) and scene.link.shape == (0, 6)
