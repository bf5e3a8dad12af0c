"""Exact draws from a finite law by table inversion, with a 16-bit guide table, summed over groups.

A 16-bit random integer names a bucket of [0, 1). Where the distribution function does not step inside the bucket the
outcome is known at once; in the few other buckets a fresh uniform number places the draw inside it. So every outcome
has its own probability to the resolution of the distribution function, at the price of a table look-up.

Every outcome carries several whole-number statistics. They travel packed into one 64-bit word (or a few), each in
digits wide enough for its largest sum, so that one addition adds them all. The number of ambiguous buckets is the last
of them: it tells which sums are still to be corrected.
"""

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from coverage_lab.records import Array, Counts

_BUCKETS = 1 << 16
_BLOCK = 1 << 18  # numbers drawn at a time: they stay in the processor's cache
_SHORTEST = 1 << 12  # samples drawn at a time, however many groups each has
LARGEST_LAW = 1 << 14  # outcomes: beyond, too many buckets are ambiguous

Word = list[tuple[int, int]]  # which statistic, and its largest sum


@dataclass(frozen=True)
class Group:
    """`count` independent groups with one law: P(outcome) and the statistics (outcomes, statistics) of each outcome."""

    chances: Array
    statistics: Counts
    count: int


def draw_sums(groups: Sequence[Group], size: int, rng: np.random.Generator) -> Counts:
    """`size` sums of the statistics over all groups, array (statistics, size)."""
    largest = np.sum([group.count * group.statistics.max(axis=0) for group in groups], axis=0)
    layout = _layout([int(top) for top in largest], max(group.count for group in groups))
    totals = np.zeros((len(layout), size), dtype=np.int64)
    for group in groups:
        _add_draws(totals, layout, group, rng)
    sums = np.empty((len(largest), size), dtype=np.int64)
    for word, total in zip(layout, totals, strict=True):
        _unpack(word, total, sums)
    return sums


def _layout(largest: Sequence[int], draws: int) -> list[Word]:
    """The statistics over as few 64-bit words as their order allows; each word has room for a count of draws."""
    words: list[Word] = []
    room = 0
    for k, top in enumerate(largest):
        if not words or room // (top + 1) == 0:
            words.append([])
            room = (1 << 62) // (draws + 1)
        words[-1].append((k, top))
        room //= top + 1
    return words


def _radix(word: Word) -> int:
    """One more than the largest sum of a word's statistics."""
    return math.prod(top + 1 for _, top in word)


def _packed(word: Word, statistics: Counts) -> Counts:
    """One word per outcome."""
    packed = np.zeros(len(statistics), dtype=np.int64)
    radix = 1
    for k, top in word:
        packed += statistics[:, k] * radix
        radix *= top + 1
    return packed


def _unpack(word: Word, totals: Counts, sums: Counts) -> None:
    """Write the statistics behind the sums of words to their rows."""
    for k, top in word[:-1]:
        totals, sums[k] = np.divmod(totals, top + 1)
    sums[word[-1][0]] = totals


def _add_draws(totals: Counts, layout: Sequence[Word], group: Group, rng: np.random.Generator) -> None:
    """Add to every total the words of `group.count` fresh draws."""
    order = np.argsort(-group.chances, kind="stable")  # rare outcomes side by side share their ambiguous buckets
    steps = np.cumsum(group.chances[order])
    certain, outcome = _guide(steps)
    words = np.stack([_packed(word, group.statistics[order]) for word in layout])
    tables = words[:, outcome]  # (words, buckets)
    flag = _radix(layout[0])
    tables[0] += flag * ~certain
    size = totals.shape[1]
    rows = max(_SHORTEST, _BLOCK // group.count)
    for start in range(0, size, rows):
        here = totals[:, start : start + rows]
        bucket = rng.integers(0, _BUCKETS, (group.count, here.shape[1]), dtype=np.uint16)
        buffer = np.empty(here.shape[1], dtype=np.int64)
        for total, table in zip(here, tables, strict=True):
            for drawn in bucket:
                total += np.take(table, drawn, out=buffer, mode="clip")
        unsure = np.flatnonzero(here[0] >= flag)
        here[0, unsure] %= flag
        group_of, place = np.nonzero(~certain[bucket[:, unsure]])
        row = unsure[place]
        _correct(here, words, bucket[group_of, row], row, (steps, outcome), rng)


def _guide(steps: Array) -> tuple[NDArray[np.bool_], Counts]:
    """For every bucket whether its outcome is certain, and the outcome at its left end."""
    edges = np.arange(_BUCKETS + 1) / _BUCKETS
    place = np.minimum(np.searchsorted(steps, edges, side="right"), len(steps) - 1)
    return place[:-1] == place[1:], place[:-1]


def _correct(
    totals: Counts,
    words: Counts,
    bucket: NDArray[np.uint16],
    row: Counts,
    guide: tuple[Array, Counts],
    rng: np.random.Generator,
) -> None:
    """Replace the outcome at the left end of ambiguous buckets by one drawn with a fresh uniform number."""
    steps, outcome = guide
    place = (bucket + rng.random(len(bucket))) / _BUCKETS
    drawn = np.minimum(np.searchsorted(steps, place, side="right"), len(steps) - 1)
    for total, word in zip(totals, words, strict=True):
        np.add.at(total, row, word[drawn] - word[outcome[bucket]])
