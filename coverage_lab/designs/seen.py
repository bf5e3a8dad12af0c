"""Exact laws of what is recorded of a group of units, some of them events, through a lens that can mistake them."""

from functools import lru_cache

import numpy as np

from coverage_lab.probability import point
from coverage_lab.records import Array

_TABLES = 64  # kept in memory: an audit uses the same few group sizes at every truth


@lru_cache(maxsize=_TABLES)
def recorded(m: int, event_chance: float, other_chance: float) -> Array:
    """P(x recorded events | k true events among m units), array (k = 0..m, x = 0..m).

    Each true event is recorded as one with `event_chance`, each true non-event with `other_chance`.
    """
    counts = np.arange(m + 1)
    of_events = point(counts[None, :], counts[:, None], event_chance)
    of_others = point(counts[None, :], counts[:, None], other_chance)
    table = np.zeros((m + 1, m + 1))
    for k in range(m + 1):
        table[k] = np.convolve(of_events[k, : k + 1], of_others[m - k, : m - k + 1])
    table.setflags(write=False)
    return table


def recorded_pairs(true: Array, event: tuple[float, float, float], other: tuple[float, float, float]) -> Array:
    """P(x recorded events, y recorded others) for a group with P(k true events) = true[k], array (m+1, m+1).

    The generating function sum of true[k]·E^k·O^(m-k), E and O linear in the marks of an event and of an other, is
    evaluated by Horner's rule with polynomials for numbers: sums of positive terms only.
    """
    m = len(true) - 1
    total, power = np.zeros((m + 1, m + 1)), np.zeros((m + 1, m + 1))
    total[0, 0], power[0, 0] = true[m], 1.0
    for k in range(m - 1, -1, -1):
        power = _times(power, other)
        total = _times(total, event) + true[k] * power
    return total


def _times(polynomial: Array, row: tuple[float, float, float]) -> Array:
    """The polynomial times (row[0]·s + row[1]·t + row[2]); what would leave the array is zero."""
    as_event, as_other, lost = row
    product = lost * polynomial
    product[1:, :] += as_event * polynomial[:-1, :]
    product[:, 1:] += as_other * polynomial[:, :-1]
    return product
