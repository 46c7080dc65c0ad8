"""Whether a part can be made: closed, wound one way, whole, and nowhere cutting through itself.

The usual tests (closed, wound, Euler number, volume) all pass on a part that cuts through itself. Three more look for
that: locally J = 1 - k (coordinate toward the centre of the bend) > 0; the centreline against itself; every edge
against every triangle.
"""

import math
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from engine.fabrication.crossings import count_cells, fill_cells, find_hits, join_sets, nearest_pair
from engine.fabrication.mesh import Array, Faces, Mesh
from engine.fabrication.stl import stored
from engine.fabrication.sweep import Profile, sample_places, smooth_tables, stations_at
from engine.geometry.tables import S, interpolate

STEPS_PER_REACH = 8
"""Points of the centreline per outer radius in the search for a tube that meets itself: distances to 0.2 %."""
ENTRIES_PER_TRIANGLE = 24
"""The grid is coarsened until triangles lie in at most this many cells each on average: long ones lie in many."""
CELLS_PER_TRIANGLE = 8
"""Cells of the grid at most, per triangle."""
BOX_SLACK = 1e-9
"""Share of the part's size by which boxes are widened, so that rounding does not hide walls that just touch."""
MOST_HITS = 16
"""Crossings noted at most; one is enough to refuse a part."""
END_STEPS = 1
"""Points at the ends of a centreline whose nearness alone proves nothing: two flat ends may face each other closely."""


class Grid(NamedTuple):
    """Regular cells: `low` (3,) corner m, `size` of a cell m, `shape` (3,), `slack` m by which boxes are widened."""

    low: Array
    size: float
    shape: NDArray[np.int64]
    slack: float


@dataclass(frozen=True)
class Expected:
    """What a good part of its kind has: Euler characteristic V - E + F (None: not known) and number of loose parts."""

    euler: int | None = None
    parts: int = 1


@dataclass(frozen=True)
class Report:
    """What an inspection found.

    Attributes
    ----------
    finite, closed, consistent : bool
        All coordinates are numbers; every edge has two triangles; which run through it in opposite senses.
    euler : int
        V - E + F over the vertices in use.
    parts : int
        Loose parts.
    volume : float
        m3, negative when inside out.
    crossings : int
        Pairs of edge and triangle that meet (counted up to a few).
    problems : tuple of str
        One sentence each, beginning in lower case ("it ..."); empty for a good part.
    """

    finite: bool
    closed: bool
    consistent: bool
    euler: int
    parts: int
    volume: float
    crossings: int
    problems: tuple[str, ...]

    @property
    def good(self) -> bool:
        """Whether nothing was found."""
        return not self.problems


def inspect(mesh: Mesh, expected: Expected | None = None) -> Report:
    """Inspect a mesh.

    Parameters
    ----------
    mesh : Mesh
    expected : Expected, optional
        Euler characteristic and number of parts that it should have.
    """
    wanted = expected or Expected()
    if not np.isfinite(mesh.vertices).all():
        said = "it has coordinates that are not numbers; check the sizes of the element."
        return Report(False, False, False, 0, 0, math.nan, 0, (said,))
    edges, closed, consistent = edges_of(mesh)
    euler, parts = _euler(mesh, len(edges)), loose_parts(mesh)
    volume = mesh.volume()
    problems = _surface_problems(closed, consistent, volume)
    if not problems:
        problems = _count_problems(euler, parts, wanted) + _size_problems(mesh)
    hits = crossings(mesh.vertices, mesh.faces, edges)
    problems += _crossing_problems(mesh, edges, hits)
    return Report(True, closed, consistent, euler, parts, volume, len(hits), tuple(problems))


def _surface_problems(closed: bool, consistent: bool, volume: float) -> list[str]:
    """Sentences on the surface as a whole."""
    if not closed:
        return ["its surface has a gap or an edge with more than two triangles; change the size that was last edited."]
    if not consistent:
        return ["its triangles do not all face outward; change the size that was last edited."]
    if not volume > 0.0:
        return [f"it encloses {volume * 1e9:.3g} mm3, so it is inside out or flat; make its wall thicker."]
    return []


def _count_problems(euler: int, parts: int, wanted: Expected) -> list[str]:
    problems = []
    if parts != wanted.parts:
        problems.append(
            f"it falls into {parts} pieces where {wanted.parts} should be; change the size that was last edited."
        )
    if wanted.euler is not None and euler != wanted.euler:
        problems.append(
            f"its Euler number is {euler} where {wanted.euler} should be; change the size that was last edited."
        )
    return problems


def _size_problems(mesh: Mesh) -> list[str]:
    """Sentence on triangles that a file in single precision cannot hold: two corners would become one."""
    kept = stored(mesh, mesh.box()[0])
    corner = [kept[mesh.faces[:, i]] for i in range(3)]
    lost = np.zeros(len(mesh.faces), dtype=np.bool_)
    for i in range(3):
        lost |= (corner[i] == corner[i - 1]).all(axis=1)
    if not lost.any():
        return []
    s = float(mesh.places[mesh.faces[int(lost.argmax()), 0]])
    return [f"it has an edge too short for the file at s = {s * 1e3:.1f} mm; raise the tolerance of a chord."]


def _crossing_problems(mesh: Mesh, edges: Faces, hits: NDArray[np.int64]) -> list[str]:
    """Sentence on the first place where the surface meets itself."""
    if len(hits) == 0:
        return []
    here = float(mesh.places[edges[hits[0, 0], 0]])
    there = float(mesh.places[mesh.faces[hits[0, 1], 0]])
    low, high = sorted((here * 1e3, there * 1e3))
    return [
        f"it cuts through itself: the wall at s = {low:.1f} mm meets the wall at s = {high:.1f} mm; "
        "lead the two apart (more drop per turn, a larger radius) or make the section smaller."
    ]


# -- surface --------------------------------------------------------------------------------------
def edges_of(mesh: Mesh) -> tuple[Faces, bool, bool]:
    """Each edge once (e, 2), whether every edge has two triangles, and whether those run through it oppositely."""
    n = np.int64(len(mesh.vertices))
    start = mesh.faces.astype(np.int64)
    end = np.roll(start, -1, axis=1)
    low, high = np.minimum(start, end), np.maximum(start, end)
    key = np.sort(((low * n + high) * 2 + (start > end)).ravel())
    pair = key >> 1
    first = np.append(True, pair[1:] != pair[:-1])
    count = np.diff(np.append(np.flatnonzero(first), len(pair)))
    closed = bool((count == 2).all()) and bool((low != high).all())
    consistent = closed and bool(((key[0::2] ^ key[1::2]) == 1).all())
    edge = pair[first]
    return np.stack([edge // n, edge % n], axis=1).astype(np.int32), closed, consistent


def _euler(mesh: Mesh, edges: int) -> int:
    used = np.zeros(len(mesh.vertices), dtype=np.bool_)
    used[mesh.faces.ravel()] = True
    return int(used.sum()) - edges + len(mesh.faces)


def loose_parts(mesh: Mesh) -> int:
    """Number of parts that share no vertex."""
    parent = np.arange(len(mesh.vertices), dtype=np.int32)
    join_sets(np.ascontiguousarray(mesh.faces), parent)
    used = np.zeros(len(parent), dtype=np.bool_)
    used[mesh.faces.ravel()] = True
    return int((used & (parent == np.arange(len(parent)))).sum())


def crossings(vertices: Array, faces: Faces, edges: Faces) -> NDArray[np.int64]:
    """Pairs (h, 2) of an edge and a triangle that meet without sharing a corner; at most `MOST_HITS` are listed.

    Parameters
    ----------
    vertices : (n, 3) float64
        m.
    faces : (m, 3) int32
    edges : (e, 2) int32
        Each edge of the mesh once.
    """
    faces = np.ascontiguousarray(faces, dtype=np.int32)
    edges = np.ascontiguousarray(edges, dtype=np.int32)
    around = np.ascontiguousarray(vertices) - 0.5 * (vertices.min(axis=0) + vertices.max(axis=0))
    grid = _grid_for(around, faces)
    start = np.zeros(int(grid.shape.prod()) + 1, dtype=np.int64)
    count_cells(around, faces, grid, start)
    np.cumsum(start, out=start)
    listed = np.zeros(int(start[-1]), dtype=np.int32)
    fill_cells(around, faces, grid, start, listed)
    hits = np.zeros((MOST_HITS, 2), dtype=np.int64)
    found = find_hits(around, faces, edges, grid, (start, listed), hits)
    return hits[:found]


def _grid_for(vertices: Array, faces: Faces) -> Grid:
    """Cells about as large as a triangle, coarser where triangles are long."""
    corners = [vertices[faces[:, i]] for i in range(3)]
    extent = np.maximum(np.maximum(corners[0], corners[1]), corners[2])
    extent -= np.minimum(np.minimum(corners[0], corners[1]), corners[2])
    low, span = vertices.min(axis=0), np.ptp(vertices, axis=0)
    size = max(float(extent.max(axis=1).mean()), 1e-3 * float(span.max()), 1e-12)
    while True:
        shape = np.floor(span / size).astype(np.int64) + 1
        entries = float(np.prod(extent / size + 1.0, axis=1).sum())
        if shape.prod() <= CELLS_PER_TRIANGLE * len(faces) + 1 and entries <= ENTRIES_PER_TRIANGLE * len(faces):
            return Grid(low, size, shape, BOX_SLACK * float(span.max()))
        size *= 1.4


# -- centreline -----------------------------------------------------------------------------------
def bend_problems(table: Array, profile: Profile) -> list[str]:
    """Sentence on a bend tighter than the section reaches toward its centre.

    J = 1 - r'' . (x down + y side) is the stretch of the section's point (x, y) along the curve; where it is not
    positive the wall folds over itself.
    """
    worst, place, size = math.inf, 0.0, 0.0
    for part in smooth_tables(table):
        stations = stations_at(part, sample_places(part))
        toward = np.stack([(stations.bend * axis).sum(axis=1) for axis in (stations.down, stations.side)], axis=1)
        stretch = 1.0 - (toward @ profile.points.T).max(axis=1)
        low = int(stretch.argmin())
        if stretch[low] < worst:
            worst, place, size = float(stretch[low]), float(stations.s[low]), float(np.hypot(*toward[low]))
    if worst > 0.0:
        return []
    reach = (1.0 - worst) / size
    return [
        f"its wall folds over itself at s = {place * 1e3:.1f} mm: the bend there has a radius of {1e3 / size:.1f} mm "
        f"and the section reaches {reach * 1e3:.1f} mm toward its centre; "
        f"make the radius larger than {reach * 1e3:.1f} mm or the section smaller."
    ]


def meeting_problems(table: Array, reach: float) -> list[str]:
    """Sentence on a tube of outer radius `reach` (m) that meets itself.

    Centrelines come closer than 2 `reach` at places further than pi `reach` apart along it.
    """
    length = float(table[-1, S] - table[0, S])
    count = max(2, math.ceil(length / reach * STEPS_PER_REACH) + 1)
    s = np.linspace(float(table[0, S]), float(table[-1, S]), count)
    points = interpolate(table[np.append(np.diff(table[:, S]) > 0.0, True)], s)[0]
    step = length / (count - 1)
    apart = math.floor(math.pi * reach / step) + 1
    distance, first, second = nearest_pair(points, step * (1.0 + 1e-6), apart, 2.0 * reach)
    if first < END_STEPS or second >= count - END_STEPS:
        return []
    return [
        f"it meets itself: its centrelines at s = {s[first] * 1e3:.1f} mm and s = {s[second] * 1e3:.1f} mm "
        f"pass {distance * 1e3:.1f} mm apart and it is {2e3 * reach:.1f} mm wide; "
        "lead them further apart (more drop per turn, a larger radius) or make the tube thinner."
    ]
