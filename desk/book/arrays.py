"""Arrays that a record owns: read-only, of one type, compared by value."""

from __future__ import annotations

from dataclasses import fields
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

__all__ = ["FloatArray", "IntArray", "owned_dates", "owned_floats", "owned_integers", "same_fields"]

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]


def owned_floats(values: ArrayLike) -> FloatArray:
    """A read-only float64 copy of `values`."""
    array = np.array(values, dtype=np.float64)
    array.flags.writeable = False
    return array


def owned_integers(values: ArrayLike) -> IntArray:
    """A read-only int64 copy of `values`."""
    array = np.array(values, dtype=np.int64)
    array.flags.writeable = False
    return array


def owned_dates(values: ArrayLike) -> NDArray[np.datetime64]:
    """A read-only datetime64[D] copy of `values`; NaT stands for no date."""
    array = np.array(values, dtype="datetime64[D]")
    array.flags.writeable = False
    return array


def same_fields(first: Any, second: Any) -> bool:
    """Whether two dataclass records of one type hold equal values, arrays included (NaN equals NaN)."""
    if type(first) is not type(second):
        return False
    for field in fields(first):
        one, two = getattr(first, field.name), getattr(second, field.name)
        if isinstance(one, np.ndarray) or isinstance(two, np.ndarray):
            if not isinstance(one, np.ndarray) or not isinstance(two, np.ndarray):
                return False
            if not np.array_equal(one, two, equal_nan=one.dtype.kind in "fM"):
                return False
        elif one != two:
            return False
    return True
