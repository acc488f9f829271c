"""Products of matrices that stay on one thread while they are small."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

__all__ = ["small_product"]

FloatArray = NDArray[np.float64]

_ONE_PART, _MOST_IN_PARTS = 200_000, 10_000_000  # multiplications


def small_product(first: FloatArray, second: FloatArray) -> FloatArray:
    """The product of two matrices, in parts so small that none is shared between threads.

    Parameters
    ----------
    first, second : ndarray, shapes (k, l) and (l, n)

    Notes
    -----
    Where other work keeps the cores busy, waiting for a second thread takes longer than such a product. Large
    ones are left to as many threads as there are.
    """
    work = first.size * second.shape[1]
    if not 0 < work <= _MOST_IN_PARTS:
        return np.asarray(first @ second)
    found = np.empty((len(first), second.shape[1]))
    rows = max(1, len(first) * _ONE_PART // work)
    for start in range(0, len(first), rows):
        part = slice(start, start + rows)
        np.matmul(first[part], second, out=found[part])
    return found
