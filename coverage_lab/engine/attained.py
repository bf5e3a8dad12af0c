"""The certified minimum over finitely many truths: those that a finite population can have."""

from collections.abc import Sequence
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from coverage_lab.engine.minimum import Piece, at_point, covering_run
from coverage_lab.probability_finite import finite_point
from coverage_lab.records import Array, Counts, Minimum

_TABLE = 100_000  # cells of a table of tails: kept for the other methods, below a hundred of them take 160 MB

Places = tuple[Counts, Counts, NDArray[np.bool_]]


def minimum_at(pieces: Sequence[Piece], points: Array) -> Minimum:
    """The smallest coverage at any of the ascending points: every one is accounted for, so it is certified.

    On a stretch of points with one covering set that is a run, its hypergeometric probability rises with the number of
    events in the population, then falls: P(X <= x) changes from M to M + 1 by -(n - x)/(N - M)·P(X = x | M), and the
    ratio of P(X = i - 1 | M) to P(X = j | M), i <= j, falls with M. So the stretch's ends bound what lies between; the
    points between are looked at where several pieces leave that open, and wherever the covering set is not a run.
    """
    places = [covering_run(piece, points) for piece in pieces]
    runs = np.logical_and.reduce([run for _, _, run in places])
    first, last = _stretches(places, runs)
    of_first, of_last = (_missed(pieces, places, points, ends) for ends in (first, last))
    miss = np.full(len(points), -1.0)
    miss[first], miss[last] = of_first.sum(axis=0), of_last.sum(axis=0)
    worst = np.maximum(of_first, of_last).sum(axis=0)
    unsettled = worst > miss.max(initial=0.0)
    between = [np.arange(a + 1, b) for a, b in zip(first[unsettled], last[unsettled], strict=True)]
    inside = np.concatenate([np.empty(0, np.int64), *between])
    miss[inside] = _missed(pieces, places, points, inside).sum(axis=0)
    for alone in np.flatnonzero(~runs):
        miss[alone] = at_point(pieces, float(points[alone])).miss
    k = int(np.argmax(miss))
    return Minimum(coverage=1.0 - float(miss[k]), at=float(points[k]), certified=True, miss=float(miss[k]))


def _stretches(places: Sequence[Places], runs: NDArray[np.bool_]) -> tuple[Counts, Counts]:
    """First and last places of the stretches of points whose covering sets are runs and stay the same."""
    moves = np.logical_or.reduce([np.diff(ends) != 0 for begin, end, _ in places for ends in (begin, end)])
    starts = np.concatenate([[True], moves | ~runs[:-1]]) & runs
    stops = np.concatenate([moves | ~runs[1:], [True]]) & runs
    return np.flatnonzero(starts), np.flatnonzero(stops)


def _missed(pieces: Sequence[Piece], places: Sequence[Places], points: Array, at: Counts) -> Array:
    """Weighted miss rates of the pieces at some of the points, array (pieces, points)."""
    rates = np.empty((len(pieces), len(at)))
    for k, (piece, (begin, end, _)) in enumerate(zip(pieces, places, strict=True)):
        outside = _outside(piece, begin[at], end[at], points, at)
        rates[k] = piece.weight * np.where(end[at] > begin[at], outside, 1.0)
    return rates


def _outside(piece: Piece, begin: Counts, end: Counts, points: Array, at: Counts) -> Array:
    """P(X in none of the positions begin..end-1) at some of the points, from tables while these are small."""
    if piece.population is None or len(points) * len(piece.lower) > _TABLE:
        return piece.outside(piece.first + begin - 1, piece.first + end, points[at])
    marks = np.rint(points[[0, -1]] * piece.population).astype(int).tolist()
    below, above = _tails(piece.trials, piece.population, (piece.first, len(piece.lower)), (marks[0], len(points)))
    return np.asarray(below[at, begin] + above[at, end])


@lru_cache(maxsize=128)
def _tails(trials: int, population: int, events: tuple[int, int], marks: tuple[int, int]) -> tuple[Array, Array]:
    """P(X < x) and P(X >= x), arrays (marks, events + 1), each summed from its own small end.

    events, marks: the first, and how many in a row; what lies beyond the events is too rare to matter.
    """
    x, m = (first + np.arange(count) for first, count in (events, marks))
    chance = finite_point(x[None, :], trials, population, m[:, None])
    none = np.zeros((len(m), 1))
    below = np.concatenate([none, np.cumsum(chance, axis=1)], axis=1)
    above = np.concatenate([none, np.cumsum(chance[:, ::-1], axis=1)], axis=1)[:, ::-1]
    return below, above
