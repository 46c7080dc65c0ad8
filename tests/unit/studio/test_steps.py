"""Edits that the window offers."""

import math

import numpy as np
import pytest

from engine.model.design import Design
from engine.model.elements import ELEMENTS, Trough, Tube
from engine.simulate import roll
from studio import steps
from studio.views.strip import SEGMENT_KINDS, VESSEL_KINDS
from studio.workspace import Workspace
from tests.designs import bend_run, desk_run


@pytest.fixture
def workspace(qapp):
    made = Workspace()
    made.new(bend_run())
    return made


def ids(design):
    return [element.id for element in design.runs[0].elements]


def test_strip_offers_every_kind_of_element_once():
    assert sorted(SEGMENT_KINDS + VESSEL_KINDS) == sorted(ELEMENTS)


@pytest.mark.parametrize("kind", SEGMENT_KINDS + VESSEL_KINDS)
def test_added_at_the_open_end_with_the_section_of_the_one_before(workspace, kind):
    changed, key = steps.add_element(workspace, kind)
    assert ids(changed)[-1] == key
    added = changed.runs[0].elements[-1]
    assert added.kind == kind
    assert added.name
    if "section" in type(added).model_fields:
        assert added.section == workspace.design.runs[0].elements[-1].section


def test_added_after_the_selected_one(workspace):
    workspace.select(["s1"])
    changed, key = steps.add_element(workspace, "straight")
    assert ids(changed) == ["s1", key, "b1", "s2"]


def test_added_before_a_tray_when_nothing_is_selected(qapp):
    workspace = Workspace()
    workspace.new(desk_run())
    changed, key = steps.add_element(workspace, "bend")
    assert ids(changed)[-2:] == [key, "tray1"]


def test_transition_after_a_bend_starts_with_its_curvature(workspace):
    workspace.select(["b1"])
    changed, key = steps.add_element(workspace, "transition")
    added = changed.runs[0].element(key)
    assert added.curvature_start == pytest.approx(1 / 0.15)
    assert added.curvature_end == 0.0


def test_added_to_a_design_without_a_run(qapp):
    workspace = Workspace()
    workspace.new(Design())
    changed, key = steps.add_element(workspace, "straight")
    assert ids(changed) == [key]


def test_duplicate_move_and_remove(workspace):
    workspace.select(["s1", "b1"])
    changed, copies = steps.duplicate_elements(workspace)
    assert ids(changed) == ["s1", "b1", *copies, "s2"]
    assert ids(steps.move_elements(workspace, 1)) == ["s2", "s1", "b1"]
    assert steps.move_elements(workspace, -1) is workspace.design
    assert ids(steps.remove_elements(workspace)) == ["s2"]


@pytest.mark.parametrize(("chosen", "left"), [("s1", "b1"), ("b1", "s1"), ("s2", "b1")])
def test_neighbour_is_selected_after_removal(workspace, chosen, left):
    workspace.select([chosen])
    assert steps.neighbour_after_removal(workspace) == left


def test_another_kind_of_section_keeps_bore_and_wall(workspace):
    made = steps.part_of_kind(workspace, Trough(bore=0.03, wall=0.004), "tube")
    assert made == Tube(bore=0.03, wall=0.004)
    assert steps.part_of_kind(workspace, 0.1, 0.2) == 0.2


def test_bank_leans_the_lowest_line_along_the_load(qapp):
    workspace = Workspace()
    workspace.new(bend_run(radius=0.15, speed=0.6))
    workspace.take_roll(roll(workspace.design))
    bend = workspace.element("b1")
    changed = steps.bank_for_speed(workspace, bend)
    bank = changed.runs[0].element("b1").bank_start
    track = workspace.roll.trajectory
    square = np.mean(np.sum(track.v[track.element == 1] ** 2, axis=1))
    # a turn to the left leans the load to the right: negative bank, tan(bank) = v^2/(g R)
    assert bank == pytest.approx(-math.atan(square / (9.80665 * 0.15)), abs=1e-4)


def test_banked_bend_is_climbed_less(qapp):
    workspace = Workspace()
    workspace.new(bend_run(radius=0.15, speed=0.8))
    workspace.take_roll(roll(workspace.design))
    banked = roll(steps.bank_for_speed(workspace, workspace.element("b1")))

    def climb(rolled):
        rows = rolled.trajectory.element == 1
        return np.mean(np.abs(rolled.trajectory.angle[rows]))

    assert climb(banked) < 0.8 * climb(workspace.roll)


def test_tube_and_straight_offer_no_bank(workspace):
    workspace.take_roll(roll(workspace.design))
    assert steps.bank_for_speed(workspace, workspace.element("s1")) is None
