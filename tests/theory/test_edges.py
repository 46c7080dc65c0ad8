"""Loops, edges and holes against closed forms.

Sources: loop 27/10: Boston University notes (seen); sharp edge: derived; hole: free-flight rule, Penner, Can. J. Phys.
80, 83 (2002) by way of a public note (the number 1.31 m/s seen), Holmes, Am. J. Phys. 59, 129 (1991) (from memory).
"""

import math

import numpy as np
import pytest

from engine.contact.patches import END, HOLE, U_MAX, PatchList, Rectangle, Revolution, Tag
from engine.geometry import primitives, profiles
from engine.integrate.result import EventKind
from tests.rolls import SHELL, SOLID, STICKS, UP, G, ball, event, free_start, happens, roll, rolling_start, well

ALONG = (np.array([1.0, 0.0, 0.0]), np.array([0.0, 1.0, 0.0]))


def table(drop: float, edge_radius: float = 0.0):
    """Table top for x <= 0 with an edge, above a floor."""
    patches, tag = PatchList(), Tag(STICKS)
    top = patches.add_plane(Rectangle(np.zeros(3), *ALONG, (-math.inf, 0.0, -math.inf, math.inf)), tag)
    line = primitives.straight_between(np.array([0.0, -5.0, -edge_radius]), np.array([0.0, 5.0, -edge_radius]))
    patches.set_link(top, U_MAX, patches.add_swept_outside(line, edge_radius, tag=tag))
    patches.add_plane(Rectangle(np.array([0.0, 0.0, -drop]), *ALONG), tag)
    return patches.to_scene()


def hole(radius: float):
    """Level plane with a round hole about the origin, as deep as it may be, with a sharp rim."""
    patches, tag = PatchList(), Tag(STICKS)
    plane = patches.add_plane(Rectangle(np.zeros(3), *ALONG, hole=radius), tag)
    inside = patches.add_revolved(Revolution(profiles.line((radius, -5.0), (radius, 0.0)), np.zeros(3), UP, 1), tag)
    rim = patches.add_swept_outside(primitives.circle(np.zeros(3), UP, radius), 0.0, closed=True, tag=tag)
    patches.set_link(plane, HOLE, rim)
    patches.set_link(inside, END, rim)
    return patches.to_scene()


@pytest.mark.parametrize("k", [SOLID, SHELL])
@pytest.mark.parametrize("share", [0.9995, 1.0005])
def test_speed_that_just_goes_round_a_loop(k: float, share: float) -> None:
    """v_bottom^2 = g rho (1 + 4/(1+k)): released 2 rho + (1+k) rho/2 above, 27/10 rho for a solid ball."""
    scene, rolling = well(0.15, axis=(0.0, 1.0, 0.0)), ball(k=k)
    path = 0.15 - rolling.radius
    least = math.sqrt(G * path * (1.0 + 4.0 / (1.0 + k)))
    release = (1.0 + k) * least**2 / (2.0 * G) / path
    assert release == pytest.approx(2.7 if k == SOLID else 2.8333, abs=5e-5)
    if k == SOLID:
        assert least == pytest.approx(2.2789, abs=5e-5)
        assert release * path == pytest.approx(0.37071, abs=5e-6)
    start = rolling_start(scene, rolling, (0.0, 0.0, -path), (share * least, 0.0, 0.0))
    run = roll(scene, rolling, start, 0.5, spacing=1e-3)
    assert happens(run, EventKind.LIFT_OFF) is (share < 1.0)
    if share > 1.0:
        top = np.argmax(run.x[:, 2])
        assert np.linalg.norm(run.v[top]) == pytest.approx(math.sqrt(G * path), rel=5e-3)


@pytest.mark.parametrize(("radius", "speed"), [(0.0127, 0.3529), (0.021335, 0.4574)])
@pytest.mark.parametrize("share", [0.98, 1.02])
def test_sharp_edge_lets_a_fast_ball_fly_at_once(radius: float, speed: float, share: float) -> None:
    """Pivots first if v^2 < g a, flies at once otherwise; then it lands v sqrt(2 h/g) away."""
    exact = math.sqrt(G * radius)
    assert exact == pytest.approx(speed, abs=5e-5)
    scene, rolling = table(0.7), ball(radius)
    run = roll(scene, rolling, rolling_start(scene, rolling, (-0.05, 0.0, radius), (share * exact, 0.0, 0.0)), 1.0)
    left, landed = event(run, EventKind.LIFT_OFF), event(run, EventKind.TOUCH_DOWN)
    assert happens(run, EventKind.PATCH) is (share < 1.0)
    if share > 1.0:
        assert abs(left.x[0]) < 1e-12
        assert landed.x[0] == pytest.approx(share * exact * math.sqrt(1.4 / G), rel=1e-9)
    else:
        assert left.x[0] > 1e-3


@pytest.mark.parametrize("share", [0.98, 1.02])
def test_round_edge_lets_a_fast_ball_fly_at_once(share: float) -> None:
    """On an edge of radius b the limit is v^2 = g (a + b): 0.41427 m/s for a = 12.5 mm, b = 5 mm (derived)."""
    exact = math.sqrt(G * 0.0175)
    assert exact == pytest.approx(0.414266, abs=5e-7)
    scene, rolling = table(0.7, 0.005), ball(0.0125)
    run = roll(scene, rolling, rolling_start(scene, rolling, (-0.05, 0.0, 0.0125), (share * exact, 0.0, 0.0)), 1.0)
    assert happens(run, EventKind.PATCH) is (share < 1.0)


@pytest.mark.parametrize(
    ("radius", "hole_radius", "aside", "limit"),
    [
        (0.021335, 0.054, 0.0, 1.3138),
        (0.0127, 0.030, 0.0, 0.9294),
        (0.008, 0.020, 0.0, 0.7922),
        (0.021335, 0.054, 0.0135, 1.2436),
        (0.021335, 0.054, 0.027, 0.9877),
    ],
)
@pytest.mark.parametrize("share", [0.995, 1.005])
def test_capture_by_a_hole(radius: float, hole_radius: float, aside: float, limit: float, share: float) -> None:
    """Centred v = (2 R_h - a) sqrt(g/2a), by d off centre (sqrt(R_h^2 - d^2) + sqrt((R_h - a)^2 - d^2)) sqrt(g/2a).

    Below it the centre has dropped by a before the ball meets the far wall, above it has not: it meets the rim.
    """
    across = math.sqrt(hole_radius**2 - aside**2) + math.sqrt((hole_radius - radius) ** 2 - aside**2)
    exact = across * math.sqrt(G / (2.0 * radius))
    assert exact == pytest.approx(limit, abs=5e-5)
    scene, rolling = hole(hole_radius), ball(radius)
    start = rolling_start(scene, rolling, (-0.1, aside, radius), (share * exact, 0.0, 0.0))
    run = roll(scene, rolling, start, 0.2 + 0.1 / limit)
    touch = event(run, EventKind.TOUCH_DOWN)
    assert bool(touch.x[2] <= 0.0) is (share < 1.0)
    assert bool(touch.patch == 1) is (share < 1.0)


def test_wall_is_met_by_a_ball_that_falls_past_the_rim() -> None:
    scene, rolling = hole(0.03), ball(0.0127)
    run = roll(scene, rolling, free_start((-0.01, 0.0, -0.02), (0.5, 0.0, 0.0)), 0.2)
    touch = event(run, EventKind.TOUCH_DOWN)
    assert touch.x[0] == pytest.approx(0.03 - 0.0127, abs=1e-10)
    assert touch.t == pytest.approx((0.03 - 0.0127 + 0.01) / 0.5, abs=1e-10)
