"""Compiles the kernels with progress: `python -m engine.warm`.

A first compilation takes about a minute; the result is kept on disk, so the second takes a second.
"""

import sys
import time
from collections.abc import Callable

import numpy as np

from engine.contact.patches import Law, PatchList, Rectangle, Tag
from engine.contact.query import ANYWHERE, foot_on, nearest_wall
from engine.contact.walls import Walls, prepare
from engine.dynamics.phases import mode_on
from engine.dynamics.rates import rates
from engine.dynamics.state import BallParams, Mode, Start
from engine.fabrication.inspection import Expected, inspect
from engine.fabrication.sweep import sweep, tube_profile
from engine.geometry.pose import pose_at
from engine.geometry.primitives import line
from engine.integrate.record import Asked, roll_rows, start_row
from engine.integrate.step import new_work, try_step

TABLE = line(pose_at((0.0, 0.0, 1.0), 0.0, 0.1), 0.2)
BALL = BallParams(0.005, 0.004, 0.4, -1.0, 0.0)


def walls() -> Walls:
    """Return a short tube over a floor."""
    patches = PatchList()
    patches.add_swept_inside(TABLE, 0.01, tag=Tag(Law()))
    patches.add_plane(Rectangle(np.zeros(3), np.eye(3)[0], np.eye(3)[1]))
    return prepare(patches.to_scene())


def stages() -> list[tuple[str, Callable[[], object]]]:
    """Return what is compiled, each with a call that compiles it, inner kernels first."""
    here, y = walls(), np.zeros(13)
    y[0:3] = TABLE[0, 1:4] + 0.005 * TABLE[0, 10:13]
    mode, work = Mode(0, 0, 0, 1), new_work()
    point = (y[0], y[1], y[2])
    start = start_row(Start(0.0, y[0:3], np.zeros(3), np.zeros(3), 0, 0.0, -1))
    return [
        ("closest points", lambda: foot_on(here, 0, point, BALL.radius, ANYWHERE)),
        ("nearest walls", lambda: nearest_wall(here, y, BALL.radius, 0, (0, point))),
        ("rates of rolling, slipping and flight", lambda: rates(here, BALL, mode, y, ANYWHERE, work.spare)),
        ("what the ball does on a wall", lambda: mode_on(here, BALL, 0, y, work.spare)),
        ("one step", lambda: try_step(here, BALL, mode, work, (1e-3, 1e-9, np.int64(0), 0.0))),
        ("events and the whole run", lambda: roll_rows(here, BALL, start, Asked(end=0.05))),
        ("checks of parts", lambda: inspect(sweep(TABLE, tube_profile(0.01, 0.002, 1e-3), 1e-3), Expected(0, 1))),
    ]


def main() -> int:
    """Compile everything, one line a stage."""
    begun = time.perf_counter()
    plan = stages()
    for number, (name, call) in enumerate(plan, 1):
        print(f"  {number}/{len(plan)} {name} ...", end="", flush=True)
        since = time.perf_counter()
        call()
        print(f" {time.perf_counter() - since:.1f} s", flush=True)
    print(f"  kernels ready after {time.perf_counter() - begun:.1f} s")
    return 0


if __name__ == "__main__":
    sys.exit(main())
