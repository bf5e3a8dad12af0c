"""What every member does first and last: arrays in, arrays out."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike
from scipy import special

from coverage_lab.records import Array, Bounds

_FEW = 100


def floats(*values: ArrayLike) -> tuple[Array, ...]:
    """The values as float64 arrays of their common broadcast shape."""
    return tuple(np.broadcast_arrays(*(np.asarray(value, dtype=np.float64) for value in values)))


def normal_point(tail: Array) -> Array:
    """The z with P(Z > z) = tail for a standard normal Z, at full precision for small tails."""
    return np.asarray(-special.ndtri(tail))


def student_point(freedom: ArrayLike, tail: ArrayLike) -> Array:
    """The t with P(T > t) = tail for Student's T with whole `freedom` >= 1; looked up where values repeat."""
    freedom, tail = np.asarray(freedom, dtype=np.float64), np.asarray(tail, dtype=np.float64)
    if tail.size > 1 or freedom.size < _FEW:
        return np.asarray(-special.stdtrit(freedom, tail))
    least = freedom.min()
    if freedom.max() - least > freedom.size:
        return np.asarray(-special.stdtrit(freedom, tail))
    table = -special.stdtrit(np.arange(least, freedom.max() + 1), tail)
    return np.asarray(table[(freedom - least).astype(np.int64)])


def pair(lower: ArrayLike, upper: ArrayLike) -> Bounds:
    """The two limits as float64 arrays, 0-d ones included."""
    return np.asarray(lower, dtype=np.float64), np.asarray(upper, dtype=np.float64)
