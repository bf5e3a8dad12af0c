"""High-precision ground for the derivations: a root finder, and binomial, beta and Poisson sums added term by term."""

from collections.abc import Callable
from functools import cache

from mpmath import erfinv, exp, log, loggamma, mp, mpf, sign, sqrt

mp.dps = 50
DIGITS = mpf(10) ** -42  # of a root, relative
NEGLIGIBLE = mpf(10) ** -48  # of a sum, relative
TINY = mpf(10) ** -40  # as good as 0 for a bracket
HALF = mpf(1) / 2
Pair = tuple[mpf, mpf]


def root(f: Callable[[mpf], mpf], low: mpf, high: mpf) -> mpf:
    """Where f changes sign in [low, high], by Ridders' rule; one of the two end points when f is 0 there."""
    at_low, at_high, last = f(low), f(high), None
    if at_low == 0 or at_high == 0:
        return low if at_low == 0 else high
    assert sign(at_low) != sign(at_high), "no change of sign"
    for _ in range(1000):
        middle = (low + high) / 2
        at_middle = f(middle)
        bend = sign(at_low) * at_middle / sqrt(at_middle**2 - at_low * at_high)
        new = middle + (middle - low) * bend
        at_new = f(new)
        if at_new == 0 or (last is not None and abs(new - last) <= DIGITS * abs(new)):
            return new
        points = sorted([(low, at_low), (middle, at_middle), (new, at_new), (high, at_high)])
        flips = [i for i in range(3) if sign(points[i][1]) != sign(points[i + 1][1])]
        (low, at_low), (high, at_high) = points[flips[0]], points[flips[0] + 1]
        last = new
    raise AssertionError("no convergence")


def quantile(tail: mpf) -> mpf:
    """z with P(Z > z) = tail."""
    return sqrt(mpf(2)) * erfinv(1 - 2 * tail)


@cache
def choose(n: int, k: int) -> mpf:
    """Binomial coefficient; digits to spare, for its logarithm can be a million."""
    with mp.workdps(70):
        return exp(loggamma(n + 1) - loggamma(k + 1) - loggamma(n - k + 1))


def chance(k: int, n: int, p: mpf) -> mpf:
    """P(X = k)."""
    return choose(n, k) * p**k * (1 - p) ** (n - k)


def _downward(x: int, n: int, p: mpf) -> mpf:
    """P(X <= x), added from x down until the terms vanish."""
    term = total = chance(x, n, p)
    odds = (1 - p) / p
    for k in range(x, 0, -1):
        term *= odds * k / (n - k + 1)
        total += term
        if term < NEGLIGIBLE * total:
            break
    return total


def at_most(x: int, n: int, p: mpf) -> mpf:
    """P(X <= x)."""
    if x < 0 or x >= n:
        return mpf(x >= n)
    return _downward(x, n, p) if x <= n * p else 1 - _downward(n - x - 1, n, 1 - p)


def at_least(x: int, n: int, p: mpf) -> mpf:
    """P(X >= x)."""
    return at_most(n - x, n, 1 - p)


@cache
def _log_beta(a: mpf, b: mpf) -> mpf:
    with mp.workdps(70):
        return loggamma(a) + loggamma(b) - loggamma(a + b)


def beta_below(p: mpf, a: mpf, b: mpf) -> mpf:
    """Beta(a, b) distribution function, from the shorter of the two series."""
    return _beta_series(p, a, b) if _terms(p, a, b) < _terms(1 - p, b, a) else 1 - _beta_series(1 - p, b, a)


def _terms(p: mpf, a: mpf, b: mpf) -> mpf:
    """About how many terms the series takes: up to its largest one, then at worst a geometric fall."""
    return max(mpf(0), ((a + b) * p - a) / (1 - p)) - 110 / log(p)


def _beta_series(p: mpf, a: mpf, b: mpf) -> mpf:
    """p^a q^b / (a B(a, b)) times the sum of prod (a + b + k) p / (a + 1 + k): positive terms only."""
    term, total, k = mpf(1), mpf(1), 0
    while term > NEGLIGIBLE * total:
        term *= (a + b + k) * p / (a + 1 + k)
        total += term
        k += 1
    return total * exp(a * log(p) + b * log(1 - p) - _log_beta(a, b)) / a


def beta_central(a: mpf, b: mpf, tail: mpf) -> Pair:
    """The points of Beta(a, b) with `tail` below, and with `tail` above."""
    return (
        root(lambda p: beta_below(p, a, b) - tail, TINY, 1 - TINY),
        1 - root(lambda q: beta_below(q, b, a) - tail, TINY, 1 - TINY),
    )


def poisson_at_most(x: int, mean: mpf) -> mpf:
    """P(Poisson(mean) <= x), by the terms from x down, or from x + 1 up."""
    if x < 0:
        return mpf(0)
    start = x if x < mean else x + 1
    term = total = exp(start * log(mean) - mean - loggamma(start + 1))
    for k in range(x, 0, -1) if x < mean else range(x + 2, x + 10**7):
        term *= k / mean if x < mean else mean / k
        total += term
        if term < NEGLIGIBLE * total:
            break
    return total if x < mean else 1 - total
