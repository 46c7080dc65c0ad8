"""From a scene and a start to a `Trajectory`: the door through which everything else rolls a ball."""

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from engine.constants import TIME_LIMIT, TOLERANCE
from engine.contact.surface import SWEPT_INSIDE, Scene
from engine.contact.walls import Walls, prepare
from engine.dynamics.state import STATE, BallParams, Start
from engine.integrate import log as columns
from engine.integrate.result import Event, EventKind, Status, Trajectory
from engine.integrate.solve import Options, solve

Array = NDArray[np.float64]
NEVER = np.zeros(1, dtype=np.uint8)
"""Cancel flag that nobody sets."""
NO_TIMES = np.zeros(0)
SAMPLE_SPACING = 0.004
"""s. Samples at most this far apart, so that drawings and charts are smooth."""
RESUME = 5 + STATE + 2
"""Length of a start row, see `integrate.solve.solve`."""


class Asked(NamedTuple):
    """What a run should do and record: end s, tolerance, sample spacing s (0: steps only), asked times s."""

    end: float = TIME_LIMIT
    tolerance: float = TOLERANCE
    spacing: float = SAMPLE_SPACING
    times: Array = NO_TIMES


class Rows(NamedTuple):
    """Raw outcome: samples (n, SAMPLE), events (m, MARK), status, steps, largest correction m."""

    samples: Array
    marks: Array
    status: int
    steps: int
    correction: float


def start_row(start: Start) -> Array:
    """Return the kernel's start row for a `Start`; regime -1 lets the state decide."""
    row = np.zeros(RESUME)
    row[0], row[1], row[2], row[3], row[4] = start.t, start.patch, start.regime, -1.0, 1.0
    row[5:8], row[8:11], row[11:14] = start.x, start.v, start.w
    row[6 + STATE] = start.patch
    return row


def resume_row(mark: Array) -> Array:
    """Return the start row that goes on from an event row."""
    row = np.zeros(RESUME)
    mode = mark[columns.MODE : columns.MODE + 4]
    row[0], row[1:5] = mark[columns.MARK_T], mode
    row[5 : 5 + STATE] = mark[columns.MARK_Y : columns.MARK_Y + STATE]
    row[5 + STATE] = mark[columns.MARK_IMPACT]
    row[6 + STATE] = mode[0] if mode[0] >= 0 else mark[columns.MARK_PATCH]
    return row


def roll_rows(walls: Walls, ball: BallParams, row: Array, asked: Asked, cancel: NDArray[np.uint8] = NEVER) -> Rows:
    """Roll from a start row and return the raw rows."""
    options = Options(float(asked.end), float(asked.tolerance), float(asked.spacing))
    log, status, steps, correction = solve(walls, ball, row, options, asked.times, cancel)
    return Rows(log.samples[: log.n_samples], log.marks[: log.n_marks], int(status), int(steps), float(correction))


def roll_scene(scene: Scene, ball: BallParams, start: Start, asked: Asked) -> Trajectory:
    """Roll one ball through a scene.

    Parameters
    ----------
    scene : Scene
    ball : BallParams
    start : Start
    asked : Asked

    Returns
    -------
    Trajectory
    """
    return trajectory(scene, ball, roll_rows(prepare(scene), ball, start_row(start), asked))


def trajectory(scene: Scene, ball: BallParams, rows: Rows) -> Trajectory:
    """Return the recorded run in named arrays, energies in joule."""
    a, mass = rows.samples, ball.mass
    y = a[:, columns.Y : columns.Y + STATE]
    x, v, w = y[:, 0:3], y[:, 3:6], y[:, 6:9]
    patch = a[:, columns.PATCH].astype(np.int64)
    loss = np.column_stack([y[:, 9:13], a[:, columns.IMPACT]]) * mass
    inertia = ball.inertia_factor * mass * ball.radius**2
    force = a[:, columns.FORCE]
    acting = np.where(a[:, columns.REGIME] == 0, a[:, columns.NEED], a[:, columns.FRICTION])
    return Trajectory(
        t=a[:, columns.T],
        x=x,
        v=v,
        w=w,
        patch=patch,
        element=_elements(scene, patch),
        s=a[:, columns.S],
        angle=a[:, columns.ANGLE],
        regime=a[:, columns.REGIME].astype(np.int64),
        normal=a[:, columns.NORMAL : columns.NORMAL + 3],
        normal_force=np.maximum(force, 0.0) * mass,
        slip_speed=a[:, columns.SLIP],
        friction_ratio=np.divide(acting, force, out=np.zeros_like(force), where=force > 0.0),
        margin=_margins(scene, patch, a[:, columns.ANGLE]),
        loss=loss,
        kinetic=0.5 * mass * np.einsum("ij,ij->i", v, v) + 0.5 * inertia * np.einsum("ij,ij->i", w, w),
        potential=-mass * (x @ scene.gravity),
        events=tuple(_event(row) for row in rows.marks),
        status=Status(rows.status),
        steps=rows.steps,
        correction=rows.correction,
    )


def _elements(scene: Scene, patch: NDArray[np.int64]) -> NDArray[np.int64]:
    """Return the placed element of every sample; in flight the last one touched."""
    owner = np.where(patch >= 0, scene.owner[np.maximum(patch, 0)] if len(scene.owner) else -1, -2)
    known = np.where(owner != -2, np.arange(len(owner)), 0)
    last = np.maximum.accumulate(known)
    return np.where(owner[last] == -2, -1, owner[last])


def _margins(scene: Scene, patch: NDArray[np.int64], angle: Array) -> Array:
    """Return the share of the way from the lip, 1 on the middle line of the section; nan where there is no lip."""
    margin = np.full(len(patch), np.nan)
    for index in np.unique(patch[patch >= 0]):
        low, high = scene.number[index, 1:3]
        if scene.kind[index] != SWEPT_INSIDE or high - low >= 2.0 * np.pi - 1e-9:
            continue
        rows = patch == index
        middle, half = 0.5 * (low + high), 0.5 * (high - low)
        margin[rows] = 1.0 - np.abs(angle[rows] - middle) / half
    return margin


def _event(row: Array) -> Event:
    y = row[columns.MARK_Y : columns.MARK_Y + STATE]
    return Event(
        kind=EventKind(int(row[columns.KIND])),
        t=float(row[columns.MARK_T]),
        x=y[0:3].copy(),
        v=y[3:6].copy(),
        w=y[6:9].copy(),
        patch=int(row[columns.MARK_PATCH]),
        value=float(row[columns.VALUE]),
        normal=row[columns.MARK_NORMAL : columns.MARK_NORMAL + 3].copy(),
    )


def join(first: Rows, row: int, mark: int, rest: Rows) -> Rows:
    """Return `first` up to sample `row` and event `mark` (both kept), then `rest` without its release event."""
    return Rows(
        np.concatenate([first.samples[: row + 1], rest.samples]),
        np.concatenate([first.marks[: mark + 1], rest.marks[1:]]),
        rest.status,
        first.steps + rest.steps,
        max(first.correction, rest.correction),
    )
