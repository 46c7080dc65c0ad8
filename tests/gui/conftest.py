"""The whole window without a screen, on a state folder of its own."""

import os

import pytest

os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")


@pytest.fixture(autouse=True)
def state_folder(tmp_path, monkeypatch):
    """Keep settings, working copies and logs of a test in a folder of its own."""
    monkeypatch.setenv("TRUNDLE_STATE", str(tmp_path / "state"))
    return tmp_path / "state"
