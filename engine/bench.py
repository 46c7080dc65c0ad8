"""`trundle bench`: speed rows, measured on this machine in one run.

Machines differ and are noisy: a row is the best of several turns, and where it can be a row is a ratio of two things
measured in turn. Targets are those the program is built to.
"""

import io
import math
import subprocess
import sys
import time
import tracemalloc
from collections.abc import Callable
from dataclasses import asdict, dataclass
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from engine.contact.patches import Law, PatchList, Revolution, Tag
from engine.contact.walls import Walls, prepare
from engine.dynamics.state import BallParams, Start
from engine.fabrication.mesh import Mesh
from engine.fabrication.stl import write_stl
from engine.fabrication.sweep import sweep, tube_profile
from engine.geometry import primitives, profiles
from engine.geometry.pose import pose_at
from engine.integrate.record import Asked, Rows, roll_rows, start_row
from engine.model.design import Design, Release, Run
from engine.model.edits import set_field
from engine.model.elements import Bend, Straight, Tube
from engine.model.storage import load
from engine.reference.plain import roll_plainly
from engine.simulate import Roll, roll

Array = NDArray[np.float64]
DEMONSTRATION = Path(__file__).parent.parent / "assets" / "examples" / "wall.json"
NO_SLIP = Law(static_friction=1e9, kinetic_friction=1e9, spin_arm=0.0)
TURNS = 5
"""Times a thing is measured; the best counts."""
PATH_ERROR = 1e-6
"""m. Path error at which speeds are compared."""
STRICT = 1e-13
SPAN = 3.0
"""s. Length of the speed runs."""


@dataclass(frozen=True)
class Row:
    """One measured figure against its target; `better` is "higher" or "lower"."""

    name: str
    value: float
    unit: str
    target: float
    better: str
    ok: bool

    def as_json(self) -> dict[str, Any]:
        """Return the row as `--json` prints it."""
        return asdict(self)


def row(name: str, value: float, unit: str, target: float, better: str) -> Row:
    """Return a row, judged."""
    ok = value >= target if better == "higher" else value <= target
    return Row(name, float(value), unit, target, better, bool(ok))


def best_time(work: Callable[[], Any], turns: int = TURNS) -> float:
    """Return the shortest of several timings, s."""
    spans = []
    for _ in range(turns):
        begun = time.perf_counter()
        work()
        spans.append(time.perf_counter() - begun)
    return min(spans)


def helix_run() -> tuple[Walls, BallParams, Start]:
    """Helical tube: radius 150, pitch 80, 5 turns, bore 44, ball 25 mm, from rest, no slip."""
    patches = PatchList()
    table = primitives.helix(pose_at((0.15, 0.0, 0.0), math.pi / 2, 0.08 / (2 * math.pi * 0.15)), 0.15, 5.0, 0.4)
    patches.add_swept_inside(table, 0.022, tag=Tag(NO_SLIP))
    ball = BallParams(0.0125, 0.0642, 0.4, 0.0, 0.0)
    x = table[0, 1:4] + (0.022 - ball.radius) * table[0, 10:13]
    return prepare(patches.to_scene()), ball, Start(0.0, x, np.zeros(3), np.zeros(3), 0, 0.0, -1)


def cylinder_run() -> tuple[Walls, BallParams, Start]:
    """Upright cylinder: bore 200, ball 25 mm, level at 2 m/s, no slip."""
    patches = PatchList()
    wall = profiles.line((0.1, -5.0), (0.1, 5.0))
    patches.add_revolved(Revolution(wall, np.zeros(3), np.array([0.0, 0.0, 1.0]), 1), Tag(NO_SLIP))
    ball = BallParams(0.0125, 0.0642, 0.4, 0.0, 0.0)
    v, n = np.array([0.0, 2.0, 0.0]), np.array([-1.0, 0.0, 0.0])
    x = np.array([0.1 - ball.radius, 0.0, 0.0])
    return prepare(patches.to_scene()), ball, Start(0.0, x, v, np.cross(n, v) / ball.radius, 0, 0.0, -1)


def path(rows: Rows) -> Array:
    """Return the positions at the asked times, m."""
    return np.asarray(rows.samples[rows.samples[:, 26] >= 0.0, 1:4])


def speed_row(name: str, case: tuple[Walls, BallParams, Start]) -> Row:
    """Return simulated seconds per second at a path error of at most PATH_ERROR."""
    walls, ball, start = case
    begin = start_row(start)
    times = np.linspace(0.1, SPAN - 0.1, 29)
    truth = path(roll_rows(walls, ball, begin, Asked(SPAN, STRICT, 0.0, times)))
    for tolerance in (1e-5, 1e-6, 1e-7, 1e-8):
        error = np.abs(path(roll_rows(walls, ball, begin, Asked(SPAN, tolerance, 0.0, times))) - truth).max()
        if error <= PATH_ERROR:
            break
    span = best_time(lambda: [roll_rows(walls, ball, begin, Asked(SPAN, tolerance, 0.0)) for _ in range(10)]) / 10
    return row(name, SPAN / span, "simulated s/s", 2000.0, "higher")


def plain_row() -> Row:
    """Return how many times faster the helix rolls than a numpy and scipy solution of the same equations."""
    walls, ball, start = helix_run()
    begin, span = start_row(start), 1.0
    fast = best_time(lambda: [roll_rows(walls, ball, begin, Asked(span, 1e-7, 0.0)) for _ in range(10)]) / 10
    slow = best_time(lambda: roll_plainly(span), 1)
    return row("helix against numpy and scipy DOP853 at the same error", slow / fast, "times", 100.0, "higher")


def long_design(count: int) -> Design:
    """Return a chain of `count` straights and bends in which the ball keeps its speed."""
    section = Tube(bore=0.029, wall=0.003)
    elements = tuple(
        Straight(id=f"s{i}", length=0.2, grade=0.02, section=section)
        if i % 2 == 0
        else Bend(id=f"b{i}", radius=0.3, turn=0.2 * (1 if i % 4 == 1 else -1), grade=0.02, section=section)
        for i in range(count)
    )
    run = Run(id="run", release=Release(speed=0.5), elements=elements)
    return Design(id="long", runs=(run,))


def kernel_time(design: Design, until: float) -> float:
    """Return the kernel's seconds per simulated second for the first `until` simulated seconds."""
    rolled = roll(design, asked=Asked(end=until))
    walls = prepare(rolled.scene)
    begin = start_row(rolled.start)
    return best_time(lambda: roll_rows(walls, rolled.ball, begin, Asked(end=until)), 9) / until


def length_row() -> Row:
    """Return the cost per simulated second with 1 000 segments over that with 10, the same first stretch rolled."""
    short, long = long_design(10), long_design(1000)
    until = 0.9 * roll(short).duration
    return row(
        "cost per simulated s, 1 000 segments to 10",
        kernel_time(long, until) / kernel_time(short, until),
        "ratio",
        1.3,
        "lower",
    )


def edit_rows() -> list[Row]:
    """Return the times of a whole re-roll and of one after an edit of the last segment,
    on the wall-size demonstration.
    """
    design = load(DEMONSTRATION)
    elements = design.runs[0].elements
    first, last = editable(elements), len(elements) - 1 - editable(tuple(reversed(elements)))
    rolled = roll(design)
    whole = min(edit_times(design, first, None))
    late = min(edit_times(design, last, rolled))
    return [
        row("wall-size demonstration, re-roll after an edit", 1e3 * whole, "ms", 16.0, "lower"),
        row("wall-size demonstration, after an edit of the last segment", 1e3 * late, "ms", 4.0, "lower"),
    ]


def editable(elements: tuple[Any, ...]) -> int:
    """Return the index of the first element with a length to edit."""
    return next(i for i, element in enumerate(elements) if hasattr(element, "length"))


def edit_times(design: Design, index: int, previous: Roll | None) -> list[float]:
    """Return the times of several rolls, each after another small edit of one element, s."""
    place = f"runs[0].elements[{index}].length"
    length = design.runs[0].elements[index].length  # type: ignore[union-attr]
    spans = []
    for turn in range(1, 10):
        edited = set_field(design, place, length * (1.0 + 1e-4 * turn))
        begun = time.perf_counter()
        roll(edited, previous=previous)
        spans.append(time.perf_counter() - begun)
    return spans


def mesh_rows() -> list[Row]:
    """Return triangles built per second, time to write a million, and the memory of doing both."""
    table = primitives.helix(pose_at((0.15, 0.0, 0.0), 0.0, 0.08), 0.15, 20.0, 1.6)
    profile = tube_profile(0.0145, 0.003, 1e-5)
    mesh = sweep(table, profile, 1e-5)
    span = best_time(lambda: sweep(table, profile, 1e-5), 3)
    million = Mesh(mesh.vertices, np.resize(mesh.faces, (1_000_000, 3)), mesh.places)
    tracemalloc.start()
    write_stl(io.BytesIO(), million, "bench")
    peak = tracemalloc.get_traced_memory()[1] / 1e6
    tracemalloc.stop()
    written = best_time(lambda: write_stl(io.BytesIO(), million, "bench"), 3)
    return [
        row("triangles built", len(mesh.faces) / span, "1/s", 5e6, "higher"),
        row("a million triangles written", written, "s", 0.5, "lower"),
        row("memory while writing them", peak, "MB", 300.0, "lower"),
    ]


def window_rows() -> list[Row]:
    """Return the time until the window is usable, warm, and how many heavy packages its import loads."""
    code = (
        "import sys, studio.app; "
        "print(sum(name in sys.modules for name in ('scipy', 'trimesh', 'dask', 'distributed')))"
    )
    loaded = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    command = [sys.executable, "-m", "studio.app", "--time-to-usable"]
    subprocess.run(command, capture_output=True, check=True)
    spans = [
        float(subprocess.run(command, capture_output=True, text=True, check=True).stdout.split()[-1]) for _ in range(3)
    ]
    return [
        row("heavy packages loaded by importing the studio", float(loaded.stdout), "packages", 0.0, "lower"),
        row("window usable, warm", min(spans), "s", 2.0, "lower"),
    ]


def run_rows(window: bool = False) -> list[Row]:
    """Measure every row; `window` adds those that open the window."""
    rows = [
        speed_row("helical tube at 1e-6 m", helix_run()),
        speed_row("upright cylinder at 1e-6 m", cylinder_run()),
        plain_row(),
        *(edit_rows() if DEMONSTRATION.exists() else []),
        length_row(),
        *mesh_rows(),
    ]
    return [*rows, *(window_rows() if window else [])]
