"""What a run of one ball leaves behind: outcomes, events, the recorded trajectory."""

from dataclasses import dataclass, field
from enum import IntEnum

import numpy as np


class Regime(IntEnum):
    """How the ball moves at a sample."""

    ROLLING = 0
    SLIPPING = 1
    FLIGHT = 2
    REST = 3


class EventKind(IntEnum):
    """What happened at an instant."""

    RELEASE = 0
    SLIP_ONSET = 1
    GRIP = 2
    LIFT_OFF = 3
    TOUCH_DOWN = 4
    PATCH = 5
    REST = 6
    ARRIVED = 7
    STOPPED = 8
    SLIP_REVERSAL = 9
    SETTLED = 10


class Status(IntEnum):
    """How the run ended; `STATUS_SENTENCES` has the words and the remedy."""

    ARRIVED = 0
    RESTED = 1
    ESCAPED = 2
    TIME_LIMIT = 3
    CHATTER = 4
    STEP_LIMIT = 5
    CANCELLED = 6
    NO_FIT = 7
    OUT_OF_BOUNDS = 8
    NOT_FINITE = 9


STATUS_SENTENCES = {
    Status.ARRIVED: "The ball arrives at the end of the run.",
    Status.RESTED: "The ball comes to rest and stays.",
    Status.ESCAPED: "The ball leaves the run and reaches the floor.",
    Status.TIME_LIMIT: "The ball is still moving at the time limit; look for an endless orbit or raise the limit.",
    Status.CHATTER: "The ball touches two walls at once, which one contact cannot follow; "
    "widen the corner or add a fillet larger than the ball.",
    Status.STEP_LIMIT: "The step count ran out; look for a place with far too small a radius.",
    Status.CANCELLED: "The run was cancelled.",
    Status.NO_FIT: "The ball does not fit into the wall it starts on; choose a larger bore or a smaller ball.",
    Status.OUT_OF_BOUNDS: "The ball leaves the site.",
    Status.NOT_FINITE: "A number of the design is too large or too small to compute with.",
}

LOSSES = ("slip", "rolling", "spin", "air", "impact")
"""Causes of energy loss, in the order of `Trajectory.loss`."""


@dataclass(frozen=True)
class Event:
    """One event: kind, time (s), state there (after it), patch, and a value
    (m/s: closing speed of a touch-down or slip speed).
    """

    kind: EventKind
    t: float
    x: np.ndarray
    v: np.ndarray
    w: np.ndarray
    patch: int
    value: float
    normal: np.ndarray = field(default_factory=lambda: np.zeros(3))


@dataclass(frozen=True)
class Trajectory:
    """The recorded run of one ball; every array has one row per sample.

    Attributes
    ----------
    t : (n,) s
    x, v, w : (n, 3) m, m/s, rad/s, world axes
    patch, element : (n,) int
        Patch in contact (-1 in flight); placed element the ball is in (last known one in flight).
    s, angle : (n,)
        Arc length along the element's curve, m (profile length on a vessel); wall angle phi, rad.
    regime : (n,) int, values of `Regime`
    normal : (n, 3) unit normal (zero in flight)
    normal_force : (n,) N
    slip_speed : (n,) m/s
    friction_ratio : (n,) |F|/N demanded while rolling, delivered while slipping
    margin : (n,) share of the way from the lip, 1 on the lowest line; nan where there is no lip
    loss : (n, 5) J, running losses in the order of `LOSSES`
    kinetic, potential : (n,) J
    correction : float
        Largest correction that put the state back on its constraint, m: an error estimate.
    """

    t: np.ndarray
    x: np.ndarray
    v: np.ndarray
    w: np.ndarray
    patch: np.ndarray
    element: np.ndarray
    s: np.ndarray
    angle: np.ndarray
    regime: np.ndarray
    normal: np.ndarray
    normal_force: np.ndarray
    slip_speed: np.ndarray
    friction_ratio: np.ndarray
    margin: np.ndarray
    loss: np.ndarray
    kinetic: np.ndarray
    potential: np.ndarray
    events: tuple[Event, ...]
    status: Status
    steps: int
    correction: float
