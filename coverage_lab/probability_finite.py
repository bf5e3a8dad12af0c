"""Hypergeometric probabilities, accurate for populations up to ten million.

X events among n units drawn without replacement from N units, M of which are events. Points are the ratio of three
binomial points at the common p = n/N, so that large powers cancel on paper (C. Loader, "Fast and accurate computation
of binomial probabilities", 2000). Tails are sums of points from the small side, never 1 minus a sum near 1.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import ArrayLike

from coverage_lab.probability import point
from coverage_lab.records import Array

_REACH = 9.0  # standard deviations from the mean beyond which less than 1e-17 of a tail is left


def finite_point(x: ArrayLike, n: ArrayLike, population: ArrayLike, marked: ArrayLike) -> Array:
    """P(X = x) for n units drawn from `population`, `marked` of which are events; 0 where x is impossible."""
    x, n, size, m = np.broadcast_arrays(*(np.asarray(v, dtype=np.float64) for v in (x, n, population, marked)))
    possible = (x >= np.maximum(0, n + m - size)) & (x <= np.minimum(n, m))
    x = np.where(possible, x, np.minimum(n, m))
    whole = n >= size
    p = np.where(whole, 0.5, n / size)
    ratio = point(x, m, p) * point(n - x, size - m, p) / point(n, size, p)
    return np.where(possible, np.where(whole, 1.0, ratio), 0.0)


def finite_at_most(x: int, n: int, population: int, marked: int) -> float:
    """P(X <= x)."""
    low, high = max(0, n + marked - population), min(n, marked)
    if x < low or x >= high:
        return float(x >= high)
    if x > n * (marked / population):
        return 1.0 - _above(x + 1, n, population, marked)
    return _below(x, n, population, marked)


def finite_at_least(x: int, n: int, population: int, marked: int) -> float:
    """P(X >= x)."""
    low, high = max(0, n + marked - population), min(n, marked)
    if x <= low or x > high:
        return float(x <= low)
    if x <= n * (marked / population):
        return 1.0 - _below(x - 1, n, population, marked)
    return _above(x, n, population, marked)


def _terms(n: int, population: int, marked: int) -> int:
    """How many points next to any count, away from the mean, hold its tail: the law is log-concave."""
    share = marked / population
    variance = n * share * (1 - share) * (population - n) / max(population - 1, 1)
    return math.ceil(_REACH * math.sqrt(variance)) + 40


def _below(x: int, n: int, population: int, marked: int) -> float:
    """P(X <= x) for x left of the mean, smallest terms first."""
    first = max(0, n + marked - population, x - _terms(n, population, marked))
    return float(finite_point(np.arange(first, x + 1), n, population, marked).sum())


def _above(x: int, n: int, population: int, marked: int) -> float:
    """P(X >= x) for x right of the mean, smallest terms first."""
    last = min(n, marked, x + _terms(n, population, marked))
    return float(finite_point(np.arange(last, x - 1, -1), n, population, marked).sum())
