"""Binomial and beta-binomial probabilities, accurate at p = 1e-12 and at a million trials.

Differences of log-gamma values lose nine digits at n = 10**6. Points therefore use the saddle-point form of
C. Loader, "Fast and accurate computation of binomial probabilities" (2000): Stirling's error and a deviance, both small
numbers. Tails use the incomplete beta function in the forms that take p itself, never 1 - p.

All functions broadcast; counts are whole numbers given as integers or floats.
"""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy import special

from coverage_lab.records import Array, Counts

_SERIES_FROM = 16.0  # from here on six terms of Stirling's series are good to the last bit
_STIRLING = (1 / 12, -1 / 360, 1 / 1260, -1 / 1680, 1 / 1188, -691 / 360360)
_SPLITTER = 134217729.0  # 2**27 + 1, Veltkamp's constant


def point(x: ArrayLike, n: ArrayLike, p: ArrayLike) -> Array:
    """P(X = x) for X ~ Binomial(n, p); 0 outside 0..n."""
    x, n, p = _floats(x, n, p)
    inside = (x > 0) & (x < n) & (p > 0) & (p < 1)
    k, m, r = np.where(inside, x, 1.0), np.where(inside, n, 2.0), np.where(inside, p, 0.5)
    exponent = _stirling_error(m) - _stirling_error(k) - _stirling_error(m - k) - _total_deviance(k, m, r)
    saddle = np.exp(exponent) * np.sqrt(m / (2 * np.pi * k * (m - k)))
    return np.where(inside, saddle, _edge_point(x, n, p))


def at_most(x: ArrayLike, n: ArrayLike, p: ArrayLike) -> Array:
    """P(X <= x) for X ~ Binomial(n, p), with full relative accuracy in the tail."""
    x, n, p = _floats(x, n, p)
    inside = (x >= 0) & (x < n)
    k, m = np.where(inside, x, 0.0), np.where(inside, n, 1.0)
    return np.where(inside, special.betaincc(k + 1, m - k, p), np.where(x < 0, 0.0, 1.0))


def at_least(x: ArrayLike, n: ArrayLike, p: ArrayLike) -> Array:
    """P(X >= x) for X ~ Binomial(n, p), with full relative accuracy in the tail."""
    x, n, p = _floats(x, n, p)
    inside = (x > 0) & (x <= n)
    k, m = np.where(inside, x, 1.0), np.where(inside, n, 1.0)
    return np.where(inside, special.betainc(k, m - k + 1, p), np.where(x > n, 0.0, 1.0))


def window(n: int, low: float, high: float, floor: float = 1e-18) -> tuple[int, int]:
    """First and last count of the smallest range outside which P(X = x) <= `floor` for every p in [low, high].

    Below n·low a point probability is largest at p = low, above n·high at p = high, so two searches do.
    """
    bottom, top = math.floor(n * low), math.ceil(n * high)
    first = _first_true(lambda x: point(x, n, low) > floor, 0, bottom)
    back = _first_true(lambda y: point(n - y, n, high) > floor, 0, n - min(top, n))
    return first, n - back


def likely(n: int, p: float, floor: float = 1e-18) -> tuple[int, int]:
    """A range of counts outside which P(X <= first-1) and P(X >= last+1) are below `floor`, found without a search.

    It holds for hypergeometric counts too, p·population of the units being marked (Hoeffding 1963).
    Bernstein's inequality: P(X - np >= t) <= exp(-t²/2(npq + t/3)), solved for t; wider than `window` by a few counts.
    """
    c = -math.log(floor)
    reach = c / 3 + math.sqrt(c * c / 9 + 2 * c * n * p * (1 - p))
    return max(0, math.floor(n * p - reach)), min(n, math.ceil(n * p + reach))


def deviance(x: ArrayLike, m: ArrayLike) -> Array:
    """x·log(x/m) + m - x for x, m >= 0, without cancellation where x is near m."""
    x, m = _floats(x, m)
    return _deviance(x, m, x - m)


def log_rising(z: ArrayLike, m: ArrayLike) -> Array:
    """Logarithm of Γ(z+m)/Γ(z) for z > 0 and z + m > 0, from the difference of two Stirling series."""
    z, m = _floats(z, m)
    base, step = np.minimum(z, z + m), np.abs(m)
    rising = np.where(base < _SERIES_FROM, _shifted_rising(base, step), _series_rising(base, step))
    return np.where(m < 0, -rising, rising)


def betabinomial(x: ArrayLike, n: ArrayLike, a: ArrayLike, b: ArrayLike) -> Array:
    """P(X = x) for X ~ Binomial(n, P), P ~ Beta(a, b); exactly 1/(n+1) for a = b = 1; 0 outside 0..n."""
    x, n, a, b = _floats(x, n, a, b)
    if np.all(a == 1) and np.all(b == 1):
        return np.where((x < 0) | (x > n), 0.0, 1 / (n + 1))
    inside = (x > 0) & (x < n)
    saddle = _betabinomial_inside(np.where(inside, x, 1.0), np.where(inside, n, 2.0), a, b)
    near, far = np.where(x <= 0, b, a), np.where(x <= 0, a, b)
    step, shift = np.minimum(n, far), np.maximum(n, far)  # the two may change places: the shorter step loses less
    edge = np.exp(log_rising(near, step) - log_rising(near + shift, step))
    uniform = (a == 1) & (b == 1)
    return np.where((x < 0) | (x > n), 0.0, np.where(uniform, 1 / (n + 1), np.where(inside, saddle, edge)))


def _floats(*values: ArrayLike) -> tuple[Array, ...]:
    return tuple(np.broadcast_arrays(*(np.asarray(value, dtype=np.float64) for value in values)))


def _first_true(test: Callable[[Counts], NDArray[np.bool_]], low: int, high: int) -> int:
    """Smallest whole number in low..high that passes a test which never turns back; `high` if none does."""
    while low < high:
        tried = np.unique(np.linspace(low, high - 1, 64).astype(np.int64))
        place = int(np.count_nonzero(~test(tried)))
        low = low if place == 0 else int(tried[place - 1]) + 1
        high = high if place == tried.size else int(tried[place])
    return high


def _edge_point(x: Array, n: Array, p: Array) -> Array:
    """P(X = x) where no saddle-point form exists: x = 0, x = n, or p = 0 or 1, where other counts are impossible."""
    nothing = np.exp(special.xlog1py(n, -p))
    return np.where(x == 0, nothing, np.where(x == n, p**n, 0.0))


def _stirling_series(z: Array) -> Array:
    w = 1 / (z * z)
    total = np.zeros_like(z)
    for coefficient in reversed(_STIRLING):
        total = total * w + coefficient
    return total / z


def _series_step(z: Array, m: Array) -> Array:
    """Stirling's series at z + m minus that at z: power by power, so that a tiny m keeps its digits."""
    u, w = 1 / (z + m), 1 / z
    gap = -m / (z * (z + m))  # u - w
    power, rise, total = w, gap, np.zeros_like(z)
    for coefficient in _STIRLING:
        total = total + coefficient * rise
        power, rise = power * w * w, u * u * rise + power * gap * (u + w)
    return total


def _stirling_error(z: Array) -> Array:
    """Stirling's error: ln Γ(z+1) - [(z+½)·ln z - z + ½·ln 2π] for z > 0."""
    series = _stirling_series(np.maximum(z, _SERIES_FROM))
    small = z < _SERIES_FROM
    if not np.any(small):
        return series
    s = np.where(small, z, 1.0)
    # The ratio is near 1, so its logarithm is good to an ulp of 1; a difference of log-gammas is not.
    ratio = special.gamma(s + 1) * np.exp(s) / (s**s * np.sqrt(2 * np.pi * s))
    return np.where(small, np.log(ratio), series)


def _deviance(x: Array, m: Array, d: Array) -> Array:
    """The deviance of x from m, given d = x - m with more digits than x and m can show."""
    near = np.abs(d) < 0.1 * (x + m)
    v = np.where(near, d, 0.0) / np.where(near, x + m, 1.0)
    w = v * v
    series = np.zeros_like(w)
    for j in range(10, 0, -1):
        series = (series + 1 / (2 * j + 1)) * w
    return np.where(near, d * v + 2 * x * v * series, special.rel_entr(x, m) - d)


def _product_error(a: Array, b: Array, product: Array) -> Array:
    """a·b minus its rounded `product`, exactly (Dekker 1971)."""
    a_high = (_SPLITTER * a) - (_SPLITTER * a - a)
    b_high = (_SPLITTER * b) - (_SPLITTER * b - b)
    a_low, b_low = a - a_high, b - b_high
    return ((a_high * b_high - product) + a_high * b_low + a_low * b_high) + a_low * b_low


def _total_deviance(x: Array, n: Array, p: Array) -> Array:
    """Deviance of x from n·p plus that of n - x from n·(1-p); the rounding of both means is carried along.

    At n = 10**6 the rounding of n·p alone would cost four digits of a point probability.
    """
    q = 1 - p
    m, w = n * p, n * q
    m_rest = _product_error(n, p, m)
    w_rest = _product_error(n, q, w) + n * ((1 - q) - p)
    correction = (m - x) * (m_rest / m) + (w - (n - x)) * (w_rest / w)
    return deviance(x, m) + deviance(n - x, w) + correction


def _series_rising(z: Array, m: Array) -> Array:
    """The rising logarithm for z at least _SERIES_FROM, m >= 0; a smaller z is replaced, its result unused."""
    z = np.maximum(z, _SERIES_FROM)
    return m * np.log(z) + _deviance(z + m, z, m) - 0.5 * np.log1p(m / z) + _series_step(z, m)


def _shifted_rising(z: Array, m: Array) -> Array:
    """The rising logarithm for small z: shifted upward to where the series holds, then stepped back down."""
    steps = int(_SERIES_FROM)
    total = _series_rising(z + steps, m)
    for i in range(steps):
        total = total - np.log1p(m / (z + i))
    return total


def _betabinomial_inside(x: Array, n: Array, a: Array, b: Array) -> Array:
    """The beta-binomial point for 0 < x < n as three saddle-point forms at the common p = n/(n+a+b).

    The deviances of x and a are from means that differ from them by the same e, and those of n - x and b by -e; the
    third form has none. So the large powers of p cancel on paper, not in floating point.
    """
    y, c = n - x, a + b
    p, q, e = n / (n + c), c / (n + c), (x * c - a * n) / (n + c)
    exponent = -_deviance(x, (x + a) * p, e) - _deviance(a, (x + a) * q, -e)
    exponent -= _deviance(y, (y + b) * p, -e) + _deviance(b, (y + b) * q, e)
    for sign, z in ((1, x + a), (-1, x), (-1, a), (1, y + b), (-1, y), (-1, b), (-1, n + c), (1, n), (1, c)):
        exponent = exponent + sign * _stirling_error(z)
    spread = (n / (x * y)) * (a * b / c) * ((n + c) / ((x + a) * (y + b)))
    return np.exp(exponent) * np.sqrt(spread / (2 * np.pi))
