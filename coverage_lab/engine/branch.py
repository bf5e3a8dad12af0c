"""Branch-and-bound for coverage on segments whose covering sets are several runs of x, or mixtures."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from coverage_lab.probability import at_least, at_most
from coverage_lab.records import Array

GAP = 1e-10  # the answer is within this of the infimum

Whole = NDArray[np.int64]


@dataclass(frozen=True)
class Runs:
    """Runs first..last of covering x, each with its binomial's trials and weight, for `segments` segments."""

    segments: int
    segment: Whole
    trials: Whole
    weight: Array
    first: Whole
    last: Whole

    @property
    def curvature(self) -> Array:
        """For each segment a bound on |K''|: every run adds at most 2 n (n - 1), since |b'(k; m, p)| <= m."""
        return self.total(self.weight * 2.0 * self.trials * (self.trials - 1))

    def of(self, chosen: Whole) -> "Runs":
        """The runs of the chosen segments, renumbered 0, 1, … in their order."""
        starts = np.searchsorted(self.segment, chosen, side="left")
        counts = np.searchsorted(self.segment, chosen, side="right") - starts
        offset = np.repeat(starts - np.concatenate([[0], np.cumsum(counts)[:-1]]), counts)
        rows = np.arange(counts.sum()) + offset
        number = np.repeat(np.arange(len(chosen)), counts)
        return Runs(len(chosen), number, self.trials[rows], self.weight[rows], self.first[rows], self.last[rows])

    def chances(self, p: Array) -> Array:
        """P(first <= X <= last) of every run at its segment's p, times the run's weight."""
        at = p[self.segment]
        miss = at_most(self.first - 1, self.trials, at) + at_least(self.last + 1, self.trials, at)
        return self.weight * (1.0 - miss)

    def total(self, chances: Array) -> Array:
        """The runs' chances summed by segment."""
        return np.bincount(self.segment, chances, self.segments).astype(float)


def branch_and_bound(
    runs: Runs, left: Array, right: Array, chance: Callable[[Array], Array], best: float
) -> tuple[float, float]:
    """(infimum of K over the segments to within 1e-10, where): K is below `best` somewhere, or `best` comes back.

    On [u, v] K is at least the sum of the lesser end value of every run (a run's probability rises, then falls), and
    at least min(K(u), K(v)) - M (v - u)^2 / 8 with M a bound on |K''|; the larger of the two bounds counts. Without the
    second an interior minimum would take millions of splits.
    """
    segment = np.arange(runs.segments)
    curvature = runs.curvature
    u, v = left, right
    at = float(left[0])
    while len(segment):
        here = runs.of(segment)
        cu, cv = chance(u), chance(v)
        ends = here.chances(cu), here.chances(cv)
        ku, kv = here.total(ends[0]), here.total(ends[1])
        for k, p in ((ku, u), (kv, v)):
            i = int(np.argmin(k))
            if k[i] < best:
                best, at = float(k[i]), float(p[i])
        by_runs = here.total(np.minimum(*ends))
        by_curvature = np.minimum(ku, kv) - curvature[segment] * (cv - cu) ** 2 / 8
        keep = np.maximum(by_runs, by_curvature) < best - GAP
        u, v, segment = u[keep], v[keep], segment[keep]
        middle = (u + v) / 2
        u, v, segment = np.concatenate([u, middle]), np.concatenate([middle, v]), np.concatenate([segment, segment])
    return best, at
