"""A reference case rolled: samples at the asked times, fine samples for extremes, marks, and the state at any event."""

import math
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from engine.constants import VERIFY_TOLERANCE
from engine.contact.query import foot_on, is_inside
from engine.contact.surface import Scene
from engine.contact.walls import prepare
from engine.dynamics.state import FLIGHT, REST, ROLLING, SLIPPING, STATE, BallParams, Start
from engine.integrate import log as columns
from engine.integrate.record import Asked, Rows, roll_rows, start_row
from engine.integrate.result import EventKind, Status
from engine.reference.surfaces import scene_of

Array = NDArray[np.float64]
FINE = 2.5e-4
"""s. Spacing of the samples in which extremes and crossings are sought."""
TOUCHING = 1e-7
"""m. A ball this near to a wall at the start is on it."""
MODES = {ROLLING: "roll", SLIPPING: "slip", FLIGHT: "flight", REST: "rest"}
AFTER = 0.05
"""s. How long a case runs past its last sample or event."""


@dataclass(frozen=True)
class CaseRun:
    """What a case's own run left: ball, scene, raw rows, and the rows at the asked times."""

    ball: BallParams
    scene: Scene
    rows: Rows
    asked: Array

    @property
    def t(self) -> Array:
        """Times of all samples, s."""
        return self.rows.samples[:, columns.T]

    def at(self, t: float) -> Array:
        """Return the sample row at an asked time; after rest, the last one."""
        samples = self.rows.samples
        wanted = samples[:, columns.ASKED] == np.searchsorted(self.asked, t)
        return np.asarray(samples[np.flatnonzero(wanted)[0]] if wanted.any() else samples[-1])

    def marks(self, *kinds: EventKind) -> Array:
        """Return the event rows of these kinds."""
        marks = self.rows.marks
        return np.asarray(marks[np.isin(marks[:, columns.KIND], [int(kind) for kind in kinds])])

    def before(self, t: float) -> Array:
        """Return the sample just before the event at t: it carries the event's time and the old mode."""
        return np.asarray(self.rows.samples[int(np.searchsorted(self.t, t, side="left"))])


def ball_of(case: dict[str, Any]) -> BallParams:
    """Return the ball of a case with its drag."""
    ball = case["ball"]
    drag = (case.get("contact") or {}).get("drag") or {}
    area = math.pi * float(ball["r"]) ** 2
    cd = float(drag.get("Cd", 0.0)) * float(drag.get("area", area)) / area
    return BallParams(float(ball["r"]), float(ball["m"]), float(ball["k"]), cd, 0.0)


def touched_patch(scene: Scene, ball: BallParams, x: Array) -> int:
    """Return the patch that a ball centre touches, -1 for none."""
    walls = prepare(scene)
    for patch in range(len(scene.kind)):
        foot = foot_on(walls, patch, (x[0], x[1], x[2]), ball.radius, (-1, 0.0))
        if abs(foot.gap) < TOUCHING and is_inside(walls, patch, foot):
            return patch
    return -1


def start_of(case: dict[str, Any], scene: Scene, ball: BallParams) -> Start:
    """Return the start of a case; on a wall the kernels decide the regime from the state."""
    begin = case["start"]
    x, v, w = (np.array(begin[key], dtype=np.float64) for key in ("x", "v", "w"))
    patch = -1 if begin["mode"] == "flight" else touched_patch(scene, ball, x)
    regime = ROLLING if begin["mode"] == "roll" else -1
    return Start(float(begin.get("t", 0.0)), x, v, w, patch, 0.0, regime)


def asked_times(case: dict[str, Any]) -> Array:
    """Return the times of samples and events of a case, rising, each once."""
    wanted = [float(entry["t"]) for key in ("samples", "events") for entry in case.get(key) or []]
    return np.unique(np.array(wanted, dtype=np.float64))


def last_time(case: dict[str, Any], asked: Array) -> float:
    """Return the last time that a case speaks of, s: a sample, an event, or a number that is a time of its run."""
    times = [
        float(value)
        for name, value in (case.get("numbers") or {}).items()
        if isinstance(value, int | float) and name.endswith(("_time", "_at"))
    ]
    return max([0.0, *asked.tolist(), *times])


def run_case(case: dict[str, Any]) -> CaseRun:
    """Roll a case from its start to a little past its last sample or event."""
    scene, ball = scene_of(case), ball_of(case)
    asked = asked_times(case)
    end = last_time(case, asked) + AFTER
    start = start_of(case, scene, ball)
    rows = roll_rows(prepare(scene), ball, start_row(start), Asked(end, VERIFY_TOLERANCE, FINE, asked))
    return CaseRun(ball, scene, rows, asked)


def run_row(case: dict[str, Any], row: dict[str, Any]) -> tuple[str, float]:
    """Roll one row of a well map; return its outcome (exit, drop, stays) and the time of it (nan: stays).

    The start is x = (R - r, 0, 0), v = speed (0, cos, -sin) of the angle down, rolling without spin about the normal.
    """
    scene, ball = scene_of(case, float(row["mu"])), ball_of(case)
    numbers = case["numbers"]
    angle, speed = math.radians(float(row["down_angle_deg"])), float(row["speed"])
    v = speed * np.array([0.0, math.cos(angle), -math.sin(angle)])
    n = np.array([-1.0, 0.0, 0.0])
    x = np.array([float(case["surfaces"][0]["radius"]) - ball.radius, 0.0, 0.0])
    start = Start(0.0, x, v, np.cross(n, v) / ball.radius, touched_patch(scene, ball, x), 0.0, -1)
    end = float(numbers["t_max"])
    rows = roll_rows(prepare(scene), ball, start_row(start), Asked(end, VERIFY_TOLERANCE, FINE))
    return first_way_out(rows.samples, float(numbers["drop_depth"]))


def first_way_out(samples: Array, depth: float) -> tuple[str, float]:
    """Return which level the centre passes first, z = 0 upward or z = -depth, and when."""
    t, z, vz = samples[:, columns.T], samples[:, columns.Y + 2], samples[:, columns.Y + 5]
    out = np.flatnonzero((z[:-1] < 0.0) & (z[1:] >= 0.0))
    down = np.flatnonzero((z[:-1] > -depth) & (z[1:] <= -depth))
    first_out = crossing(t, z, vz, (int(out[0]), int(out[0]) + 1), 0.0) if len(out) else math.inf
    first_down = crossing(t, z, vz, (int(down[0]), int(down[0]) + 1), -depth) if len(down) else math.inf
    if math.isinf(first_out) and math.isinf(first_down):
        return "stays", math.nan
    return ("exit", first_out) if first_out < first_down else ("drop", first_down)


def crossing(t: Array, value: Array, rate: Array, pair: tuple[int, int], level: float) -> float:
    """Return when a quantity passes `level` between two samples, by a cubic through values and rates."""
    i, j = pair
    h = t[j] - t[i]
    if h <= 0.0:
        return float(t[i])
    a, b, c, d = value[i] - level, h * rate[i], value[j] - level, h * rate[j]
    roots = np.roots([2 * a + b - 2 * c + d, -3 * a - 2 * b + 3 * c - d, b, a])
    real = roots[np.abs(roots.imag) < 1e-9].real
    inside = real[(real > -1e-9) & (real < 1 + 1e-9)]
    return float(t[i] + h * (inside.min() if len(inside) else a / (a - c)))


def ended_at_rest(run: CaseRun) -> bool:
    """Return whether the run ended with the ball at rest."""
    return run.rows.status == Status.RESTED


def state_of(row: Array) -> tuple[Array, Array, Array]:
    """Return x, v, w of a sample row."""
    y = row[columns.Y : columns.Y + STATE]
    return y[0:3], y[3:6], y[6:9]


def state_of_mark(row: Array) -> tuple[Array, Array, Array]:
    """Return x, v, w of an event row."""
    y = row[columns.MARK_Y : columns.MARK_Y + STATE]
    return y[0:3], y[3:6], y[6:9]
