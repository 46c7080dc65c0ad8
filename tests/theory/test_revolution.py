"""Cones, paraboloids, funnels, bowls and domes against closed forms.

Sources: cone: Campos et al., Eur. J. Phys. 27, 567 (2006) (abstract seen); bowl period: textbook; dome 10/17 and 2/3:
arXiv:0808.3531 (seen), Irodov, Problems in General Physics, 1.263 (seen). Formulas with spin, ratios of frequencies and
the general inertia factor k are derived.
"""

import math

import numpy as np
import pytest

from engine.geometry import profiles
from engine.integrate.result import EventKind
from tests.rolls import (
    SHELL,
    SLICK,
    SOLID,
    G,
    ball,
    cone,
    coulomb,
    event,
    foot,
    happens,
    revolved,
    roll,
    rolling_start,
    sphere,
    state_at,
)

TABLE = 1e-8
"""Where the wall lets go depends on its curvature, and the table of an arc has that to some 1e-8 between its knots."""


def above_cone(half_angle: float, rho: float, radius: float) -> tuple[float, float, float]:
    """Centre at distance rho from the axis, on the wall z = rho/tan(half angle)."""
    return rho, 0.0, rho / math.tan(half_angle) + radius / math.sin(half_angle)


def circle_speed(rho: float, rise: float, k: float, radius: float, spin: float = 0.0) -> float:
    """Speed of the steady circle: (1+k) Omega^2 rho = z' (g - k a Omega w_n)."""
    a, b, c = (1.0 + k) * rho, rise * k * radius * spin, -rise * G
    return rho * (-b + math.sqrt(b * b - 4.0 * a * c)) / (2.0 * a)


@pytest.mark.parametrize(
    ("degrees", "rho", "k", "speed"), [(60.0, 0.30, SOLID, 1.1015), (80.0, 0.50, SHELL, 0.7202)], ids=["solid", "shell"]
)
def test_circular_orbit_in_a_cone(degrees: float, rho: float, k: float, speed: float) -> None:
    """v^2 = g r z'/(1+k): 0.845 times a sliding particle for a solid ball."""
    half = math.radians(degrees)
    scene, rolling = cone(half), ball(k=k)
    exact = math.sqrt(G * rho / math.tan(half) / (1.0 + k))
    assert exact == pytest.approx(speed, abs=5e-5)
    start = rolling_start(scene, rolling, above_cone(half, rho, rolling.radius), (0.0, exact, 0.0))
    run = roll(scene, rolling, start, 5.0)
    assert np.abs(np.hypot(run.x[:, 0], run.x[:, 1]) - rho).max() < 1e-9


@pytest.mark.parametrize(("spin", "rate"), [(-30.0, 5.0349), (25.0, 4.6989)])
def test_spin_changes_the_circular_orbit(spin: float, rate: float) -> None:
    half, rho = math.radians(50.0), 0.25
    scene, rolling = cone(half), ball()
    speed = circle_speed(rho, 1.0 / math.tan(half), SOLID, rolling.radius, spin)
    assert speed / rho == pytest.approx(rate, abs=5e-5)
    start = rolling_start(scene, rolling, above_cone(half, rho, rolling.radius), (0.0, speed, 0.0), spin)
    run = roll(scene, rolling, start, 3.0)
    assert np.abs(np.hypot(run.x[:, 0], run.x[:, 1]) - rho).max() < 1e-9
    assert np.abs(np.einsum("ij,ij->i", run.w, run.normal) - spin).max() < 1e-7


@pytest.mark.parametrize(("degrees", "ratio"), [(60.0, 1.5236), (30.0, 0.9820)])
def test_radial_against_orbital_frequency(degrees: float, ratio: float) -> None:
    """Without spin: sqrt(3 sin^2 + k/(1+k) cos^2) of the half angle; a particle has sqrt(3) sin."""
    half, rho = math.radians(degrees), 0.3
    exact = math.sqrt(3.0 * math.sin(half) ** 2 + SOLID / (1.0 + SOLID) * math.cos(half) ** 2)
    assert exact == pytest.approx(ratio, abs=5e-5)
    scene, rolling = cone(half), ball()
    speed = circle_speed(rho, 1.0 / math.tan(half), SOLID, rolling.radius)
    start = rolling_start(scene, rolling, above_cone(half, rho, rolling.radius), (0.0, 1.0001 * speed, 0.0))
    period = 2.0 * math.pi * rho / speed / exact
    times = np.concatenate([np.linspace(0.9, 1.1, 41), np.linspace(1.9, 2.1, 41)]) * period
    run = roll(scene, rolling, start, 2.2 * period, times)
    radial = np.einsum("ij,ij->i", run.x[:, :2], run.v[:, :2])[[state_at(run, t) for t in times]]
    # the radial speed passes zero upward once a period: at the nearest approach, where the ball started
    first = np.interp(0.0, radial[:41], times[:41])
    second = np.interp(0.0, radial[41:], times[41:])
    turning = np.unwrap(np.arctan2(run.x[:, 1], run.x[:, 0]))
    swept = np.interp(second, run.t, turning) - np.interp(first, run.t, turning)
    assert 2.0 * math.pi / swept == pytest.approx(exact, rel=1e-3)


def test_cone_keeps_areal_speed_and_turns_height_into_spin() -> None:
    """r^2 Omega = h is kept; w_n = w_n0 + (cot(half angle)/a) h (1/r - 1/r0)."""
    half, rho = math.radians(40.0), 0.2
    scene, rolling = cone(half), ball()
    start = rolling_start(scene, rolling, above_cone(half, rho, rolling.radius), (0.0, 1.4, 0.0), 20.0)
    run = roll(scene, rolling, start, 2.0)
    r = np.hypot(run.x[:, 0], run.x[:, 1])
    h = run.x[:, 0] * run.v[:, 1] - run.x[:, 1] * run.v[:, 0]
    spin = np.einsum("ij,ij->i", run.w, run.normal)
    assert np.abs(h / h[0] - 1.0).max() < 1e-10
    assert np.ptp(r) > 0.02
    assert np.abs(spin - 20.0 - h[0] / (math.tan(half) * rolling.radius) * (1.0 / r - 1.0 / rho)).max() < 1e-7


def test_paraboloid_turns_at_one_rate_at_every_height() -> None:
    """Centre surface z = c r^2: Omega^2 = 2 c g/(1+k) at every radius. A tiny ball: wall and centre surface as one."""
    scene, rolling = revolved(profiles.parabola((0.0, 1.0), 4.0)), ball(1e-5)
    for rho in (0.05, 0.2, 0.4):
        there = foot(scene, rolling, (rho, 0.0, 2.0 * rho**2))
        rise = -there.nx / there.nz
        speed = circle_speed(rho, rise, SOLID, rolling.radius)
        assert speed / rho == pytest.approx(5.2933, rel=1e-4)
        run = roll(scene, rolling, rolling_start(scene, rolling, (rho, 0.0, 2.0 * rho**2), (0.0, speed, 0.0)), 0.5)
        assert np.abs(np.hypot(run.x[:, 0], run.x[:, 1]) - run.x[0, 0]).max() < 1e-4 * rho


@pytest.mark.parametrize("rho", [0.15, 0.25])
def test_circular_orbit_in_a_funnel(rho: float) -> None:
    """Wall z = -c/rho; the slope of the centre surface is that of the wall under it."""
    scene, rolling = revolved(profiles.hyperbola((0.02, 1.0), 0.01)), ball()
    start = rolling_start(scene, rolling, (rho, 0.0, -0.01 / rho), (0.0, 0.0, 0.0))
    there = foot(scene, rolling, start.x)
    speed = circle_speed(float(start.x[0]), -there.nx / there.nz, SOLID, rolling.radius)
    run = roll(scene, rolling, rolling_start(scene, rolling, start.x, (0.0, speed, 0.0)), 1.0)
    assert np.abs(np.hypot(run.x[:, 0], run.x[:, 1]) - start.x[0]).max() < 1e-8


@pytest.mark.parametrize("k", [SOLID, SHELL])
def test_small_swing_in_a_bowl(k: float) -> None:
    """T = 2 pi sqrt((1+k)(R-a)/g); R 0.3 m, a 12.7 mm, solid: 1.2725 s. Amplitude 1e-3 rad adds 1/16 of its square."""
    scene, rolling, small = sphere(0.3), ball(k=k), 1e-3
    path = 0.3 - rolling.radius
    period = 2.0 * math.pi * math.sqrt((1.0 + k) * path / G)
    if k == SOLID:
        assert period == pytest.approx(1.2725, abs=5e-5)
    period *= 1.0 + small**2 / 16.0
    x = (path * math.sin(small), 0.0, -path * math.cos(small))
    run = roll(scene, rolling, rolling_start(scene, rolling, x, (0.0, 0.0, 0.0)), 1.1 * period, [0.25 * period, period])
    assert abs(run.x[state_at(run, 0.25 * period), 0]) < 1e-6 * path * small
    assert run.x[state_at(run, period), 0] == pytest.approx(path * math.sin(small), rel=1e-9)


@pytest.mark.parametrize("k", [0.2, SOLID, 0.5, SHELL])
@pytest.mark.parametrize("speed", [0.05, 0.3, 0.9])
def test_lift_off_from_a_dome(k: float, speed: float) -> None:
    """Cos = (2 + (1+k) F)/(3+k), F = v0^2/(g (R+a)): 10/17 for a solid ball from rest; spin as in Irodov 1.263."""
    scene, rolling = sphere(0.2, outside=True), ball(k=k)
    path = 0.2 + rolling.radius
    froude = speed**2 / (G * path)
    run = roll(scene, rolling, rolling_start(scene, rolling, (0.0, 0.0, path), (speed, 0.0, 0.0)), 3.0)
    left = event(run, EventKind.LIFT_OFF)
    cosine = left.x[2] / path
    assert cosine == pytest.approx((2.0 + (1.0 + k) * froude) / (3.0 + k), rel=TABLE)
    assert float(np.linalg.norm(left.v)) == pytest.approx(math.sqrt(G * path * cosine), rel=1e-8)
    if k == SOLID and speed == 0.05:
        assert cosine == pytest.approx(10.0 / 17.0, abs=5e-4)
        assert np.linalg.norm(left.w) == pytest.approx(math.sqrt(10.0 * G * path / 17.0) / rolling.radius, rel=5e-4)


def test_frictionless_dome_lets_go_at_two_thirds() -> None:
    scene, rolling = sphere(0.2, SLICK, outside=True), ball()
    path = 0.2 + rolling.radius
    run = roll(scene, rolling, rolling_start(scene, rolling, (0.0, 0.0, path), (0.01, 0.0, 0.0)), 3.0)
    froude = 1e-4 / (G * path)
    assert event(run, EventKind.LIFT_OFF).x[2] / path == pytest.approx((2.0 + froude) / 3.0, rel=TABLE)


def test_fast_ball_leaves_the_crest_at_once() -> None:
    scene, rolling = sphere(0.2, outside=True), ball()
    path = 0.2 + rolling.radius
    run = roll(
        scene, rolling, rolling_start(scene, rolling, (0.0, 0.0, path), (1.001 * math.sqrt(G * path), 0.0, 0.0)), 0.1
    )
    assert not np.isin(run.regime[1:], (0, 1)).any()


@pytest.mark.parametrize(("mu", "degrees"), [(0.1, 17.97), (0.2, 29.07), (0.3, 35.38), (0.5, 41.83), (1.0, 47.54)])
def test_slip_on_a_dome_starts_where_friction_runs_out(mu: float, degrees: float) -> None:
    """Mu = 2 sin/(17 cos - 10) for a solid ball from rest at the top (from memory, derived anew)."""
    scene, rolling = sphere(0.2, coulomb(mu), outside=True), ball()
    path = 0.2 + rolling.radius
    run = roll(scene, rolling, rolling_start(scene, rolling, (0.0, 0.0, path), (1e-3, 0.0, 0.0)), 3.0)
    assert happens(run, EventKind.LIFT_OFF)
    onset = event(run, EventKind.SLIP_ONSET)
    angle = math.atan2(onset.x[0], onset.x[2])
    assert math.degrees(angle) == pytest.approx(degrees, abs=6e-3)
    assert 2.0 * math.sin(angle) / (17.0 * math.cos(angle) - 10.0) == pytest.approx(mu, rel=1e-4)
    assert onset.t < event(run, EventKind.LIFT_OFF).t
