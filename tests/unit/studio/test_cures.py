"""Cures that can be pressed take their finding away."""

import math

import pytest

from engine.findings.finding import FindingKind
from engine.model.elements import Bend, Helix, Straight, Trough, Tube
from engine.simulate import roll
from studio.cures import cure_of, offers, shortened
from studio.workspace import Workspace
from tests.designs import bend_run, crest_run, single_run


def rolled(design):
    workspace = Workspace()
    workspace.new(design)
    workspace.take_roll(roll(design))
    return workspace


def of_kind(workspace, kind):
    return [finding for finding in workspace.roll.findings if finding.kind is kind]


def heading(rolled_run):
    return rolled_run.layout.placed[-1].outlet.tangent


def test_eased_joints_no_longer_jump_and_the_run_goes_on_in_the_same_direction(qapp):
    workspace = rolled(bend_run())
    jumps = of_kind(workspace, FindingKind.CURVATURE_JUMP)
    assert [finding.segment for finding in jumps] == ["b1", "s2"]
    before = heading(workspace.roll)
    for _ in range(2):
        cure = cure_of(workspace, of_kind(workspace, FindingKind.CURVATURE_JUMP)[0])
        workspace.edit(cure.label, cure.design)
        workspace.take_roll(roll(workspace.design))
    assert of_kind(workspace, FindingKind.CURVATURE_JUMP) == []
    assert [element.kind for element in workspace.run.elements] == [
        "straight",
        "transition",
        "bend",
        "transition",
        "straight",
    ]
    assert heading(workspace.roll) == pytest.approx(before, abs=1e-9)


def test_bore_is_taken_over_where_the_running_face_steps_up(qapp):
    workspace = rolled(
        single_run(
            Straight(id="s1", grade=0.05, section=Tube(bore=0.026)),
            Straight(id="s2", grade=0.05, section=Tube(bore=0.021)),
        )
    )
    [finding] = [finding for finding in of_kind(workspace, FindingKind.JOINT) if finding.unit == "m"]
    cure = cure_of(workspace, finding)
    assert cure.design.runs[0].element("s2").section == Tube(bore=0.026)
    assert not [entry for entry in roll(cure.design).findings if entry.kind is FindingKind.JOINT]


def test_a_finding_without_a_cure_to_press_offers_none(qapp):
    workspace = rolled(crest_run())
    [finding] = of_kind(workspace, FindingKind.IMPACT)
    assert not offers(workspace, finding)
    assert cure_of(workspace, finding) is None


def test_thin_margin_of_a_trough_bend_is_cured_by_banking(qapp):
    section = Trough(opening=math.pi)
    workspace = rolled(
        single_run(
            Straight(id="s1", length=0.3, grade=0.15, section=section),
            Bend(id="b1", radius=0.08, turn=1.5, section=section),
            Straight(id="s2", length=0.2, section=section),
        )
    )
    found = of_kind(workspace, FindingKind.THIN_MARGIN)
    assert found
    assert offers(workspace, found[0])
    least = min(finding.value for finding in found)
    cure = cure_of(workspace, found[0])
    again = [entry.value for entry in roll(cure.design).findings if entry.kind is FindingKind.THIN_MARGIN]
    assert not again or min(again) > least


def test_a_shortened_helix_keeps_its_grade():
    made = shortened(Helix(id="h", turns=2.0, drop=0.12), 0.25)
    assert made.drop / made.turns == pytest.approx(0.06)
    assert made.turns == pytest.approx(2.0 - 0.25 / (2.0 * math.pi))
