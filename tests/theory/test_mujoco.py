"""Planes and an impact against MuJoCo, an independent engine (package `mujoco`).

MuJoCo has soft contacts: a ball sinks in by some micrometres and slip never ends quite. Rolling and sliding speeds are
therefore compared to 1e-4, about ten times what was measured, and places on a slope to 1e-3. Its rebound follows from
stiffness and damping; the restitution is taken from its own normal motion, and what is compared is the change along
the floor of an impact that slides all through, to 0.5 %: the contact lasts a third of a millisecond there, no time
here, and weight adds 0.2 % to the impulse. Slip must stay large to the end: their friction is damped and gives way
where it is slow.
"""

import math

import mujoco
import numpy as np
import pytest

from engine.integrate.result import EventKind
from tests.rolls import G, ball, coulomb, event, free_start, roll, rolling_start, sliding_start, slope

RADIUS, MASS = 0.0127, 0.0668


def simulate(friction: float, start, end: float, *, step: float = 1e-4, tilt: float = 0.0, contact: str = ""):
    """Rows t, x (3), v (3), w (3) of a solid ball above a plane in MuJoCo. `start` = x, v, w; `tilt` deg toward +x."""
    contact = contact or 'solref="0.002 1" solimp="0.99 0.999 0.001 0.5 2"'
    rubs = f'friction="{friction} 0 0" condim="3" {contact}'
    model = mujoco.MjModel.from_xml_string(
        f"""<mujoco><option timestep="{step}" gravity="0 0 -{G}" integrator="RK4" cone="elliptic" impratio="100"
        tolerance="1e-14" iterations="200"/><worldbody><geom type="plane" size="50 50 1" euler="0 {tilt} 0" {rubs}/>
        <body><freejoint/><geom type="sphere" size="{RADIUS}" mass="{MASS}" {rubs}/></body></worldbody></mujoco>"""
    )
    state = mujoco.MjData(model)
    state.qpos[:3], state.qvel[:3], state.qvel[3:] = start
    rows = []
    while state.time < end:
        mujoco.mj_step(model, state)
        rows.append([state.time, *state.qpos[:3], *state.qvel])
    return np.array(rows)


@pytest.mark.parametrize("degrees", [2.0, 10.0, 25.0])
def test_rolling_down_a_slope(degrees: float) -> None:
    angle = math.radians(degrees)
    normal = np.array([math.sin(angle), 0.0, math.cos(angle)])
    theirs = simulate(0.5, (RADIUS * normal, np.zeros(3), np.zeros(3)), 0.5, tilt=degrees)[-1]
    scene, rolling = slope(angle, coulomb(0.5)), ball(RADIUS, mass=MASS)
    run = roll(scene, rolling, rolling_start(scene, rolling, RADIUS * normal, np.zeros(3)), float(theirs[0]))
    assert np.linalg.norm(run.v[-1]) == pytest.approx(np.linalg.norm(theirs[4:7]), rel=1e-4)
    assert run.x[-1, 0] == pytest.approx(theirs[1], rel=1e-3)


@pytest.mark.parametrize("spin", [0.0, -150.0])
def test_slide_to_roll(spin: float) -> None:
    start = (np.array([0.0, 0.0, RADIUS]), np.array([2.0, 0.3, 0.0]), np.array([0.0, spin, 0.0]))
    theirs = simulate(0.2, start, 1.2)[-1]
    scene, rolling = slope(law=coulomb(0.2)), ball(RADIUS, mass=MASS)
    run = roll(scene, rolling, sliding_start(scene, rolling, *start), float(theirs[0]))
    assert run.v[-1, :2] == pytest.approx(theirs[4:6], rel=1e-4)
    assert run.x[-1, :2] == pytest.approx(theirs[1:3], rel=1e-4)


@pytest.mark.parametrize("across", [4.0, 6.0])
def test_impact_that_slides(across: float) -> None:
    start = (np.array([0.0, 0.0, 1e-3 + RADIUS]), np.array([across, 0.0, -1.4]), np.zeros(3))
    stiff = 'solref="-1e8 -3000" solimp="0.9 0.9 0.001 0.5 2"'
    theirs = simulate(0.2, start, 0.002, step=1e-6, contact=stiff)
    turned = int(np.flatnonzero((theirs[1:, 6] > 0.0) & (theirs[:-1, 6] < 0.0))[0])
    after = turned + int(np.argmax(theirs[turned:, 6]))
    restitution = -theirs[after, 6] / theirs[:after, 6].min()
    run = roll(slope(law=coulomb(0.2, restitution=restitution)), ball(RADIUS, mass=MASS), free_start(*start), 0.2)
    hit = event(run, EventKind.TOUCH_DOWN)
    assert across - hit.v[0] == pytest.approx(across - theirs[after, 4], rel=5e-3)
    assert hit.w[1] == pytest.approx(theirs[after, 8], rel=5e-3)
    assert across - hit.v[0] > 0.4
