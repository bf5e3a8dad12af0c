"""Hypergeometric probabilities, accurate for populations up to ten million.

X events among n units drawn without replacement from N units, M of which are events. Points are the ratio of three
binomial points at the common p = n/N, so that large powers cancel on paper (C. Loader, "Fast and accurate computation
of binomial probabilities", 2000). Tails are sums of points outward from the count, on the side away from the mean.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import ArrayLike

from coverage_lab.probability import point
from coverage_lab.records import Array

_NEGLIGIBLE = 1e-18  # of a sum, relative
_AT_A_TIME = 16


def finite_point(x: ArrayLike, n: ArrayLike, population: ArrayLike, marked: ArrayLike) -> Array:
    """P(X = x) for n units drawn from `population`, `marked` of which are events; 0 where x is impossible."""
    x, n, size, m = np.broadcast_arrays(*(np.asarray(v, dtype=np.float64) for v in (x, n, population, marked)))
    possible = (x >= np.maximum(0, n + m - size)) & (x <= np.minimum(n, m))
    x = np.where(possible, x, np.minimum(n, m))
    whole = n >= size
    p = np.where(whole, 0.5, n / size)
    ratio = point(x, m, p) * point(n - x, size - m, p) / point(n, size, p)
    return np.where(possible, np.where(whole, 1.0, ratio), 0.0)


def reachable(population: int, low: float, high: float) -> Array:
    """Every M/N in [low, high], ascending: the proportions that a population of N can have."""
    first, last = math.floor(low * population) - 1, math.ceil(high * population) + 1
    truths = np.arange(max(first, 0), min(last, population) + 1) / population
    return truths[(truths >= low) & (truths <= high)]


def finite_below(x: ArrayLike, n: ArrayLike, population: ArrayLike, marked: ArrayLike) -> Array:
    """P(X <= x), broadcasting: the smaller tail is summed outward, with full relative accuracy there."""
    x, n, size, m = np.broadcast_arrays(*(np.asarray(v, dtype=np.float64) for v in (x, n, population, marked)))
    small = x * size < n * m
    tail = _outward(np.where(small, x, n - x - 1), n, size, np.where(small, m, size - m))
    return np.where(small, tail, 1.0 - tail)


def finite_above(x: ArrayLike, n: ArrayLike, population: ArrayLike, marked: ArrayLike) -> Array:
    """P(X >= x), broadcasting: that of the unmarked units, P(n - X <= n - x)."""
    x, n, size, m = np.broadcast_arrays(*(np.asarray(v, dtype=np.float64) for v in (x, n, population, marked)))
    return finite_below(n - x, n, size, size - m)


def finite_at_most(x: int, n: int, population: int, marked: int) -> float:
    """P(X <= x) of one case."""
    return float(finite_below(x, n, population, marked))


def finite_at_least(x: int, n: int, population: int, marked: int) -> float:
    """P(X >= x) of one case."""
    return float(finite_above(x, n, population, marked))


def _outward(x: Array, n: Array, population: Array, marked: Array) -> Array:
    """P(X <= x) added from x down, for x below the mean, some terms at a time; finished elements drop out."""
    cases = np.stack([values.ravel() for values in (np.minimum(x, np.minimum(n, marked)), n, population, marked)])
    term = finite_point(*cases)
    total = term.copy()
    active = np.flatnonzero(term > 0)
    cases, term = cases[:, active], term[active]
    while active.size:
        k, s, size, m = cases[:, :, None]
        k = k - np.arange(_AT_A_TIME)
        falls = (k * (size - m - s + k)) / ((m - k + 1) * (s - k + 1))  # 0 at the smallest possible count
        terms = term[:, None] * np.cumprod(falls, axis=1)
        total[active] += terms.sum(axis=1)
        going = terms[:, -1] > _NEGLIGIBLE * total[active]
        active, term, cases = active[going], terms[going, -1], cases[:, going]
        cases[0] -= _AT_A_TIME
    return total.reshape(x.shape)
