"""Exact laws of what is recorded of a group of units, some of them events, through a lens that can mistake them."""

from functools import lru_cache

import numpy as np

from coverage_lab.designs.lens import Lens, Row
from coverage_lab.probability import point
from coverage_lab.records import Array

_TABLES = 256  # kept in memory: an audit uses the same group sizes at every truth


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


def recorded_pairs(true: Array, lens: Lens) -> Array:
    """P(x recorded events, y recorded others) of a group, array like `true`: P(k true events, j true others).

    Mistakes are made in groups of one size at a time, then events and others are thinned each at its own rate. Where
    the loss of a unit that is also mistaken depends on what it is, the two cannot be taken apart.
    """
    if lens.mixes and lens.kept is None:
        return _entangled(true, lens)
    mixed = _mistaken(true, lens.chance(1.0), lens.chance(0.0)) if lens.mixes else true
    if not lens.loses:
        return mixed
    counts = np.arange(len(true))
    kept_events = point(counts[None, :], counts[:, None], 1 - lens.event[2])
    kept_others = point(counts[None, :], counts[:, None], 1 - lens.other[2])
    return np.asarray(kept_events.T @ mixed @ kept_others)


def _mistaken(true: Array, event_chance: float, other_chance: float) -> Array:
    """The law of pairs after mistakes, group size by group size."""
    mixed = np.zeros_like(true)
    for m in range(len(true)):
        x = np.arange(m + 1)
        if true[x, m - x].any():
            mixed[x, m - x] = true[x, m - x] @ recorded(m, event_chance, other_chance)
    return mixed


def _entangled(true: Array, lens: Lens) -> Array:
    """The same in general: sum of true[k, j]·E^k·O^j, E and O linear in the marks of an event and of an other.

    Horner's rule with polynomials for numbers: sums of positive terms only.
    """
    seen = np.zeros_like(true)
    for m in range(len(true)):
        k = np.arange(m + 1)
        law = true[k, m - k]
        if law.any():
            seen[: m + 1, : m + 1] += _horner(law, lens)
    return seen


def _horner(law: Array, lens: Lens) -> Array:
    """The record of a group of one size with P(k true events) = law[k]."""
    m = len(law) - 1
    total, power = np.zeros((m + 1, m + 1)), np.zeros((m + 1, m + 1))
    total[0, 0], power[0, 0] = law[m], 1.0
    for k in range(m - 1, -1, -1):
        power = _times(power, lens.other)
        total = _times(total, lens.event) + law[k] * power
    return total


def _times(polynomial: Array, row: Row) -> Array:
    """The polynomial times (row[0]·s + row[1]·t + row[2]); what would leave the array is zero."""
    as_event, as_other, lost = row
    product = lost * polynomial
    product[1:, :] += as_event * polynomial[:-1, :]
    product[:, 1:] += as_other * polynomial[:, :-1]
    return product
