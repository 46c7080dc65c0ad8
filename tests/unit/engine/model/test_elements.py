"""Every element can be made with an id alone; what has no shape is refused, what cannot work is not."""

import math

import pytest
from pydantic import ValidationError

from engine.model.elements import (
    ELEMENTS,
    SEGMENTS,
    Bend,
    Bowl,
    Dome,
    FreeLine,
    Funnel,
    Helix,
    Points,
    Straight,
    Trough,
    Tube,
    Well,
)

SEGMENT_FIELDS = {"kind", "id", "name", "pair", "note", "section", "bank_start", "bank_end"}


@pytest.mark.parametrize("kind", ELEMENTS)
def test_an_id_is_enough(kind):
    element = ELEMENTS[kind](id="e1")
    assert element.kind == kind
    assert type(element).model_validate(element.model_dump()) == element


@pytest.mark.parametrize("owner", SEGMENTS, ids=lambda owner: owner.__name__)
def test_every_segment_has_section_and_bank(owner):
    assert set(owner.model_fields) >= SEGMENT_FIELDS


def test_an_element_cannot_be_changed():
    with pytest.raises(ValidationError, match="frozen"):
        Straight(id="s1").length = 2.0


def test_lip_angle_is_half_of_the_wall_that_is_left():
    assert Trough(opening=math.pi).lip_angle == pytest.approx(math.pi / 2)
    assert Trough(opening=math.radians(60)).lip_angle == pytest.approx(math.radians(150))


def test_title_is_the_name_or_else_the_id():
    assert Straight(id="s1").title == "s1"
    assert Straight(id="s1", name="Start").title == "Start"


@pytest.mark.parametrize(
    ("make", "sentence"),
    [
        (lambda: Bend(id="b", turn=0.0), "turn must not be 0"),
        (lambda: Helix(id="h", turns=0.0), "turns must not be 0"),
        (lambda: Funnel(id="f", rim_radius=0.1, throat_radius=0.1), "throat_radius 0.1 m must be smaller"),
        (lambda: Bowl(id="b", sphere_radius=0.1, rim_radius=0.2), "rim_radius 0.2 m must not be larger"),
        (lambda: Bowl(id="b", hole_radius=0.3, rim_radius=0.2), "hole_radius 0.3 m must be smaller"),
        (lambda: Dome(id="d", sphere_radius=0.1, rim_radius=0.2), "rim_radius 0.2 m must not be larger"),
        (lambda: Well(id="w", depth=0.01, rim_fillet=0.02), "take 0.04 m together, more than the depth"),
        (lambda: Well(id="w", radius=0.01, floor_fillet=0.02), "floor_fillet 0.02 m must not be larger"),
        (lambda: Points(points=((0.1, 0.0), (0.1, 0.2))), "points must run from the throat outward"),
        (lambda: Points(points=((0.1, 0.2), (0.2, 0.2))), "points must end higher than they begin"),
        (lambda: FreeLine(id="l", points=((0.0, 0.0, 0.0),)), r"points\[0\] is the same place"),
        (lambda: FreeLine(id="l", points=((0.1, 0.0, 0.0),) * 2), r"points\[1\] is the same place"),
    ],
)
def test_what_has_no_shape_is_refused_in_words(make, sentence):
    with pytest.raises(ValidationError, match=sentence):
        make()


def test_what_cannot_work_is_still_drawn():
    """A bend tighter than its tube, a tube smaller than the ball, a climb: found later, not refused."""
    assert Bend(id="b", radius=0.001, section=Tube(bore=0.05)).radius == 0.001
    assert Straight(id="s", grade=-3.0, section=Tube(bore=0.001)).grade == -3.0
    assert Well(id="w", floor=False, floor_fillet=0.5, radius=0.1).floor_fillet == 0.5


@pytest.mark.parametrize("value", [math.nan, math.inf, -1.0, 0.0, 1e308, "0.1", True, None])
def test_a_length_must_be_a_sane_number(value):
    with pytest.raises(ValidationError):
        Straight(id="s", length=value)


def test_a_whole_number_is_a_length():
    assert Straight(id="s", length=2).length == 2.0
