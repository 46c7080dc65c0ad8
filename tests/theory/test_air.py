"""Drag of a sphere against the open library `fluids`, and closed forms of motion in air.

`fluids.drag.Clift_Gauvin` holds the correlation of Clift and Gauvin (1971) as in Clift, Grace and Weber. Density and
viscosity of air at 15 C, 1.225 kg/m3 and 1.7894e-5 Pa s, are from memory.
"""

import math

import fluids
import numpy as np
import pytest

from engine.contact.laws import drag_coefficient
from engine.contact.patches import PatchList
from engine.dynamics.state import BallParams
from tests.rolls import SHELL, G, free_start, roll, state_at

AIR_15 = (1.225, 1.7894e-5)


@pytest.mark.parametrize(
    ("reynolds", "cd"),
    [
        (1, 27.6481),
        (10, 4.13474),
        (100, 1.07039),
        (400, 0.60850),
        (1e3, 0.46387),
        (3e3, 0.39448),
        (1e4, 0.41032),
        (1e5, 0.46745),
        (3e5, 0.46466),
    ],
)
def test_drag_coefficient_is_that_of_clift_and_gauvin(reynolds: float, cd: float) -> None:
    assert drag_coefficient(float(reynolds)) == pytest.approx(cd, rel=2e-5)
    assert drag_coefficient(float(reynolds)) == pytest.approx(fluids.drag.Clift_Gauvin(float(reynolds)), rel=1e-12)


@pytest.mark.parametrize(
    ("radius", "mass", "terminal"),
    [(0.02, 0.0027, 8.74), (0.0127, 0.0668, 67.0)],
    ids=["table tennis", "steel 25.4 mm"],
)
def test_terminal_speed(radius: float, mass: float, terminal: float) -> None:
    """A ball let fall ends at the speed at which drag by `fluids` carries its weight; published: 8.74 and 67 m/s."""
    rho, viscosity = AIR_15
    area = math.pi * radius**2
    low, high = 0.1, 200.0
    for _ in range(80):
        speed = 0.5 * (low + high)
        pull = 0.5 * rho * fluids.drag.Clift_Gauvin(rho * speed * 2.0 * radius / viscosity) * area * speed**2
        low, high = (speed, high) if pull < mass * G else (low, speed)
    rolling = BallParams(radius, mass, SHELL, -1.0, 0.0)
    run = roll(PatchList().to_scene(air=AIR_15), rolling, free_start((0, 0, 0), (0, 0, -0.9 * terminal)), 60.0)
    assert -run.v[-1, 2] == pytest.approx(speed, rel=1e-4)
    assert speed == pytest.approx(terminal, rel=0.012)


def test_fall_with_constant_drag_coefficient() -> None:
    """V = vt tanh(g t/vt), z = -(vt^2/g) ln cosh(g t/vt)."""
    rolling = BallParams(0.02, 0.0027, SHELL, 0.47, 0.0)
    terminal = math.sqrt(2.0 * rolling.mass * G / (1.2041 * 0.47 * math.pi * rolling.radius**2))
    run = roll(PatchList().to_scene(air=(1.2041, 1.8e-5)), rolling, free_start((0, 0, 0), (0, 0, 0)), 2.0, [1.5])
    i = state_at(run, 1.5)
    assert run.v[i, 2] == pytest.approx(-terminal * math.tanh(G * 1.5 / terminal), rel=1e-10)
    assert run.x[i, 2] == pytest.approx(-(terminal**2) / G * math.log(math.cosh(G * 1.5 / terminal)), rel=1e-10)


def test_energy_lost_to_air_is_booked() -> None:
    rolling = BallParams(0.02, 0.0027, SHELL, -1.0, 0.0)
    scene = PatchList().to_scene(air=AIR_15)
    run = roll(scene, rolling, free_start((0, 0, 0), (3.0, 0.5, 1.0), (0.0, 30.0, 0.0)), 1.0)
    energy = run.kinetic + run.potential
    assert np.abs(energy + run.loss[:, 3] - energy[0]).max() < 1e-9 * run.kinetic.max()
    assert run.loss[-1, 3] > 1e-3 * run.kinetic[0]


def test_lift_turns_a_spinning_ball_aside() -> None:
    """Lift acts along w x v: back spin lifts, and it does no work."""
    rolling = BallParams(0.02, 0.0027, SHELL, 0.0, 1.0)
    scene = PatchList().to_scene(air=AIR_15)
    run = roll(scene, rolling, free_start((0, 0, 0), (5.0, 0, 0), (0.0, -20.0, 0.0)), 0.1)
    plain = roll(scene, rolling, free_start((0, 0, 0), (5.0, 0, 0)), 0.1)
    assert run.x[-1, 2] > plain.x[-1, 2] + 1e-4
    energy = run.kinetic + run.potential
    assert np.abs(energy - energy[0]).max() < 1e-10 * energy[0]
    # C_L = 1.6 S below S = 0.1 (from memory): the first acceleration is 1/2 rho A 1.6 (a w/v) v^2/m
    up = 0.5 * AIR_15[0] * math.pi * 0.02**2 * 1.6 * (0.02 * 20.0 / 5.0) * 25.0 / 0.0027
    near = np.argmax(run.t > 1e-3)
    assert (run.v[near, 2] / run.t[near] + G) == pytest.approx(up, rel=1e-2)
