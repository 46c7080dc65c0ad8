"""Sentences about refused values: the prefix of a part, and how given values are shown."""

import pytest
from pydantic import ValidationError

from engine.model.elements import Bend
from engine.model.problems import problems_of, shown


def test_the_path_of_a_part_begins_with_its_place_in_the_design():
    with pytest.raises(ValidationError) as caught:
        Bend.model_validate({"id": "b", "section": {"kind": "tube", "bore": -1}})
    (problem,) = problems_of(caught.value, Bend, "runs[2].elements[5]")
    assert problem.path == "runs[2].elements[5].section.bore"
    assert problem.sentence == "runs[2].elements[5].section.bore is -1; give a number from 1e-05 to 1000 m."


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (None, "null"),
        (True, "true"),
        (1.5, "1.5"),
        ("é", '"é"'),
        ("a\ud800", '"a\\ud800"'),
        ("x" * 100, '"' + "x" * 36 + "..."),
        ([1, 2], "a list of 2"),
        ({"a": 1}, "an object {...}"),
        (10**99, "a whole number of about 100 digits"),
    ],
)
def test_a_given_value_is_shown_short_and_as_in_the_file(value, text):
    assert shown(value) == text
