"""Results as arrays to draw: the ball's path, what it does at a time, its orientation, colour runs, places of findings.

No widgets and no Qt: everything here is arrays in, arrays out. Shapes of elements are in `studio.outlines` (from
above) and `studio.meshes` (in space).
"""

import math
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING, NamedTuple

import numpy as np
from numpy.typing import NDArray

from engine.constants import STANDARD_GRAVITY
from engine.errors import TrundleError
from engine.findings.finding import Finding
from engine.geometry.tables import interpolate
from engine.integrate.result import LOSSES, Regime
from engine.model.design import Design
from engine.placement import Layout, lay_out

if TYPE_CHECKING:
    from engine.simulate import Roll

Array = NDArray[np.float64]
Indices = NDArray[np.int64]

LEVELS = 24
"""Colours along a path: each run of one colour is one line."""
MISS, LONGEST_CHORD = 0.1, 30.0
"""px. A drawn line misses the true one by about this much, and has a point at least this often."""
LEAST_TURN = 1e-12
"""rad. A turn smaller than this has no axis worth computing."""


@dataclass(frozen=True, eq=False)
class BallPath:
    """What the ball does along its way, one row per sample.

    Attributes
    ----------
    t : (n,) s
    place : (n, 3) m
        Middle of the ball.
    speed : (n,) m/s
    angle : (n,) rad
        Wall angle; nan off the track (vessels, plates).
    load : (n,)
        Normal force over the weight of the ball.
    regime, element : (n,) int
    developed : (n,) m
        Length of the way travelled so far.
    head : (n,) m
        Height of the head line: total energy over weight.
    lost : (n, 5) m
        Head lost so far, by cause in the order of `LOSSES`.
    slip, margin : (n,)
        Slip speed, m/s; margin to the lip, nan where there is none.
    spin : (n, 3) rad/s
        Angular velocity.
    bore_spin : (n,) rad/s
        Its part about the normal of the wall; 0 in flight.
    radius : float
        m.
    """

    t: Array
    place: Array
    speed: Array
    angle: Array
    load: Array
    regime: Indices
    element: Indices
    developed: Array
    head: Array
    lost: Array
    slip: Array
    margin: Array
    spin: Array
    bore_spin: Array
    radius: float

    @cached_property
    def orientation(self) -> Array:
        """Orientation (n, 4) of the ball as it really turns, quaternions (w, x, y, z) from body to world."""
        return orientations(self.t, self.spin)

    @property
    def top_speed(self) -> float:
        """Largest speed on the way, m/s; at least a millimetre a second, so that it can be divided by."""
        return max(1e-3, float(self.speed.max()))


class Moment(NamedTuple):
    """The ball at one time: s, m, m/s, rad, load over weight, developed length and head (m), nearest sample before."""

    t: float
    place: Array
    speed: float
    angle: float
    load: float
    developed: float
    head: float
    sample: int


class Arrival(NamedTuple):
    """Where the ball first comes into an element: index in the layout, sample."""

    index: int
    sample: int


def layout_of(design: Design, roll: "Roll | None") -> Layout:
    """Layout of a design, that of the roll when it is of this design; empty when it cannot be laid out."""
    if roll is not None and roll.design is design:
        return roll.layout
    try:
        return lay_out(design)
    except TrundleError:
        return Layout(design, ())


def path_of(roll: "Roll | None") -> BallPath | None:
    """Path of the ball of a roll; None when there is none."""
    if roll is None or len(roll.trajectory.t) < 2:
        return None
    track, weight = roll.trajectory, roll.ball.mass * STANDARD_GRAVITY
    on_track = [entry.index for entry in roll.layout.placed if entry.curve is not None]
    step = np.sqrt((np.diff(track.x, axis=0) ** 2).sum(axis=1))
    return BallPath(
        t=track.t - track.t[0],
        place=track.x,
        speed=np.sqrt((track.v * track.v).sum(axis=1)),
        angle=np.where(np.isin(track.element, on_track), track.angle, np.nan),
        load=track.normal_force / weight,
        regime=track.regime.astype(np.int64),
        element=track.element.astype(np.int64),
        developed=np.concatenate([[0.0], np.cumsum(step)]),
        head=track.x[:, 2] + track.kinetic / weight,
        lost=track.loss / weight,
        slip=track.slip_speed,
        margin=track.margin,
        spin=track.w,
        bore_spin=(track.w * track.normal).sum(axis=1),
        radius=roll.ball.radius,
    )


def moment_at(path: BallPath, t: float) -> Moment:
    """The ball at a time, read linearly between the samples."""
    last = len(path.t) - 1
    sample = min(max(int(np.searchsorted(path.t, t, side="right")) - 1, 0), last - 1)
    span = path.t[sample + 1] - path.t[sample]
    share = min(max((t - path.t[sample]) / span, 0.0), 1.0) if span > 0.0 else 0.0

    def between(values: Array) -> Array:
        return np.asarray(values[sample] + share * (values[sample + 1] - values[sample]))

    columns = (path.speed, path.angle, path.load, path.developed, path.head)
    speed, angle, load, developed, head = (float(between(column)) for column in columns)
    return Moment(t, between(path.place), speed, angle, load, developed, head, sample)


class Series(NamedTuple):
    """One quantity over time: words, SI unit, values (n,) in that unit, nan where it has none."""

    words: str
    unit: str
    values: Array


def series_of(path: BallPath) -> list[Series]:
    """Quantities that are charted over time."""
    return [
        Series("speed", "m/s", path.speed),
        Series("wall angle", "rad", np.where(path.regime == int(Regime.FLIGHT), np.nan, path.angle)),
        Series("load", "g", path.load),
        Series("slip", "m/s", path.slip),
        Series("spin about the normal", "rad/s", path.bore_spin),
        Series("head", "m", path.head),
    ]


def time_at(path: BallPath, developed: float) -> float:
    """Time (s) at which the ball has come a developed length (m)."""
    return float(np.interp(developed, path.developed, path.t))


def arrivals(path: BallPath) -> list[Arrival]:
    """First sample of each element on the way, in the order of arrival."""
    index, sample = np.unique(path.element, return_index=True)
    return [Arrival(int(index[i]), int(sample[i])) for i in np.argsort(sample) if index[i] >= 0]


def losses_of(path: BallPath) -> tuple[float, list[tuple[str, float]]]:
    """Head lost on the whole way (m) and the share of each cause, largest first; below half a per cent left out."""
    lost = path.lost[-1] - path.lost[0]
    total = float(lost.sum())
    if total <= 0.0:
        return 0.0, []
    shares = sorted(zip(LOSSES, (lost / total).tolist(), strict=True), key=lambda pair: -pair[1])
    return total, [(cause, share) for cause, share in shares if share >= 0.005]


# -- findings -------------------------------------------------------------------------------------
def finding_place(finding: Finding, layout: Layout) -> Array | None:
    """Place (3,) of a finding, m; None when it has none."""
    if finding.position is not None:
        return np.asarray(finding.position, dtype=np.float64)
    entry = next((entry for entry in layout.placed if entry.element.id == finding.segment), None)
    if entry is None:
        return None
    if entry.curve is not None and math.isfinite(finding.s):
        return np.asarray(interpolate(entry.curve, np.array([finding.s]))[0][0])
    return entry.inlet.position


def finding_sample(finding: Finding, path: BallPath, layout: Layout) -> int | None:
    """Sample of the path nearest to a finding: by its time, else by its place; None when it has neither."""
    if math.isfinite(finding.t):
        return int(np.argmin(np.abs(path.t - finding.t)))
    place = finding_place(finding, layout)
    if place is None:
        return None
    entry = next((entry for entry in layout.placed if entry.element.id == finding.segment), None)
    rows = np.flatnonzero(path.element == entry.index) if entry is not None else np.arange(len(path.t))
    if len(rows) == 0:
        return None
    return int(rows[np.argmin(((path.place[rows] - place) ** 2).sum(axis=1))])


def shown_findings(findings: Sequence[Finding]) -> list[Finding]:
    """Findings to mark on a drawing, worst first: of each kind in each element the first one only."""
    found: dict[tuple[str, str, str], Finding] = {}
    for finding in findings:
        found.setdefault((finding.kind.value, finding.severity.value, finding.segment), finding)
    return list(found.values())


# -- lines of many colours ------------------------------------------------------------------------
def levels_of(values: Array, top: float, count: int = LEVELS) -> Indices:
    """Colour level (n,) of values from 0 to `top`: 0 ... count - 1."""
    return np.clip((values * (count / top)).astype(np.int64), 0, count - 1)


def thinned(points: Array, step: float, keys: Indices) -> Indices:
    """Rows to keep of a line (n, 2) in px: the ends, wherever `keys` changes, and enough between to look the same.

    A chord of length L of a line of curvature k misses it by k L^2 / 8; so sqrt(k / (8 `MISS`)) points are wanted a px,
    one each `LONGEST_CHORD` at least and one each `step` px at most. Length along the line is used, so a line that
    turns back on itself keeps its turns.
    """
    pieces = np.diff(points, axis=0)
    size = np.hypot(pieces[:, 0], pieces[:, 1])
    heading = np.arctan2(pieces[:, 1], pieces[:, 0])
    turn = np.abs((np.diff(heading, prepend=heading[0]) + math.pi) % (2.0 * math.pi) - math.pi)
    curvature = turn / np.maximum(size, 1e-9)
    density = np.clip(np.sqrt(curvature / (8.0 * MISS)), 1.0 / LONGEST_CHORD, 1.0 / step)
    bins = np.floor(np.concatenate([[0.0], np.cumsum(density * size)]))
    kept = np.ones(len(points), dtype=bool)
    step_up = np.diff(bins)
    kept[1:-1] = (step_up[:-1] > 0.0) | (step_up[1:] > 1.0) | (keys[1:-1] != keys[:-2])
    return np.flatnonzero(kept)


def evenly(along: Array, step: float) -> Array:
    """Lengths (m,) along a line, evenly apart by about `step`, from its first to its last length."""
    count = max(1, math.ceil((along[-1] - along[0]) / step))
    return np.linspace(along[0], along[-1], count + 1)


def runs_of(keys: Indices) -> list[tuple[int, int]]:
    """Stretches [first, last] of one key each; each ends on the first row of the next, so that no gap is left."""
    changes = np.flatnonzero(np.diff(keys)) + 1
    first = np.concatenate([[0], changes])
    last = np.concatenate([changes, [len(keys) - 1]])
    return [(int(a), int(b)) for a, b in zip(first, last, strict=True) if b > a]


def regime_runs(path: BallPath, regime: Regime) -> list[tuple[int, int]]:
    """Stretches [first, last] of samples in one regime."""
    inside = path.regime == int(regime)
    edges = np.diff(np.concatenate([[0], inside.astype(np.int64), [0]]))
    starts, stops = np.flatnonzero(edges == 1), np.flatnonzero(edges == -1)
    return [(int(a), min(int(b), len(inside) - 1)) for a, b in zip(starts, stops, strict=True)]


# -- orientation ----------------------------------------------------------------------------------
def quaternion_product(a: Array, b: Array) -> Array:
    """Products a b (n, 4) of quaternions (w, x, y, z)."""
    aw, ax, ay, az = np.moveaxis(a, -1, 0)
    bw, bx, by, bz = np.moveaxis(b, -1, 0)
    parts = (
        aw * bw - ax * bx - ay * by - az * bz,
        aw * bx + ax * bw + ay * bz - az * by,
        aw * by - ax * bz + ay * bw + az * bx,
        aw * bz + ax * by - ay * bx + az * bw,
    )
    return np.stack(parts, axis=-1)


def turn_quaternions(turns: Array) -> Array:
    """Quaternions (n, 4) of rotation vectors (n, 3), rad."""
    size = np.sqrt((turns * turns).sum(axis=-1, keepdims=True))
    share = np.where(size > LEAST_TURN, np.sin(0.5 * size) / np.maximum(size, LEAST_TURN), 0.5)
    return np.concatenate([np.cos(0.5 * size), share * turns], axis=-1)


def orientations(t: Array, spin: Array) -> Array:
    """Orientation (n, 4) at times (n,) from the angular velocity (n, 3), starting unturned.

    q_i+1 = exp(dt (w_i + w_i+1)/2) q_i, second order in dt. The running product is taken by doubling: after pass k each
    row holds the product over the last 2^k steps, so n rows take log2 n passes of array work.
    """
    steps = turn_quaternions(0.5 * (spin[1:] + spin[:-1]) * np.diff(t)[:, None])
    product = np.concatenate([[[1.0, 0.0, 0.0, 0.0]], steps])
    reach = 1
    while reach < len(product):
        product[reach:] = quaternion_product(product[reach:], product[:-reach].copy())
        reach *= 2
    return np.asarray(product / np.sqrt((product * product).sum(axis=1, keepdims=True)))


def orientation_at(path: BallPath, moment: Moment) -> Array:
    """Orientation (4,) of the ball at a moment: that of the sample before, turned on by the spin since."""
    i = moment.sample
    since = moment.t - path.t[i]
    span = path.t[i + 1] - path.t[i]
    share = 0.5 * since / span if span > 0.0 else 0.0
    mean = path.spin[i] + share * (path.spin[i + 1] - path.spin[i])
    return quaternion_product(turn_quaternions(mean * since), path.orientation[i])
