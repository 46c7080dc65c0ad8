"""The window as a person uses it: open, select, type, undo, save, be told what is wrong."""

import json

import pytest
from PySide6.QtCore import QMimeData, QPoint, QPointF, Qt, QUrl
from PySide6.QtGui import QDropEvent
from PySide6.QtWidgets import QAbstractButton, QComboBox, QFrame, QLineEdit, QListWidget, QWidget

from engine.model.storage import load, save
from engine.simulate import roll
from studio import dialogs
from studio.actions import MENUS, SEPARATOR
from studio.main_window import Drawings, MainWindow
from studio.settings import Settings
from studio.theme import Theme
from studio.workers.preview import Preview
from studio.workspace import Workspace
from tests.designs import bend_run, crest_run, every_kind

LIMIT_MS = 300_000
"""ms. The first roll of a fresh machine compiles the kernels."""


def blank_drawings(workspace, theme):
    """Panes without drawings: what is tested here is the window around them."""
    return Drawings(QFrame(), QFrame(), QFrame())


@pytest.fixture
def window(qtbot, monkeypatch):
    monkeypatch.setattr(dialogs, "ask_unsaved", lambda parent, name: dialogs.Answer.DISCARD)
    workspace = Workspace(Theme())
    made = MainWindow(workspace, Preview(workspace, roll), Settings(), blank_drawings)
    made.resize(1440, 900)
    made.show()
    yield made
    made.close()
    made.deleteLater()


@pytest.fixture
def bend_file(tmp_path):
    save(bend_run(), tmp_path / "bend.json")
    return tmp_path / "bend.json"


def opened(window, path, qtbot):
    assert window.files.load(path)
    qtbot.waitUntil(lambda: window.workspace.current, timeout=LIMIT_MS)


def type_number(qtbot, window, name, text):
    line = window.inspector.editor(name).line
    line.setFocus()
    line.selectAll()
    qtbot.keyClicks(line, text)
    qtbot.keyClick(line, Qt.Key.Key_Return)


def test_open_select_edit_undo_redo_save_reload(window, bend_file, tmp_path, qtbot):
    workspace = window.workspace
    opened(window, bend_file, qtbot)
    before, first = workspace.design, workspace.roll.duration
    workspace.select(["b1"])
    type_number(qtbot, window, "radius", "30 cm")
    assert workspace.design.runs[0].element("b1").radius == pytest.approx(0.3)
    qtbot.waitUntil(lambda: workspace.current, timeout=LIMIT_MS)
    assert workspace.roll.duration > first
    assert window.windowTitle() == "bend (edited) · Trundle"
    assert window.actions_by_name["undo"].text() == "&Undo radius of b1"
    after = workspace.design
    window.actions_by_name["undo"].trigger()
    assert workspace.design is before
    assert window.inspector.editor("radius").line.text() == "150"
    assert not workspace.dirty
    window.actions_by_name["redo"].trigger()
    assert workspace.design is after
    target = tmp_path / "other.json"
    assert window.files.save_to(target)
    assert not workspace.dirty
    assert load(target) == after
    assert window.files.load(target)
    assert workspace.design == after
    assert load(bend_file) == before
    assert window.settings.recent[0] == target.resolve()


def test_changes_are_undone_one_by_one_to_the_same_file(window, bend_file, qtbot):
    workspace = window.workspace
    opened(window, bend_file, qtbot)
    before = bend_file.read_bytes()
    for kind in ("helix", "funnel", "tray"):
        window.strip.buttons[kind].click()
    workspace.select(["b1"])
    window.actions_by_name["duplicate"].trigger()
    window.actions_by_name["later"].trigger()
    window.actions_by_name["delete"].trigger()
    assert workspace.undo_stack.count() == 6
    while workspace.undo_stack.canUndo():
        window.actions_by_name["undo"].trigger()
    workspace.save(bend_file)
    assert bend_file.read_bytes() == before


def test_added_element_is_selected_and_shown(window, bend_file, qtbot):
    opened(window, bend_file, qtbot)
    window.strip.buttons["helix"].click()
    element = window.workspace.selected_element
    assert element.kind == "helix"
    assert window.inspector.editor("turns").line.text() == "2"
    assert window.actions_by_name["undo"].text() == "&Undo add helix"


def test_wrong_number_is_answered_where_it_was_typed(window, bend_file, qtbot):
    workspace = window.workspace
    opened(window, bend_file, qtbot)
    workspace.select(["b1"])
    before = workspace.design
    type_number(qtbot, window, "turn", "0")
    answer = window.inspector.editor("turn").answer
    assert answer.text() == "Turn must not be 0; give an angle, positive to the left, or use a straight."
    assert answer.isVisible()
    assert workspace.design is before
    type_number(qtbot, window, "turn", "45")
    assert not answer.isVisible()


def test_stepping_a_number_is_one_step_to_undo(window, bend_file, qtbot):
    workspace = window.workspace
    opened(window, bend_file, qtbot)
    workspace.select(["b1"])
    line = window.inspector.editor("radius").line
    for _ in range(5):
        qtbot.keyClick(line, Qt.Key.Key_Up)
    assert workspace.design.runs[0].element("b1").radius == pytest.approx(0.155)
    assert workspace.undo_stack.count() == 1


def test_section_becomes_a_tube_and_its_rows_follow(window, bend_file, qtbot):
    workspace = window.workspace
    opened(window, bend_file, qtbot)
    workspace.select(["b1"])
    box = window.inspector.editor("section").box
    box.setCurrentIndex(box.findData("tube"))
    box.activated.emit(box.currentIndex())
    assert workspace.design.runs[0].element("b1").section.kind == "tube"
    assert "opening" not in [row.path[-1] for row in window.inspector.rows]


def test_run_page_edits_release_and_ball(window, bend_file, qtbot):
    workspace = window.workspace
    opened(window, bend_file, qtbot)
    workspace.select([])
    type_number(qtbot, window, "speed", "0.7")
    assert workspace.design.runs[0].release.speed == pytest.approx(0.7)
    box = window.inspector.editor("ball").box
    box.setCurrentIndex(box.findData("steel-20"))
    box.activated.emit(box.currentIndex())
    assert workspace.design.runs[0].ball == "steel-20"


def test_verdict_says_what_is_drawn(window, bend_file, qtbot):
    workspace = window.workspace
    opened(window, bend_file, qtbot)
    assert f"Clears in {workspace.roll.duration:.1f} s" in window.header.verdict.toolTip()
    window.workspace.select([])
    type_number(qtbot, window, "speed", "0")
    workspace.select(["s2"])
    type_number(qtbot, window, "grade", "-20")
    qtbot.waitUntil(lambda: workspace.current, timeout=LIMIT_MS)
    assert window.header.verdict.property("state") == "fails"
    assert window.header.verdict.toolTip().startswith("Fails · ")


def test_finding_leads_to_its_element_and_time(window, tmp_path, qtbot):
    save(crest_run(), tmp_path / "crest.json")
    opened(window, tmp_path / "crest.json", qtbot)
    window.actions_by_name["next_finding"].trigger()
    finding = window.workspace.roll.findings[0]
    assert window.workspace.selection == (finding.segment,)
    assert window.workspace.time == pytest.approx(finding.t)


def test_damaged_file_lists_every_problem_at_once(window, tmp_path, monkeypatch):
    raw = json.loads(json.dumps({"schema_version": 1, "units": "furlong", "runs": [{"id": "r1", "bal": "x"}]}))
    (tmp_path / "broken.json").write_text(json.dumps(raw), encoding="utf-8")
    told = []
    monkeypatch.setattr(dialogs, "tell_problems", lambda parent, head, problems: told.append((head, problems)))
    assert not window.files.load(tmp_path / "broken.json")
    [(headline, problems)] = told
    assert headline == "broken.json cannot be opened."
    assert len(problems) == 2
    shown = dialogs.problems_dialog(window, headline, problems).findChild(QListWidget)
    assert [shown.item(row).text() for row in range(shown.count())] == list(problems)


@pytest.mark.parametrize(
    ("answer", "closed", "saved"),
    [(dialogs.Answer.CANCEL, False, False), (dialogs.Answer.DISCARD, True, False), (dialogs.Answer.SAVE, True, True)],
)
def test_closing_asks_about_unsaved_changes(window, bend_file, qtbot, monkeypatch, answer, closed, saved):
    opened(window, bend_file, qtbot)
    window.strip.buttons["tray"].click()
    monkeypatch.setattr(dialogs, "ask_unsaved", lambda parent, name: answer)
    assert window.close() is closed
    assert (len(load(bend_file).runs[0].elements) == 4) is saved


def test_dropped_file_is_opened(window, bend_file, qtbot):
    mime = QMimeData()
    mime.setUrls([QUrl.fromLocalFile(str(bend_file))])
    drop = QDropEvent(
        QPointF(300, 300),
        Qt.DropAction.CopyAction,
        mime,
        Qt.MouseButton.LeftButton,
        Qt.KeyboardModifier.NoModifier,
    )
    window.dropEvent(drop)
    assert window.workspace.path == bend_file


def test_every_kind_of_element_can_be_inspected(window, tmp_path):
    save(every_kind(), tmp_path / "all.json")
    assert window.files.load(tmp_path / "all.json")
    for run in window.workspace.design.runs:
        for element in run.elements:
            window.workspace.select([element.id])
            names = {row.path[-1] for row in window.inspector.rows}
            assert {"name", "note", "pair"} < names
            assert len(names) > 4


def test_refreshing_the_panels_changes_nothing(window, bend_file, qtbot):
    opened(window, bend_file, qtbot)
    window.workspace.select(["b1"])
    with qtbot.assertNotEmitted(window.workspace.designChanged):
        window.inspector._refresh()
        window.header.refresh()
        window.workspace.take_roll(window.workspace.roll)
    assert window.workspace.undo_stack.count() == 0


def test_strip_shrinks_to_icons_in_a_narrow_window(window, qapp):
    window.resize(1280, 800)
    qapp.processEvents()
    button = window.strip.buttons["bend"]
    assert button.toolButtonStyle() == Qt.ToolButtonStyle.ToolButtonIconOnly
    assert window.strip.width() < 60
    window.resize(1440, 900)
    qapp.processEvents()
    assert button.toolButtonStyle() == Qt.ToolButtonStyle.ToolButtonTextBesideIcon


def test_panes_hide_and_come_back(window):
    for name, pane in window.panes.items():
        window.actions_by_name[f"pane_{name}"].trigger()
        assert pane.isHidden()
        assert not window.actions_by_name[f"pane_{name}"].isChecked()
    window.actions_by_name["usual_panes"].trigger()
    assert all(pane.isVisible() for pane in window.panes.values())


def test_sizes_of_panes_are_remembered(window, qtbot, qapp):
    window.resize(790, 700)  # within the small screen of the platform without one
    qapp.processEvents()
    window.board.setSizes([420, 300])
    sizes = window.board.sizes()
    window.close()
    workspace = Workspace(Theme())
    again = MainWindow(workspace, Preview(workspace, roll), Settings(), blank_drawings)
    again.show()
    qapp.processEvents()
    assert again.board.sizes() == sizes
    again.close()
    again.deleteLater()


def test_theme_switches_at_once_and_is_remembered(window, qapp):
    window.actions_by_name["theme_dark"].trigger()
    assert window.theme.name == "dark"
    assert window.theme.hex("panel") in qapp.styleSheet()
    assert Settings().theme == "dark"
    window.actions_by_name["theme_light"].trigger()
    assert window.theme.name == "light"


def test_every_command_has_a_key_or_stands_in_a_menu_and_no_key_is_given_twice(window):
    specs = [spec for entries in MENUS.values() for spec in entries if spec.name not in (SEPARATOR, "recent")]
    assert {spec.name for spec in specs} == set(window.actions_by_name)
    keys = [key for spec in specs for key in spec.keys]
    assert len(keys) == len(set(keys))


def test_everything_with_the_keyboard_has_a_name(window, bend_file, qtbot):
    opened(window, bend_file, qtbot)
    window.workspace.select(["b1"])
    nameless = [
        widget
        for widget in window.findChildren(QWidget)
        if isinstance(widget, (QAbstractButton, QLineEdit, QComboBox))
        and widget.isVisible()
        and widget.focusPolicy() & Qt.FocusPolicy.TabFocus
        and not (widget.accessibleName() or (isinstance(widget, QAbstractButton) and widget.text()))
    ]
    assert nameless == []


def test_parts_are_exported_with_progress_and_told(window, bend_file, tmp_path, qtbot):
    opened(window, bend_file, qtbot)
    window.export.start(tmp_path / "parts")
    qtbot.waitUntil(lambda: bool(window.export.written), timeout=LIMIT_MS)
    files = sorted(path.name for path in (tmp_path / "parts").iterdir())
    assert len(files) == 3
    assert all(name.endswith("-mm.stl") for name in files)


def test_cure_is_taken_by_pressing_it_and_undone(window, bend_file, qtbot):
    workspace = window.workspace
    opened(window, bend_file, qtbot)
    before, count = workspace.design, len(workspace.roll.findings)
    view = window.findings.list
    row = view.visualRect(window.findings.model.index(0, 0))
    qtbot.mouseClick(view.viewport(), Qt.MouseButton.LeftButton, pos=QPoint(row.left() + 60, row.bottom() - 14))
    qtbot.waitUntil(lambda: workspace.design is not before and workspace.current, timeout=LIMIT_MS)
    assert workspace.selected_element.kind == "transition"
    assert len(workspace.roll.findings) < count
    window.actions_by_name["undo"].trigger()
    assert workspace.design is before
