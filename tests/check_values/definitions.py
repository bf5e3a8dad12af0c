"""The definition of every method of events and trials, put into mpmath with plain root finding and direct scans."""

from collections.abc import Callable
from functools import cache
from itertools import pairwise

from mpmath import asin, exp, log, mpf, pi, sin, sqrt
from precise import (
    HALF,
    TINY,
    Pair,
    at_least,
    at_most,
    beta_below,
    beta_central,
    chance,
    choose,
    poisson_at_most,
    quantile,
    root,
)


# --- normal approximations and their relatives ------------------------------------------------------------------------
def wald(x: int, n: int, tail: mpf) -> Pair:
    p = mpf(x) / n
    half = quantile(tail) * sqrt(p * (1 - p) / n)
    return p - half, p + half


def wald_cc(x: int, n: int, tail: mpf) -> Pair:
    lower, upper = wald(x, n, tail)
    return lower - HALF / n, upper + HALF / n


def _score_below(centre: mpf, n: int, tail: mpf) -> mpf:
    """The p < centre with (centre - p)^2 = z^2 p (1 - p) / n."""
    z = quantile(tail)
    if centre == 1:  # where centre itself solves the equation
        return n / (n + z**2)
    return root(lambda p: (centre - p) ** 2 - z**2 * p * (1 - p) / n, mpf(0), centre)


def wilson(x: int, n: int, tail: mpf) -> Pair:
    p = mpf(x) / n
    return _score_below(p, n, tail) if x else mpf(0), 1 - _score_below(1 - p, n, tail) if x < n else mpf(1)


def wilson_cc(x: int, n: int, tail: mpf) -> Pair:
    down, up = mpf(2 * x - 1) / (2 * n), mpf(2 * x + 1) / (2 * n)
    return (
        _score_below(down, n, tail) if down > 0 else mpf(0),
        1 - _score_below(1 - up, n, tail) if up < 1 else mpf(1),
    )


def _with_pseudo_counts(x: int, n: int, tail: mpf, events: mpf, trials: mpf) -> Pair:
    p = (x + events) / (n + trials)
    half = quantile(tail) * sqrt(p * (1 - p) / (n + trials))
    return p - half, p + half


def agresti_coull(x: int, n: int, tail: mpf) -> Pair:
    return _with_pseudo_counts(x, n, tail, quantile(tail) ** 2 / 2, quantile(tail) ** 2)


def plus_four(x: int, n: int, tail: mpf) -> Pair:
    return _with_pseudo_counts(x, n, tail, mpf(2), mpf(4))


def arcsine(x: int, n: int, tail: mpf) -> Pair:
    angle = asin(sqrt((x + mpf(3) / 8) / (n + mpf(3) / 4)))
    half = quantile(tail) / (2 * sqrt(mpf(n)))
    return sin(max(angle - half, mpf(0))) ** 2, sin(min(angle + half, pi / 2)) ** 2


def _on_logit_scale(centre: mpf, half: mpf) -> Pair:
    return 1 / (1 + exp(half - centre)), 1 / (1 + exp(-half - centre))


def logit(x: int, n: int, tail: mpf) -> Pair:
    if x in (0, n):
        return clopper_pearson(x, n, tail)
    return _on_logit_scale(log(mpf(x) / (n - x)), quantile(tail) * sqrt(mpf(n) / (mpf(x) * (n - x))))


def logit_half(x: int, n: int, tail: mpf) -> Pair:
    variance = mpf(n + 1) * (n + 2) / (mpf(n) * (x + 1) * (n - x + 1))
    return _on_logit_scale(log((x + HALF) / (n - x + HALF)), quantile(tail) * sqrt(variance))


def cloglog(x: int, n: int, tail: mpf) -> Pair:
    if x in (0, n):
        return clopper_pearson(x, n, tail)
    p, z = mpf(x) / n, quantile(tail)
    centre, error = log(-log(p)), sqrt((1 - p) / (n * p)) / abs(log(p))
    return exp(-exp(centre + z * error)), exp(-exp(centre - z * error))


def second_order(x: int, n: int, tail: mpf) -> Pair:
    z = quantile(tail)
    eta, gamma_1, gamma_2 = z**2 / 3 + mpf(1) / 6, -(13 * z**2 / 18 + mpf(17) / 18), z**2 / 18 + mpf(7) / 36

    def upper(k: int) -> mpf:
        spread = mpf(k) * (n - k) / mpf(n) ** 2
        radicand = max(mpf(0), spread + (gamma_1 * spread + gamma_2) / n)
        return (k + eta) / (n + 2 * eta) + z * sqrt(radicand) / sqrt(mpf(n))

    return 1 - upper(n - x), upper(x)


# --- likelihood and Bayes ---------------------------------------------------------------------------------------------
def likelihood_ratio(x: int, n: int, tail: mpf) -> Pair:
    z, p_hat = quantile(tail), mpf(x) / n

    def excess(p: mpf) -> mpf:
        return 2 * ((x * log(p_hat / p) if x else 0) + ((n - x) * log((1 - p_hat) / (1 - p)) if x < n else 0)) - z**2

    return root(excess, TINY, p_hat) if x else mpf(0), root(excess, p_hat, 1 - TINY) if x < n else mpf(1)


def uniform_bayes(x: int, n: int, tail: mpf) -> Pair:
    return beta_central(mpf(x + 1), mpf(n - x + 1), tail)


def jeffreys(x: int, n: int, tail: mpf) -> Pair:
    lower, upper = beta_central(x + HALF, n - x + HALF, tail)
    return lower if x else mpf(0), upper if x < n else mpf(1)


def jeffreys_modified(x: int, n: int, tail: mpf) -> Pair:
    lower, upper = jeffreys(x, n, tail)
    lower, upper = mpf(0) if x == 1 else lower, mpf(1) if x == n - 1 else upper
    end = tail ** (mpf(1) / n)
    return end if x == n else lower, 1 - end if x == 0 else upper


def jeffreys_hpd(x: int, n: int, tail: mpf) -> Pair:
    a, b = x + HALF, n - x + HALF
    if x in (0, n):  # the density only falls, or only rises
        far = root(lambda q: beta_below(q, n + HALF, HALF) - 2 * tail, TINY, 1 - TINY)
        return (mpf(0), 1 - far) if x == 0 else (far, mpf(1))
    mode = (a - 1) / (a + b - 2)

    def gap_above(low: mpf) -> mpf:
        """1 - u, where the density at u > mode is as high as at `low`."""
        level = (a - 1) * log(low) + (b - 1) * log(1 - low)
        return root(lambda v: (b - 1) * log(v) + (a - 1) * log(1 - v) - level, exp(level / (b - 1)), 1 - mode)

    def outside(low: mpf) -> mpf:
        return beta_below(low, a, b) + beta_below(gap_above(low), b, a) - 2 * tail

    odds = mode / (1 - mode)
    low = high = mode * (1 - mpf(10) ** -20 * (1 - mode))
    while outside(low) > 0:
        odds /= 2
        low, high = odds / (1 + odds), low
    lower = root(outside, low, high)
    return lower, 1 - gap_above(lower)


# --- exact ----------------------------------------------------------------------------------------------------------
def _by_tails(x: int, n: int, tail: mpf, share: mpf) -> Pair:
    """Where the tail that holds `share` of the observed probability falls to `tail`."""

    def upper(k: int) -> mpf:
        end = 1 - TINY / n
        return root(lambda p: at_most(k - 1, n, p) + share * chance(k, n, p) - tail, mpf(k) / n + TINY, end)

    return 1 - upper(n - x) if x else mpf(0), upper(x) if x < n else mpf(1)


def clopper_pearson(x: int, n: int, tail: mpf) -> Pair:
    return _by_tails(x, n, tail, mpf(1))


def mid_p(x: int, n: int, tail: mpf) -> Pair:
    return _by_tails(x, n, tail, HALF)


def poisson_exact(x: int, n: int, tail: mpf) -> Pair:
    widest = 2 * x + 200 * (1 + sqrt(mpf(x)))
    lower = root(lambda mean: 1 - poisson_at_most(x - 1, mean) - tail, TINY, widest) if x else mpf(0)
    return lower / n, root(lambda mean: poisson_at_most(x, mean) - tail, TINY, widest) / n


def _hull_upper(x: int, n: int, alpha: mpf, start: mpf, far: Callable, tie: Callable) -> mpf:
    """Largest p with P(X <= x) + P(X >= y(p)) > alpha; `start` is a p beyond it.

    y(p) is the first y > x that is as extreme as x (`far`); it grows by one beyond each p where y and x tie (`tie`),
    and there the acceptance jumps down. Every piece between two ties is looked at, from the right.
    """
    y, above = x, n + 1
    while above - y > 1:  # at `start`: the first y that is far, which n + 1 stands for when none is
        middle = (y + above) // 2
        y, above = (y, middle) if far(middle, start) else (middle, above)
    right, y = start, above
    while True:
        left = tie(y - 1)
        spots = [right - (right - left) * j / 8 for j in range(9)]
        accepted = [at_most(x, n, p) + at_least(y, n, p) - alpha for p in spots]
        assert accepted[0] <= 0, "the scan began too far left"
        for j in range(1, 9):
            if accepted[j] > 0:
                return root(lambda p, y=y: at_most(x, n, p) + at_least(y, n, p) - alpha, spots[j], spots[j - 1])
        if at_most(x, n, left) + at_least(y - 1, n, left) > alpha:
            return left
        right, y = left, y - 1


def blaker(x: int, n: int, tail: mpf) -> Pair:
    def upper(k: int) -> mpf:
        def excess(y: int, p: mpf) -> mpf:
            return at_most(k, n, p) - at_least(y, n, p)

        start = clopper_pearson(k, n, tail)[1]  # the acceptance is at most twice P(X <= k)
        return _hull_upper(
            k, n, 2 * tail, start, lambda y, p: excess(y, p) >= 0, lambda y: root(lambda p: excess(y, p), TINY, start)
        )

    return 1 - upper(n - x) if x else mpf(0), upper(x) if x < n else mpf(1)


def sterne(x: int, n: int, tail: mpf) -> Pair:
    def upper(k: int) -> mpf:
        start = clopper_pearson(k, n, tail / 100)[1]
        return _hull_upper(
            k, n, 2 * tail, start,
            lambda y, p: chance(y, n, p) <= chance(k, n, p),
            lambda y: 1 / (1 + (choose(n, y) / choose(n, k)) ** (mpf(1) / (y - k))),
        )  # fmt: skip

    return 1 - upper(n - x) if x else mpf(0), upper(x) if x < n else mpf(1)


@cache
def short_lower_limits(n: int, tail: mpf) -> tuple[mpf, ...]:
    """Lower limits of the shortest exact table: one pass over k = n .. 1 from Clopper-Pearson."""
    lower = [clopper_pearson(k, n, tail)[0] for k in range(n + 1)]
    for k in range(n, 0, -1):
        lower[k] = _moved_right(lower, k, n, 1 - 2 * tail)
    return tuple(lower)


def _moved_right(lower: list[mpf], k: int, n: int, goal: mpf) -> mpf:
    """The supremum of L(k), with U(n - k) = 1 - L(k), that keeps the coverage: the first failing stretch, bisected."""

    def keeps(to: mpf) -> bool:
        moved = [to if j == k else lower[j] for j in range(n + 1)]
        return _least_coverage(moved, n, lower[k], to) >= goal - mpf(10) ** -30

    stops = sorted({p for v in lower for p in (v, 1 - v) if p > lower[k]} | {mpf(1)})
    good = lower[k]
    for bad in stops:
        if not keeps(bad):
            break
        good = bad
    while bad - good > mpf(10) ** -43:
        middle = (good + bad) / 2
        good, bad = (middle, bad) if keeps(middle) else (good, middle)
    return good


def _least_coverage(lower: list[mpf], n: int, left: mpf, right: mpf) -> mpf:
    """Infimum over the open (left, right): both ends of every stretch on which the covering set is constant."""
    ends = sorted({p for v in lower for p in (v, 1 - v) if left < p < right} | {left, right})
    least = mpf(1)
    for a, b in pairwise(ends):
        covering = [j for j in range(n + 1) if lower[j] <= (a + b) / 2 <= 1 - lower[n - j]]
        least = min([least, *(sum(chance(j, n, p) for j in covering) for p in (a, b))])
    return least


def shortest_exact(x: int, n: int, tail: mpf) -> Pair:
    lower = short_lower_limits(n, tail)
    return lower[x], 1 - lower[n - x]


METHODS: dict[str, Callable[[int, int, mpf], Pair]] = {
    function.__name__.replace("_", "-"): function
    for function in (
        wilson, clopper_pearson, jeffreys, agresti_coull, mid_p, blaker, shortest_exact, sterne, second_order,
        likelihood_ratio, jeffreys_modified, wilson_cc, uniform_bayes, jeffreys_hpd, arcsine, logit, logit_half,
        cloglog, plus_four, poisson_exact, wald_cc, wald,
    )
}  # fmt: skip
