"""Set-up: safe to run again, quick when nothing changed, plain words when something is missing."""

import os
import shutil
import sys

import pytest

DPKG = """#!/bin/sh
case "$3" in
  libegl1|libglib2.0-0t64) echo "install ok installed" ;;
  *) echo "no packages found" >&2; exit 1 ;;
esac
"""


@pytest.fixture
def steps(script, tmp_path, monkeypatch):
    """Return the module on a project of its own."""
    made = script("setup_steps")
    (tmp_path / "packaging").mkdir()
    shutil.copy(made.ROOT / "pyproject.toml", tmp_path)
    shutil.copy(made.ROOT / "packaging" / "constraints.txt", tmp_path / "packaging")
    monkeypatch.setattr(made, "ROOT", tmp_path)
    monkeypatch.setattr(made, "VENV", tmp_path / ".venv")
    (tmp_path / ".venv").mkdir()
    return made


@pytest.fixture
def pip_calls(steps, monkeypatch):
    """Return the list of calls of a pip that does nothing."""
    calls = []
    monkeypatch.setattr(steps, "_pip", calls.append)
    return calls


@pytest.fixture
def debian(tmp_path, monkeypatch):
    """Make this a Debian on which one library is there and another under its new name; no apt-get."""
    folder = tmp_path / "bin"
    folder.mkdir()
    (folder / "dpkg-query").write_text(DPKG)
    (folder / "dpkg-query").chmod(0o755)
    monkeypatch.setenv("PATH", str(folder))


def test_old_python_is_told_what_is_needed(steps):
    with pytest.raises(steps.SetupError, match=r"This is Python 3\.9\.2; Trundle needs 3\.11 or newer"):
        steps.check_python((3, 9, 2))
    steps.check_python((3, 11, 0))


def test_second_installation_calls_no_pip(steps, pip_calls):
    steps.install("tests")
    steps.install("tests")
    steps.install("")
    assert len(pip_calls) == 1
    assert pip_calls[0][-1] == f"{steps.ROOT}[tests]"
    assert str(steps.ROOT / "packaging" / "constraints.txt") in pip_calls[0]


def test_extras_are_added_to_a_plain_installation(steps, pip_calls):
    steps.install("")
    steps.install("tests")
    steps.install("")
    assert [call[-1] for call in pip_calls] == [str(steps.ROOT), f"{steps.ROOT}[tests]"]


@pytest.mark.parametrize("name", ["pyproject.toml", "packaging/constraints.txt"])
def test_changed_requirements_are_installed(steps, pip_calls, name):
    steps.install("")
    path = steps.ROOT / name
    path.write_text("# changed\n" + path.read_text(encoding="utf-8"), encoding="utf-8")
    steps.install("")
    assert len(pip_calls) == 2


def test_settings_of_the_linter_need_no_installation(steps, pip_calls):
    steps.install("")
    path = steps.ROOT / "pyproject.toml"
    path.write_text(
        path.read_text(encoding="utf-8").replace("line-length = 120", "line-length = 110"), encoding="utf-8"
    )
    steps.install("")
    assert len(pip_calls) == 1


def test_interrupted_installation_is_done_again(steps, monkeypatch):
    def interrupted(words):
        raise KeyboardInterrupt

    monkeypatch.setattr(steps, "_pip", interrupted)
    with pytest.raises(KeyboardInterrupt):
        steps.install("")
    calls = []
    monkeypatch.setattr(steps, "_pip", calls.append)
    steps.install("")
    assert len(calls) == 1


def test_failure_of_pip_becomes_one_sentence(steps, monkeypatch):
    monkeypatch.setattr(steps, "venv_python", lambda: sys.executable)
    with pytest.raises(steps.SetupError, match="Installing the packages failed"):
        steps._pip(["install", "--no-such-option"])
    assert not (steps.VENV / steps.STAMP).exists()


@pytest.mark.parametrize(
    ("printed", "meaning"),
    [
        ("ERROR: Could not install packages due to an OSError: [Errno 28] No space left on device", "The disk is full"),
        ("WARNING: Retrying after NewConnectionError('[Errno -3]')\nERROR: No matching distribution", "network"),
        ("ERROR: No matching distribution found for PySide6-Essentials==6.11.3", "no build for this Python"),
        ("error: [Errno 30] Read-only file system: 'x'", "cannot be written"),
        ("something else", "something else"),
    ],
)
def test_causes_in_plain_words(steps, printed, meaning):
    assert meaning in steps.cause_of(printed)


def test_python_without_ensurepip_gets_the_exact_line(steps, monkeypatch):
    monkeypatch.setattr(steps, "_works", lambda command: False)
    monkeypatch.setattr(steps, "can_install", lambda: False)
    wanted = f"sudo apt-get install python{sys.version_info[0]}.{sys.version_info[1]}-venv"
    with pytest.raises(steps.SetupError, match=wanted):
        steps.make_venv()


def test_full_disk_is_told_before_anything_is_made(steps, monkeypatch):
    usage = shutil.disk_usage(steps.ROOT)._replace(free=10_000_000)
    monkeypatch.setattr(steps.shutil, "disk_usage", lambda path: usage)
    with pytest.raises(steps.SetupError, match="less than 2 GB"):
        steps.make_venv()


def test_folder_that_cannot_be_written_is_told(steps, tmp_path, monkeypatch):
    (tmp_path / "file").touch()
    monkeypatch.setattr(steps, "VENV", tmp_path / "file")
    with pytest.raises(steps.SetupError, match="cannot be made"):
        steps.make_venv()


def test_environment_is_made_once(steps, monkeypatch):
    made = []
    monkeypatch.setattr(steps, "run", lambda command, what: made.append(command))
    steps.make_venv()
    assert made[0][1:3] == ["-m", "venv"]
    monkeypatch.setattr(steps, "venv_python", lambda: steps.Path(sys.executable))
    steps.make_venv()
    assert len(made) == 1


def test_libraries_under_their_new_name_count(steps, debian):
    assert steps.missing_libraries(("libegl1", "libglib2.0-0", "libgl1")) == ["libgl1"]


def test_missing_libraries_are_named_with_the_line_to_type(steps, debian, capsys):
    assert not steps.system_libraries(("libegl1", "libgl1", "xvfb"))
    assert "sudo apt-get install --no-install-recommends libgl1 xvfb\n" in capsys.readouterr().out
    assert steps.system_libraries(("libegl1",))


def test_no_libraries_are_missing_where_there_is_no_dpkg(steps, monkeypatch, tmp_path):
    monkeypatch.setenv("PATH", str(tmp_path))
    assert steps.missing_libraries(("libegl1",)) == []


def test_command_that_fails_becomes_one_sentence(steps):
    with pytest.raises(steps.SetupError, match="Trying failed with exit code 3"):
        steps.run([sys.executable, "-c", "raise SystemExit(3)"], "Trying")
    with pytest.raises(steps.SetupError, match="Trying could not start"):
        steps.run([str(steps.ROOT / "nothing")], "Trying")


def test_interpreter_of_the_environment_is_where_this_system_puts_it(steps):
    assert steps.venv_python().name == ("python.exe" if os.name == "nt" else "python")
