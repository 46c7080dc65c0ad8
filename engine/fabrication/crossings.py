"""Compiled searches for a solid that cuts through itself: edges against triangles, a centreline against itself.

A watertight mesh with consistent winding and the right Euler number may still pass through itself; only these tests
see it.
"""

import math

from engine.kernel import kernel

GRAZING = 1e-9
"""Sine of the angle between an edge and a plane below which both count as parallel: a flat face has 1e-13."""
TOUCHING = 1e-9
"""Share of an edge or triangle by which a hit may lie outside and still count: touching is as bad as cutting."""


@kernel
def cell_range(low, high, axis, grid):
    """First and last cell along an axis that the span from `low` to `high` (m), a little widened, lies in."""
    first = math.floor((low - grid.slack - grid.low[axis]) / grid.size)
    last = math.floor((high + grid.slack - grid.low[axis]) / grid.size)
    top = grid.shape[axis] - 1
    return min(max(first, 0), top), min(max(last, 0), top)


@kernel
def triangle_span(vertices, faces, t, axis):
    """Lowest and highest coordinate of triangle t along an axis, m."""
    a, b, c = vertices[faces[t, 0], axis], vertices[faces[t, 1], axis], vertices[faces[t, 2], axis]
    return min(a, b, c), max(a, b, c)


@kernel
def triangle_cells(vertices, faces, t, grid):
    """Cells (first and last along x, y, z) that the box of triangle t lies in."""
    low, high = triangle_span(vertices, faces, t, 0)
    x0, x1 = cell_range(low, high, 0, grid)
    low, high = triangle_span(vertices, faces, t, 1)
    y0, y1 = cell_range(low, high, 1, grid)
    low, high = triangle_span(vertices, faces, t, 2)
    z0, z1 = cell_range(low, high, 2, grid)
    return x0, x1, y0, y1, z0, z1


@kernel
def count_cells(vertices, faces, grid, start):
    """Add to `start[cell + 1]` the number of triangles in each cell."""
    for t in range(faces.shape[0]):
        x0, x1, y0, y1, z0, z1 = triangle_cells(vertices, faces, t, grid)
        for x in range(x0, x1 + 1):
            for y in range(y0, y1 + 1):
                for z in range(z0, z1 + 1):
                    start[(x * grid.shape[1] + y) * grid.shape[2] + z + 1] += 1


@kernel
def fill_cells(vertices, faces, grid, start, listed):
    """List the triangles of each cell; `start` is used as a set of cursors and put back afterwards."""
    for t in range(faces.shape[0]):
        x0, x1, y0, y1, z0, z1 = triangle_cells(vertices, faces, t, grid)
        for x in range(x0, x1 + 1):
            for y in range(y0, y1 + 1):
                for z in range(z0, z1 + 1):
                    cell = (x * grid.shape[1] + y) * grid.shape[2] + z
                    listed[start[cell]] = t
                    start[cell] += 1
    for cell in range(start.shape[0] - 1, 0, -1):
        start[cell] = start[cell - 1]
    start[0] = 0


@kernel
def find_hits(vertices, faces, edges, grid, cells, hits):
    """Write pairs (edge, triangle) that meet into `hits`; return how many, at most as many as it has rows."""
    start, listed = cells
    found = 0
    for e in range(edges.shape[0]):
        p, q = edges[e, 0], edges[e, 1]
        x0, x1 = cell_range(min(vertices[p, 0], vertices[q, 0]), max(vertices[p, 0], vertices[q, 0]), 0, grid)
        y0, y1 = cell_range(min(vertices[p, 1], vertices[q, 1]), max(vertices[p, 1], vertices[q, 1]), 1, grid)
        z0, z1 = cell_range(min(vertices[p, 2], vertices[q, 2]), max(vertices[p, 2], vertices[q, 2]), 2, grid)
        for x in range(x0, x1 + 1):
            for y in range(y0, y1 + 1):
                for z in range(z0, z1 + 1):
                    cell = (x * grid.shape[1] + y) * grid.shape[2] + z
                    for i in range(start[cell], start[cell + 1]):
                        if meets(vertices, faces, listed[i], p, q, grid.slack):
                            hits[found, 0], hits[found, 1] = e, listed[i]
                            found += 1
                            if found == hits.shape[0]:
                                return found
    return found


@kernel
def between(vertices, i, j):
    """Vector from vertex i to vertex j, m."""
    return vertices[j, 0] - vertices[i, 0], vertices[j, 1] - vertices[i, 1], vertices[j, 2] - vertices[i, 2]


@kernel
def meets(vertices, faces, t, p, q, slack):
    """Whether the edge from vertex p to q meets triangle t, which must share no corner with it.

    With d = q - p, the triangle's plane normal n = e1 x e2 and m = p - a: the edge is at share u = -(m . n)/(d . n)
    in the plane; the point lies inside when its barycentric shares do. Parallel to the plane within `GRAZING`: no.
    """
    a, b, c = faces[t, 0], faces[t, 1], faces[t, 2]
    if p in (a, b, c) or q in (a, b, c):
        return False
    for axis in range(3):
        low, high = triangle_span(vertices, faces, t, axis)
        first, last = min(vertices[p, axis], vertices[q, axis]), max(vertices[p, axis], vertices[q, axis])
        if last < low - slack or first > high + slack:
            return False
    dx, dy, dz = between(vertices, p, q)
    ux, uy, uz = between(vertices, a, b)
    vx, vy, vz = between(vertices, a, c)
    mx, my, mz = between(vertices, a, p)
    nx, ny, nz = uy * vz - uz * vy, uz * vx - ux * vz, ux * vy - uy * vx
    steep = dx * nx + dy * ny + dz * nz
    area2, length2 = nx * nx + ny * ny + nz * nz, dx * dx + dy * dy + dz * dz
    if steep * steep <= GRAZING * GRAZING * area2 * length2:
        return False
    share = -(mx * nx + my * ny + mz * nz) / steep
    if share < -TOUCHING or share > 1.0 + TOUCHING:
        return False
    wx, wy, wz = mx + share * dx, my + share * dy, mz + share * dz
    first = ((wy * vz - wz * vy) * nx + (wz * vx - wx * vz) * ny + (wx * vy - wy * vx) * nz) / area2
    second = ((uy * wz - uz * wy) * nx + (uz * wx - ux * wz) * ny + (ux * wy - uy * wx) * nz) / area2
    return first >= -TOUCHING and second >= -TOUCHING and first + second <= 1.0 + TOUCHING


@kernel
def nearest_pair(points, step, apart, limit):
    """Distance (m) and indices of the closest two points (n, 3) nearer than `limit` and `apart` or more indices apart.

    Neighbours are at most `step` (m) apart, so from a pair at distance D no pair nearer than the best so far comes
    within the next (D - best)/step points: they are passed over. Returns (limit, -1, -1) when there is none.
    """
    best, first, second = limit, -1, -1
    n = points.shape[0]
    for i in range(n):
        j = i + apart
        while j < n:
            x, y, z = points[j, 0] - points[i, 0], points[j, 1] - points[i, 1], points[j, 2] - points[i, 2]
            distance = math.sqrt(x * x + y * y + z * z)
            if distance < best:
                best, first, second = distance, i, j
            j += max(1, int((distance - best) / step))
    return best, first, second


@kernel
def join_sets(faces, parent):
    """Union-find over triangles: afterwards `parent` (n,) leads every vertex to the first of its loose part."""
    for t in range(faces.shape[0]):
        for i in range(1, 3):
            a, b = faces[t, 0], faces[t, i]
            while parent[a] != a:
                parent[a] = parent[parent[a]]
                a = parent[a]
            while parent[b] != b:
                parent[b] = parent[parent[b]]
                b = parent[b]
            if a < b:
                parent[b] = a
            else:
                parent[a] = b
