"""Means over the planned range in closed form: p has a Beta(a0, b0) density restricted to [low, high]; no grid.

Given X = x, p has a Beta(x + a0, n - x + b0) density, and X itself is beta-binomial; so the chance that an interval
misses is a sum over x of beta-binomial weights times differences of incomplete beta functions.
"""

from dataclasses import dataclass

import numpy as np
from scipy.special import betainc

from coverage_lab.engine.measures import Stack
from coverage_lab.probability import betabinomial
from coverage_lab.records import Array, Counts, Side


@dataclass(frozen=True)
class Range:
    """The planned range of the true proportion with its Beta weights; low < high."""

    low: float
    high: float
    prior: tuple[float, float]

    @property
    def mass(self) -> float:
        """The unrestricted prior's probability of the range."""
        return float(np.diff(betainc(*self.prior, [self.low, self.high]))[0])

    @property
    def mean(self) -> float:
        """E[p] over the range."""
        a, b = self.prior
        inside = float(np.diff(betainc(a + 1, b, [self.low, self.high]))[0])
        return a / (a + b) * inside / self.mass


def range_means(events: Counts, n: int, limits: Stack, over: Range, side: Side) -> dict[str, Array]:
    """Mean miss rates, width, outside-[0,1] and zero-width rates over the range; (methods,) each.

    events: (samples,), every x that the range can produce, with the limits for the same x.
    """
    x = events.astype(float)
    a, b = x + over.prior[0], n - x + over.prior[1]
    weight = betabinomial(events, n, *over.prior) / over.mass
    at_low, at_high = (np.asarray(betainc(a, b, end), dtype=float) for end in (over.low, over.high))
    below = (at_high - _between(a, b, limits.upper, over, at_low, at_high)) @ weight
    above = (_between(a, b, limits.lower, over, at_low, at_high) - at_low) @ weight
    chance = weight * (at_high - at_low)
    return {
        "missed_below": below,
        "missed_above": above,
        "mean_width": _mean_width(limits, chance, over, side),
        "outside_unit_rate": limits.outside @ chance,
        "zero_width_rate": limits.zero @ chance,
    }


def _between(a: Array, b: Array, limit: Array, over: Range, at_low: Array, at_high: Array) -> Array:
    """I_t(a, b) at the limits t held in the range; the incomplete beta is evaluated only strictly inside it."""
    inside = (limit > over.low) & (limit < over.high)
    value = np.where(limit <= over.low, at_low, at_high)
    rows, columns = np.nonzero(inside)
    value[rows, columns] = betainc(a[columns], b[columns], limit[rows, columns])
    return value


def _mean_width(limits: Stack, chance: Array, over: Range, side: Side) -> Array:
    """Mean width, or the mean signed excess of a one-sided bound over the truth."""
    if side == "two-sided":
        return (limits.upper - limits.lower) @ chance
    return limits.upper @ chance - over.mean if side == "upper" else over.mean - limits.lower @ chance
