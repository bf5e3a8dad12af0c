"""Coverage over a whole range of p for many n at once, exactly and with no grid.

Over a range, coverage is lowest just left of a lower limit or just right of an upper one, or at an end of the range:
between two neighbouring limits it rises, then falls, and at a limit itself the closed interval still covers. Rows whose
limits turn back (what covers is no run then) are left to the engine's own minimum.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.special import betainc

from coverage_lab.engine.means import Range
from coverage_lab.engine.minimum import SAME, Piece, minimum
from coverage_lab.probability import at_least, at_most, betabinomial
from coverage_lab.records import Array, Counts
from coverage_lab.sizing.rows import Rows
from coverage_lab.sizing.tails import outside_bounds


def worst(rows: Rows, lower: Array, upper: Array, low: float, high: float) -> tuple[Array, Array]:
    """The largest miss rate over [low, high] of every row, and the p where it is approached; (rows,) each.

    lower, upper: (flat,), truncated to [0, 1]. Every x that covers somewhere in the range must be among the events.
    """
    row, p, beside, beside_lower = _single(rows, low) if low == high else _ends(rows, lower, upper, low, high)
    begin = _rank(rows, upper, row, beside)
    end = np.maximum(_rank(rows, lower, row, beside_lower), begin)
    hopeful = _hopeful(rows, row, begin, end, p)
    row, begin, end, p = row[hopeful], begin[hopeful], end[hopeful], p[hopeful]
    largest = _largest(row, _quick_miss(rows, row, begin, end, p), len(rows.n))
    row, begin, end, p = row[largest], begin[largest], end[largest], p[largest]
    miss = at_most(rows.first[row] + begin - 1, rows.n[row], p) + at_least(rows.first[row] + end, rows.n[row], p)
    miss = np.where(end > begin, miss, 1.0)
    for turned in np.flatnonzero(_turning(rows, lower) | _turning(rows, upper)):
        miss[turned], p[turned] = _by_engine(rows, lower, upper, (low, high), int(turned))
    return miss, p


def _single(rows: Rows, p: float) -> tuple[Counts, Array, Array, Array]:
    """The one place to look when the range is one proportion, where closed intervals cover."""
    at = np.full(len(rows.n), p)
    return np.arange(len(rows.n)), at, at, np.nextafter(at, 2.0)


def _ends(rows: Rows, lower: Array, upper: Array, low: float, high: float) -> tuple[Counts, Array, Array, Array]:
    """Every place to look: row, p, and just beside it the p at which limits are ranked; those within SAME are one."""
    lefts = np.flatnonzero((lower > low) & (lower < high))
    rights = np.flatnonzero((upper > low) & (upper < high))
    every = np.arange(len(rows.n))
    left_p = np.concatenate([lower[lefts], np.full(len(every), high)])
    right_p = np.concatenate([upper[rights], np.full(len(every), low)])
    row = np.concatenate([rows.row[lefts], every, rows.row[rights], every])
    beside = np.concatenate([left_p * (1 - SAME), np.maximum(right_p * (1 + SAME), np.nextafter(right_p, 2.0))])
    return row, np.concatenate([left_p, right_p]), beside, beside


def _rank(rows: Rows, limits: Array, row: Counts, p: Array) -> Counts:
    """How many limits of its row lie left of each p: complex numbers sort by their real part first, here the row."""
    return np.asarray(np.searchsorted(rows.row + 1j * limits, row + 1j * p) - rows.start[row])


def _hopeful(rows: Rows, row: Counts, begin: Counts, end: Counts, p: Array) -> Counts:
    """The places whose miss rate can be the largest of their row, by two-sided bounds; usually one in ten."""
    low, high = outside_bounds(rows.first[row] + begin, rows.first[row] + end, rows.n[row], p)
    nothing = end == begin
    best = np.zeros(len(rows.n))
    np.maximum.at(best, row, np.where(nothing, 1.0, low))
    return np.flatnonzero(np.where(nothing, 1.0, high) >= best[row])


def _quick_miss(rows: Rows, row: Counts, begin: Counts, end: Counts, p: Array) -> Array:
    """P(X outside the run begin … end-1) from the faster form of the lower tail: ample to see which is largest."""
    n = rows.n[row]
    first, after = rows.first[row] + begin, rows.first[row] + end
    left, right = first > 0, (after > 0) & (after <= n)
    below = betainc(np.where(left, n - first + 1, 1), np.where(left, first, 1), 1 - p)
    above = betainc(np.where(right, after, 1), np.where(right, n - after + 1, 1), p)
    miss = np.where(left, below, 0.0) + np.where(right, above, np.where(after > n, 0.0, 1.0))
    return np.where(end > begin, miss, 1.0)


def _largest(row: Counts, values: Array, count: int) -> Counts:
    """For each row the place of its largest value."""
    top = np.full(count, -np.inf)
    np.maximum.at(top, row, values)
    places = np.flatnonzero(values == top[row])
    found = np.zeros(count, dtype=np.int64)
    found[row[places]] = places
    return found


def _turning(rows: Rows, limits: Array) -> NDArray[np.bool_]:
    """Which rows have a limit below the one before it; (rows,)."""
    return np.asarray(np.minimum.reduceat(rows.steps(limits), rows.start) < 0)


def _by_engine(rows: Rows, lower: Array, upper: Array, between: tuple[float, float], k: int) -> tuple[float, float]:
    """One row's largest miss and its place, whatever the order of its limits."""
    span = slice(rows.start[k], rows.start[k] + rows.size[k])
    found = minimum([Piece(int(rows.n[k]), 1.0, int(rows.first[k]), lower[span], upper[span])], *between)
    return found.miss, found.at


@dataclass(frozen=True)
class Prior:
    """What the mean over the range needs beside the limits, shared by all methods on the same rows.

    a, b, weight, at_low, at_high are (flat,): given x, p has a Beta(a, b) density; weight·I_t(a, b) is the chance of x
    with p below t. `left_out` is the chance of all events that are not among the rows; (rows,).
    """

    rows: Rows
    over: Range
    a: Array
    b: Array
    weight: Array
    at_low: Array
    at_high: Array
    left_out: Array

    @classmethod
    def on(cls, rows: Rows, over: Range) -> "Prior":
        """On rows with every event that the range can produce."""
        a = np.asarray(rows.events + over.prior[0], dtype=np.float64)
        b = np.asarray(rows.trials - rows.events + over.prior[1], dtype=np.float64)
        weight = betabinomial(rows.events, rows.trials, *over.prior) / over.mass
        at_low, at_high = (np.asarray(betainc(a, b, end), dtype=np.float64) for end in (over.low, over.high))
        return cls(rows, over, a, b, weight, at_low, at_high, np.zeros(len(rows.n)))

    def within(self, rows: Rows) -> "Prior":
        """On rows of the same n with fewer events; the chance of the rest is summed, not subtracted from 1."""
        place = (self.rows.start - self.rows.first)[rows.row] + rows.events
        rest = self.weight * (self.at_high - self.at_low)
        rest[place] = 0.0
        a, b, weight, at_low, at_high = (v[place] for v in (self.a, self.b, self.weight, self.at_low, self.at_high))
        return Prior(rows, self.over, a, b, weight, at_low, at_high, left_out=self.rows.total(rest))

    def mean_miss(self, lower: Array, upper: Array) -> Array:
        """The mean miss rate over the range of every row, in closed form; (rows,).

        Every x that covers somewhere in the range must be among the events.
        """
        missed = (self.at_high - self._below(upper)) + (self._below(lower) - self.at_low)
        return self.left_out + self.rows.total(self.weight * missed)

    def _below(self, limit: Array) -> Array:
        """P(p < limit | x) with the limit held in the range; the incomplete beta only where it lies strictly inside."""
        value = np.where(limit <= self.over.low, self.at_low, self.at_high)
        inside = np.flatnonzero((limit > self.over.low) & (limit < self.over.high))
        value[inside] = betainc(self.a[inside], self.b[inside], limit[inside])
        return value
