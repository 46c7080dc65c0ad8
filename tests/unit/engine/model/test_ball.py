"""Mass and inertia of layered balls against closed forms."""

import math

import pytest
from pydantic import ValidationError

from engine.model.ball import Ball, Layer, Material, Pair

ROUNDED = 5e-6
"""Published check values have five decimals."""


def ball(*layers: tuple[str, float]) -> Ball:
    """Return a ball of (material, radius) layers."""
    return Ball(id="b", layers=tuple(Layer(material=material, radius=radius) for material, radius in layers))


MATERIALS = {
    "heavy": Material(id="heavy", density=7800.0),
    "light": Material(id="light", density=1200.0),
}


def test_solid_ball_has_two_fifths_and_the_mass_of_its_volume():
    solid = ball(("heavy", 0.01))
    assert solid.inertia_factor(MATERIALS) == pytest.approx(0.4, rel=1e-15)
    assert solid.mass(MATERIALS) == pytest.approx(7800.0 * 4 / 3 * math.pi * 1e-6, rel=1e-15)


@pytest.mark.parametrize(
    ("share", "expected"),
    [(0.5, 0.44286), (0.7, 0.50650), (0.8, 0.55108), (0.9, 0.60444), (0.95, 0.63444), (0.99, 0.66004)],
)
def test_hollow_ball_follows_the_thick_shell(share, expected):
    """k = (2/5)(1 - q^5)/(1 - q^3), evaluated by hand for inner over outer radius q."""
    hollow = ball(("void", share * 0.02), ("heavy", 0.02))
    assert hollow.inertia_factor(MATERIALS) == pytest.approx(expected, abs=ROUNDED)


def test_thin_shell_comes_near_two_thirds():
    thickness = 1e-6
    hollow = ball(("void", 0.02 * (1 - thickness)), ("heavy", 0.02))
    assert hollow.inertia_factor(MATERIALS) == pytest.approx(2 / 3, abs=2 * thickness)


@pytest.mark.parametrize(("core", "coat", "expected"), [("heavy", "light", 0.29374), ("light", "heavy", 0.51007)])
def test_coated_ball_depends_on_the_order_of_its_layers(core, coat, expected):
    coated = ball((core, 0.8 * 0.01), (coat, 0.01))
    assert coated.inertia_factor(MATERIALS) == pytest.approx(expected, abs=ROUNDED)


def test_layers_of_one_material_are_a_solid_ball():
    layered = ball(("heavy", 0.003), ("heavy", 0.007), ("heavy", 0.01))
    assert layered.inertia_factor(MATERIALS) == pytest.approx(0.4, rel=1e-14)
    assert layered.mass(MATERIALS) == pytest.approx(ball(("heavy", 0.01)).mass(MATERIALS), rel=1e-14)


def test_radius_is_that_of_the_outermost_layer():
    assert ball(("void", 0.009), ("heavy", 0.01)).radius == 0.01


def test_layers_that_do_not_grow_are_refused():
    with pytest.raises(ValidationError, match="layers must grow from inside out"):
        ball(("heavy", 0.01), ("light", 0.01))


def test_a_surface_of_nothing_is_refused():
    with pytest.raises(ValidationError, match='must not end with "void"'):
        ball(("heavy", 0.01), ("void", 0.012))


def test_kinetic_friction_above_static_is_refused():
    with pytest.raises(ValidationError, match=r"kinetic_friction 0\.4 must not be larger than static_friction 0\.3"):
        Pair(id="p", static_friction=0.3, kinetic_friction=0.4)
