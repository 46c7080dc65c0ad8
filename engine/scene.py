"""Layout to Scene: the only place where document and kernels meet.

>>> built = build(lay_out(design), "run")          # doctest: +SKIP
>>> built.scene.kind, built.ball.radius, built.start.x
"""

import math
from collections.abc import Sequence
from functools import lru_cache
from itertools import pairwise
from typing import NamedTuple

import numpy as np

from engine.constants import AIR_DENSITY, AIR_VISCOSITY, STANDARD_GRAVITY
from engine.contact.patches import Law, PatchList, Rectangle, Tag
from engine.contact.surface import ROLE_CATCH, ROLE_FLOOR, ROLE_WALL, Scene
from engine.dynamics.state import BallParams, Start
from engine.element_walls import Neighbours, Walls, add_walls, join
from engine.errors import DesignError
from engine.model.ball import Material, Pair
from engine.model.catalogue import contact_modulus
from engine.model.design import Design, Run
from engine.model.elements import Tray
from engine.placement import Layout, Placed
from engine.release import start_of

BY_REYNOLDS = -1.0
"""Drag coefficient of a sphere by its Reynolds number (see `BallParams`)."""
FREE_FALL = 1.0
"""m. Without a site the floor lies this far below the lowest wall."""


class Surroundings(NamedTuple):
    """Gravity (3,) m/s2; air density kg/m3 (0: none) and viscosity Pa s.

    Drag coefficient (negative: by Reynolds number); lift 0 or 1.
    """

    gravity: tuple[float, float, float] = (0.0, 0.0, -STANDARD_GRAVITY)
    air_density: float = AIR_DENSITY
    air_viscosity: float = AIR_VISCOSITY
    drag_coefficient: float = BY_REYNOLDS
    lift: float = 0.0


ROOM = Surroundings()
"""A room at 20 C with standard gravity."""


class Built(NamedTuple):
    """What the kernels need for one run, and `patches`: for each entry of `layout.placed` the patches it owns
    (others: none).
    """

    scene: Scene
    ball: BallParams
    start: Start
    patches: tuple[tuple[int, ...], ...]


def build(layout: Layout, run_id: str, around: Surroundings = ROOM) -> Built:
    """Walls, ball and start of one run. Only the run's own elements are walls; patch 0 is the floor of the site."""
    design = layout.design
    run, chain = design.run(run_id), layout.of_run(run_id)
    if not chain:
        raise DesignError(f'The run "{run_id}" has no elements; add one before rolling a ball through it.')
    patches = PatchList()
    patches.add_plane(_floor(layout), Tag(law_of(design, run, None), ROLE_FLOOR, -1))
    walls = _walls(patches, design, run, chain)
    for first, second in pairwise(zip(chain, walls, strict=True)):
        join(patches, first, second)
    ball = ball_of(design, run, around)
    owned = {entry.index: wall.patches for entry, wall in zip(chain, walls, strict=True)}
    return Built(
        scene=patches.to_scene(around.gravity, (around.air_density, around.air_viscosity)),
        ball=ball,
        start=start_of(run.release, chain, walls, ball.radius),
        patches=tuple(owned.get(entry.index, ()) for entry in layout.placed),
    )


def _walls(patches: PatchList, design: Design, run: Run, chain: Sequence[Placed]) -> list[Walls]:
    around: list[Placed | None] = [None, *chain, None]
    laws: dict[str | None, Law] = {}
    found = []
    for place, entry in enumerate(chain):
        role = ROLE_CATCH if isinstance(entry.element, Tray) else ROLE_WALL
        if entry.element.pair not in laws:
            laws[entry.element.pair] = law_of(design, run, entry)
        tag = Tag(laws[entry.element.pair], role, entry.index)
        found.append(add_walls(patches, entry, Neighbours(around[place], around[place + 2]), tag))
    return found


def _floor(layout: Layout) -> Rectangle:
    """Endless level plane at the floor of the site, or well below everything."""
    site = layout.design.site
    level = site.floor if site is not None else float(layout.bounds()[0, 2]) - FREE_FALL
    return Rectangle(np.array([0.0, 0.0, level]), np.array([1.0, 0.0, 0.0]), np.array([0.0, 1.0, 0.0]))


def ball_of(design: Design, run: Run, around: Surroundings = ROOM) -> BallParams:
    """Ball of a run as the kernels see it."""
    ball = design.ball_of(run)
    materials = design.material_table()
    return BallParams(
        ball.radius, ball.mass(materials), ball.inertia_factor(materials), around.drag_coefficient, around.lift
    )


def law_of(design: Design, run: Run, entry: Placed | None) -> Law:
    """Contact law of a run's ball on an element (None: on the floor)."""
    pair = design.pair_of(run, entry.element if entry is not None else None)
    return _law(pair, *_materials(design, pair))


def _materials(design: Design, pair: Pair) -> tuple[Material | None, Material | None]:
    table = design.material_table() if pair.contact_modulus is None else {}
    return table.get(pair.ball_material), table.get(pair.wall_material)


@lru_cache(maxsize=256)
def _law(pair: Pair, ball: Material | None, wall: Material | None) -> Law:
    """Numbers of a pair.

    Without a modulus of its own it comes from the two materials, and is 0 where those do not say.
    """
    modulus = pair.contact_modulus
    if modulus is None and ball is not None and wall is not None:
        modulus = contact_modulus(ball, wall)
    return Law(
        static_friction=pair.static_friction,
        kinetic_friction=pair.kinetic_friction,
        rolling_loss=pair.rolling_loss,
        loss_speed=math.inf if pair.loss_speed is None else pair.loss_speed,
        restitution=pair.restitution,
        spin_arm=-1.0 if pair.spin_arm is None else pair.spin_arm,
        contact_modulus=modulus or 0.0,
    )
