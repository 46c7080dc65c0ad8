"""The import contracts hold, and a wrong import breaks the one it should."""

import os
import shutil
import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parent.parent.parent
PLANTED = {
    "engine: imports point down": ("engine/contact/laws.py", "import engine.integrate.step"),
    "studio: imports point down": ("studio/workspace.py", "import studio.main_window"),
    "engine knows no window": ("engine/bench.py", "import PySide6.QtCore"),
    "kernels know neither the document nor heavy packages": ("engine/dynamics/state.py", "import scipy.optimize"),
    "views see results through display and workspace": ("studio/views/plan.py", "import engine.dynamics.state"),
    "no cycles between siblings": ("engine/model/ball.py", "import engine.model.design"),
}


def lint(folder):
    """Run the contracts on the tree in a folder; return exit code and text."""
    command = [sys.executable, "-c", "from importlinter.cli import lint_imports_command as main; main()", "--no-cache"]
    environment = {**os.environ, "PYTHONPATH": str(folder)}
    done = subprocess.run(
        command, cwd=folder, env=environment, capture_output=True, text=True, timeout=120, check=False
    )
    return done.returncode, done.stdout + done.stderr


@pytest.fixture
def tree(tmp_path):
    """Return a copy of the tree that may be spoiled."""
    for name in ("engine", "studio"):
        shutil.copytree(ROOT / name, tmp_path / name, ignore=shutil.ignore_patterns("__pycache__"))
    shutil.copy(ROOT / "pyproject.toml", tmp_path)
    return tmp_path


def test_contracts_hold():
    code, text = lint(ROOT)
    assert code == 0, text
    assert "0 broken" in text


@pytest.mark.parametrize("contract", PLANTED)
def test_wrong_import_breaks_its_contract(tree, contract):
    name, line = PLANTED[contract]
    path = tree / name
    path.write_text(path.read_text(encoding="utf-8") + f"\n{line}\n", encoding="utf-8")
    code, text = lint(tree)
    assert code == 1, text
    assert f"{contract} BROKEN" in text
