"""The command line as a user meets it: exit codes, sentences, JSON, and never a traceback."""

import io
import json
import os
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest

from engine import cli
from engine.cli import main
from engine.model.design import Design, OutletStart, Run
from engine.model.elements import Straight
from engine.model.storage import save, schema
from tests.designs import desk_run, level_run, straight_run

CHECK_KEYS = ["verdict", "outcome", "duration_s", "exit_speed_m_s", "findings"]
FINDING_KEYS = [
    *("kind", "severity", "where", "segment", "s_m", "t_s"),
    *("value", "limit", "unit", "sentence", "cure"),
]
LAST_SAMPLE = 0.5 * 0.004 / 1.0
"""The exit speed is that of the last sample before the end, at most 4 mm of 1 m upstream; v grows as sqrt(s)."""
COLUMNS = ["t_s", "x_m", "y_m", "z_m", "vx_m_s"]


@pytest.fixture
def file(tmp_path):
    """Return a function that saves a design and gives back the path of its file."""

    def write(design: Design) -> str:
        save(design, tmp_path / "design.json")
        return str(tmp_path / "design.json")

    return write


def uphill() -> Design:
    """Return a level trough that is far too long for its release: the ball stops in it."""
    return level_run(speed=0.05, length=5.0)


# -- check ----------------------------------------------------------------------------------------
def test_check_of_a_run_that_fails_prints_findings_and_gives_1(file, capsys):
    assert main(["check", file(uphill())]) == cli.FOUND
    output = capsys.readouterr().out
    assert output.startswith("Run r1 fails: ")
    assert "s1" in output


def test_check_json_has_exactly_the_promised_fields(file, capsys):
    assert main(["check", file(uphill()), "--json"]) == cli.FOUND
    report = json.loads(capsys.readouterr().out)
    assert list(report) == CHECK_KEYS
    assert report["verdict"] == "fails"
    assert report["findings"] and all(list(finding) == FINDING_KEYS for finding in report["findings"])


def test_check_agrees_with_the_closed_form(file, capsys):
    """Rolling without loss from rest down a height h of 0.1 m: v = sqrt(2 g h / (1 + k)), k = 2/5."""
    main(["check", file(straight_run()), "--json"])
    report = json.loads(capsys.readouterr().out)
    assert report["outcome"] == "arrived"
    ideal = (2 * 9.80665 * 0.1 / 1.4) ** 0.5
    assert 0.0 <= 1.0 - report["exit_speed_m_s"] / ideal <= LAST_SAMPLE


def test_check_covers_every_run_or_the_one_asked_for(file, capsys):
    design = uphill()
    second = Run(id="r2", start=OutletStart(run="r1", element="s1"), elements=(Straight(id="x1", grade=0.1),))
    path = file(design.model_copy(update={"runs": (*design.runs, second)}))
    main(["check", path])
    both = capsys.readouterr().out
    assert "Run r1" in both and "Run r2" in both
    main(["check", path, "--run", "r2"])
    assert "Run r1" not in capsys.readouterr().out


# -- unusable input -------------------------------------------------------------------------------
def test_every_problem_is_a_line_on_standard_error(tmp_path, capsys):
    (tmp_path / "bad.json").write_text('{"schema_version": 1, "nmae": 1, "units": "ell"}')
    assert main(["check", str(tmp_path / "bad.json")]) == cli.UNUSABLE
    captured = capsys.readouterr()
    lines = captured.err.splitlines()
    assert captured.out == "" and len(lines) == 2
    assert lines[0].endswith("units is \"ell\"; allowed is 'mm', 'cm', 'm' or 'in'.")


def test_problems_are_one_object_with_json(tmp_path, capsys):
    (tmp_path / "bad.json").write_text('{"schema_version": 1, "nmae": 1}')
    assert main(["check", str(tmp_path / "bad.json"), "--json"]) == cli.UNUSABLE
    answer = json.loads(capsys.readouterr().out)
    assert list(answer) == ["error", "problems"]
    assert answer["problems"] and answer["problems"][0].startswith("nmae is not a field")


@pytest.mark.parametrize("command", [["check"], ["simulate", "--out", "x.csv"], ["export", "--out", "parts"]])
def test_a_design_without_a_run_is_answered(file, capsys, command):
    assert main([command[0], file(Design()), *command[1:]]) == cli.UNUSABLE
    assert "has no run yet" in capsys.readouterr().err


def test_a_run_without_elements_is_answered(file, capsys):
    assert main(["check", file(Design(runs=(Run(id="r1"),)))]) == cli.UNUSABLE
    assert capsys.readouterr().err.strip().endswith(".")


def test_an_unknown_run_is_answered_with_the_known_ones(file, capsys):
    assert main(["check", file(desk_run()), "--run", "r9"]) == cli.UNUSABLE
    assert 'There is no run "r9"; known are "r1".' in capsys.readouterr().err


def test_a_missing_file_is_answered(capsys):
    assert main(["check", "no-such-file.json"]) == cli.UNUSABLE
    assert "there is no such file or folder" in capsys.readouterr().err


def test_a_missing_argument_ends_with_the_usage(capsys):
    with pytest.raises(SystemExit) as caught:
        main(["check"])
    assert caught.value.code == cli.UNUSABLE
    assert "usage: trundle check" in capsys.readouterr().err


# -- simulate -------------------------------------------------------------------------------------
def test_simulate_writes_csv_that_reads_back(file, tmp_path, capsys):
    out = tmp_path / "run.csv"
    assert main(["simulate", file(straight_run()), "--out", str(out)]) == cli.CLEAN
    table = np.genfromtxt(out, delimiter=",", names=True, dtype=None, encoding="utf-8")
    assert list(table.dtype.names[:5]) == COLUMNS
    assert np.all(np.diff(table["t_s"]) >= 0.0) and len(table) > 2
    assert table["z_m"][-1] < table["z_m"][0]


def test_simulate_writes_the_same_numbers_as_npz(file, tmp_path, capsys):
    path = file(straight_run())
    main(["simulate", path, "--out", str(tmp_path / "run.csv")])
    assert main(["simulate", path, "--out", str(tmp_path / "run.npz"), "--json"]) == cli.CLEAN
    table = np.genfromtxt(tmp_path / "run.csv", delimiter=",", names=True, dtype=None, encoding="utf-8")
    with np.load(tmp_path / "run.npz", allow_pickle=False) as archive:
        assert list(archive) == list(table.dtype.names)
        np.testing.assert_array_equal(archive["x_m"], table["x_m"])
        np.testing.assert_array_equal(archive["regime"], table["regime"])


def test_simulate_refuses_an_unknown_ending(file, capsys):
    assert main(["simulate", file(desk_run()), "--out", "run.xls"]) == cli.UNUSABLE
    assert "ends in .csv or .npz" in capsys.readouterr().err


def test_simulate_into_a_missing_folder_is_answered(file, tmp_path, capsys):
    assert main(["simulate", file(straight_run()), "--out", str(tmp_path / "none" / "x.csv")]) == cli.UNUSABLE
    assert "there is no such file or folder" in capsys.readouterr().err


# -- schema, window, endings ----------------------------------------------------------------------
def test_schema_is_printed_and_written(tmp_path, capsys):
    assert main(["schema"]) == cli.CLEAN
    assert json.loads(capsys.readouterr().out) == schema()
    assert main(["schema", "--out", str(tmp_path / "schema.json")]) == cli.CLEAN
    assert json.loads((tmp_path / "schema.json").read_text()) == schema()


@pytest.mark.parametrize("given", [[], ["a.json"]])
def test_without_a_command_the_window_takes_over(monkeypatch, given):
    called = []
    monkeypatch.setattr(os, "execv", lambda *arguments: called.append(arguments))
    main(given)
    assert called == [(sys.executable, [sys.executable, "-m", "studio.app", *given])]


def test_a_window_that_is_not_installed_is_answered(monkeypatch, capsys):
    monkeypatch.setattr(cli, "WINDOW_NEEDS", "no_such_package")
    assert main([]) == cli.UNUSABLE
    assert "The window needs no_such_package" in capsys.readouterr().err


def test_an_unknown_command_is_answered_with_the_nearest(capsys):
    assert main(["chekc", "a.json"]) == cli.UNUSABLE
    assert capsys.readouterr().err == 'There is no command "chekc"; the nearest known name is "check".\n'


def test_ctrl_c_gives_130(monkeypatch, file, capsys):
    def interrupted(*_: object, **__: object) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr(cli, "roll", interrupted)
    assert main(["check", file(desk_run())]) == cli.INTERRUPTED
    assert capsys.readouterr().err == "Stopped.\n"


def test_no_progress_is_written_when_nobody_watches(file, capsys):
    main(["check", file(straight_run())])
    assert capsys.readouterr().err == ""


def test_progress_is_written_to_a_terminal(monkeypatch):
    class Terminal(io.StringIO):
        def isatty(self) -> bool:
            return True

    screen = Terminal()
    monkeypatch.setattr(sys, "stderr", screen)
    cli._progress("Rolling")
    assert screen.getvalue() == "\r\x1b[KRolling"


def test_a_reader_that_stops_reading_is_no_error():
    root = Path(__file__).parents[3]
    program = "import sys; from engine.cli import main; sys.exit(main(['schema']))"
    reader = f'{sys.executable} -c "{program}" | head -c 1'
    done = subprocess.run(["sh", "-c", reader], capture_output=True, cwd=root, check=False)
    assert done.stderr == b""
