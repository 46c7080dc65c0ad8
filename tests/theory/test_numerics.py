"""The numbers behind the motion: order of the step and of its continuous extension, energy, bookkeeping, determinism.

Orders: Dormand and Prince 8(5,3) with a seventh-order continuous extension; Hairer, Norsett and Wanner, Solving
Ordinary Differential Equations I, II.5 and II.6.
"""

import math
from concurrent.futures import ThreadPoolExecutor

import numpy as np
import pytest

from engine.constants import TOLERANCE
from engine.contact.patches import Law, PatchList, Tag
from engine.contact.walls import prepare
from engine.dynamics.rates import rates
from engine.dynamics.state import ROLLING, Mode
from engine.geometry import primitives
from engine.geometry.pose import pose_at
from engine.integrate.record import Asked, roll_rows, roll_scene, start_row
from engine.integrate.result import Status
from engine.integrate.step import dense_at, fill_dense, new_work, try_step, warm_start
from engine.integrate.tableau import STAGES
from tests.rolls import ANY, SOLID, G, ball, coulomb, rolling_start, sphere, well

BORE, SPEED = 0.15, 2.0
ROLLS = Mode(0, ROLLING, 0, 1)


def exact(rolling, t: float, bore: float = BORE, speed: float = SPEED) -> np.ndarray:
    """Centre of a ball in an upright cylinder after a level entry (closed form)."""
    path = bore - rolling.radius
    rate = speed / path
    middle = -G / (rolling.inertia_factor * rate**2)
    bobbing = rate * math.sqrt(rolling.inertia_factor / (1.0 + rolling.inertia_factor))
    return np.array([path * math.cos(rate * t), path * math.sin(rate * t), middle * (1.0 - math.cos(bobbing * t))])


def stepped(steps: int, span: float, share: float = 1.0) -> float:
    """Error of the centre after equal steps over `span`, read at a share of the last step, m."""
    rolling, scene = ball(), well(BORE)
    start = rolling_start(scene, rolling, (BORE - rolling.radius, 0.0, 0.0), (0.0, SPEED, 0.0))
    walls, work, h = prepare(scene), new_work(), span / steps
    work.y0[:] = start_row(start)[5:18]
    contact = rates(walls, rolling, ROLLS, work.y0, ANY, work.k[0])
    for step in range(steps):
        piece, q = warm_start(walls, ROLLS, contact.foot)
        plan = (h, 1.0, piece, q)
        _, contact = try_step(walls, rolling, ROLLS, work, plan)
        if step == steps - 1:
            fill_dense(walls, rolling, ROLLS, work, plan)
            dense_at(work, share, work.trial)
            return float(np.linalg.norm(work.trial[:3] - exact(rolling, (steps - 1 + share) * h)))
        work.y0[:] = work.y1
        work.k[0] = work.k[STAGES]
    raise AssertionError("no steps")


def test_observed_order_of_the_step() -> None:
    errors = [stepped(steps, 0.8) for steps in (10, 14, 20)]
    pairs = zip(errors, errors[1:], (1.4, 20 / 14), strict=False)
    orders = [math.log(coarse / fine) / math.log(finer) for coarse, fine, finer in pairs]
    assert errors[-1] > 1e-13
    assert min(orders) > 7.3


@pytest.mark.parametrize("share", [0.25, 0.5, 0.9])
def test_observed_order_of_the_continuous_extension(share: float) -> None:
    """Within one step the error falls as h^8: a seventh-order extension."""
    coarse, fine = stepped(1, 0.1, share), stepped(1, 0.05, share)
    assert fine > 1e-15
    assert math.log2(coarse / fine) > 7.0


def test_error_follows_the_tolerance() -> None:
    """In a narrow well, where the tolerance and not the longest step sets the size of steps."""
    rolling, scene = ball(), well(0.04)
    start = rolling_start(scene, rolling, (0.04 - rolling.radius, 0.0, 0.0), (0.0, 2.0 * SPEED, 0.0))
    errors = []
    for tolerance in (1e-5, 1e-7, 1e-9):
        run = roll_scene(scene, rolling, start, Asked(5.0, tolerance, 0.0))
        errors.append(float(np.linalg.norm(run.x[-1] - exact(rolling, 5.0, 0.04, 2.0 * SPEED))))
    assert errors[0] < 1e-2
    assert errors[1] < 0.1 * errors[0] and errors[2] < 0.1 * errors[1]


def test_energy_does_not_drift_without_losses() -> None:
    """A minute in a bowl with spin, at the usual tolerance: the drift is below 1e-7 of the motion."""
    rolling, scene = ball(), sphere(0.2)
    start = rolling_start(scene, rolling, (0.15, 0.0, -0.11), (0.0, 0.9, 0.0), 30.0)
    run = roll_scene(scene, rolling, start, Asked(60.0, TOLERANCE))
    energy = run.kinetic + run.potential
    assert np.abs(energy - energy[0]).max() < 1e-7 * np.ptp(run.kinetic)
    assert run.correction < 1e-9
    assert run.loss[-1].sum() < 1e-9 * np.ptp(run.kinetic)


def helix_tube(law: Law):
    """Two turns of a helical tube in air, and a ball at rest near its top, a little off the lowest line."""
    patches = PatchList()
    table = primitives.helix(pose_at((0.12, 0.0, 0.0), 0.5 * math.pi, 0.1 / (2.0 * math.pi * 0.12)), 0.12, 12.0, 1.2)
    patches.add_swept_inside(table, 0.03, tag=Tag(law))
    scene, rolling = patches.to_scene(air=(1.2, 1.8e-5)), ball()._replace(drag_coefficient=-1.0)
    return scene, rolling, rolling_start(scene, rolling, (0.13, 0.03, -0.016), (0.0, 0.0, 0.0))


def test_losses_add_up_to_the_drop() -> None:
    """Kinetic + potential + losses to slip, rolling, spin, air stay, to 1e-6 of the energy turned over."""
    law = coulomb(0.15, rolling_loss=0.004, spin_arm=1e-5)
    run = roll_scene(*helix_tube(law), Asked(3.0, TOLERANCE))
    total = run.kinetic + run.potential + run.loss.sum(axis=1)
    turned_over = run.potential[0] - run.potential[-1]
    assert turned_over > 0.1
    assert (run.loss[-1, :4] > 1e-4 * turned_over).all()
    assert np.abs(total - total[0]).max() < 1e-6 * turned_over


def test_losses_never_run_backward() -> None:
    law = coulomb(0.15, rolling_loss=0.004, spin_arm=1e-5)
    run = roll_scene(*helix_tube(law), Asked(3.0, TOLERANCE))
    ordered = np.argsort(run.t, kind="stable")
    assert np.diff(run.loss[ordered], axis=0).min() > -1e-9 * run.kinetic.max()


def test_spin_friction_and_more_friction_make_a_slower_ball() -> None:
    """In a helix more friction makes a slower ball (independent solutions: 3.0, 2.4, 2.0 m/s at 6 s)."""
    speeds = []
    for mu in (0.1, 0.2, 0.3):
        scene, rolling, start = helix_tube(coulomb(mu))
        run = roll_scene(scene, rolling._replace(drag_coefficient=0.0), start, Asked(3.0, TOLERANCE))
        speeds.append(float(np.linalg.norm(run.v[-1])))
    assert speeds[0] > speeds[1] > speeds[2]


@pytest.mark.parametrize("threads", [1, 2, 4])
def test_same_bits_on_any_number_of_threads(threads: int) -> None:
    law = coulomb(0.15, rolling_loss=0.004, spin_arm=1e-5)
    scene, rolling, start = helix_tube(law)
    walls, row = prepare(scene), start_row(start)

    def run(_: int) -> bytes:
        rows = roll_rows(walls, rolling, row, Asked(2.0, TOLERANCE))
        assert rows.status == Status.TIME_LIMIT
        return rows.samples.tobytes() + rows.marks.tobytes()

    alone = run(0)
    with ThreadPoolExecutor(threads) as pool:
        assert set(pool.map(run, range(8))) == {alone}


@pytest.mark.parametrize("k", [SOLID, 0.6])
def test_position_after_ten_seconds(k: float) -> None:
    """At the usual tolerance the path is good to a micrometre after ten seconds."""
    rolling, scene = ball(k=k), well(BORE)
    start = rolling_start(scene, rolling, (BORE - rolling.radius, 0.0, 0.0), (0.0, SPEED, 0.0))
    run = roll_scene(scene, rolling, start, Asked(10.0, TOLERANCE, 0.0))
    assert np.linalg.norm(run.x[-1] - exact(rolling, 10.0)) < 1e-6
