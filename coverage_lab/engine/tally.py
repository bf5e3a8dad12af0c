"""Equal samples counted once: the shape that both routes share.

A column is an array whose axis 0 runs over samples; further axes, such as strata, belong to the sample.
"""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from coverage_lab.records import Columns, Counts, Outcomes

_DENSE = 1 << 22  # largest key range that is counted in a dense array
_SPARSE = 16  # keys per sample up to which a dense array is quicker than sorting
_LARGEST_KEY = (1 << 63) - 1
_NEAR_ZERO = 1 << 12


@dataclass(frozen=True)
class Radix:
    """One column's digit in a mixed-radix key: (value - least) * below, and the key range up to this digit."""

    name: str
    least: int
    below: int
    span: int


def tally(columns: Columns, counts: Counts | None = None) -> tuple[Columns, Counts]:
    """Distinct samples and how often each occurs, in the order of their keys.

    Columns of length 1 are constants and stay as they are.
    """
    varying = {name: values for name, values in columns.items() if len(values) > 1}
    if not varying:
        size = 1 if counts is None else int(counts.sum())
        return columns, np.array([size], dtype=np.int64)
    quick = _quick_key(varying)
    if quick is None:
        group, first = _grouped(varying)
        total = np.bincount(group, weights=counts, minlength=len(first)).astype(np.int64)
        return {**columns, **{name: values[first] for name, values in varying.items()}}, total
    key, radices = quick
    total = np.bincount(key, weights=counts).astype(np.int64)
    distinct = np.flatnonzero(total)
    return {**columns, **{r.name: distinct // r.below % (r.span // r.below) + r.least for r in radices}}, total[
        distinct
    ]


def _quick_key(varying: Columns) -> tuple[Counts, list[Radix]] | None:
    """One mixed-radix integer per sample, and the digits it is made of, while all keys fit a dense array of counts."""
    if any(column.ndim > 1 or column.dtype.kind != "i" for column in varying.values()):
        return None
    key: Counts | None = None
    radices: list[Radix] = []
    below = 1
    for name, column in varying.items():
        least, most = int(column.min()), int(column.max())
        least = 0 if 0 <= least < _NEAR_ZERO else least  # a small offset is cheaper kept than taken off every draw
        radices.append(Radix(name, least, below, below * (most - least + 1)))
        if radices[-1].span > _DENSE:
            return None
        digit = column if least == 0 else column - least
        key = digit if key is None else key + digit * below
        below = radices[-1].span
    return None if key is None else (key, radices)


def _grouped(varying: Columns) -> tuple[Counts, Counts]:
    """For every sample the number of its group of equal samples, and for every group the place of one of its samples.

    Whole-number columns make a key. What is a function of them, such as an estimate made of counts, needs no place in
    it: that is verified, not assumed, and a column that is not gets its place.
    """
    flat = [column for values in varying.values() for column in _scalars(values)]
    whole = [column for column in flat if column.dtype.kind in "iub"]
    key = _key(_independent(whole)) if whole else np.zeros(len(flat[0]), dtype=np.int64)
    group, first = _distinct(key)
    for column in flat:
        if not np.array_equal(column[first][group], column):
            rank = np.unique(column, return_inverse=True)[1]
            group, first = _distinct(_key([group, rank]))
    return group, first


def _scalars(values: NDArray[Any]) -> list[NDArray[Any]]:
    """A column as columns of one number a sample."""
    return [values] if values.ndim == 1 else list(values.reshape(len(values), -1).T)


def _independent(columns: Sequence[Counts]) -> list[Counts]:
    """The columns without those that are a straight line of the first one that varies."""
    kept: list[Counts] = []
    for column in columns:
        if (column == column[0]).all():
            continue
        if not kept or not _on_a_line(kept[0], column):
            kept.append(column)
    return kept or [columns[0]]


def _on_a_line(x: Counts, y: Counts) -> bool:
    """Whether y = a + b·x with rational b, exactly; x varies."""
    other = int(np.argmax(x != x[0]))
    dx, dy = int(x[other] - x[0]), int(y[other] - y[0])
    return bool(((y - y[0]) * dx == (x - x[0]) * dy).all())


def _key(columns: Sequence[Counts]) -> Counts:
    """One mixed-radix integer per sample, equal just for equal samples; compressed where 64 bits would not do."""
    key = np.zeros(len(columns[0]), dtype=np.int64)
    span = 1
    for column in columns:
        low, high = int(column.min()), int(column.max())
        if span * (high - low + 1) > _LARGEST_KEY:
            distinct, key = np.unique(key, return_inverse=True)
            span = len(distinct)
        key = key + (column - low) * span
        span *= high - low + 1
    return key


def _distinct(key: Counts) -> tuple[Counts, Counts]:
    """The number of every key's group in ascending order of keys, and the place of one member of each group."""
    low, span = int(key.min()), int(key.max()) - int(key.min()) + 1
    if span <= _DENSE and span <= _SPARSE * len(key):
        present = np.zeros(span, dtype=bool)
        present[key - low] = True
        group = (np.cumsum(present) - 1)[key - low]
        groups = int(group.max()) + 1
    else:
        distinct, group = np.unique(key, return_inverse=True)
        groups = len(distinct)
    first = np.empty(groups, dtype=np.int64)
    first[group] = np.arange(len(key))
    return group, first


def simulated(columns: Columns, counts: Counts) -> Outcomes:
    """A tally as weighted outcomes."""
    draws = int(counts.sum())
    return Outcomes(columns, counts / draws, draws)


def restricted(outcomes: Outcomes, columns: Sequence[str]) -> Outcomes:
    """A simulation's outcomes told apart by some of their columns only."""
    if outcomes.draws is None or set(columns) >= set(outcomes.columns):
        return outcomes
    counts = np.rint(outcomes.weight * outcomes.draws)
    kept = {name: outcomes.columns[name] for name in columns}
    if all(len(values) == 1 for values in kept.values()):
        return Outcomes(kept, np.ones(1), outcomes.draws)
    return simulated(*tally(kept, counts.astype(np.int64)))


def joined(samples: Sequence[Columns]) -> Columns:
    """Several lists of samples as one; a column that is the same everywhere becomes a constant."""
    sizes = [max(len(values) for values in columns.values()) for columns in samples]
    together = {
        name: np.concatenate(
            [np.broadcast_to(c[name], (k, *c[name].shape[1:])) for c, k in zip(samples, sizes, strict=True)]
        )
        for name in samples[0]
    }
    return {name: values[:1] if (values == values[0]).all() else values for name, values in together.items()}


def merged(shares: Sequence[tuple[Columns, Counts]]) -> tuple[Columns, Counts]:
    """Several tallies as one; their order does not matter."""
    if len(shares) == 1:
        return shares[0]
    counts = np.concatenate([counts for _, counts in shares])
    return tally(joined([columns for columns, _ in shares]), counts)


def union(samples: Sequence[Columns]) -> tuple[Columns, list[Counts]]:
    """The distinct samples of several lists, and for each list where its samples stand in the union."""
    sizes = [max(len(values) for values in columns.values()) for columns in samples]
    columns = joined(samples)
    varying = {name: values for name, values in columns.items() if len(values) > 1}
    if not varying:
        return columns, [np.zeros(k, dtype=np.int64) for k in sizes]
    group, first = _grouped(varying)
    distinct = {**columns, **{name: values[first] for name, values in varying.items()}}
    return distinct, np.split(group, np.cumsum(sizes)[:-1])
