"""The start command: where results go, and the whole job without a window."""

import json
import sys
from pathlib import Path

import pytest

from engine.model.storage import save
from tests.designs import desk_run


@pytest.fixture
def start(script, monkeypatch):
    """Return the module, on the Python that runs the tests."""
    made = script("start")
    monkeypatch.setattr(made, "venv_python", lambda: Path(sys.executable))
    return made


@pytest.fixture
def design(tmp_path):
    """Return the file of a small design."""
    save(desk_run(), tmp_path / "desk.json")
    return tmp_path / "desk.json"


def test_results_go_into_the_next_free_folder(start, tmp_path):
    wanted = tmp_path / "trundle-out"
    for name in ("trundle-out", "trundle-out-2", "trundle-out-3"):
        folder = start.result_folder(wanted)
        assert folder == tmp_path / name
        (folder / "report.md").touch()


def test_folder_that_cannot_be_written_is_replaced_by_a_temporary_one(start, tmp_path, capsys):
    (tmp_path / "file").touch()
    folder = start.result_folder(tmp_path / "file" / "out")
    assert folder.is_dir()
    assert tmp_path not in folder.parents
    assert "cannot be written" in capsys.readouterr().out
    folder.rmdir()


def test_screen_is_what_the_environment_says(start, monkeypatch):
    monkeypatch.setattr(start.sys, "platform", "linux")
    for name in ("DISPLAY", "WAYLAND_DISPLAY"):
        monkeypatch.delenv(name, raising=False)
    assert not start.has_screen()
    monkeypatch.setenv("WAYLAND_DISPLAY", "wayland-0")
    assert start.has_screen()
    monkeypatch.setattr(start.sys, "platform", "win32")
    monkeypatch.delenv("WAYLAND_DISPLAY")
    assert start.has_screen()


def test_whole_job_without_a_window(start, design, tmp_path, monkeypatch, capsys):
    monkeypatch.setenv("QT_QPA_PLATFORM", "offscreen")
    start.without_window(design, tmp_path / "out")
    printed = capsys.readouterr().out
    report = (tmp_path / "out" / "report.md").read_text(encoding="utf-8")
    parts = sorted(path.name for path in (tmp_path / "out" / "parts").glob("*.stl"))
    pictures = [path for path in (tmp_path / "out" / "pictures").glob("*.png") if path.stat().st_size > 5000]
    checked = json.loads(start.module("engine.cli", "check", str(design), "--json").stdout)
    assert f"**{checked['verdict']}**" in report
    assert f"Run {desk_run().runs[0].id} " in printed
    assert all(finding["sentence"] in report for finding in checked["findings"])
    assert len(parts) == len(desk_run().runs[0].elements)
    assert all(f"`{name}`" in report for name in parts)
    assert len(pictures) >= 4
    assert all(f"pictures/{path.name}" in report for path in pictures)
    assert f"look at {tmp_path / 'out' / 'report.md'}" in printed


def test_design_that_cannot_be_used_is_refused_in_words(start, tmp_path):
    (tmp_path / "broken.json").write_text("{", encoding="utf-8")
    with pytest.raises(start.SetupError, match="cannot be used"):
        start.without_window(tmp_path / "broken.json", tmp_path / "out")
    assert not (tmp_path / "out").exists()


def test_screen_that_is_not_there_leads_to_the_job_without_a_window(start, design, monkeypatch, capfd):
    monkeypatch.setenv("QT_QPA_PLATFORM", "xcb")
    monkeypatch.setenv("DISPLAY", ":9876")
    assert start.open_window(design) is False
    assert "could not be opened" in capfd.readouterr().out


def test_virtual_screen_comes_up_and_goes(script):
    test = script("test")
    with test.VirtualScreen() as environment:
        started = test.shutil.which("Xvfb") is not None and sys.platform not in ("win32", "darwin")
        assert environment["QT_QPA_PLATFORM"] == ("xcb" if started else "offscreen")
        assert "WAYLAND_DISPLAY" not in environment
        assert environment.get("DISPLAY", "").startswith(":") == started


def test_closing_line_and_exit_code_of_pytest_are_kept(script, monkeypatch, tmp_path, capfdbinary):
    test = script("test")
    monkeypatch.setattr(test, "venv_python", lambda: sys.executable)
    monkeypatch.setattr(test, "ROOT", tmp_path)
    (tmp_path / "test_it.py").write_text("def test_good():\n    pass\n\n\ndef test_bad():\n    assert 1 == 2\n")
    environment = {name: value for name, value in test.os.environ.items() if not name.startswith("PYTEST")}
    code, line = test.pytest(environment, "-p", "no:cacheprovider", "test_it.py")
    assert code == 1
    assert "1 failed, 1 passed" in line
    assert b"assert 1 == 2" in capfdbinary.readouterr().out
