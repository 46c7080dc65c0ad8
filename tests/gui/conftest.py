"""The whole window without a screen, on a state folder of its own."""

import os

import pytest
from PySide6.QtCore import QCoreApplication, Qt

os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")
# before any application object: shaders are kept for all views, and a second view draws nothing without it
QCoreApplication.setAttribute(Qt.ApplicationAttribute.AA_ShareOpenGLContexts)


@pytest.fixture(autouse=True)
def state_folder(tmp_path, monkeypatch):
    """Keep settings, working copies and logs of a test in a folder of its own."""
    monkeypatch.setenv("TRUNDLE_STATE", str(tmp_path / "state"))
    return tmp_path / "state"
