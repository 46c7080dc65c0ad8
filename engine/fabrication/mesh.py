"""Triangle meshes of solids: what they hold, their volume, and the strips and blocks they are made of.

Triangles run counter-clockwise seen from outside the material. Lengths in m.
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
Faces = NDArray[np.int32]


@dataclass(frozen=True, eq=False)
class Mesh:
    """A closed surface of triangles.

    Attributes
    ----------
    vertices : (n, 3) float64
        m.
    faces : (m, 3) int32
        Rows of `vertices`, counter-clockwise seen from outside.
    places : (n,) float64
        Arc length along the centreline or meridian that each vertex belongs to, m (plates: 0).
    """

    vertices: Array
    faces: Faces
    places: Array

    @property
    def triangles(self) -> int:
        """Number of triangles."""
        return len(self.faces)

    def box(self) -> Array:
        """Low and high corner (2, 3), m."""
        return np.stack([self.vertices.min(axis=0), self.vertices.max(axis=0)])

    def volume(self) -> float:
        """Volume enclosed, m3; negative when the triangles are inside out.

        V = 1/6 sum over triangles of a . (b x c), corners taken from the middle of the box so that a part far from the
        origin loses no digits.
        """
        a, b, c = self._corners()
        return float(np.einsum("ij,ij->", a, np.cross(b, c))) / 6.0

    def areas(self) -> Array:
        """Area (m,) of each triangle, m2."""
        a, b, c = self._corners()
        normal = np.cross(b - a, c - a)
        return np.asarray(0.5 * np.sqrt((normal * normal).sum(axis=1)))

    def _corners(self) -> tuple[Array, Array, Array]:
        around = self.vertices - self.box().mean(axis=0)
        return around[self.faces[:, 0]], around[self.faces[:, 1]], around[self.faces[:, 2]]


def band(low: NDArray[np.int64], high: NDArray[np.int64], *, closed: bool) -> Faces:
    """Triangles of the strips between neighbouring rows of vertices.

    Parameters
    ----------
    low, high : (b, k) int
        Vertex numbers of b strips: strip i lies between the row `low[i]` and the row `high[i]`.
    closed : bool
        Whether the last vertex of a row is followed by its first.

    Returns
    -------
    (2 b k or 2 b (k - 1), 3) int32
        Seen with `low` below and `high` above, k growing to the right, the triangles are counter-clockwise.
    """
    step = (slice(None), slice(None)) if closed else (slice(None), slice(None, -1))
    faces = np.empty((*low[step].shape, 2, 3), dtype=np.int32)
    right_low, right_high = (_shifted(low), _shifted(high)) if closed else (low[:, 1:], high[:, 1:])
    faces[..., 0, 0] = faces[..., 1, 0] = low[step]
    faces[..., 0, 1] = right_low
    faces[..., 0, 2] = faces[..., 1, 1] = right_high
    faces[..., 1, 2] = high[step]
    return faces.reshape(-1, 3)


def _shifted(rows: NDArray[np.int64]) -> NDArray[np.int64]:
    """Each row moved on by one place."""
    return np.roll(rows, -1, axis=1)


def blocks(edges: Sequence[Array], filled: NDArray[np.bool_]) -> Mesh:
    """Solid of upright blocks on a grid.

    Parameters
    ----------
    edges : three arrays (a + 1,), (b + 1,), (c + 1,)
        Grid lines along x, y, z, growing, m.
    filled : (a, b, c) bool
        Which blocks are material; two blocks that meet at an edge only would not make a closed surface.
    """
    shape = np.array(filled.shape) + 1
    room = np.pad(filled, 1)
    quads = [quad for axis in range(3) for sense in (1, -1) for quad in _skin(room, axis, sense, shape)]
    corners = np.concatenate(quads)
    used, number = np.unique(corners, return_inverse=True)
    place = np.stack(np.unravel_index(used, shape), axis=1)
    vertices = np.stack([edges[axis][place[:, axis]] for axis in range(3)], axis=1)
    square = number.reshape(-1, 4)
    faces = np.concatenate([square[:, [0, 1, 2]], square[:, [0, 2, 3]]]).astype(np.int32)
    return Mesh(vertices, faces, np.zeros(len(vertices)))


def _skin(room: NDArray[np.bool_], axis: int, sense: int, shape: NDArray[np.int64]) -> list[NDArray[np.int64]]:
    """Squares (q, 4) of grid corners on the block faces whose outward normal is `sense` along `axis`."""
    bare = room & ~np.roll(room, -sense, axis=axis)
    cell = np.argwhere(bare) - 1
    if sense > 0:
        cell[:, axis] += 1
    first, second = (axis + 1) % 3, (axis + 2) % 3
    turn = [(0, 0), (1, 0), (1, 1), (0, 1)] if sense > 0 else [(0, 0), (0, 1), (1, 1), (1, 0)]
    corners = []
    for across, along in turn:
        corner = cell.copy()
        corner[:, first] += across
        corner[:, second] += along
        corners.append(np.ravel_multi_index(tuple(corner.T), tuple(shape)))
    return [np.stack(corners, axis=1)] if len(cell) else []
