"""Working copy: there after each step, gone once saved, offered only when its session is gone."""

import json

from engine.model.edits import set_field
from engine.model.storage import load, save
from studio.working_copy import WorkingCopy, copies_folder, discard, left_copies
from studio.workspace import Workspace
from tests.designs import bend_run, desk_run


def edited(workspace):
    workspace.edit("radius", set_field(workspace.design, "runs[0].elements[1].radius", 0.2))


def test_copy_follows_the_steps_and_goes_when_saved(qapp, qtbot, tmp_path):
    workspace = Workspace()
    copy = WorkingCopy(workspace)
    workspace.new(bend_run())
    edited(workspace)
    qtbot.waitUntil(copy.file.exists, timeout=3000)
    assert load(copy.file) == workspace.design
    workspace.save(tmp_path / "a.json")
    assert not copy.file.exists()


def test_a_copy_of_a_running_session_is_not_offered(qapp):
    workspace = Workspace()
    copy = WorkingCopy(workspace)
    workspace.new(bend_run())
    edited(workspace)
    copy.write()
    assert copy.file.exists()
    assert left_copies() == []


def leave_copy(name, design, path):
    folder = copies_folder()
    folder.mkdir(parents=True, exist_ok=True)
    save(design, folder / f"{name}.json")
    (folder / f"{name}.note").write_text(json.dumps({"path": path}), encoding="utf-8")


def test_a_left_copy_is_offered_with_its_file_and_can_be_discarded(qapp, tmp_path):
    leave_copy("1-1", desk_run(), str(tmp_path / "desk.json"))
    [left] = left_copies()
    assert left.design == desk_run()
    assert left.path == tmp_path / "desk.json"
    discard(left)
    assert left_copies() == []
    assert not left.copy.exists()


def test_a_damaged_copy_is_left_out(qapp):
    leave_copy("1-1", desk_run(), "")
    (copies_folder() / "1-1.json").write_text("{", encoding="utf-8")
    (copies_folder() / "2-2.note").write_text("[]", encoding="utf-8")
    assert left_copies() == []


def test_a_folder_that_cannot_be_made_is_noted_and_work_goes_on(qapp, state_folder):
    workspace = Workspace()
    copy = WorkingCopy(workspace)
    workspace.new(bend_run())
    state_folder.parent.mkdir(parents=True, exist_ok=True)
    state_folder.write_text("a file where the folder should be", encoding="utf-8")
    edited(workspace)
    copy.write()
    assert "cannot be written" in copy.failure
    assert workspace.dirty
