"""The pins: complete, what the tests run with, and free of the fault that one of them is there for."""

import re
import sys
import tomllib
from importlib import metadata
from pathlib import Path

import pytest
from PySide6.QtCore import QObject

ROOT = Path(__file__).resolve().parent.parent.parent.parent
PINS = dict(
    line.split("==")
    for line in (ROOT / "packaging" / "constraints.txt").read_text(encoding="utf-8").splitlines()
    if line and not line.startswith("#")
)
CALLS = 5000


def plain(name):
    """Return the name of a package in its normal form."""
    return re.sub(r"[-_.]+", "-", name).lower()


@pytest.mark.parametrize("name", PINS)
def test_pin_is_what_the_tests_run_with(name):
    assert metadata.version(name) == PINS[name]


def test_every_required_package_is_pinned():
    project = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))["project"]
    wanted = project["dependencies"] + project["optional-dependencies"]["tests"]
    names = {plain(re.match(r"[\w.-]+", line)[0]) for line in wanted}
    assert names <= {plain(name) for name in PINS}


def test_pyside_is_the_version_that_keeps_its_references():
    assert PINS["PySide6_Essentials"] == "6.11.3"
    thing = QObject()
    before = sys.getrefcount(None)
    for _ in range(CALLS):
        thing.setObjectName("x")
    assert abs(sys.getrefcount(None) - before) < CALLS // 10
