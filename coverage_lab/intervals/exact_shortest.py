"""The shortest exact table in the sense of Blyth, Still and Casella."""

from __future__ import annotations

from functools import lru_cache

import numpy as np
from numpy.typing import ArrayLike
from scipy import special

from coverage_lab.intervals.exact import clopper_pearson
from coverage_lab.intervals.inputs import floats, pair
from coverage_lab.intervals.solve import root
from coverage_lab.records import Array, Bounds, Method

LARGEST_N = 1000  # the table is built one count after another, and checked against brute force only for small n


def shortest_exact(events: ArrayLike, trials: ArrayLike, tail: ArrayLike) -> Bounds:
    """Clopper–Pearson limits pulled in as far as coverage allows, for n, n−1, …, 1 events and their mirror in turn."""
    x, n, tail = floats(events, trials, tail)
    lower, upper = np.empty(x.shape), np.empty(x.shape)
    for size, error in set(zip(n.ravel().tolist(), tail.ravel().tolist(), strict=True)):
        here = (n == size) & (tail == error)
        low, rest = _table(int(size), error)
        lower[here], upper[here] = low[x[here].astype(int)], rest[(size - x[here]).astype(int)]
    return pair(lower, upper)


@lru_cache(maxsize=32)
def _table(n: int, tail: float) -> tuple[Array, Array]:
    """Lower limits L and 1 - L of all counts 0..n; the upper limit at i is 1 - L at n - i."""
    counts = np.arange(n + 1)
    lower, upper = clopper_pearson(counts, n, tail)
    rest = upper[::-1].copy()
    for k in range(n, 0, -1):
        lower[k], rest[k] = _moved(k, n, 2 * tail, lower, rest)
    lower.flags.writeable = rest.flags.writeable = False
    return lower, rest


def _moved(k: int, n: int, alpha: float, lower: Array, rest: Array) -> tuple[float, float]:
    """The supremum (and one minus it) to which L(k) can move while coverage without k stays at 1 - alpha or more.

    Right of L(k) the other counts that cover p are i..k-1, i being the first with U(i) > p; each U(i) passed takes one
    away. From one half on the mirror image n - k is gone too, as if U(n-k) were one half.
    """
    p, q = float(lower[k]), float(rest[k])
    slack = alpha + min(1e-12, 1e-10 * alpha)  # a coverage that equals 1 - alpha but for rounding still holds
    i = n - int(np.searchsorted(lower, q, side="left")) + 1
    while i < k and _missed(p, k, i, n) <= slack:
        end, end_rest = float(rest[n - i]), float(lower[n - i])
        if i == n - k and end > 0.5:
            end = end_rest = 0.5
        if _missed(end, k, i, n) > slack:
            p = float(root(_excess, p, end, k, i, n, alpha))
            return p, 1 - p
        p, q, i = end, end_rest, i + 1
    return p, q


def _missed(p: ArrayLike, k: ArrayLike, i: ArrayLike, n: ArrayLike) -> Array:
    """P(X >= k) + P(X < i)."""
    p, k, i, n = (np.asarray(value, dtype=np.float64) for value in (p, k, i, n))
    return np.add(special.betainc(k, n - k + 1, p), special.betaincc(i, n - i + 1, p), dtype=np.float64)


def _excess(p: Array, k: Array, i: Array, n: Array, alpha: Array) -> Array:
    return np.asarray(np.log(_missed(p, k, i, n) / alpha))


SHORTEST_EXACT = Method(
    name="shortest-exact",
    function=shortest_exact,
    label="shortest exact (Blyth–Still–Casella)",
    family="exact",
    source='C. R. Blyth & H. A. Still, "Binomial confidence intervals", Journal of the American Statistical '
    'Association 78:108 (1983); G. Casella, "Refining binomial confidence intervals", Canadian Journal of Statistics '
    "14:113 (1986)",
    formula="from Clopper–Pearson, for k = n, n − 1, …, 1: L(k) moved right and U(n − k) = 1 − L(k) left, to the "
    "supremum that keeps the worst coverage at 1 − α or more; one pass",
    ends="0 at 0 events and 1 at n events; the other end is computed",
    faults="other published constructions differ slightly; intervals can be non-nested (n = 10: L(10) .7330 at 95 %, "
    f".7324 at 94.5 %); for n up to {LARGEST_N}",
    sides=("two-sided",),
    slow=True,
    largest_n=LARGEST_N,
    exemptions={"nested": "each limit depends on the others, which move with the confidence too"},
)
