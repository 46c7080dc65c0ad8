"""Starting: what is imported, how soon the window can be used, what it opens, what it writes when it breaks."""

import json
import logging
import subprocess
import sys
import time

import pytest
from PySide6.QtWidgets import QApplication

from engine.model.storage import save
from studio import app, dialogs, pictures
from studio.resources import state_folder
from studio.settings import Settings
from studio.working_copy import copies_folder
from tests.designs import bend_run, desk_run

LIMIT_MS = 300_000
USABLE_S = 2.0
"""s. From making the application to a window that takes input, kernels compiled before."""
HEAVY = (
    "scipy.linalg",
    "scipy.optimize",
    "scipy.sparse",
    "scipy.spatial",
    "scipy.interpolate",
    "trimesh",
    "dask",
    "ezdxf",
    "manifold3d",
)
"""numba itself imports the bare `scipy`; its parts are what costs."""


@pytest.fixture
def window(qtbot, monkeypatch):
    app.make_application()
    monkeypatch.setattr(dialogs, "ask_unsaved", lambda parent, name: dialogs.Answer.DISCARD)
    made = app.make_window(Settings())
    made.show()
    yield made
    made.close()
    made.deleteLater()


def test_window_is_set_in_the_font_that_ships_with_it(window):
    assert QApplication.font().family() == "Inter"
    assert window.header.name.fontInfo().family() == "Inter"


def test_importing_the_window_loads_nothing_heavy():
    code = f"import sys, studio.app; print([name for name in {HEAVY!r} if name in sys.modules])"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, timeout=120, check=True)
    assert done.stdout.strip() == "[]"


def test_whole_job_with_the_drawings(window, tmp_path, qtbot):
    save(bend_run(), tmp_path / "bend.json")
    app.open_first(window, tmp_path / "bend.json")
    workspace = window.workspace
    qtbot.waitUntil(lambda: workspace.current, timeout=LIMIT_MS)
    before = workspace.design
    workspace.select(["b1"])
    workspace.set_time(0.5 * workspace.roll.duration)
    window.inspector.editor("radius").committed.emit(0.2, False)
    qtbot.waitUntil(lambda: workspace.current, timeout=LIMIT_MS)
    window.actions_by_name["undo"].trigger()
    assert workspace.design is before
    window.actions_by_name["redo"].trigger()
    window.fit()
    QApplication.processEvents()
    assert window.files.save_to(tmp_path / "new.json")
    after = workspace.design
    assert window.files.load(tmp_path / "new.json")
    assert workspace.design == after


@pytest.mark.parametrize("theme", ["light", "dark"])
def test_window_is_drawn_in_the_paper_of_its_theme(window, tmp_path, qtbot, theme):
    save(desk_run(), tmp_path / "desk.json")
    app.open_first(window, tmp_path / "desk.json")
    window.use_theme(theme)
    app.wait_for_roll(window)
    image = window.header.grab().toImage()
    assert image.pixelColor(image.width() // 3, 3) == window.theme.colour("panel")


def test_window_is_usable_soon(window, qtbot, tmp_path):
    save(desk_run(), tmp_path / "desk.json")
    app.open_first(window, tmp_path / "desk.json")
    app.wait_for_roll(window)
    window.close()
    begun = time.perf_counter()
    again = app.make_window(Settings())
    again.show()
    app.open_first(again, tmp_path / "desk.json")
    QApplication.processEvents()
    passed = time.perf_counter() - begun
    again.close()
    again.deleteLater()
    assert passed < USABLE_S


def test_without_a_file_there_is_something_to_roll(window, qtbot):
    app.open_first(window, None)
    assert window.workspace.run.elements
    qtbot.waitUntil(lambda: window.workspace.current, timeout=LIMIT_MS)


def test_damaged_file_is_told_and_a_new_design_opened(window, tmp_path, monkeypatch):
    (tmp_path / "broken.json").write_text("{", encoding="utf-8")
    told = []
    monkeypatch.setattr(dialogs, "tell_problems", lambda parent, head, problems: told.append(problems))
    app.open_first(window, tmp_path / "broken.json")
    assert len(told) == 1
    assert window.workspace.run.elements


@pytest.mark.parametrize("wanted", [True, False])
def test_work_of_a_session_that_ended_badly_is_offered(window, monkeypatch, wanted):
    copies_folder().mkdir(parents=True)
    save(bend_run(), copies_folder() / "1-1.json")
    (copies_folder() / "1-1.note").write_text(json.dumps({"path": ""}), encoding="utf-8")
    monkeypatch.setattr(dialogs, "ask_recover", lambda parent, left: wanted)
    app.open_first(window, None)
    assert (window.workspace.design == bend_run()) is wanted
    assert window.workspace.dirty is wanted
    assert not (copies_folder() / "1-1.json").exists()
    assert window.copy.file.exists() is wanted


def test_crash_is_written_to_the_log(monkeypatch):
    monkeypatch.setattr(sys, "excepthook", sys.excepthook)
    root = logging.getLogger()
    before = list(root.handlers)
    root.handlers.clear()
    try:
        app.start_log()
        try:
            raise ValueError("made up for the log")
        except ValueError as error:
            app.report_crash(type(error), error, error.__traceback__)
        text = (state_folder() / "trundle.log").read_text(encoding="utf-8")
    finally:
        for handler in root.handlers:
            handler.close()
        root.handlers[:] = before
    assert "made up for the log" in text
    assert "Traceback" in text


def test_pictures_are_written_without_a_screen(tmp_path):
    save(desk_run(), tmp_path / "desk.json")
    assert pictures.main([str(tmp_path / "desk.json"), "--out", str(tmp_path / "out")]) == 0
    names = sorted(path.name for path in (tmp_path / "out").iterdir())
    assert names == ["elevation.png", "plan.png", "window-dark.png", "window-light.png"]
    assert all((tmp_path / "out" / name).stat().st_size > 2000 for name in names)
