"""Many n at once: their events as one flat ragged array, so that a method is evaluated once for all of them.

A row is one n with the events first … last; `flat` arrays run through all rows in turn.
"""

from collections.abc import Iterator
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from coverage_lab.records import Array, Counts

WIDE = 41.4  # -ln 1e-18: a window outside which nothing matters, at the scale of a double


@dataclass(frozen=True)
class Rows:
    """One row an n, ascending; arrays n, first, last are (rows,)."""

    n: Counts
    first: Counts
    last: Counts

    @cached_property
    def size(self) -> Counts:
        """How many events each row has; (rows,)."""
        return self.last - self.first + 1

    @cached_property
    def start(self) -> Counts:
        """Where each row begins in the flat arrays; (rows,)."""
        return np.cumsum(self.size) - self.size

    @cached_property
    def row(self) -> Counts:
        """The row of every event; (flat,)."""
        return np.repeat(np.arange(len(self.n)), self.size)

    @cached_property
    def events(self) -> Counts:
        """(flat,)."""
        return np.arange(len(self.row)) + (self.first - self.start)[self.row]

    @cached_property
    def trials(self) -> Counts:
        """(flat,)."""
        return self.n[self.row]

    def total(self, values: Array) -> Array:
        """Flat values summed by row."""
        return np.asarray(np.add.reduceat(values, self.start))

    def steps(self, values: Array) -> Array:
        """values[x + 1] - values[x] within each row, 0 at its last event; (flat,)."""
        steps = np.append(np.diff(values), 0.0)
        steps[self.start + self.size - 1] = 0.0
        return steps


def reach(n: Counts, p: float, exponent: float) -> Array:
    """The t with P(|X - np| >= t) <= 2·exp(-exponent), by Bernstein's inequality; (rows,)."""
    return np.asarray(exponent / 3 + np.sqrt(exponent * exponent / 9 + 2 * exponent * p * (1 - p) * n))


def rows(n: Counts, low: float, high: float, exponent: float = WIDE) -> Rows:
    """For every n the events between the reach below n·low and the reach above n·high."""
    first = np.floor(n * low - reach(n, low, exponent)).astype(np.int64)
    last = np.ceil(n * high + reach(n, high, exponent)).astype(np.int64)
    return Rows(n, np.maximum(first, 0), np.minimum(last, n))


def joined(one: Rows, other: Rows) -> Rows:
    """The same n with the events of both."""
    return Rows(one.n, np.minimum(one.first, other.first), np.maximum(one.last, other.last))


def blocks(n: Counts, cost: Array, most: float) -> Iterator[Counts]:
    """The n cut into consecutive blocks whose costs sum to about `most`."""
    number = (np.cumsum(cost) // most).astype(np.int64)
    yield from np.split(n, np.flatnonzero(np.diff(number)) + 1)
