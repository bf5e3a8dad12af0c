"""Equal samples counted once: the shape that both routes share."""

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from coverage_lab.records import Columns, Counts, Outcomes

_DENSE = 1 << 22  # largest key range that is counted in a dense array


def tally(columns: Columns, counts: Counts | None = None) -> tuple[Columns, Counts]:
    """Distinct samples and how often each occurs, in the order of their keys.

    Columns of length 1 are constants and stay as they are.
    """
    varying = {name: values for name, values in columns.items() if len(values) > 1}
    if not varying:
        size = 1 if counts is None else int(counts.sum())
        return columns, np.array([size], dtype=np.int64)
    key, spans = _key(list(varying.values()))
    if spans[-1] <= _DENSE:
        total = np.bincount(key, weights=counts, minlength=1).astype(np.int64)
        distinct = np.flatnonzero(total)
        total = total[distinct]
    else:
        distinct, inverse = np.unique(key, return_inverse=True)
        total = np.bincount(inverse, weights=counts).astype(np.int64)
    return {**columns, **_decoded(distinct, varying, spans)}, total


def _key(values: Sequence[NDArray[np.int64]]) -> tuple[Counts, list[int]]:
    """One mixed-radix integer per sample, and the running product of the radices."""
    key = np.zeros(len(values[0]), dtype=np.int64)
    span = 1
    spans = []
    for column in values:
        low, high = int(column.min()), int(column.max())
        key += (column - low) * span
        span *= high - low + 1
        spans.append(span)
    if span > np.iinfo(np.int64).max:
        raise OverflowError("samples take too many distinct values to be told apart by one 64-bit key")
    return key, spans


def _decoded(key: Counts, varying: Columns, spans: list[int]) -> dict[str, Counts]:
    """The columns behind the keys."""
    columns = {}
    below = 1
    for (name, values), span in zip(varying.items(), spans, strict=True):
        columns[name] = key // below % (span // below) + values.min()
        below = span
    return columns


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
    key, spans = _key(list(varying.values()))
    distinct, inverse = np.unique(key, return_inverse=True)
    return {**columns, **_decoded(distinct, varying, spans)}, np.split(inverse, np.cumsum(sizes)[:-1])
