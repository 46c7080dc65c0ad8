"""Workspace and undo: what is emitted, what merges, what is the same again after undo."""

import pytest

from engine.errors import DesignError, DesignFileError
from engine.model.edits import set_field
from engine.model.storage import load, save
from studio.workspace import Workspace
from tests.designs import bend_run, desk_run, every_kind


@pytest.fixture
def workspace(qapp):
    made = Workspace()
    made.new(bend_run())
    return made


def radius(workspace, value):
    return set_field(workspace.design, "runs[0].elements[1].radius", value)


def test_undo_gives_back_the_same_object(workspace):
    before = workspace.design
    workspace.edit("radius", radius(workspace, 0.2))
    after = workspace.design
    assert after.runs[0].elements[1].radius == 0.2
    workspace.undo_stack.undo()
    assert workspace.design is before
    workspace.undo_stack.redo()
    assert workspace.design is after


def test_edit_without_change_makes_no_step(workspace):
    workspace.edit("nothing", radius(workspace, workspace.design.runs[0].elements[1].radius))
    assert workspace.undo_stack.count() == 0


def test_steps_with_one_key_merge_and_others_do_not(workspace):
    before = workspace.design
    for value in (0.16, 0.17, 0.18):
        workspace.edit("radius", radius(workspace, value), "radius")
    workspace.edit("radius", radius(workspace, 0.19))
    assert workspace.undo_stack.count() == 2
    workspace.undo_stack.undo()
    assert workspace.design.runs[0].elements[1].radius == 0.18
    workspace.undo_stack.undo()
    assert workspace.design is before


def test_a_drag_back_to_the_start_leaves_no_step(workspace):
    before = workspace.design
    workspace.edit("radius", radius(workspace, 0.2), "radius")
    workspace.edit("radius", radius(workspace, 0.15), "radius")
    assert workspace.design == before
    assert workspace.undo_stack.count() == 0


def test_selection_drops_what_is_gone_and_what_is_unknown(workspace, qtbot):
    workspace.select(["b1", "no such", "b1", "s2"])
    assert workspace.selection == ("b1", "s2")
    with qtbot.waitSignal(workspace.selectionChanged):
        workspace.put(desk_run().model_copy(update={"runs": ()}))
    assert workspace.selection == ()


def test_selecting_an_element_of_another_run_works_on_that_run(qapp):
    workspace = Workspace()
    workspace.new(every_kind())
    assert workspace.run_id == "r1"
    workspace.select(["s9"])
    assert workspace.run_id == "r2"


def test_time_stays_within_the_roll(workspace):
    workspace.set_time(5.0)
    assert workspace.time == 0.0


def test_edited_mark_follows_undo_and_save(workspace, tmp_path):
    assert not workspace.dirty
    workspace.edit("radius", radius(workspace, 0.2))
    assert workspace.dirty
    workspace.undo_stack.undo()
    assert not workspace.dirty
    workspace.undo_stack.redo()
    workspace.save(tmp_path / "a.json")
    assert not workspace.dirty
    assert load(tmp_path / "a.json") == workspace.design
    workspace.undo_stack.undo()
    assert workspace.dirty


def test_saving_without_a_file_is_refused_in_words(workspace):
    with pytest.raises(DesignError, match="choose a name"):
        workspace.save()


def test_a_damaged_file_leaves_everything_as_it_was(workspace, tmp_path):
    broken = tmp_path / "broken.json"
    broken.write_text('{"schema_version": 1, "runs": 3, "units": "furlong"}', encoding="utf-8")
    before = workspace.design
    with pytest.raises(DesignFileError) as caught:
        workspace.open(broken)
    assert len(caught.value.problems) == 2
    assert workspace.design is before
    assert workspace.path is None


def test_opening_forgets_undo_selection_and_time(workspace, tmp_path, qtbot):
    save(desk_run(), tmp_path / "desk.json")
    workspace.edit("radius", radius(workspace, 0.2))
    workspace.select(["b1"])
    with qtbot.waitSignal(workspace.opened):
        workspace.open(tmp_path / "desk.json")
    assert workspace.undo_stack.count() == 0
    assert workspace.selection == ()
    assert workspace.title == "desk"


def test_recovered_work_counts_as_edited_until_saved(qapp, tmp_path):
    workspace = Workspace()
    workspace.recover(bend_run(), None)
    assert workspace.dirty
    workspace.save(tmp_path / "b.json")
    assert not workspace.dirty
