"""The way from an old file to the current version, on a made-up registry: version 1 has no predecessor yet."""

from engine.model.design import SCHEMA_VERSION
from engine.model.migrations import STEPS, migrate, version_problem


def metres(raw: dict) -> dict:
    """Version 1 had millimetres."""
    raw["length"] = raw.pop("length_mm") / 1000
    return raw


def named(raw: dict) -> dict:
    """Version 2 had no names."""
    return {**raw, "name": "unnamed"}


MADE_UP = {1: metres, 2: named}


def test_steps_are_taken_in_order_up_to_the_current_version():
    old = {"schema_version": 1, "length_mm": 250}
    assert migrate(old, 3, MADE_UP) == {"schema_version": 3, "length": 0.25, "name": "unnamed"}
    assert old == {"schema_version": 1, "length_mm": 250}


def test_a_file_half_way_takes_only_the_steps_it_lacks():
    assert migrate({"schema_version": 2, "length": 1}, 3, MADE_UP) == {
        "schema_version": 3,
        "length": 1,
        "name": "unnamed",
    }


def test_a_current_file_is_left_alone():
    raw = {"schema_version": 3}
    assert migrate(raw, 3, MADE_UP) is raw


def test_a_version_without_a_way_is_told():
    problem = version_problem({"schema_version": 0}, 3, MADE_UP)
    assert problem is not None
    assert problem.sentence == "schema_version is 0; there is no way from version 0 to 1."
    assert version_problem({"schema_version": 1}, 3, MADE_UP) is None


def test_every_version_up_to_the_current_one_has_its_step():
    assert sorted(STEPS) == list(range(1, SCHEMA_VERSION))
