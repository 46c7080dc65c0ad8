"""Single walls and balls that tests roll on: plain surfaces built from patches, no document."""

import math

import numpy as np

from engine.constants import VERIFY_TOLERANCE
from engine.contact.patches import Law, PatchList, Rectangle, Revolution, Tag
from engine.contact.query import foot_on
from engine.contact.walls import prepare
from engine.dynamics.state import BallParams, Start
from engine.geometry import profiles
from engine.integrate.record import Asked, roll_scene
from engine.integrate.result import EventKind

G = 9.80665
SOLID, SHELL = 0.4, 2.0 / 3.0
STICKS = Law(static_friction=1e9, kinetic_friction=1e9, restitution=0.5)
"""Never slips."""
SLICK = Law(static_friction=0.0, kinetic_friction=0.0, restitution=0.5)
UP = np.array([0.0, 0.0, 1.0])
ANY = (np.int64(-1), 0.0)


def coulomb(mu: float, **others: float) -> Law:
    """Friction, the same at rest and sliding."""
    return Law(static_friction=mu, kinetic_friction=mu, **others)


def ball(radius: float = 0.0127, k: float = SOLID, mass: float = 0.0668) -> BallParams:
    return BallParams(radius, mass, k, 0.0, 0.0)


def revolved(meridian, law: Law = STICKS, axis=UP, side: int = 1):
    """One surface of revolution about an axis through the origin."""
    patches = PatchList()
    patches.add_revolved(Revolution(meridian, np.zeros(3), np.asarray(axis, dtype=float), side), Tag(law))
    return patches.to_scene()


def well(radius: float, law: Law = STICKS, axis=UP):
    """Endless cylinder, ball inside."""
    return revolved(profiles.line((radius, -50.0), (radius, 50.0)), law, axis)


def cone(half_angle: float, law: Law = STICKS):
    """Cone with its apex at the origin, ball above the wall."""
    return revolved(profiles.line((0.0, 0.0), (5.0, 5.0 / math.tan(half_angle))), law)


def sphere(radius: float, law: Law = STICKS, outside: bool = False):
    """Sphere about the origin, ball inside (bowl) or outside (dome)."""
    return revolved(profiles.arc((0.0, 0.0), radius, (-0.5 * math.pi, 0.5 * math.pi)), law, side=-1 if outside else 1)


def slope(angle: float = 0.0, law: Law = STICKS):
    """Endless plane through the origin that falls toward +x by `angle`."""
    patches = PatchList()
    u = np.array([math.cos(angle), 0.0, -math.sin(angle)])
    patches.add_plane(Rectangle(np.zeros(3), u, np.array([0.0, 1.0, 0.0])), Tag(law))
    return patches.to_scene()


def foot(scene, rolling: BallParams, x):
    """Foot of a ball centre on the first patch."""
    return foot_on(prepare(scene), 0, tuple(float(part) for part in x), rolling.radius, ANY)


def resting_on(scene, rolling: BallParams, x):
    """Centre moved along the normal onto the first patch, and the normal there."""
    there = foot(scene, rolling, x)
    n = np.array([there.nx, there.ny, there.nz])
    return np.asarray(x, dtype=float) - there.gap * n, n


def rolling_start(scene, rolling: BallParams, x, v, spin: float = 0.0) -> Start:
    """Start on the first patch, rolling with velocity v and `spin` rad/s about the normal."""
    x, n = resting_on(scene, rolling, x)
    v = np.asarray(v, dtype=float)
    return Start(0.0, x, v, np.cross(n, v) / rolling.radius + spin * n, 0, 0.0, 0)


def free_start(x, v, w=(0.0, 0.0, 0.0)) -> Start:
    """Start in the air."""
    return Start(0.0, np.array(x, dtype=float), np.array(v, dtype=float), np.array(w, dtype=float), -1, 0.0, -1)


def sliding_start(scene, rolling: BallParams, x, v, w=(0.0, 0.0, 0.0)) -> Start:
    """Start on the first patch with any spin."""
    x, _ = resting_on(scene, rolling, x)
    return Start(0.0, x, np.array(v, dtype=float), np.array(w, dtype=float), 0, 0.0, -1)


def roll(scene, rolling: BallParams, start: Start, end: float, times=(), spacing: float = 0.0):
    """Roll at the tight tolerance; `spacing` 0 keeps the samples of the steps and the asked times only."""
    asked = Asked(end, VERIFY_TOLERANCE, spacing, np.asarray(times, dtype=float))
    return roll_scene(scene, rolling, start, asked)


def state_at(trajectory, t: float):
    """Index of the sample at an asked time."""
    return int(np.argmin(np.abs(trajectory.t - t)))


def event(trajectory, kind: EventKind, index: int = 0):
    """The index-th event of a kind."""
    return [entry for entry in trajectory.events if entry.kind == kind][index]


def happens(trajectory, kind: EventKind) -> bool:
    return any(entry.kind == kind for entry in trajectory.events)
