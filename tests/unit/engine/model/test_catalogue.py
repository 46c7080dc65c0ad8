"""Built-in values: complete, sourced, and in agreement with published masses and sizes."""

import pytest

from engine.model.ball import VOID, Ball, Layer, Material, Pair
from engine.model.catalogue import (
    BALLS,
    MATERIALS,
    PAIRS,
    TUBES,
    ball_table,
    contact_modulus,
    material_table,
    pair_table,
)
from engine.model.design import Design, Process, Run

BALLS_PER_KILOGRAM = {
    "steel-12.7": 119,
    "steel-15.875": 60.84,
    "steel-19.05": 35.27,
    "steel-20": 30.5,
    "steel-25.4": 14.88,
}
"""A ball maker's stock list."""


def test_every_entry_names_its_source():
    assert all(material.source for material in MATERIALS.values())
    assert all(pair.source and pair.confidence in ("common practice", "from memory") for pair in PAIRS.values())
    assert all(tube.source for tube in TUBES)


def test_every_reference_of_the_catalogue_exists():
    layers = {layer.material for ball in BALLS.values() for layer in ball.layers}
    walls = {pair.wall_material for pair in PAIRS.values()} | {pair.ball_material for pair in PAIRS.values()}
    assert (layers - {VOID}) | walls | {tube.material for tube in TUBES} <= set(MATERIALS)


def test_every_stock_ball_rolls_on_acrylic():
    """The surface of each stock ball has a contact pair with the commonest tube."""
    surfaces = {ball.layers[-1].material for ball in BALLS.values()}
    assert {f"{surface}-pmma" for surface in surfaces} <= set(PAIRS)


def test_defaults_of_a_run_are_in_the_catalogue():
    run = Run(id="r1")
    assert run.ball in BALLS and run.pair in PAIRS


@pytest.mark.parametrize("key", BALLS_PER_KILOGRAM)
def test_steel_balls_weigh_what_the_maker_counts(key):
    mass = BALLS[key].mass(MATERIALS)
    assert 1.0 / mass == pytest.approx(BALLS_PER_KILOGRAM[key], rel=3e-3)


@pytest.mark.parametrize(
    ("key", "low", "high"),
    [
        ("table-tennis", 2.69e-3, 2.72e-3),  # ITTF Law 2.03: 2.7 g
        ("golf", 0.0458, 0.04593),  # at most 45.93 g
        ("squash", 0.023, 0.025),  # 23 to 25 g
        ("pool", 0.156, 0.170),  # 5.5 to 6 oz
        ("glass-16", 5.3e-3, 5.5e-3),  # 5.4 g
    ],
)
def test_game_balls_weigh_what_their_rules_ask(key, low, high):
    assert low <= BALLS[key].mass(MATERIALS) <= high


def test_inertia_of_hollow_game_balls():
    """Table tennis about 0.65, squash about 0.516 (derived from size, mass and density of the wall)."""
    assert BALLS["table-tennis"].inertia_factor(MATERIALS) == pytest.approx(0.65, abs=0.01)
    assert BALLS["squash"].inertia_factor(MATERIALS) == pytest.approx(0.516, abs=0.003)


def test_contact_modulus_follows_hertz():
    """Steel (206 GPa, 0.3) on acrylic (3.2 GPa, 0.37): 1/E* = 0.91/206 + 0.8631/3.2 per GPa, so 3.648 GPa."""
    steel = Material(id="a", young=206e9, poisson=0.3)
    acrylic = Material(id="b", young=3.2e9, poisson=0.37)
    assert contact_modulus(steel, acrylic) == pytest.approx(3.648e9, rel=1e-3)
    assert contact_modulus(steel, Material(id="c", young=1e10)) is None


def test_tubes_have_walls_and_usual_sizes():
    assert all(tube.wall > 0.0 for tube in TUBES)
    sizes = {tube.name: tube for tube in TUBES}
    assert sizes["PVC pipe 2 in, Schedule 40"].bore == pytest.approx(0.0525)
    assert sizes["Copper tube 22 x 1.1 mm"].bore == pytest.approx(0.0198)
    assert sizes["Acrylic tube 25/21 mm"].wall == pytest.approx(0.002)


def test_own_entries_come_before_built_in_ones():
    own_material, own_pair = Material(id="steel", density=1.0), Pair(id="steel-pmma", rolling_loss=0.5)
    own_ball = Ball(id="steel-16", layers=(Layer(radius=0.5),))
    assert material_table((own_material,))["steel"] is own_material
    assert pair_table((own_pair,))["steel-pmma"] is own_pair
    assert ball_table((own_ball,))["steel-16"] is own_ball
    assert len(ball_table((own_ball,))) == len(BALLS)


def test_default_process_is_valid():
    assert Design().process == Process()
