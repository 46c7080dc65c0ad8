"""Fields as the editors see them: unit, bounds, label and kind of each."""

import pytest

from engine.model.ball import Ball, Layer, Material, Pair
from engine.model.base import Frozen, fields_of, kind_name
from engine.model.design import Design, FreeStart, KeepOut, OutletStart, Process, Release, Run, Site, Station
from engine.model.elements import (
    ELEMENTS,
    Bend,
    Cone,
    Funnel,
    Hyperbolic,
    Parabolic,
    Points,
    Power,
    Straight,
    Trough,
    Tube,
    Well,
)

ROOTS = (Design, Site, KeepOut, Process, Run, Release, FreeStart, OutletStart, Station, Ball, Layer, Material, Pair)
SHAPES = (Tube, Trough, Cone, Power, Hyperbolic, Parabolic, Points)
EVERY_CLASS: list[type[Frozen]] = [*ELEMENTS.values(), *SHAPES, *ROOTS]


def spec(owner: type[Frozen], name: str):
    """Return the specification of one field."""
    return next(field for field in fields_of(owner) if field.name == name)


@pytest.mark.parametrize("owner", EVERY_CLASS, ids=lambda owner: owner.__name__)
def test_every_number_has_unit_label_and_finite_bounds(owner):
    for field in fields_of(owner):
        assert field.label
        if field.kind == "number":
            assert field.low is not None and field.high is not None
            assert field.low < field.high
            assert field.unit or field.name == "exponent"


@pytest.mark.parametrize("owner", EVERY_CLASS, ids=lambda owner: owner.__name__)
def test_every_default_lies_within_its_bounds(owner):
    for field in fields_of(owner):
        default = owner.model_fields[field.name].default
        if field.kind == "number" and isinstance(default, float):
            assert field.low <= default <= field.high


def test_a_length_is_described_with_its_bounds():
    field = spec(Bend, "radius")
    assert (field.label, field.unit, field.low, field.high, field.kind) == ("Radius", "m", 1e-5, 1e3, "number")


def test_a_union_lists_its_kinds():
    assert spec(Straight, "section").choices == ("tube", "trough")
    assert spec(Funnel, "profile").choices == ("cone", "power", "hyperbolic", "parabolic", "points")


def test_kinds_of_editors_are_told_apart():
    assert spec(Straight, "pair").kind == "reference" and spec(Straight, "pair").optional
    assert spec(Well, "floor").kind == "flag"
    assert spec(Well, "hand").choices == ("1", "-1")
    assert spec(FreeStart, "position").kind == "vector"
    assert spec(Points, "points").kind == "points"
    assert spec(Ball, "layers").kind == "models"
    assert spec(Release, "direction").optional


def test_fields_of_an_object_are_those_of_its_class():
    assert fields_of(Straight(id="s1")) == fields_of(Straight)


def test_kind_is_no_editable_field_but_comes_first_in_the_document():
    assert "kind" not in [field.name for field in fields_of(Straight)]
    assert next(iter(Straight.model_fields)) == "kind"
    assert kind_name(Straight) == "straight" and kind_name(Run) == "Run"
