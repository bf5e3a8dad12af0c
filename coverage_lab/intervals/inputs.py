"""What every member does first and last: arrays in, arrays out."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike
from scipy import special

from coverage_lab.records import Array, Bounds


def floats(*values: ArrayLike) -> tuple[Array, ...]:
    """The values as float64 arrays of their common broadcast shape."""
    return tuple(np.broadcast_arrays(*(np.asarray(value, dtype=np.float64) for value in values)))


def normal_point(tail: Array) -> Array:
    """The z with P(Z > z) = tail for a standard normal Z, at full precision for small tails."""
    return np.asarray(-special.ndtri(tail))


def student_point(freedom: Array, tail: Array) -> Array:
    """The t with P(T > t) = tail for Student's T with `freedom` > 0."""
    return np.asarray(-special.stdtrit(freedom, tail))


def pair(lower: ArrayLike, upper: ArrayLike) -> Bounds:
    """The two limits as float64 arrays, 0-d ones included."""
    return np.asarray(lower, dtype=np.float64), np.asarray(upper, dtype=np.float64)
