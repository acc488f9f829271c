"""Directions of a path through time, the most important first."""

from __future__ import annotations

import heapq

import numpy as np

from desk.book import Bridge
from desk.book.arrays import FloatArray

__all__ = ["directions"]


def directions(bridge: Bridge, length: int, count: int) -> FloatArray:
    """Orthonormal combinations of the normals of `length` equal steps of a Brownian motion.

    Normals drawn for the directions and put together by their transpose are independent standard normals of
    the steps again: only their order of importance is another.

    Parameters
    ----------
    bridge : Bridge
        By principal components, direction j is ``√(4/(2n+1)) cos((2j+1)(2k-1)π/(2(2n+1)))`` at step k of n:
        the right singular vectors of the running sum, by falling singular value. Åkesson, F. and Lehoczky,
        J.P. (2000), Path generation for quasi-Monte Carlo simulation of mortgage-backed securities,
        Management Science 46; Glasserman, P. (2003), Monte Carlo Methods in Financial Engineering, section
        3.1. By a Brownian bridge, the first moves the end of the path, the next its middle given the end, and
        so on, the longest gap first. Caflisch, R.E. and Moskowitz, B. (1995), Modified Monte Carlo methods
        using quasi-random sequences; Glasserman, section 3.1.
    length : int
        n.
    count : int
        How many directions, at most `length`.

    Returns
    -------
    ndarray, shape (count, length)
    """
    if not 0 <= count <= length:
        raise ValueError(f"`count` must be from 0 to {length}")
    if bridge is Bridge.COMPONENTS:
        return _components(length, count)
    return _bridge(length, count)


def _components(length: int, count: int) -> FloatArray:
    wave = 2.0 * np.arange(count)[:, None] + 1.0
    place = 2.0 * np.arange(1, length + 1) - 1.0
    angle = 0.5 * np.pi * wave * place / (2.0 * length + 1.0)
    return np.asarray(np.sqrt(4.0 / (2.0 * length + 1.0)) * np.cos(angle))


def _bridge(length: int, count: int) -> FloatArray:
    found = np.zeros((count, length))
    if count == 0:
        return found
    found[0] = 1.0 / np.sqrt(length)
    gaps = [(-length, 0, length)]
    for row in found[1:]:
        _, start, end = heapq.heappop(gaps)
        middle = (start + end) // 2
        first, last = middle - start, end - middle
        row[start:middle] = np.sqrt(last / (first * (first + last)))
        row[middle:end] = -np.sqrt(first / (last * (first + last)))
        for low, high in ((start, middle), (middle, end)):
            if high - low > 1:
                heapq.heappush(gaps, (low - high, low, high))
    return found
