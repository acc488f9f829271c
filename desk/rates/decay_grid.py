"""Linear least squares for all decays of a grid at a time, and the lowest points of what they leave."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

__all__ = ["least_squares", "lowest_of_three"]

FloatArray = NDArray[np.float64]

_RIDGE = 1e-11


def lowest_of_three(values: FloatArray, axis: int) -> FloatArray:
    """Each value or the lower of its two neighbours along an axis."""
    along = np.moveaxis(values, axis, 0)
    found = along.copy()
    np.minimum(found[1:], along[:-1], out=found[1:])
    np.minimum(found[:-1], along[1:], out=found[:-1])
    return np.moveaxis(found, 0, axis)


def least_squares(products: FloatArray, picks: list[NDArray[np.intp]]) -> tuple[FloatArray, FloatArray]:
    """Linear least squares on some of the columns, for many choices of columns at a time.

    Parameters
    ----------
    products : ndarray, shape (c + 1, c + 1)
        Of every two columns, the goal being the last.
    picks : list of ndarray, shapes that broadcast
        The columns of each choice.

    Returns
    -------
    cost : ndarray, the broadcast shape
    numbers : ndarray, the number of columns and the broadcast shape
        By Cholesky's method, written out over the choices.
    """
    count, goal = len(picks), np.array(len(products) - 1)
    lower: list[list[FloatArray]] = [[] for _ in range(count + 1)]
    for i, rows in enumerate([*picks, goal]):
        for j in range(min(i + 1, count)):
            left = products[rows, picks[j]]
            for k in range(j):
                left = left - lower[i][k] * lower[j][k]
            if i == j:
                lower[i].append(np.sqrt(np.maximum(left, _RIDGE * products[rows, rows])))
            else:
                lower[i].append(left / lower[j][j])
    shape = np.broadcast_shapes(*(pick.shape for pick in picks))
    cost = np.full(shape, products[goal, goal])
    for part in lower[count]:
        cost -= part**2
    numbers = np.empty((count, *shape))
    for i in range(count - 1, -1, -1):
        left = lower[count][i]
        for k in range(i + 1, count):
            left = left - lower[k][i] * numbers[k]
        numbers[i] = left / lower[i][i]
    return np.maximum(cost, 0.0), numbers
