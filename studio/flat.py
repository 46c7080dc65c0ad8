"""Bands about a line in the plane, as a tube shows from any side."""

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]


def offsets(points: Array, distance: float) -> tuple[Array, Array]:
    """Lines (n, 2) to the left and right of a polyline (n, 2) at a distance, mitred at its corners.

    The bisector of two unit normals m, n is (m + n)/(1 + m.n); where the line turns back it is cut short.
    """
    step = np.diff(points, axis=0)
    length = np.sqrt((step**2).sum(axis=1, keepdims=True))
    good = length[:, 0] > 1e-9
    if not good.any():
        return points, points
    if not good.all():
        place = np.maximum.accumulate(np.where(good, np.arange(len(good)), -1))
        place[place < 0] = int(np.argmax(good))
        step, length = step[place], length[place]
    normal = np.stack([-step[:, 1], step[:, 0]], axis=1) / length
    before, after = np.concatenate([normal[:1], normal]), np.concatenate([normal, normal[-1:]])
    share = np.maximum(1.0 + (before * after).sum(axis=1, keepdims=True), 0.3)
    shift = distance * (before + after) / share
    return points + shift, points - shift


def band(centre: Array, half: float, lap: float) -> Array:
    """Outline (2n, 2) of a piece of some half width about its centreline (n, 2), longer at both ends by `lap`."""
    line = centre.copy()
    for end, inner in ((0, 1), (-1, -2)):
        step = line[end] - centre[inner]
        size = float(np.hypot(*step))
        if size > abs(lap) * 2:
            line[end] = line[end] + step * (lap / size)
    left, right = offsets(line, half)
    return np.concatenate([left, right[::-1]])
