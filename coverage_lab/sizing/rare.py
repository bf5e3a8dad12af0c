"""Rare outcomes: the n at which few events, or none, rule out a rate; the n that sees some events. Always one-sided.

Seeing at most c events rules out the rate θ when P(X <= c | θ) <= 1 - confidence; in an unlimited population that is the
same as a one-sided Clopper-Pearson upper bound of at most θ. In a population of N units a rate stands for ⌈θN⌉ events.
All of these chances move one way with n, so that halving finds the n exactly.
"""

from collections.abc import Callable

import numpy as np
import pandas as pd

from coverage_lab.intervals import clopper_pearson
from coverage_lab.probability import at_least, at_most
from coverage_lab.probability_finite import finite_at_least, finite_at_most
from coverage_lab.records import Rare, alpha_of
from coverage_lab.records_sizing import Seen
from coverage_lab.rounding import percent
from coverage_lab.sizing.formula import ceiling

TIES = 1e-12  # a chance this close to its limit, relatively, is at it
LARGEST_N = 10**9
CURVE_POINTS = 121  # of an operating characteristic

RARE_COLUMNS = ["events", "n", "bound", "probability_at_hoped_for", "census"]


def marked(rate: float, population: int) -> int:
    """How many of the population's units are events at this rate: ⌈θN⌉."""
    return min(ceiling(rate * population), population)


def chance_at_most(events: int, n: int, rate: float, population: int | None = None) -> float:
    """P(X <= events) among n units."""
    if population is None:
        return float(at_most(events, n, rate))
    return finite_at_most(events, n, population, marked(rate, population))


def chance_at_least(events: int, n: int, rate: float, population: int | None = None) -> float:
    """P(X >= events) among n units."""
    if population is None:
        return float(at_least(events, n, rate))
    return finite_at_least(events, n, population, marked(rate, population))


def ruling_out(events: int, limit: float, confidence: float, population: int | None = None) -> int | None:
    """The smallest n so that at most `events` events rule out the rate `limit`; None when even a census cannot."""
    allowed = alpha_of(confidence) * (1 + TIES)
    return _smallest(lambda n: chance_at_most(events, n, limit, population) <= allowed, events + 1, population)


def seeing(events: int, rate: float, probability: float, population: int | None = None) -> int | None:
    """The smallest n that sees at least `events` events with the probability; None when even a census cannot."""
    wanted = probability * (1 - TIES)
    return _smallest(lambda n: chance_at_least(events, n, rate, population) >= wanted, events, population)


def _smallest(test: Callable[[int], bool], start: int, population: int | None) -> int | None:
    """The smallest n >= start that passes a test which never turns back."""
    top = LARGEST_N if population is None else population
    high = min(max(start, 1), top)
    low = high - 1
    while not test(high):
        if high == top:
            return None
        low, high = high, min(2 * high, top)
    while high - low > 1:
        middle = (low + high) // 2
        low, high = (low, middle) if test(middle) else (middle, high)
    return high


def bound(events: int, n: int, confidence: float, population: int | None = None) -> float:
    """The one-sided upper bound after `events` events in n units: Clopper-Pearson, or exact for the population."""
    if population is None:
        return float(clopper_pearson(events, n, alpha_of(confidence))[1])
    tail = alpha_of(confidence)
    low, high = events, population  # P(X <= events) falls as more units are marked
    while high > low:
        middle = (low + high + 1) // 2
        low, high = (middle, high) if finite_at_most(events, n, population, middle) > tail else (low, middle - 1)
    return low / population


def rare_table(rare: Rare, confidence: float, hoped_for: float | None, population: int | None = None) -> pd.DataFrame:
    """For every number of events allowed: events, n, bound, probability_at_hoped_for, census (n is the population).

    n is <NA> where even a census cannot rule the rate out, because so many events are allowed.
    """
    rows = []
    for events in rare.events if rare.limit is not None else ():
        n = ruling_out(events, rare.limit, confidence, population) if rare.limit is not None else None
        chance = chance_at_most(events, n, hoped_for, population) if n is not None and hoped_for is not None else None
        limit = bound(events, n, confidence, population) if n is not None else None
        rows.append((events, n, limit, chance, n is not None and n == population))
    table = pd.DataFrame(rows, columns=RARE_COLUMNS)
    return table.astype({"events": int, "n": "Int64", "bound": float, "probability_at_hoped_for": float, "census": bool})


def seen(rare: Rare, population: int | None = None) -> Seen | None:
    """The n that sees at least the plan's number of events, or None when the plan does not ask or no n does."""
    if rare.see_at_least is None or rare.at_rate is None:
        return None
    n = seeing(rare.see_at_least, rare.at_rate, rare.with_probability, population)
    if n is None:
        return None
    chance = chance_at_least(rare.see_at_least, n, rare.at_rate, population)
    return Seen(rare.see_at_least, rare.at_rate, n, chance, census=n == population)


def characteristic(table: pd.DataFrame, limit: float | None, population: int | None = None) -> pd.DataFrame:
    """Operating characteristics: the chance of at most the allowed events, by true rate from 0 to twice the limit.

    Columns events, n, p, probability; for a population the rates are those that it can have.
    """
    rows = []
    for row in table[table["n"].notna()].to_dict("records") if limit is not None else ():
        for p in np.unique(reachable(np.linspace(0.0, min(2 * (limit or 0.0), 1.0), CURVE_POINTS), population)):
            chance = chance_at_most(int(row["events"]), int(row["n"]), float(p), population)
            rows.append((int(row["events"]), int(row["n"]), float(p), chance))
    return pd.DataFrame(rows, columns=["events", "n", "p", "probability"])


def reachable(p: np.ndarray, population: int | None) -> np.ndarray:
    """The rates themselves, or rounded up to whole events of the population."""
    return p if population is None else np.array([marked(float(rate), population) / population for rate in p])


def zero_statement(table: pd.DataFrame, confidence: float, population: int | None = None) -> str | None:
    """What seeing no event would allow to say; None when the plan does not allow for that."""
    rows = table[(table["events"] == 0) & table["n"].notna()]
    if rows.empty:
        return None
    n, limit = int(rows.iloc[0]["n"]), float(rows.iloc[0]["bound"])
    of = "" if population is None else f" of the {population}"
    level = percent(confidence)
    if n == population:
        return f"If none of all {n} units is an event, there is none: with so small a population the answer is a census."
    return (
        f"If no event is seen in {n} units{of}, the true rate is at most {percent(limit, 'up')} with {level} confidence "
        f"(one-sided); this does not show that the rate is zero."
    )
