"""Credible intervals from a beta posterior, measured here as confidence intervals."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike
from scipy import special

from coverage_lab.intervals.inputs import floats, pair
from coverage_lab.intervals.quantiles import beta_lower, beta_upper, beta_upper_and_rest
from coverage_lab.intervals.solve import root
from coverage_lab.intervals.sources import BROWN_CAI_DASGUPTA
from coverage_lab.records import Array, Bounds, Method


def jeffreys(events: ArrayLike, trials: ArrayLike, tail: ArrayLike) -> Bounds:
    """Equal-tailed posterior limits under Jeffreys' prior Beta(½, ½), opened to 0 and 1 at the ends."""
    x, n, tail = floats(events, trials, tail)
    lower = np.where(x > 0, beta_lower(x + 0.5, n - x + 0.5, tail), 0.0)
    return pair(lower, np.where(x < n, beta_upper(x + 0.5, n - x + 0.5, tail), 1.0))


def jeffreys_modified(events: ArrayLike, trials: ArrayLike, tail: ArrayLike) -> Bounds:
    """Jeffreys' limits, replaced next to the ends; the exact limits at 0 and n events are set last."""
    x, n, tail = floats(events, trials, tail)
    lower, upper = jeffreys(x, n, tail)
    lower, upper = np.where(x == 1, 0.0, lower), np.where(x == n - 1, 1.0, upper)
    power = np.log(tail) / n
    return pair(np.where(x == n, np.exp(power), lower), np.where(x == 0, -np.expm1(power), upper))


def uniform_bayes(events: ArrayLike, trials: ArrayLike, tail: ArrayLike) -> Bounds:
    """Equal-tailed posterior limits under the uniform prior."""
    x, n, tail = floats(events, trials, tail)
    return pair(beta_lower(x + 1, n - x + 1, tail), beta_upper(x + 1, n - x + 1, tail))


def jeffreys_hpd(events: ArrayLike, trials: ArrayLike, tail: ArrayLike) -> Bounds:
    """The shortest region of Jeffreys' posterior that holds 1 − 2·tail.

    Found for the rarer outcome, whose posterior leans right, and mirrored for the other.
    """
    x, n, tail = floats(events, trials, tail)
    few = np.minimum(x, n - x)
    inside = few > 0
    k, m = np.where(inside, few, 1.0), np.where(inside, n, 2.0)
    log_low = _log_shortest(k + 0.5, m - k + 0.5, tail)
    low = np.where(inside, np.exp(log_low), 0.0)
    left_out = np.where(inside, _right_tail(log_low, k + 0.5, m - k + 0.5, tail), 2 * tail)
    high, rest = beta_upper_and_rest(few + 0.5, n - few + 0.5, left_out)
    return pair(np.where(x > few, rest, low), np.where(x > few, 1 - low, high))


def _log_shortest(a: Array, b: Array, tail: Array) -> Array:
    """Logarithm of the lower end of the shortest region of Beta(a, b), 1 < a <= b.

    The lower tail holds at most half of what is left out, which bounds the end from above; the density at the
    equal-tailed upper limit bounds the density at both ends, which bounds it from below.
    """
    equal = beta_upper(a, b, tail)
    bottom = np.log(equal) + np.log1p(-equal) * (b - 1) / (a - 1)
    return root(_density_gap, bottom, np.log(beta_lower(a, b, tail)), a, b, tail, absolute=2e-16)


def _right_tail(log_low: Array, a: Array, b: Array, tail: Array) -> Array:
    return np.asarray(2 * tail - special.betainc(a, b, np.exp(log_low)))


def _density_gap(log_low: Array, a: Array, b: Array, tail: Array) -> Array:
    """Log-density at the lower end minus that at the upper end which leaves the rest of 2·tail above it."""
    high, rest = beta_upper_and_rest(a, b, _right_tail(log_low, a, b, tail))
    log_rest = np.where(high < 0.5, np.log1p(-np.minimum(high, 0.5)), np.log(rest))
    gap = (a - 1) * (log_low - np.log(high)) + (b - 1) * (np.log1p(-np.exp(log_low)) - log_rest)
    return np.asarray(gap)


JEFFREYS = Method(
    name="jeffreys",
    function=jeffreys,
    label="Jeffreys",
    family="Bayes",
    source=BROWN_CAI_DASGUPTA,
    formula="Beta(x + ½, n − x + ½) quantiles at tail and 1 − tail",
    ends="set to 0 at 0 events and to 1 at n events",
    faults="deep dips: at 95 % the worst coverage is .866 (n = 4) to .896",
)

JEFFREYS_MODIFIED = Method(
    name="jeffreys-modified",
    function=jeffreys_modified,
    label="Jeffreys, modified",
    family="Bayes",
    source=f"{BROWN_CAI_DASGUPTA}, section 4.1.2",
    formula="Jeffreys, with L(1) = 0 and U(n − 1) = 1, then U(0) = 1 − tail^(1/n) and L(n) = tail^(1/n)",
    ends="the exact (Clopper–Pearson) limits at 0 and n events",
    faults="a rule in pieces; the limits next to the ends are 0 and 1 as well",
)

JEFFREYS_HPD = Method(
    name="jeffreys-hpd",
    function=jeffreys_hpd,
    label="Jeffreys, highest density",
    family="Bayes",
    source="G. E. P. Box & G. C. Tiao, Bayesian Inference in Statistical Analysis, Addison-Wesley (1973)",
    formula="the shortest region of Beta(x + ½, n − x + ½) that holds 1 − α",
    ends="[0, Beta(1 − α; ½, n + ½)] at 0 events, its mirror at n events",
    faults="not invariant: another scale for the proportion gives another interval",
    sides=("two-sided",),
)

UNIFORM_BAYES = Method(
    name="uniform-bayes",
    function=uniform_bayes,
    label="Bayes, uniform prior",
    family="Bayes",
    source='T. Bayes, "An essay towards solving a problem in the doctrine of chances", Philosophical Transactions of '
    'the Royal Society 53:370 (1763); P.-S. Laplace, "Mémoire sur la probabilité des causes par les évènements" (1774)',
    formula="Beta(x + 1, n − x + 1) quantiles at tail and 1 − tail",
    ends="the lower limit at 0 events is above 0, the upper one at n events below 1",
    faults="never covers a proportion near enough to 0 or 1: worst coverage 0",
    exemptions={"holds-estimate": "the limits are never 0 or 1, the estimate at 0 and n events is"},
)
