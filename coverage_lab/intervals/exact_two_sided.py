"""Two-sided exact intervals that invert one test of both tails together: Blaker's and Sterne's.

Limits are sought as log-odds, where a small p and a small 1 - p keep their digits alike: the upper limit at x is the
lower limit at n - x with its sign turned. S is P(X >= x) and F is P(X <= y), both at the log-odds in question.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy import special

from coverage_lab.intervals.inputs import floats, pair
from coverage_lab.intervals.quantiles import beta_lower, beta_upper
from coverage_lab.intervals.solve import root
from coverage_lab.probability import at_least, at_most, log_rising
from coverage_lab.records import Array, Bounds, Method

_TIE = 1e-11  # probabilities this close, relatively, are equal
_ROUNDING = 2e-16  # an absolute step of the log-odds, hence a relative one of a small p


def blaker(events: ArrayLike, trials: ArrayLike, tail: ArrayLike) -> Bounds:
    """Hull of the p at which outcomes no more central than x, counted by their smaller tail, have more than 2·tail."""
    return _both_limits(_blaker_lower, events, trials, tail)


def sterne(events: ArrayLike, trials: ArrayLike, tail: ArrayLike) -> Bounds:
    """Hull of the p at which outcomes no more probable than x have more than 2·tail in all."""
    return _both_limits(_sterne_lower, events, trials, tail)


def _both_limits(
    lower_log_odds: Callable[[Array, Array, Array], Array], events: ArrayLike, trials: ArrayLike, tail: ArrayLike
) -> Bounds:
    """Both limits from the log-odds of lower limits at x and at n - x, each distinct case solved once."""
    x, n, tail = floats(events, trials, tail)
    cases = np.stack([np.concatenate([a.ravel(), b.ravel()]) for a, b in ((x, n - x), (n, n), (tail, tail))])
    distinct, back = np.unique(cases, axis=1, return_inverse=True)
    log_odds = np.full(distinct.shape[1], -np.inf)
    some = distinct[0] > 0
    if some.any():
        log_odds[some] = lower_log_odds(*distinct[:, some])
    low, high = log_odds[back.ravel()].reshape((2, *x.shape))
    return pair(special.expit(low), special.expit(-high))


def _blaker_lower(x: Array, n: Array, tail: Array) -> Array:
    """Log-odds of Blaker's lower limit, x >= 1.

    Right of the Clopper–Pearson limit l the outcomes up to y - 1 are no more central than x, y being the first with
    F_y(l) > tail; y joins where S_x = F_y, and there the sum is certainly above 2·tail.
    """
    low = _log_odds(beta_lower(x, n - x + 1, tail), beta_upper(n - x + 1, x, tail))
    y = _first_count(lambda y: _below(y, n, low) * (1 + _TIE) > tail, x)
    high = _log_odds(beta_upper(y + 1, n - y, tail), beta_lower(n - y, y + 1, tail))
    tie = root(_tail_ratio, low, np.maximum(low, high), x, y, n, absolute=_ROUNDING)
    return _crossing(low, tie, x, y, n, tail)


def _sterne_lower(x: Array, n: Array, tail: Array) -> Array:
    """Log-odds of Sterne's lower limit, x >= 1.

    The outcomes up to y are no more probable than x from the tie b(y) = b(x) on. The first tie at which S_x + F_y
    exceeds 2·tail is found by binary search.
    """
    y = _first_count(lambda y: _both_tails(_tie_log_odds(x, y, n), x, y, n) > 2 * tail, x)
    start = _log_odds(beta_lower(x, n - x + 1, tail), beta_upper(n - x + 1, x, tail))
    before = np.where(y > 0, _tie_log_odds(x, np.maximum(y - 1, 0), n), start)
    return _crossing(before, _tie_log_odds(x, y, n), x, y, n, tail)


def _crossing(low: Array, tie: Array, x: Array, y: Array, n: Array, tail: Array) -> Array:
    """Where S_x + F_{y-1} rises above 2·tail in (low, tie), or the tie itself: there it jumps to S_x + F_y."""
    limit = np.maximum(low, tie)
    early = np.flatnonzero(_both_tails(limit, x, y - 1, n) > 2 * tail)
    x, y, n, tail = (values[early] for values in (x, y, n, tail))
    limit[early] = root(_excess, low[early], limit[early], x, y - 1, n, tail, absolute=_ROUNDING)
    return limit


def _first_count(test: Callable[[Array], NDArray[np.bool_]], below: Array) -> Array:
    """Smallest whole number in 0 .. below - 1 that passes, per element; the test never turns back."""
    low, high = np.zeros_like(below), below - 1
    while np.any(low < high):
        middle = np.floor((low + high) / 2)
        passed = test(middle)
        low, high = np.where(passed, low, np.minimum(middle + 1, high)), np.where(passed, middle, high)
    return high


def _tie_log_odds(x: Array, y: Array, n: Array) -> Array:
    """Log-odds at which x and y < x are equally probable."""
    step = x - y
    return (log_rising(y + 1, step) - log_rising(n - x + 1, step)) / step


def _log_odds(p: Array, q: Array) -> Array:
    return np.log(p) - np.log(q)


def _above(x: Array, n: Array, log_odds: Array) -> Array:
    """P(X >= x), computed from the smaller of p and 1 - p."""
    minor = special.expit(-np.abs(log_odds))
    rare = log_odds < 0
    chance = np.empty_like(minor)
    chance[rare] = at_least(x[rare], n[rare], minor[rare])
    common = ~rare
    chance[common] = at_most(n[common] - x[common], n[common], minor[common])
    return chance


def _below(y: Array, n: Array, log_odds: Array) -> Array:
    return _above(n - y, n, -log_odds)


def _both_tails(log_odds: Array, x: Array, y: Array, n: Array) -> Array:
    return _above(x, n, log_odds) + _below(y, n, log_odds)


def _tail_ratio(log_odds: Array, x: Array, y: Array, n: Array) -> Array:
    return np.asarray(np.log(_above(x, n, log_odds) / _below(y, n, log_odds)))


def _excess(log_odds: Array, x: Array, y: Array, n: Array, tail: Array) -> Array:
    return np.asarray(np.log(_both_tails(log_odds, x, y, n) / (2 * tail)))


BLAKER = Method(
    name="blaker",
    function=blaker,
    label="Blaker exact",
    family="exact",
    source='H. Blaker, "Confidence curves and improved exact confidence intervals for discrete distributions", '
    "Canadian Journal of Statistics 28:783 (2000)",
    formula="hull of {p : a(x, p) > α}, a = P(m(X) ≤ m(x)), m(k) = min{P(X ≤ k), P(X ≥ k)}",
    ends="0 at 0 events and 1 at n events; the other end is computed",
    faults="the acceptance function jumps in p, so that the set can have gaps (at 95 % first n = 31, x = 1) which the "
    "hull fills; limits stand still over ranges of confidence; always inside Clopper–Pearson",
    sides=("two-sided",),
    slow=True,
)

STERNE = Method(
    name="sterne",
    function=sterne,
    label="Sterne exact",
    family="exact",
    source='T. E. Sterne, "Some remarks on confidence or fiducial limits", Biometrika 41:275 (1954)',
    formula="hull of {p : Σ b(k) over all k with b(k) ≤ b(x) > α}, b(k) = P(X = k)",
    ends="0 at 0 events and 1 at n events; the other end is computed",
    faults="the set can have gaps (at 95 % first n = 30, x = 1) which the hull fills; may leave Clopper–Pearson "
    "(n = 10, x = 1)",
    sides=("two-sided",),
    slow=True,
)
