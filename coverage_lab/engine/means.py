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

    def masses(self, points: Array) -> Array:
        """The prior's chance, within the range, of what is nearer to each ascending point than to the others."""
        if len(points) == 1 or self.low == self.high:
            return np.full(len(points), 1 / len(points))
        cuts = np.concatenate([[self.low], (points[1:] + points[:-1]) / 2, [self.high]])
        return np.asarray(np.diff(betainc(*self.prior, cuts)) / self.mass)


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


def point_means(points: Array, weights: Array, limits: Stack, side: Side) -> dict[str, Array]:
    """The same means over ascending truths; weights (points, samples) are the joint chances of truth and sample."""
    by_sample, by_point = weights.sum(axis=0), weights.sum(axis=1)
    until = np.concatenate([np.zeros((1, weights.shape[1])), np.cumsum(weights, axis=0)])
    columns = np.arange(weights.shape[1])
    right_of_upper = np.searchsorted(points, limits.upper, side="right")
    left_of_lower = np.searchsorted(points, limits.lower, side="left")
    mean = float(points @ by_point)
    width = limits.upper if side == "upper" else -limits.lower if side == "lower" else limits.upper - limits.lower
    offset = {"upper": -mean, "lower": mean}.get(side, 0.0)
    return {
        "missed_below": (until[-1] - until[right_of_upper, columns]).sum(axis=1),
        "missed_above": until[left_of_lower, columns].sum(axis=1),
        "mean_width": width @ by_sample + offset,
        "outside_unit_rate": limits.outside @ by_sample,
        "zero_width_rate": limits.zero @ by_sample,
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
