"""Use case: a design rolled, its findings and its verdict. What the command line, the window and scripts call.

>>> from engine.model.storage import load
>>> from engine.simulate import roll
>>> roll(load("assets/examples/desk.json")).verdict          # doctest: +SKIP
'clears'
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.contact.surface import Scene
from engine.contact.walls import Walls, prepare
from engine.dynamics.state import BallParams, Start
from engine.findings.finding import Finding
from engine.findings.judge import find, verdict
from engine.integrate import log as columns
from engine.integrate.record import NEVER, Asked, Rows, join, resume_row, roll_rows, start_row, trajectory
from engine.integrate.result import Status, Trajectory
from engine.model.design import Design
from engine.placement import Layout, lay_out
from engine.scene import build

MOST_CHANGED = 40
"""An edit that changes more patches than this is rolled from the start: looking for a place to resume costs more."""
PATCH_ARRAYS = ("kind", "count", "number", "link", "law", "role", "box")


@dataclass(frozen=True)
class Roll:
    """One run of a design, rolled.

    Attributes
    ----------
    design, run_id, layout
        What was rolled.
    scene, ball, start
        As the kernels saw it.
    rows : Rows
        Raw samples and events, from which an edited design may be resumed.
    trajectory : Trajectory
    findings : tuple of Finding
        Worst first.
    verdict : str
        "clears" or "fails".
    outcome : str
        How the ball ended, in lower case: arrived, rested, escaped, time_limit, ...
    duration, exit_speed : float
        s; m/s just before the end.
    resumed : float
        Time from which this run was rolled anew, s (0: from the start).
    """

    design: Design
    run_id: str
    layout: Layout
    scene: Scene
    ball: BallParams
    start: Start
    rows: Rows
    trajectory: Trajectory
    findings: tuple[Finding, ...]
    verdict: str
    outcome: str
    duration: float
    exit_speed: float
    resumed: float


def roll(
    design: Design,
    run_id: str | None = None,
    previous: Roll | None = None,
    *,
    asked: Asked | None = None,
    cancel: NDArray[np.uint8] = NEVER,
) -> Roll:
    """Roll one ball through one run of a design.

    Parameters
    ----------
    design : Design
    run_id : str, optional
        The first run when left out.
    previous : Roll, optional
        An earlier roll of nearly the same design: what is unchanged before the edit is kept.
    asked : Asked, optional
        End, tolerance and sampling.
    cancel : (1,) uint8
        Set to 1 by another thread to stop.

    Returns
    -------
    Roll
    """
    chosen = run_id or design.runs[0].id
    layout = lay_out(design)
    built = build(layout, chosen)
    wish = asked or Asked()
    walls = prepare(built.scene)
    rows, resumed = _rows(walls, built.scene, built.ball, built.start, (previous, chosen, wish, cancel))
    track = trajectory(built.scene, built.ball, rows)
    findings = find(design, layout, track)
    return Roll(
        design=design,
        run_id=chosen,
        layout=layout,
        scene=built.scene,
        ball=built.ball,
        start=built.start,
        rows=rows,
        trajectory=track,
        findings=findings,
        verdict=verdict(findings, track.status),
        outcome=Status(rows.status).name.lower(),
        duration=float(track.t[-1] - track.t[0]),
        exit_speed=float(np.linalg.norm(track.v[max(0, len(track.t) - 2)])),
        resumed=resumed,
    )


def _rows(
    walls: Walls,
    scene: Scene,
    ball: BallParams,
    start: Start,
    how: tuple[Roll | None, str, Asked, NDArray[np.uint8]],
) -> tuple[Rows, float]:
    """Return the raw rows, rolled from the start or from the last event before anything changed, and that time."""
    previous, run_id, asked, cancel = how
    place = _resume_place(previous, run_id, scene, ball, start)
    if previous is None or place is None:
        return roll_rows(walls, ball, start_row(start), asked, cancel), 0.0
    sample, mark = place
    row = resume_row(previous.rows.marks[mark])
    return join(previous.rows, sample, mark, roll_rows(walls, ball, row, asked, cancel)), float(row[0])


def _resume_place(
    previous: Roll | None, run_id: str, scene: Scene, ball: BallParams, start: Start
) -> tuple[int, int] | None:
    """Return (sample, event) from which an edited design can go on, None to start anew."""
    if previous is None or previous.run_id != run_id or previous.ball != ball or not _same_start(previous.start, start):
        return None
    old, changed = previous.scene, changed_patches(previous.scene, scene)
    if len(changed) > MOST_CHANGED or not np.array_equal(old.air, scene.air):
        return None
    samples, marks = previous.rows.samples, previous.rows.marks
    touched = np.isin(samples[:, columns.PATCH], changed)
    x = samples[:, columns.Y : columns.Y + 3]
    reach = 2.0 * ball.radius
    for boxes in (old.box, scene.box):
        for patch in changed[changed < len(boxes)]:
            low, high = boxes[patch, :3] - reach, boxes[patch, 3:] + reach
            touched |= ((x > low) & (x < high)).all(axis=1)
    first = int(np.argmax(touched)) if touched.any() else len(samples) - 1
    limit = samples[first, columns.T]
    usable = np.flatnonzero((marks[:, columns.MARK_T] < limit) & ~np.isin(marks[:, columns.MODE], changed))
    if len(usable) == 0 or usable[-1] == 0:
        return None
    mark = int(usable[-1])
    # the sample with the old mode stands just before the event; the one with the new mode is made anew
    sample = int(np.searchsorted(samples[:, columns.T], marks[mark, columns.MARK_T], side="left"))
    return sample, mark


def _same_start(a: Start, b: Start) -> bool:
    """Return whether two starts are the same to the bit."""
    same = a.patch == b.patch and a.regime == b.regime and a.t == b.t
    return same and all(np.array_equal(p, q) for p, q in ((a.x, b.x), (a.v, b.v), (a.w, b.w)))


def changed_patches(old: Scene, new: Scene) -> NDArray[np.int64]:
    """Return the indices of patches that differ between two scenes, those only one of them has included."""
    common = min(len(old.kind), len(new.kind))
    differs = np.zeros(max(len(old.kind), len(new.kind)), dtype=bool)
    differs[common:] = True
    for name in PATCH_ARRAYS:
        a, b = getattr(old, name)[:common], getattr(new, name)[:common]
        differs[:common] |= (a != b).reshape(common, -1).any(axis=1)
    for patch in np.flatnonzero(~differs[:common]):
        table = "meridian" if old.kind[patch] == 2 else "knots"
        count = old.count[patch]
        a, b = getattr(old, table), getattr(new, table)
        differs[patch] = not np.array_equal(a[old.first[patch] :][:count], b[new.first[patch] :][:count])
    return np.flatnonzero(differs)
