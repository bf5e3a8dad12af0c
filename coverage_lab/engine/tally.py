"""Equal samples counted once: the shape that both routes share."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from coverage_lab.records import Columns, Counts, Outcomes

_DENSE = 1 << 22  # largest key range that is counted in a dense array
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
    key, radices = _key(varying)
    if radices[-1].span <= _DENSE:
        total = np.bincount(key, weights=counts).astype(np.int64)
        distinct = np.flatnonzero(total)
        total = total[distinct]
    else:
        distinct, inverse = np.unique(key, return_inverse=True)
        total = np.bincount(inverse, weights=counts).astype(np.int64)
    return {**columns, **_decoded(distinct, radices)}, total


def _key(varying: Columns) -> tuple[Counts, list[Radix]]:
    """One mixed-radix integer per sample, and the digits it is made of."""
    key: Counts | None = None
    radices: list[Radix] = []
    below = 1
    for name, column in varying.items():
        least, most = int(column.min()), int(column.max())
        least = 0 if 0 <= least < _NEAR_ZERO else least  # a small offset is cheaper kept than taken off every draw
        digit = column if least == 0 else column - least
        key = digit if key is None else key + digit * below
        radices.append(Radix(name, least, below, below * (most - least + 1)))
        below = radices[-1].span
    if key is None or below > np.iinfo(np.int64).max:
        raise OverflowError("samples take too many distinct values to be told apart by one 64-bit key")
    return key, radices


def _decoded(key: Counts, radices: list[Radix]) -> dict[str, Counts]:
    """The columns behind the keys."""
    return {r.name: key // r.below % (r.span // r.below) + r.least for r in radices}


def simulated(columns: Columns, counts: Counts) -> Outcomes:
    """A tally as weighted outcomes."""
    draws = int(counts.sum())
    return Outcomes(columns, counts / draws, draws)


def joined(samples: Sequence[Columns]) -> Columns:
    """Several lists of samples as one; a column that is the same everywhere becomes a constant."""
    sizes = [max(len(values) for values in columns.values()) for columns in samples]
    together = {
        name: np.concatenate([np.broadcast_to(c[name], (k,)) for c, k in zip(samples, sizes, strict=True)])
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
    key, radices = _key(varying)
    distinct, inverse = np.unique(key, return_inverse=True)
    return {**columns, **_decoded(distinct, radices)}, np.split(inverse, np.cumsum(sizes)[:-1])
