"""Scripts of packaging/, which is no package: loaded by path."""

import importlib
import sys
from pathlib import Path

import pytest

FOLDER = Path(__file__).resolve().parent.parent.parent.parent / "packaging"


@pytest.fixture
def script(monkeypatch):
    """Return a function that loads a script by name, fresh for each test."""
    monkeypatch.syspath_prepend(FOLDER)
    names = [path.stem for path in FOLDER.glob("*.py")]

    def load(name):
        monkeypatch.delitem(sys.modules, name, raising=False)
        return importlib.import_module(name)

    yield load
    for name in names:
        if getattr(sys.modules.get(name), "__file__", "").startswith(str(FOLDER)):
            del sys.modules[name]
