"""Quick two-sided bounds of binomial tails, to see which of many places are worth an exact look.

For np <= k <= n, with σ = √(npq) and x = (k - np)/σ:  P(X >= k) = σ·b(k-1; n-1, p)·Y(x)·exp(E/σ), where Y is Mills'
ratio and 0 <= E <= min(√(π/8), 1/x). B. D. McKay, "On Littlewood's estimate for the binomial distribution", Advances
in Applied Probability 21:475 (1989).
"""

import numpy as np
from scipy.special import erfcx, gammaln

from coverage_lab.records import Array, Counts

SLACK = 1e-8  # rounding of the logarithms, far more than they lose
NARROWEST = 0.1  # standard deviations below which the bounds are too far apart to be of use
_HALF_PI_ROOT = np.sqrt(np.pi / 2)
_LARGEST = np.sqrt(np.pi / 8)


def outside_bounds(first: Counts, after: Counts, n: Counts, p: Array) -> tuple[Array, Array]:
    """Lower and upper bounds of P(X < first) + P(X >= after); 0 and 2 where the quick bound does not apply."""
    factorials = gammaln(np.arange(int(n.max()) + 2, dtype=np.float64) + 1)
    spread = np.sqrt(n * p * (1 - p))
    with np.errstate(divide="ignore"):  # at p = 0 and 1 the bound does not apply
        logs = np.log(p), np.log1p(-p)
    above = _tail(after, n, p, spread, logs, factorials)
    below = _tail(n - first + 1, n, 1 - p, spread, logs[::-1], factorials)
    return above[0] + below[0], above[1] + below[1]


def _tail(
    k: Counts, n: Counts, p: Array, spread: Array, logs: tuple[Array, Array], factorials: Array
) -> tuple[Array, Array]:
    """Bounds of P(X >= k): McKay's where k is right of the mean, 0 where k > n, else 0 and 1."""
    ours = (k >= 1) & (k <= n) & (k >= n * p) & (spread > NARROWEST)
    j = np.where(ours, k, n)
    scale = np.where(ours, spread, 1.0)
    x = np.where(ours, (j - n * p) / scale, 1.0)
    log_p, log_q = (np.where(ours, value, 0.0) for value in logs)
    point = factorials[n - 1] - factorials[j - 1] - factorials[n - j] + (j - 1) * log_p + (n - j) * log_q
    low = scale * np.exp(point) * _HALF_PI_ROOT * erfcx(x / np.sqrt(2))
    high = low * np.exp(np.minimum(_LARGEST, 1 / np.maximum(x, 1.0e-9)) / scale)
    return np.where(ours, low * (1 - SLACK), 0.0), np.where(ours, high * (1 + SLACK), np.where(k > n, 0.0, 1.0))
