"""A reference case rolled: samples at the asked times, fine samples for extremes and crossings, and the marks."""

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from engine.constants import VERIFY_TOLERANCE
from engine.contact.query import foot_on, is_inside
from engine.contact.surface import Scene
from engine.contact.walls import prepare
from engine.dynamics.state import FLIGHT, REST, ROLLING, SLIPPING, STATE, BallParams, Start
from engine.errors import TrundleError
from engine.integrate import log as columns
from engine.integrate.record import Asked, Rows, roll_rows, start_row
from engine.integrate.result import EventKind, Status
from engine.reference.cases import Case
from engine.reference.reader import Array, Record
from engine.reference.surfaces import scene_of

FINE, FINE_ROWS = 2.5e-4, 40_000
"""s. Spacing of the samples in which extremes and crossings are sought, and how many of them a long run has."""
ROW_SPACING = 1e-3
"""s. Spacing of the samples of a map's row."""
TOUCHING = 1e-7
"""m. A ball this near to a wall at the start is on it."""
AFTER = 0.05
"""s. How long a case runs past its last sample or event."""
MODES = {ROLLING: "roll", SLIPPING: "slip", FLIGHT: "flight", REST: "rest"}
HORIZONS = ("stop_time", "spin_stop_time", "slide_time", "period")
"""Numbers that are times of the case's own run: it is followed until then."""
STENCIL = 4
"""Samples through which a value between samples is interpolated."""


class UnfitCaseError(TrundleError):
    """A case cannot be set up: the ball does not touch the wall that it should start on."""


@dataclass(frozen=True)
class Moment:
    """State of the run at an instant: t s, x m, v m/s, w rad/s."""

    t: float
    x: Array
    v: Array
    w: Array


@dataclass(frozen=True)
class CaseRun:
    """What a case's own run left: the case, ball, scene, raw rows, and the asked times."""

    case: Case
    ball: BallParams
    scene: Scene
    rows: Rows
    asked: Array

    @property
    def t(self) -> Array:
        """Times of all samples, s."""
        return self.rows.samples[:, columns.T]

    @property
    def span(self) -> Array:
        """Sample rows up to the last sample of the case (of its last event where it has none)."""
        listed = [sample.t for sample in self.case.samples] or [event.state.t for event in self.case.events]
        return np.asarray(self.rows.samples[self.t <= max(listed, default=math.inf) + 1e-12])

    def at(self, t: float) -> Array | None:
        """Return the sample row at an asked time; at rest the last one; None when the run did not come so far."""
        samples = self.rows.samples
        found = np.flatnonzero(samples[:, columns.ASKED] == np.searchsorted(self.asked, t))
        if len(found):
            return np.asarray(samples[found[0]])
        return np.asarray(samples[-1]) if self.rows.status == Status.RESTED else None

    def marks(self, *kinds: EventKind) -> Array:
        """Return the event rows of these kinds."""
        marks = self.rows.marks
        return np.asarray(marks[np.isin(marks[:, columns.KIND], [int(kind) for kind in kinds])])

    def before(self, mark: Array) -> Array:
        """Return the sample just before an event: it carries the event's time and the old mode."""
        return np.asarray(self.rows.samples[int(np.searchsorted(self.t, mark[columns.MARK_T], side="left"))])

    def crossing(self, value: Callable[[Array], Array], rising: bool, index: int = 0) -> Moment | None:
        """Return when `value` of the sample rows passes zero for the index-th time (0: first) in one sense."""
        rows = self.rows.samples[np.concatenate([[True], np.diff(self.t) > 0.0])]
        values = value(rows) * (1.0 if rising else -1.0)
        passed = np.flatnonzero((values[1:-1] < 0.0) & (values[2:] >= 0.0)) + 1
        if index >= len(passed):
            return None
        i = int(passed[index])
        near = rows[i - 1 : i - 1 + STENCIL]
        t = _root(near[:, columns.T], values[i - 1 : i - 1 + STENCIL], (rows[i, columns.T], rows[i + 1, columns.T]))
        return moment_of(lagrange(near[:, columns.T], t) @ near[:, columns.Y : columns.Y + STATE], t)


def lagrange(nodes: Array, t: float) -> Array:
    """Return the weights at t of the polynomial through values at `nodes`: products of (t - t_j)/(t_i - t_j)."""
    own = np.eye(len(nodes), dtype=bool)
    ahead = np.where(own, 1.0, t - nodes[None, :])
    apart = np.where(own, 1.0, nodes[:, None] - nodes[None, :])
    return np.asarray((ahead / apart).prod(axis=1))


def _root(nodes: Array, values: Array, bracket: tuple[float, float]) -> float:
    """Return where the polynomial through values at `nodes` passes zero within a bracket, by halving."""
    low, high = bracket
    for _ in range(60):
        middle = 0.5 * (low + high)
        if float(lagrange(nodes, middle) @ values) < 0.0:
            low = middle
        else:
            high = middle
    return high


def moment_of(y: Array, t: float) -> Moment:
    """Return the moment of a state (13,) at t."""
    return Moment(float(t), y[0:3], y[3:6], y[6:9])


def moment_of_sample(row: Array) -> Moment:
    """Return the moment of a sample row."""
    return moment_of(row[columns.Y : columns.Y + STATE], row[columns.T])


def moment_of_mark(row: Array) -> Moment:
    """Return the moment of an event row, just after the event."""
    return moment_of(row[columns.MARK_Y : columns.MARK_Y + STATE], row[columns.MARK_T])


def ball_of(case: Case) -> BallParams:
    """Return the ball of a case; its drag coefficient is referred to its own cross-section."""
    if case.ball is None:
        raise UnfitCaseError("the case has no ball")
    radius, mass, inertia = case.ball
    own = math.pi * radius**2
    area = case.contact.area or own
    return BallParams(radius, mass, inertia, case.contact.drag * area / own, 0.0)


def touched_patch(scene: Scene, ball: BallParams, x: Array) -> int:
    """Return the patch that a ball centre touches.

    Raises
    ------
    UnfitCaseError
        When it touches none.
    """
    walls, nearest = prepare(scene), math.inf
    for patch in range(len(scene.kind)):
        foot = foot_on(walls, patch, (x[0], x[1], x[2]), ball.radius, (-1, 0.0))
        if is_inside(walls, patch, foot):
            nearest = min(nearest, abs(foot.gap))
            if abs(foot.gap) < TOUCHING:
                return patch
    raise UnfitCaseError(f"the ball starts {nearest:.3g} m away from the nearest wall, not on it")


def asked_times(case: Case) -> Array:
    """Return the times of samples and events of a case, rising, each once."""
    return np.unique([state.t for state in (*case.samples, *(event.state for event in case.events))]).astype(np.float64)


def _end_of(case: Case, asked: Array) -> float:
    """Return until when a case is followed, s."""
    numbers = [case.numbers[key] for key in HORIZONS if isinstance(case.numbers.get(key), int | float)]
    return float(max([*asked, *numbers], default=0.0)) + AFTER


def run_case(case: Case) -> CaseRun:
    """Roll a case from its start to a little past its last sample or event."""
    begin, ball, asked = case.start, ball_of(case), asked_times(case)
    if begin is None or begin.x is None or begin.v is None or begin.w is None:
        raise UnfitCaseError("the case has no start")
    end = _end_of(case, asked)
    speed = float(np.linalg.norm(begin.v))
    scene = scene_of(case, ball.radius, speed * end + 0.5 * case.gravity * end**2)
    flying = begin.mode == "flight"
    patch = -1 if flying else touched_patch(scene, ball, begin.x)
    regime = ROLLING if begin.mode == "roll" else -1
    start = Start(begin.t, begin.x, begin.v, begin.w, patch, 0.0, regime)
    spacing = max(FINE, (end - begin.t) / FINE_ROWS)
    rows = roll_rows(prepare(scene), ball, start_row(start), Asked(end, VERIFY_TOLERANCE, spacing, asked))
    # within a step the asked times come before the evenly spaced ones; the two samples of an event keep their order
    in_order = np.argsort(rows.samples[:, columns.T], kind="stable")
    return CaseRun(case, ball, scene, rows._replace(samples=rows.samples[in_order]), asked)


def run_row(case: Case, row: Record) -> tuple[str, float]:
    """Roll one row of a well map; return its outcome (exit, drop, stays) and the time of it (nan: stays).

    The start is x = (R - r, 0, 0), v = speed (0, cos, -sin) of the angle down, rolling without spin about the normal.
    """
    ball = ball_of(case)
    cylinder = next(surface for surface in case.surfaces if surface["type"] == "cylinder")
    end, depth = float(case.numbers["t_max"]), float(case.numbers["drop_depth"])
    scene = scene_of(case, ball.radius, 0.0, float(row["mu"]))
    angle, speed = math.radians(float(row["down_angle_deg"])), float(row["speed"])
    v = speed * np.array([0.0, math.cos(angle), -math.sin(angle)])
    n = np.array([-1.0, 0.0, 0.0])
    x = np.array([cylinder["radius"] - ball.radius, 0.0, 0.0])
    start = Start(0.0, x, v, np.cross(n, v) / ball.radius, touched_patch(scene, ball, x), 0.0, -1)
    rows = roll_rows(prepare(scene), ball, start_row(start), Asked(end, VERIFY_TOLERANCE, ROW_SPACING))
    return first_way_out(rows.samples, depth)


def first_way_out(samples: Array, depth: float) -> tuple[str, float]:
    """Return which level the centre passes first, z = 0 upward or z = -depth, and when (s)."""
    t, z, vz = samples[:, columns.T], samples[:, columns.Y + 2], samples[:, columns.Y + 5]
    out = np.flatnonzero((z[:-1] < 0.0) & (z[1:] >= 0.0))
    down = np.flatnonzero((z[:-1] > -depth) & (z[1:] <= -depth))
    first_out = level_passed(t, z, vz, (out[0], 0.0)) if len(out) else math.inf
    first_down = level_passed(t, z, vz, (down[0], -depth)) if len(down) else math.inf
    if math.isinf(first_out) and math.isinf(first_down):
        return "stays", math.nan
    return ("exit", first_out) if first_out < first_down else ("drop", first_down)


def level_passed(t: Array, value: Array, rate: Array, place: tuple[int, float]) -> float:
    """Return when a quantity passes a level between samples i and i+1, by the cubic through values and rates, s."""
    i, level = place
    h = float(t[i + 1] - t[i])
    a, b, c, d = value[i] - level, h * rate[i], value[i + 1] - level, h * rate[i + 1]
    low, high = 0.0, 1.0
    for _ in range(60):
        q = 0.5 * (low + high)
        here = a + q * (b + q * (3.0 * (c - a) - 2.0 * b - d + q * (2.0 * (a - c) + b + d)))
        if (here > 0.0) == (a > 0.0):
            low = q
        else:
            high = q
    return float(t[i] + h * high)
