"""Verdict line and figures: true for what is drawn, taken from the roll."""

import numpy as np
import pytest

from engine.findings.finding import FindingKind
from engine.model.edits import set_field
from engine.simulate import roll
from studio import words
from studio.item_models import FindingsModel
from studio.workspace import Workspace
from tests.designs import bend_run, crest_run, level_run


def rolled(design):
    workspace = Workspace()
    workspace.new(design)
    workspace.take_roll(roll(design))
    return workspace


def test_every_kind_of_finding_has_words():
    assert set(words.FINDING_WORDS) == set(FindingKind)


def test_verdict_of_a_run_that_clears_names_time_and_least_margin(qapp):
    workspace = rolled(bend_run())
    verdict = words.verdict_of(workspace)
    track = workspace.roll.trajectory
    least = 100 * np.nanmin(track.margin)
    assert verdict.state == "clears"
    assert verdict.text == f"Clears in {workspace.roll.duration:.1f} s · least margin {least:.0f} % at b1"


def test_verdict_is_withdrawn_while_the_design_is_another(qapp):
    workspace = rolled(bend_run())
    workspace.edit("radius", set_field(workspace.design, "runs[0].elements[1].radius", 0.2))
    assert words.verdict_of(workspace) == ("Rolling …", "none")
    workspace.undo_stack.undo()
    assert words.verdict_of(workspace).state == "clears"


def test_verdict_of_a_ball_that_stops_fails(qapp):
    workspace = rolled(level_run(speed=0.05, length=5.0))
    verdict = words.verdict_of(workspace)
    assert verdict.state == "fails"
    assert verdict.text.startswith("Fails · ")
    assert verdict.text.endswith(f" after {workspace.roll.duration:.1f} s")


def test_thin_findings_turn_the_line_to_thin(qapp):
    workspace = rolled(crest_run())
    assert any(finding.severity == "thin" for finding in workspace.roll.findings)
    assert words.verdict_of(workspace).state == "thin"


def test_figures_are_those_of_the_element(qapp):
    workspace = rolled(bend_run())
    figures = dict(words.figures_of(workspace.roll, workspace.element("b1")))
    track = workspace.roll.trajectory
    rows = np.flatnonzero(track.element == 1)
    speed = np.linalg.norm(track.v[rows[0]])
    assert figures["Arrives"] == f"{speed:.2f} m/s at {track.t[rows[0]]:.2f} s"
    load = track.normal_force[rows].max() / (workspace.roll.ball.mass * 9.80665)
    assert figures["Load at most"] == f"{load:.2f} g"
    assert figures["Climbs the wall to"].endswith("° right")


def test_findings_are_listed_worst_first_with_all_their_words(qapp):
    workspace = rolled(crest_run())
    model = FindingsModel(workspace)
    assert model.rowCount() == len(workspace.roll.findings) > 0
    spoken = model.data(model.index(0, 0), words_role())
    finding = workspace.roll.findings[0]
    assert finding.sentence in spoken
    assert finding.cure in spoken
    workspace.take_failure("gone")
    assert model.rowCount() == 0


def words_role():
    from PySide6.QtCore import Qt

    return Qt.ItemDataRole.AccessibleTextRole


def test_section_in_short(qapp):
    workspace = rolled(bend_run())
    assert words.section_words(workspace.element("b1"), "mm") == "trough 28/24"


@pytest.mark.parametrize(("value", "unit", "text"), [(0.0254, "m", "25.4 mm"), (0.03, "grade", "3 %")])
def test_quantities_for_reading(value, unit, text):
    assert words.quantity_words(value, unit) == text
