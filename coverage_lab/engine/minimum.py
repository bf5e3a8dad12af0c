"""The certified infimum of coverage over a range of p: by end points where covering sets are runs, else by branching.

Coverage at p of a binomial design is K(p) = sum of P(X = x) over the covering x. Between two neighbouring end points of
the intervals the covering set is constant. When it is a run i..j, K' = n [b(i-1; n-1, p) - b(j; n-1, p)] changes sign
once, from + to -, so the infimum over the segment is at one of its ends (Wang 2007, Stat. Sinica 17:361). Intervals are
closed, so the value at an end point itself is never below its two limits and needs no look. With several pieces each
run's probability rises and falls by itself: the sum of the lesser ends bounds the segment, and what that leaves open is
branched on.
"""

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from coverage_lab.engine.branch import GAP, Runs, branch_and_bound
from coverage_lab.probability import at_least, at_most
from coverage_lab.probability_finite import finite_above, finite_below
from coverage_lab.records import Array, Minimum

SAME = 1e-13  # end points closer than this, relatively, are one: exact limits share them up to rounding

_UPPER, _LOWER = 1, 2
_BOTH = _UPPER | _LOWER

Chance = Callable[[Array], Array]
Flags = NDArray[np.bool_]


@dataclass(frozen=True)
class Piece:
    """One binomial part, X ~ Binomial(trials, chance(p)), with `weight`; limits for x = first and on, none left out.

    chance(p) runs in a straight line from at_zero to at_one, the same for all pieces of a design. With a `population`
    the part is hypergeometric instead, p·population of its units being events.
    """

    trials: int
    weight: float
    first: int
    lower: Array
    upper: Array
    at_zero: float = 0.0
    at_one: float = 1.0
    population: int | None = None

    def chance(self, p: Array) -> Array:
        """The chance that a unit is recorded as an event."""
        return self.at_zero * (1 - p) + self.at_one * p

    def outside(self, below: ArrayLike, above: ArrayLike, p: Array) -> Array:
        """P(X <= below) + P(X >= above) at truth p, with full relative accuracy in both tails."""
        return self.at_most(below, p) + self.at_least(above, p)

    def at_most(self, x: ArrayLike, p: Array) -> Array:
        """P(X <= x) at truth p."""
        if self.population is None:
            return at_most(x, self.trials, self.chance(p))
        return finite_below(x, self.trials, self.population, np.rint(p * self.population))

    def at_least(self, x: ArrayLike, p: Array) -> Array:
        """P(X >= x) at truth p."""
        if self.population is None:
            return at_least(x, self.trials, self.chance(p))
        return finite_above(x, self.trials, self.population, np.rint(p * self.population))


@dataclass(frozen=True)
class Segments:
    """Open segments of the range with constant covering sets, and the miss rates at their two ends from inside.

    `ordered` is False where some covering set is not a single run: there the ends prove nothing. `worst` is a rate that
    no miss rate on the segment exceeds; infinite where the covering set of some piece is not a run.
    """

    left: Array
    right: Array
    miss_left: Array
    miss_right: Array
    ordered: Flags
    worst: Array


def identity(p: Array) -> Array:
    """The chance of an event is the true proportion itself."""
    return p


def edges(pieces: Sequence[Piece], low: float, high: float) -> tuple[Array, Array, Flags, Flags]:
    """Left and right ends of the segments into which the limits cut [low, high], and which of the ends can be worst.

    Coverage falls at an end point only where an interval begins (seen from the left) or ends (seen from the right), so
    a left end matters when some upper limit lies there, a right end when some lower limit does, and so do low and high.
    """
    uppers = np.concatenate([piece.upper for piece in pieces])
    lowers = np.concatenate([piece.lower for piece in pieces])
    cuts = np.concatenate([[low], uppers, lowers, [high]])
    kind = np.repeat([_BOTH, _UPPER, _LOWER, _BOTH], [1, len(uppers), len(lowers), 1])
    inside = (cuts >= low) & (cuts <= high)
    order = np.argsort(cuts[inside], kind="stable")
    cuts, kind = cuts[inside][order], kind[inside][order]
    gap = np.flatnonzero(cuts[1:] - cuts[:-1] > SAME * cuts[1:])
    if len(gap) == 0:
        return np.array([low]), np.array([high]), np.array([True]), np.array([True])
    shared = np.bitwise_or.reduceat(kind, np.concatenate([[0], gap + 1]))
    return cuts[gap], cuts[gap + 1], (shared[:-1] & _UPPER) > 0, (shared[1:] & _LOWER) > 0


def segments(pieces: Sequence[Piece], low: float, high: float, *, every_end: bool = True) -> Segments:
    """The segments with the miss rate at both ends of each, or only where an end can be worst (elsewhere 0)."""
    left, right, falls_left, falls_right = edges(pieces, low, high)
    rows = np.arange(len(left))
    at_left, at_right = (rows, rows) if every_end else (rows[falls_left], rows[falls_right])
    ends = np.concatenate([left[at_left], right[at_right]])
    both = np.concatenate([at_left, at_right])
    runs = np.ones(len(left), dtype=bool)
    miss_left, miss_right, worst = np.zeros(len(left)), np.zeros(len(left)), np.zeros(len(left))
    for piece in pieces:
        begin, end, run = covering_run(piece, (left + right) / 2)
        runs &= run
        begin, end = begin[both], end[both]
        outside = piece.outside(piece.first + begin - 1, piece.first + end, ends)
        miss = piece.weight * np.where(end > begin, outside, 1.0)
        one, other = np.zeros(len(left)), np.zeros(len(left))
        one[at_left], other[at_right] = np.split(miss, [len(at_left)])
        miss_left, miss_right, worst = miss_left + one, miss_right + other, worst + np.maximum(one, other)
    ordered = runs & (len(pieces) == 1)
    return Segments(left, right, miss_left, miss_right, ordered, np.where(runs, worst, np.inf))


def covering_run(piece: Piece, p: Array) -> tuple[NDArray[np.int64], NDArray[np.int64], Flags]:
    """For each p the covering positions begin..end-1, and whether they are known to be a run.

    The limits' running maximum from the left and minimum from the right bracket every disorder: where both count the
    same number of limits to the left of p, those limits are a prefix, however disordered the rest may be.
    """
    begin, run_upper = _prefix(piece.upper, p, side="left")
    end, run_lower = _prefix(piece.lower, p, side="right")
    return begin, end, run_upper & run_lower


def _prefix(limits: Array, p: Array, side: str) -> tuple[NDArray[np.int64], Flags]:
    """How many leading limits lie left of p, and whether these are all that do. Sound for any order of the limits."""
    from_left = np.maximum.accumulate(limits)
    from_right = np.minimum.accumulate(limits[::-1])[::-1]
    least = np.searchsorted(from_left, p, side=side)  # type: ignore[call-overload]
    most = np.searchsorted(from_right, p, side=side)  # type: ignore[call-overload]
    return least, least == most


def minimum(pieces: Sequence[Piece], low: float, high: float) -> Minimum:
    """The infimum of coverage over [low, high], certified; `at` is the p where it is approached.

    Exact to rounding where the covering sets are runs of one binomial; elsewhere within 1e-10 by branch-and-bound.
    """
    if low == high:
        return at_point(pieces, low)
    found = segments(pieces, low, high, every_end=len(pieces) > 1)
    best = _at_ends(found)
    rest = ~found.ordered & (found.worst > best.miss + GAP)
    if not rest.any():
        return best
    runs = covering_runs(pieces, (found.left[rest] + found.right[rest]) / 2)
    coverage, at = branch_and_bound(runs, found.left[rest], found.right[rest], pieces[0].chance, best.coverage)
    return best if coverage >= best.coverage else Minimum(coverage, at, certified=True, miss=1.0 - coverage)


def _at_ends(found: Segments) -> Minimum:
    """The largest miss at an end of a segment whose covering sets are runs."""
    runs = np.isfinite(found.worst)
    left = np.where(runs, found.miss_left, -1.0)
    right = np.where(runs, found.miss_right, -1.0)
    i, j = int(np.argmax(left)), int(np.argmax(right))
    miss, at = (left[i], found.left[i]) if left[i] >= right[j] else (right[j], found.right[j])
    if miss < 0:
        return Minimum(coverage=1.0, at=float(found.left[0]), certified=True, miss=0.0)
    return Minimum(coverage=1.0 - float(miss), at=float(at), certified=True, miss=float(miss))


def at_point(pieces: Sequence[Piece], p: float) -> Minimum:
    """Coverage at one p, as the minimum of a range that is a single proportion."""
    miss = 0.0
    for piece in pieces:
        positions = np.arange(len(piece.lower)) + piece.first
        covers = (piece.lower <= p) & (p <= piece.upper)
        first, last = _ends_of_runs(covers)
        miss += piece.weight * _outside(piece, positions[first], positions[last], np.array([p]))
    return Minimum(coverage=1.0 - miss, at=p, certified=True, miss=miss)


def _outside(piece: Piece, first: NDArray[np.int64], last: NDArray[np.int64], p: Array) -> float:
    """P(X in none of the runs first..last): what lies before, between and after them."""
    if len(first) == 0:
        return 1.0
    between = piece.at_least(last[:-1] + 1, p) - piece.at_least(first[1:], p)
    return float(piece.outside(first[0] - 1, last[-1] + 1, p).item() + between.sum())


def _ends_of_runs(covers: Flags) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """First and last positions of the runs of True."""
    padded = np.concatenate([[False], covers, [False]]).astype(np.int8)
    change = np.diff(padded)
    return np.flatnonzero(change == 1), np.flatnonzero(change == -1) - 1


def covering_runs(pieces: Sequence[Piece], p: Array) -> Runs:
    """The runs of covering x at each p, all pieces together, sorted by segment."""
    segment, trials, weight, first, last = [], [], [], [], []
    for piece in pieces:
        for k, value in enumerate(p):
            begin, end = _ends_of_runs((piece.lower <= value) & (value <= piece.upper))
            segment.append(np.full(len(begin), k))
            trials.append(np.full(len(begin), piece.trials))
            weight.append(np.full(len(begin), piece.weight))
            first.append(piece.first + begin)
            last.append(piece.first + end)
    joined = [np.concatenate(column) for column in (segment, trials, weight, first, last)]
    order = np.argsort(joined[0], kind="stable")
    return Runs(len(p), *(column[order] for column in joined))
