"""Exact laws of clustered samples: of one cluster, of a sum over clusters, and of a sum with its sum of squares."""

import math
from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from scipy import special

from coverage_lab.designs.frame import SMALLEST
from coverage_lab.designs.lens import Lens
from coverage_lab.designs.seen import recorded, recorded_pairs
from coverage_lab.probability import betabinomial, point
from coverage_lab.records import Array, Counts

LARGEST_JOINT = 400_000  # cells of the joint law's array
_STEPPED = 250  # units in a cluster up to which the first chance is no smaller than doubles go
NEVER = 1e-16  # an outcome of one cluster that is less likely does not occur in any simulation
_KEPT = 512  # laws of one cluster kept in memory


@lru_cache(maxsize=_KEPT)
def cluster_counts(m: int, p: float, icc: float, lens: Lens) -> Array:
    """P(x recorded events) in a cluster of m units, x = 0..m, through a lens that loses none."""
    true = _true_events(m, p, icc)
    return true @ recorded(m, lens.event[0], lens.other[0]) if lens.mixes else true


@lru_cache(maxsize=_KEPT)
def cluster_pairs(sizes: "int | RandomSizes", p: float, icc: float, lens: Lens) -> Array:
    """P(x recorded events, y recorded others) in a cluster of fixed or random size, array (largest+1, largest+1)."""
    law = sizes.law() if isinstance(sizes, RandomSizes) else np.eye(sizes + 1)[sizes]
    pairs = np.zeros((len(law), len(law)))
    for m in np.flatnonzero(law).tolist():
        k = np.arange(m + 1)
        pairs[k, m - k] = law[m] * _true_events(m, p, icc)
    return recorded_pairs(pairs, lens)


@dataclass(frozen=True)
class RandomSizes:
    """Cluster sizes that are gamma numbers with this mean and coefficient of variation, rounded, at least 1."""

    mean: int
    cv: float

    def draw(self, shape: tuple[int, int], rng: np.random.Generator) -> Counts:
        """Literal sizes."""
        spread = self.cv**2
        return np.maximum(np.rint(rng.gamma(1 / spread, self.mean * spread, shape)), 1).astype(np.int64)

    @property
    def largest(self) -> int:
        """A size that no cluster exceeds in any simulation."""
        spread = self.cv**2
        return max(1, math.ceil(special.gammainccinv(1 / spread, NEVER) * self.mean * spread))

    def law(self) -> Array:
        """P(size = m), m = 0..largest."""
        spread = self.cv**2
        cuts = np.append(np.arange(1, self.largest) + 0.5, np.inf) / (self.mean * spread)
        below = np.diff(special.gammainc(1 / spread, cuts), prepend=0.0)
        above = -np.diff(special.gammaincc(1 / spread, cuts), prepend=1.0)
        return np.concatenate([[0.0], np.where(cuts < 1 / spread, below, above)])  # each from its own small tail


def _true_events(m: int, p: float, icc: float) -> Array:
    """Binomial, or beta-binomial with Beta(p(1-icc)/icc, (1-p)(1-icc)/icc)."""
    x = np.arange(m + 1)
    if icc == 0 or p in (0.0, 1.0):
        return point(x, m, p)
    strength = (1 - icc) / icc
    a, b = p * strength, (1 - p) * strength
    if m > _STEPPED:
        return betabinomial(x, m, a, b)
    return _stepped(m, a, b) if a <= b else _stepped(m, b, a)[::-1]


def _stepped(m: int, a: float, b: float) -> Array:
    """The beta-binomial law for a <= b from its first chance, a product, by the ratios of neighbours: quick for few."""
    j = np.arange(m)
    ratios = (m - j) * (a + j) / ((j + 1) * (b + m - 1 - j))
    return np.asarray(np.prod((b + j) / (a + b + j)) * np.concatenate([[1.0], np.cumprod(ratios)]))


def total_law(laws: Sequence[tuple[Array, int]]) -> tuple[Counts, Array]:
    """Totals over clusters and their probabilities; `laws` gives each cluster law with its number of clusters."""
    total = np.ones(1)
    for law, count in laws:
        total = np.convolve(total, _power(law, count))
    events = np.flatnonzero(total > SMALLEST)
    return events, total[events]


def _power(law: Array, count: int) -> Array:
    """The law of a sum of `count` independent copies, by repeated squaring: sums of positive terms only."""
    power, square = np.ones(1), law
    while count:
        if count & 1:
            power = np.convolve(power, square)
        count >>= 1
        if count:
            square = np.convolve(square, square)
    return power


def joint_law(law: Array, count: int) -> tuple[Counts, Counts, Array] | None:
    """(sum of x, sum of x², probability) over `count` clusters with one law; None when the array would be too large.

    Cluster by cluster, on the sum of x and the sum of x(x-1)/2, which has no gaps. Cells at the border that are too
    rare to matter are cut off as they arise. Where x is mostly large the non-events are counted instead.
    """
    m = len(law) - 1
    if law @ np.arange(m + 1) > m / 2 + 1e-9:
        mirrored = joint_law(law[::-1].copy(), count)
        if mirrored is None:
            return None
        others, squares, chance = mirrored
        return count * m - others, count * m * m - 2 * m * others + squares, chance
    outcomes = np.flatnonzero(law > 0)
    cells, first = np.ones((1, 1)), (0, 0)
    for _ in range(count):
        cells, first = _cut(_with_one_more(cells, law, outcomes), first)
        if cells.size > LARGEST_JOINT:
            return None
    x, pairs = np.nonzero(cells > SMALLEST)
    events = x + first[0]
    return events, 2 * (pairs + first[1]) + events, cells[x, pairs]


def _with_one_more(cells: Array, law: Array, outcomes: Counts) -> Array:
    """The joint law after one more cluster."""
    rows, columns = cells.shape
    most = int(outcomes[-1])
    grown = np.zeros((rows + most, columns + most * (most - 1) // 2))
    for x in outcomes.tolist():
        pairs = x * (x - 1) // 2
        grown[x : x + rows, pairs : pairs + columns] += law[x] * cells
    return grown


def _cut(cells: Array, first: tuple[int, int]) -> tuple[Array, tuple[int, int]]:
    """The array without its border of negligible cells, and the place of its new corner."""
    matters = cells > SMALLEST / 100
    rows, columns = np.flatnonzero(matters.any(axis=1)), np.flatnonzero(matters.any(axis=0))
    cut = cells[rows[0] : rows[-1] + 1, columns[0] : columns[-1] + 1]
    return cut, (first[0] + int(rows[0]), first[1] + int(columns[0]))
