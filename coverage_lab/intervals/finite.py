"""Intervals for a sample without replacement from a finite population; an infinite one (inf) needs no correction."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import ArrayLike

from coverage_lab.intervals.exact import clopper_pearson, mid_p
from coverage_lab.intervals.inputs import floats, normal_point, pair
from coverage_lab.intervals.score import wilson_at
from coverage_lab.intervals.sources import COCHRAN
from coverage_lab.probability_finite import finite_above, finite_point
from coverage_lab.records import Array, Bounds, Method

_TIE = 1e-11  # probabilities this close, relatively, are equal
_NEEDS = ("events", "trials", "population")


def wald_fpc(events: ArrayLike, trials: ArrayLike, population: ArrayLike, tail: ArrayLike) -> Bounds:
    """The plus-or-minus formula with the unbiased variance and the share of the population not drawn."""
    x, n, size, tail = floats(events, trials, population, tail)
    p = x / n
    error = np.sqrt((1 - n / size) * p * ((n - x) / n) / np.where(n > 1, n - 1, 1.0))
    return pair(p - normal_point(tail) * error, p + normal_point(tail) * error)


def wilson_fpc(events: ArrayLike, trials: ArrayLike, population: ArrayLike, tail: ArrayLike) -> Bounds:
    """Wilson's interval with as many trials as would give the same variance; the proportion itself after a census."""
    x, n, size, tail = floats(events, trials, population, tail)
    census = n >= size
    endless = np.isinf(size) | census
    ratio = np.where(endless, 1.0, (size - 1) / np.where(endless, 1.0, size - n))
    lower, upper = wilson_at(x * ratio, n * ratio, normal_point(tail))
    return pair(np.where(census, x / n, lower), np.where(census, x / n, upper))


def hypergeometric_exact(events: ArrayLike, trials: ArrayLike, population: ArrayLike, tail: ArrayLike) -> Bounds:
    """Every M/N under which neither x or more nor x or fewer events have a probability of at most `tail`."""
    return _inverted(_tail_chance, clopper_pearson, *floats(events, trials, population, tail))


def hypergeometric_mid_p(events: ArrayLike, trials: ArrayLike, population: ArrayLike, tail: ArrayLike) -> Bounds:
    """The same with half the probability of the observed count left out of each tail."""
    return _inverted(_half_tail_chance, mid_p, *floats(events, trials, population, tail))


def _tail_chance(x: Array, n: Array, size: Array, marked: Array) -> Array:
    return finite_above(x, n, size, marked)


def _half_tail_chance(x: Array, n: Array, size: Array, marked: Array) -> Array:
    """P(X > x) and half of P(X = x)."""
    return finite_above(x + 1, n, size, marked) + finite_point(x, n, size, marked) / 2


def _inverted(
    chance: Callable[..., Array],
    endless: Callable[..., Bounds],
    x: Array,
    n: Array,
    size: Array,
    tail: Array,
) -> Bounds:
    """Whole counts M divided by N, as the truth is, so that a limit that is an attained truth covers it.

    The upper count is N less the lower count of the non-events, in whole numbers.
    """
    infinite = np.isinf(size)
    known = np.where(infinite, n, size)
    lower = _fewest(chance, x, n, known, tail) / known
    upper = (known - _fewest(chance, n - x, n, known, tail)) / known
    if not infinite.any():
        return pair(lower, upper)
    limits = endless(x, n, tail)
    return pair(np.where(infinite, limits[0], lower), np.where(infinite, limits[1], upper))


def _fewest(chance: Callable[..., Array], x: Array, n: Array, size: Array, tail: Array) -> Array:
    """The smallest possible M whose chance of x or more exceeds the tail, by bisection: it rises with M."""
    low, high = x, size - n + x
    while (low < high).any():
        middle = np.floor((low + high) / 2)
        enough = chance(x, n, size, middle) > tail * (1 + _TIE)
        low, high = np.where(enough | (low == high), low, middle + 1), np.where(enough, middle, high)
    return np.asarray(low)


WILSON_FPC = Method(
    name="wilson-fpc",
    function=wilson_fpc,
    label="Wilson score, finite population",
    family="finite population",
    source="E. B. Wilson 1927, with the effective sample size of " + COCHRAN,
    formula="Wilson with n* = n·(N − 1)/(N − n) trials and the same proportion",
    ends="exactly 0 at 0 events and 1 at n events; the proportion itself after a census",
    faults="dips near 0 and 1 like Wilson's; one-sided bounds are biased",
    needs=_NEEDS,
)

HYPERGEOMETRIC_EXACT = Method(
    name="hypergeometric-exact",
    function=hypergeometric_exact,
    label="hypergeometric exact",
    family="finite population",
    source="C. J. Clopper & E. S. Pearson 1934, for hypergeometric counts; H. S. Konijn, Statistical Theory of Sample "
    "Survey Design and Analysis, North-Holland (1973)",
    formula="all M/N with P(X ≥ x | M) > tail and P(X ≤ x | M) > tail",
    ends="0 at 0 events, 1 at n events",
    faults="conservative",
    needs=_NEEDS,
)

HYPERGEOMETRIC_MID_P = Method(
    name="hypergeometric-mid-p",
    function=hypergeometric_mid_p,
    label="hypergeometric mid-P",
    family="finite population",
    source="H. O. Lancaster 1961, J. Am. Stat. Assoc. 56:223, for hypergeometric counts",
    formula="as hypergeometric exact, with half the probability of the observed count left out of each tail",
    ends="0 at 0 events, 1 at n events",
    faults="no guarantee",
    needs=_NEEDS,
)

WALD_FPC = Method(
    name="wald-fpc",
    function=wald_fpc,
    label="plus-or-minus (Wald), finite population",
    family="finite population",
    source=COCHRAN + ", section 3.6",
    formula="p̂ ± z·√[(1 − n/N)·p̂q̂/(n − 1)]; standard error 0 at n = 1",
    ends="zero width",
    faults="with one event in the population its coverage is n/N: one that is not drawn leaves [0, 0]; leaves [0, 1]",
    needs=_NEEDS,
)
