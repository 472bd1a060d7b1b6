"""Cubic splines through evenly spaced values: how coarse tables become fine ones."""

from __future__ import annotations

from functools import cache

import numpy as np

from engine.image.transfer import Floats


@cache
def _curvature(count: int) -> Floats:
    """Return the matrix that turns values into second derivatives times the squared step.

    Not-a-knot ends: the first two and the last two pieces share one cubic. ``count`` at least 4.
    """
    left = np.zeros((count, count))
    right = np.zeros((count, count))
    for row in range(1, count - 1):
        left[row, row - 1 : row + 2] = 1.0, 4.0, 1.0
        right[row, row - 1 : row + 2] = 6.0, -12.0, 6.0
    left[0, :3] = left[-1, -3:] = 1.0, -2.0, 1.0
    return np.asarray(np.linalg.solve(left, right))


def spline(values: Floats, position: Floats) -> Floats:
    """Return values interpolated along the first axis.

    ``values`` (n, K) stand at positions 0 to n - 1; ``position`` is (m,) or (m, K), in steps from
    the first value. Beyond the ends the last piece goes on. Result (m, K).
    """
    count = len(values)
    curvature = _curvature(count) @ values
    if position.ndim == 1:
        position = position[:, None]
    place = np.clip(position.astype(np.intp), 0, count - 2)
    b = position - place
    a = 1.0 - b

    def at(table: Floats, index: np.ndarray[tuple[int, ...], np.dtype[np.intp]]) -> Floats:
        return np.asarray(np.take_along_axis(table, np.broadcast_to(index, shape), axis=0))

    shape = np.broadcast_shapes(place.shape, (1, values.shape[1]))
    low, high = at(values, place), at(values, place + 1)
    bend_low, bend_high = at(curvature, place), at(curvature, place + 1)
    return a * low + b * high + ((a**3 - a) * bend_low + (b**3 - b) * bend_high) / 6.0
