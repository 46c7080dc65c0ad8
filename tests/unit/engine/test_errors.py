"""The error family: sentences, nearest names, reasons of the system."""

import errno

import pytest

from engine import errors
from engine.errors import DesignFileError, TrundleError, UnknownNameError, nearest, os_reason, suggestion


@pytest.mark.parametrize(
    ("given", "expected"), [("raduis", "radius"), ("RADIUS", "radius"), ("lenght", "length"), ("xyz", None), ("", None)]
)
def test_the_nearest_known_name_is_found(given, expected):
    assert nearest(given, ["radius", "turn", "length"]) == expected


def test_a_suggestion_names_the_nearest_or_all_when_they_are_few():
    assert suggestion("bnd", ["bend", "helix"]) == '; the nearest known name is "bend"'
    assert suggestion("xyz", ["bend", "helix"]) == '; known are "bend", "helix"'
    assert suggestion("xyz", []) == "; none is known yet"
    assert suggestion("xyz", [f"name{n}" for n in range(30)]) == "; 30 names are known, none of them near"


def test_an_unknown_name_is_a_sentence():
    error = UnknownNameError("run", "r9", ["main", "side"])
    assert str(error) == 'There is no run "r9"; known are "main", "side".'
    assert (error.given, error.known) == ("r9", ("main", "side"))


def test_a_file_error_keeps_every_problem():
    error = DesignFileError("a.json", ["One.", "Two."])
    assert error.problems == ("One.", "Two.")
    assert str(error) == "a.json cannot be used: One. Two."


def test_the_reason_of_the_system_is_in_plain_words():
    assert os_reason(OSError(errno.ENOSPC, "No space left on device")) == "the disk is full"
    assert os_reason(OSError(errno.EIO, "Input/output error")) == "input/output error"
    assert os_reason(OSError()) == "the system gave no reason"


def test_every_error_of_the_family_can_be_caught_as_one():
    family = [entry for entry in vars(errors).values() if isinstance(entry, type) and issubclass(entry, Exception)]
    assert len(family) > 8
    assert all(issubclass(entry, TrundleError) for entry in family)
