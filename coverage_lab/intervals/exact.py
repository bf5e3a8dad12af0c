"""Exact and half-exact limits that invert one tail at a time."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike
from scipy import special

from coverage_lab.intervals.inputs import floats, pair
from coverage_lab.intervals.quantiles import beta_lower, beta_upper
from coverage_lab.intervals.solve import root
from coverage_lab.probability import at_least, at_most, deviance, point
from coverage_lab.records import Array, Bounds, Method

_SERIES_STOPS = 1e5


def clopper_pearson(events: ArrayLike, trials: ArrayLike, tail: ArrayLike) -> Bounds:
    """Every p under which neither x or more nor x or fewer events have a probability below `tail`.

    The tail is not doubled at 0 and n events.
    """
    x, n, tail = floats(events, trials, tail)
    return pair(_lower(x, n, tail), _upper(x, n, tail))


def mid_p(events: ArrayLike, trials: ArrayLike, tail: ArrayLike) -> Bounds:
    """The exact limits with half the probability of the observed count left out of each tail.

    Each limit lies between the exact ones of x and of its neighbour.
    """
    x, n, tail = floats(events, trials, tail)
    inside = (x > 0) & (x < n)
    k, m = np.where(inside, x, 1.0), np.where(inside, n, 2.0)
    lower = np.exp(root(_mid_p_above, np.log(_lower(k, m, tail)), np.log(_lower(k + 1, m, tail)), k, m, tail))
    upper = root(_mid_p_below, _upper(k - 1, m, tail), _upper(k, m, tail), k, m, tail)
    power = np.log(np.minimum(2 * tail, 1.0)) / n
    lower = np.where(inside, lower, np.where(x == 0, 0.0, np.exp(power)))
    return pair(lower, np.where(inside, upper, np.where(x == n, 1.0, -np.expm1(power))))


def poisson_exact(events: ArrayLike, trials: ArrayLike, tail: ArrayLike) -> Bounds:
    """Garwood's exact limits for the mean of a Poisson count, divided by n."""
    x, n, tail = floats(events, trials, tail)
    lower = np.where(x > 0, _poisson_lower(np.where(x > 0, x, 1.0), tail), 0.0)
    upper = np.where(x > 0, special.gammainccinv(x + 1, tail), -np.log(tail))
    return pair(lower / n, upper / n)


def _poisson_lower(x: Array, tail: Array) -> Array:
    """The mean m with P(X >= x) = tail, x >= 1.

    The library's series for it stops too early when x is large and the tail small; one Newton step, with the tail as
    the point probability times a hypergeometric sum, mends that.
    """
    mean = np.array(special.gammaincinv(x, tail))
    many = x > _SERIES_STOPS
    m, k = mean[many], x[many]
    chance = np.exp(-deviance(k, m) - 1 / (12 * k)) / np.sqrt(2 * np.pi * k)  # P(X = k) by Stirling's formula
    mean[many] = m + (tail[many] / chance - special.hyp1f1(1.0, k + 1, m)) * m / k
    return mean


def _lower(x: Array, n: Array, tail: Array) -> Array:
    inside = (x > 0) & (x < n)
    quantile = beta_lower(np.where(inside, x, 1.0), np.where(inside, n - x + 1, 1.0), tail)
    return np.where(inside, quantile, np.where(x == 0, 0.0, np.exp(np.log(tail) / n)))


def _upper(x: Array, n: Array, tail: Array) -> Array:
    inside = (x > 0) & (x < n)
    quantile = beta_upper(np.where(inside, x + 1, 1.0), np.where(inside, n - x, 1.0), tail)
    return np.where(inside, quantile, np.where(x == n, 1.0, -np.expm1(np.log(tail) / n)))


def _mid_p_above(log_p: Array, x: Array, n: Array, tail: Array) -> Array:
    p = np.exp(log_p)
    return _log_ratio(at_least(x + 1, n, p) + point(x, n, p) / 2, tail)


def _mid_p_below(p: Array, x: Array, n: Array, tail: Array) -> Array:
    return _log_ratio(at_most(x - 1, n, p) + point(x, n, p) / 2, tail)


def _log_ratio(chance: Array, tail: Array) -> Array:
    """Log of chance / tail, kept finite where a limit rounds to 1 and the chance to 0."""
    return np.log(np.maximum(chance / tail, 1e-300))


CLOPPER_PEARSON = Method(
    name="clopper-pearson",
    function=clopper_pearson,
    label="Clopper–Pearson exact",
    family="exact",
    source='C. J. Clopper & E. S. Pearson, "The use of confidence or fiducial limits illustrated in the case of the '
    'binomial", Biometrika 26:404 (1934)',
    formula="L = Beta(tail; x, n − x + 1), U = Beta(1 − tail; x + 1, n − x)",
    ends="0 at 0 events, 1 at n events; the tail is not doubled there",
    faults="conservative",
)

MID_P = Method(
    name="mid-p",
    function=mid_p,
    label="mid-P exact",
    family="exact",
    source='H. O. Lancaster, "Significance tests in discrete distributions", Journal of the American Statistical '
    'Association 56:223 (1961); G. Berry & P. Armitage, "Mid-P confidence intervals: a brief review", The Statistician '
    "44:417 (1995)",
    formula="U: P(X < x) + ½·P(X = x) = tail; L: P(X > x) + ½·P(X = x) = tail",
    ends="0 at 0 events and 1 at n events; U(0) = 1 − (2·tail)^(1/n)",
    faults="no guarantee: at 95 % the worst coverage is .921 for n 15–60, .912 at n = 6",
)

POISSON_EXACT = Method(
    name="poisson-exact",
    function=poisson_exact,
    label="Poisson exact (Garwood)",
    family="exact",
    source='F. Garwood, "Fiducial limits for the Poisson distribution", Biometrika 28:437 (1936)',
    formula="L = χ²(tail; 2x)/2n, U = χ²(1 − tail; 2x + 2)/2n",
    ends="0 at 0 events, with U(0) = −ln(tail)/n; nothing special at n events",
    faults="the upper limit can exceed 1; for rare outcomes only",
    exemptions={"mirror": "a Poisson count has no largest value: events and non-events are not treated alike"},
)
