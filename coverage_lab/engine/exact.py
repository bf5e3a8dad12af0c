"""Figures over a whole range of p that need no grid: certified minima and means of a design's mixture."""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from coverage_lab.engine.attained import minimum_at
from coverage_lab.engine.bounds import evaluate
from coverage_lab.engine.means import Range, point_means, range_means
from coverage_lab.engine.measures import MEASURES, Stack, measure, stack
from coverage_lab.engine.minimum import Piece, minimum
from coverage_lab.probability import likely, point, window
from coverage_lab.probability_finite import finite_point, reachable
from coverage_lab.records import Array, Counts, Design, Method, Minimum, Outcomes, Part, Side

MEAN_POINTS = 2001  # truths that a mean is taken over, at most, where no closed form exists


@dataclass(frozen=True)
class Listed:
    """One part with the events that the range can produce and every method's limits for them."""

    part: Part
    events: Counts
    limits: Stack  # (methods, events)

    def piece(self, k: int) -> Piece:
        """Method k's limits as the minimum wants them."""
        part, lower, upper = self.part, self.limits.lower[k], self.limits.upper[k]
        return Piece(
            *(part.trials, part.weight, int(self.events[0]), lower, upper),
            at_zero=part.at_zero,
            at_one=part.at_one,
            population=part.population,
        )


def possible(part: Part, low: float, high: float, floor: float = 1e-18) -> Counts:
    """Every events count whose probability exceeds the floor somewhere in [low, high]."""
    if part.population is not None:
        return np.arange(likely(part.trials, low, floor)[0], likely(part.trials, high, floor)[1] + 1)
    least, most = np.sort(part.chance(np.array([low, high])))
    first, last = window(part.trials, float(least), float(most), floor)
    return np.arange(first, last + 1)


def listed(
    design: Design, methods: Sequence[Method], n: int, between: tuple[float, float], side: Side, tail: float
) -> list[Listed]:
    """The design's parts at n with the methods' limits, evaluated for what the range can produce."""
    found = []
    for part in design.parts(n) or ():
        events = possible(part, *between)
        columns = part.columns(events)
        found.append(Listed(part, events, stack([evaluate(method, columns, side, tail) for method in methods])))
    return found


def minimum_of(parts: Sequence[Listed], k: int, low: float, high: float) -> Minimum:
    """Method k's certified minimum over [low, high]: over every p, or over every truth that a population can have."""
    pieces = [part.piece(k) for part in parts]
    population = parts[0].part.population
    return minimum(pieces, low, high) if population is None else minimum_at(pieces, reachable(population, low, high))


def means_of(parts: Sequence[Listed], over: Range, side: Side) -> dict[str, Array]:
    """Every method's means over the range, weighted over the parts; at a single proportion the exact values there."""
    total = {name: np.zeros(len(parts[0].limits.lower)) for name in MEASURES}
    for part in parts:
        for name, values in _means(part, over, side).items():
            total[name] = total[name] + part.part.weight * values
    return total


def _means(part: Listed, over: Range, side: Side) -> dict[str, Array]:
    """One part's means: in closed form where the chance of an event is p, or p uniform; else over points."""
    of = part.part
    if over.low == over.high:
        outcomes = Outcomes({"trials": np.array([of.trials])}, point_weights(part, np.array(over.low)))
        values = measure(outcomes, part.limits, over.low, side)
        return {name: values[name] for name in MEASURES}
    if of.population is not None:
        points = thinned(reachable(of.population, over.low, over.high), MEAN_POINTS)
    elif (of.at_zero, of.at_one) == (0.0, 1.0):
        return range_means(part.events, of.trials, part.limits, over, side)
    elif over.prior == (1.0, 1.0) and of.at_one > of.at_zero:
        return _stretched_means(part, over, side)
    else:
        points = np.linspace(over.low, over.high, MEAN_POINTS)
    weights = over.masses(points)[:, None] * point_weights(part, points[:, None])
    return point_means(points, weights, part.limits, side)


def _stretched_means(part: Listed, over: Range, side: Side) -> dict[str, Array]:
    """For uniform p the chance of an event is uniform too: the closed form holds on its scale."""
    of = part.part
    low, high = of.chance(np.array([over.low, over.high])).tolist()
    limits = replace(part.limits, lower=of.chance(part.limits.lower), upper=of.chance(part.limits.upper))
    means = range_means(part.events, of.trials, limits, Range(low, high, over.prior), side)
    return {**means, "mean_width": means["mean_width"] / (of.at_one - of.at_zero)}


def thinned(points: Array, most: int) -> Array:
    """At most `most` of the points, evenly spread, both ends among them."""
    if len(points) <= most:
        return points
    return points[np.unique(np.linspace(0, len(points) - 1, most).astype(np.int64))]


def point_weights(part: Listed, p: Array) -> Array:
    """The part's probabilities of its events at p; broadcasts."""
    of = part.part
    if of.population is None:
        return point(part.events, of.trials, of.chance(p))
    return finite_point(part.events, of.trials, of.population, np.rint(p * of.population))


def figures(parts: Sequence[Listed], over: Range, side: Side) -> list[dict[str, float]]:
    """For every method: worst_miss with its place, and the means; what a standard is judged by."""
    means = means_of(parts, over, side)
    rows = []
    for k in range(len(parts[0].limits.lower)):
        least = minimum_of(parts, k, over.low, over.high)
        row = {name: float(values[k]) for name, values in means.items()}
        miss = row["missed_below"] + row["missed_above"]
        worst = {"minimum_coverage": least.coverage, "minimum_at": least.at, "worst_miss": least.miss}
        rows.append({**worst, "mean_coverage": 1.0 - miss, "mean_miss": miss, **row})
    return rows


def restricted(parts: Sequence[Listed], low: float, high: float) -> list[Listed]:
    """The same parts with only the events that a narrower range can produce."""
    found = []
    for part in parts:
        rows = np.flatnonzero(np.isin(part.events, possible(part.part, low, high)))
        found.append(replace(part, events=part.events[rows], limits=part.limits.at(rows)))
    return found
