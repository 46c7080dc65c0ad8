"""Field editors: units typed in any way, wrong input answered in place, stepping by keys."""

import math

import pytest
from PySide6.QtCore import Qt

from engine.model.base import fields_of
from engine.model.elements import Bend, FreeLine, Funnel, Trough, Well
from studio.widgets.editors import PointsEditor, editor_for
from studio.widgets.fields import QuantityEditor


def spec_of(model, name):
    return next(spec for spec in fields_of(model) if spec.name == name)


def quantity(qtbot, model, name, value, units="mm"):
    editor = QuantityEditor(spec_of(model, name), units)
    qtbot.addWidget(editor)
    editor.show_value(value)
    return editor


def type_in(qtbot, editor, text):
    """Type a text and leave the field; return what was handed on."""
    got = []
    editor.committed.connect(lambda value, merge: got.append((value, merge)))
    editor.line.selectAll()
    qtbot.keyClicks(editor.line, text)
    qtbot.keyClick(editor.line, Qt.Key.Key_Return)
    return got


@pytest.mark.parametrize(
    ("text", "value"),
    [("200", 0.2), ("12 mm", 0.012), ("1/2 in", 0.0127), ("1 3/4 in", 0.04445), ("20 cm", 0.2), ("0,5 m", 0.5)],
)
def test_length_is_read_in_any_unit(qtbot, text, value):
    [(got, merge)] = type_in(qtbot, quantity(qtbot, Bend, "radius", 0.15), text)
    assert got == pytest.approx(value, rel=1e-12)
    assert merge is False


def test_angle_is_in_degrees_and_grade_in_per_cent(qtbot):
    [(turn, _)] = type_in(qtbot, quantity(qtbot, Bend, "turn", 1.0), "45")
    assert turn == pytest.approx(math.pi / 4, rel=1e-12)
    [(grade, _)] = type_in(qtbot, quantity(qtbot, Bend, "grade", 0.03), "1:40")
    assert grade == pytest.approx(0.025, rel=1e-12)


def test_bare_number_is_in_the_unit_of_the_design(qtbot):
    editor = quantity(qtbot, Bend, "radius", 0.0254, units="in")
    assert editor.line.text() == "1"
    assert editor.unit_label.text() == "in"
    [(got, _)] = type_in(qtbot, editor, "2")
    assert got == pytest.approx(0.0508, rel=1e-12)


def test_word_instead_of_a_number_is_answered_in_place(qtbot):
    editor = quantity(qtbot, Bend, "radius", 0.15)
    assert type_in(qtbot, editor, "wide") == []
    assert not editor.answer.isHidden()
    assert '"wide" is not a number' in editor.answer.text()
    assert "0.01 mm to 1000000 mm" in editor.answer.text()
    assert editor.line.property("wrong") is True
    assert editor.line.accessibleDescription() == editor.answer.text()


def test_number_out_of_bounds_says_what_is_allowed_in_the_units_of_the_design(qtbot):
    editor = quantity(qtbot, Trough, "opening", math.pi)
    assert type_in(qtbot, editor, "400") == []
    assert editor.answer.text() == "Opening must be 0.06 deg to 359.94 deg."


def test_answer_goes_once_the_number_is_right(qtbot):
    editor = quantity(qtbot, Bend, "radius", 0.15)
    type_in(qtbot, editor, "0")
    assert not editor.answer.isHidden()
    type_in(qtbot, editor, "150")
    assert editor.answer.isHidden()
    assert editor.line.property("wrong") is False


def test_escape_gives_the_value_back(qtbot):
    editor = quantity(qtbot, Bend, "radius", 0.15)
    editor.line.selectAll()
    qtbot.keyClicks(editor.line, "77")
    qtbot.keyClick(editor.line, Qt.Key.Key_Escape)
    assert editor.line.text() == "150"


def test_leaving_unchanged_hands_nothing_on(qtbot):
    editor = quantity(qtbot, Bend, "radius", 0.1512345678)
    assert type_in(qtbot, editor, editor.line.text()) == []


def test_arrow_keys_step_and_merge(qtbot):
    editor = quantity(qtbot, Bend, "radius", 0.15)
    got = []
    editor.committed.connect(lambda value, merge: (got.append((value, merge)), editor.show_value(value)))
    qtbot.keyClick(editor.line, Qt.Key.Key_Up)
    qtbot.keyClick(editor.line, Qt.Key.Key_Up, Qt.KeyboardModifier.ShiftModifier)
    qtbot.keyClick(editor.line, Qt.Key.Key_Down)
    assert [value for value, _ in got] == pytest.approx([0.151, 0.161, 0.160], rel=1e-12)
    assert all(merge for _, merge in got)


def test_steps_stop_at_the_bound(qtbot):
    editor = quantity(qtbot, Trough, "lip_radius", 0.0)
    got = []
    editor.committed.connect(lambda value, merge: got.append(value))
    qtbot.keyClick(editor.line, Qt.Key.Key_Down)
    assert got == []


def test_optional_number_may_be_left_empty(qtbot):
    from engine.model.design import Release

    editor = quantity(qtbot, Release, "direction", 0.5)
    got = []
    editor.committed.connect(lambda value, merge: got.append(value))
    editor.line.clear()
    qtbot.keyClick(editor.line, Qt.Key.Key_Return)
    assert got == [None]


def test_points_are_read_line_by_line_and_a_wrong_line_is_named(qtbot):
    editor = PointsEditor(spec_of(FreeLine, "points"), "mm")
    qtbot.addWidget(editor)
    editor.show_value(((0.1, 0.0, -0.01), (0.2, 0.05, -0.02)))
    assert editor.text.toPlainText() == "100  0  -10\n200  50  -20"
    got = []
    editor.committed.connect(lambda value, merge: got.append(value))
    editor.text.setPlainText("100 0 -10\n200 60")
    editor.finish()
    assert got == []
    assert editor.answer.text() == "Line 2 has 2 numbers; give 3, apart by blanks."
    editor.text.setPlainText("100 0 -10\n20cm 60 -20")
    editor.finish()
    assert got == [((0.1, 0.0, -0.01), (0.2, 0.06, -0.02))]


@pytest.mark.parametrize(("model", "name"), [(Well, "floor"), (Well, "hand"), (Funnel, "name"), (Funnel, "depth")])
def test_editors_hold_an_accessible_name(qtbot, model, name):
    spec = spec_of(model, name)
    editor = editor_for(spec, "mm")
    qtbot.addWidget(editor)
    assert editor.focusProxy().accessibleName() == spec.label
