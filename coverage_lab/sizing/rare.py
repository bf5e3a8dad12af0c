"""Rare outcomes: the n at which few events, or none, rule out a rate; the n that sees some events. Always one-sided.

Seeing at most c events rules out the rate θ when P(X <= c | θ) <= 1 - confidence; in an unlimited population that is
the same as a one-sided Clopper-Pearson upper bound of at most θ. In a population of N a rate stands for ⌈θN⌉ events.
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


def rare_table(rare: Rare | None, confidence: float, population: int | None = None) -> pd.DataFrame:
    """For every number of events allowed: events, n, bound, probability_at_hoped_for, census (n is the population).

    n is <NA> where even a census cannot rule the rate out, because so many events are allowed.
    """
    rows = []
    if rare is not None and rare.limit is not None:
        rows = [_rare_row(c, rare.limit, rare.hoped_for, confidence, population) for c in rare.events]
    table = pd.DataFrame(rows, columns=RARE_COLUMNS)
    table[["bound", "probability_at_hoped_for"]] = table[["bound", "probability_at_hoped_for"]].astype(float)
    return table.astype({"events": "int64", "n": "Int64", "census": "bool"})


def _rare_row(
    events: int, limit: float, hoped_for: float | None, confidence: float, population: int | None
) -> tuple[int, int | None, float | None, float | None, bool]:
    """One number of events allowed."""
    n = ruling_out(events, limit, confidence, population)
    if n is None:
        return events, None, None, None, False
    chance = None if hoped_for is None else chance_at_most(events, n, hoped_for, population)
    return events, n, bound(events, n, confidence, population), chance, n == population


def seen(rare: Rare, population: int | None = None) -> Seen | None:
    """The n that sees at least the plan's number of events, or None when the plan does not ask or no n does."""
    if rare.see_at_least is None or rare.at_rate is None:
        return None
    n = seeing(rare.see_at_least, rare.at_rate, rare.with_probability, population)
    if n is None:
        return None
    chance = chance_at_least(rare.see_at_least, n, rare.at_rate, population)
    return Seen(rare.see_at_least, rare.at_rate, n, chance, census=n == population)


def characteristic(table: pd.DataFrame, rare: Rare | None, population: int | None = None) -> pd.DataFrame:
    """Operating characteristics: the chance of at most the allowed events, by true rate from 0 to twice the limit.

    Columns events, n, p, probability; for a population the rates are those that it can have.
    """
    rows = []
    if rare is not None and rare.limit is not None:
        rates = np.linspace(0.0, min(2 * rare.limit, 1.0), CURVE_POINTS)
        if population is not None:
            rates = np.unique([marked(float(rate), population) / population for rate in rates])
        for row in table[table["n"].notna()].to_dict("records"):
            events, n = int(row["events"]), int(row["n"])
            rows += [(events, n, float(p), chance_at_most(events, n, float(p), population)) for p in rates]
    return pd.DataFrame(rows, columns=["events", "n", "p", "probability"])


def zero_statement(table: pd.DataFrame, confidence: float, population: int | None = None) -> str | None:
    """What seeing no event would allow to say; None when the plan does not allow for that."""
    rows = table[(table["events"] == 0) & table["n"].notna()]
    if rows.empty:
        return None
    n, limit = int(rows.iloc[0]["n"]), float(rows.iloc[0]["bound"])
    of = "" if population is None else f" of the {population}"
    level = percent(confidence)
    if n == population:
        return f"With a population of {n} the answer is a census: if none of all {n} units is an event, there is none."
    return (
        f"If no event is seen in {n} units{of}, the true rate is at most {percent(limit, 'up')} with {level} "
        f"confidence (one-sided); this does not show that the rate is zero."
    )
