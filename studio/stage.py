"""Everything to show in space, joined: an opaque and a clear mesh, rims, lines of even width on screen. No Qt."""

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from engine.placement import Layout
from studio.display import Array
from studio.meshes import Mesh, Single, Solid, joined, solid_of

CLEAR_KINDS = ("tube", "vessel")
"""Kinds one looks through."""


class Group(NamedTuple):
    """One mesh of several solids, and the element (index in the layout) of each of its vertices."""

    mesh: Mesh
    element: NDArray[np.int64]


class Stage(NamedTuple):
    """Everything to show: what hides, what one looks through, rims (m, 2, 3) with the element of each, the solids."""

    opaque: Group
    clear: Group
    rims: Single
    rim_element: NDArray[np.int64]
    solids: list[Solid]

    @property
    def points(self) -> Single:
        """All vertices (n, 3), m."""
        return np.concatenate([self.opaque.mesh.vertices, self.clear.mesh.vertices])


def stage_of(layout: Layout) -> Stage:
    """Everything placed; shapes are kept from last time while nothing about them changes."""
    solids = [solid for entry in layout.placed if (solid := solid_of(entry)) is not None]
    rims = [solid.mesh.lines.reshape(-1, 2, 3) for solid in solids]
    counts = [len(part) for part in rims]
    return Stage(
        group([solid for solid in solids if solid.kind not in CLEAR_KINDS]),
        group([solid for solid in solids if solid.kind in CLEAR_KINDS]),
        np.concatenate(rims) if rims else np.zeros((0, 2, 3), dtype=np.float32),
        np.repeat(np.array([solid.element for solid in solids], dtype=np.int64), counts),
        solids,
    )


def group(solids: Sequence[Solid]) -> Group:
    """Solids as one mesh."""
    if not solids:
        return Group(joined([], np.zeros((0, 3))), np.zeros(0, dtype=np.int64))
    meshes = [solid.mesh for solid in solids]
    counts = np.array([len(mesh.vertices) for mesh in meshes])
    starts = np.cumsum(counts) - counts
    mesh = Mesh(
        np.concatenate([mesh.vertices for mesh in meshes]),
        np.concatenate([mesh.normals for mesh in meshes]),
        np.concatenate([mesh.faces + np.uint32(start) for mesh, start in zip(meshes, starts, strict=True)]),
        np.zeros((0, 3), dtype=np.float32),
    )
    return Group(mesh, np.repeat(np.array([solid.element for solid in solids], dtype=np.int64), counts))


class Ribbon(NamedTuple):
    """Lines drawn with an even width on screen: each point twice, once for each side of the line.

    `points` (n, 3); `ahead` (n, 3) a short step along the line; `side` (n,) 0 or 1; `faces` (m, 3); `source` (n,) the
    row of the line each comes from.
    """

    points: Single
    ahead: Single
    side: Single
    faces: NDArray[np.uint32]
    source: NDArray[np.int64]


def ribbon(points: Array, step: float, shown: NDArray[np.bool_] | None = None) -> Ribbon:
    """Ribbon along a line (n, 3); `step` is the length of the short step, m (a thousandth of what is shown).

    Where `shown` (n,) is False, the piece from there to the next point is left out.
    """
    along = np.gradient(points, axis=0) if len(points) > 1 else np.zeros_like(points)
    number = np.arange(len(points), dtype=np.uint32)
    links = np.stack([number[:-1], number[1:]], axis=1)
    return _ribbon(points, _short(along, step), links if shown is None else links[shown[:-1]])


def ribbons(pieces: Array, step: float) -> Ribbon:
    """Ribbon of separate pieces (m, 2, 3)."""
    points = pieces.reshape(-1, 3).astype(np.float64)
    along = np.repeat(pieces[:, 1] - pieces[:, 0], 2, axis=0).astype(np.float64)
    return _ribbon(points, _short(along, step), np.arange(len(points), dtype=np.uint32).reshape(-1, 2))


def _short(along: Array, step: float) -> Array:
    """Vectors (n, 3) of one length along a line."""
    size = np.sqrt((along * along).sum(axis=1, keepdims=True))
    return np.asarray(step * along / np.maximum(size, 1e-12))


def _ribbon(points: Array, ahead: Array, links: NDArray[np.uint32]) -> Ribbon:
    source = np.repeat(np.arange(len(points), dtype=np.int64), 2)
    a, b = 2 * links[:, 0], 2 * links[:, 1]
    faces = np.stack([a, a + 1, b + 1, a, b + 1, b], axis=1).reshape(-1, 3).astype(np.uint32)
    side = np.tile(np.array([0.0, 1.0], dtype=np.float32), len(points))
    return Ribbon(points[source].astype(np.float32), ahead[source].astype(np.float32), side, faces, source)
