"""Figures over a whole range of p that need no grid: certified minima and closed-form means of binomial parts."""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from coverage_lab.engine.bounds import evaluate
from coverage_lab.engine.means import Range, range_means
from coverage_lab.engine.measures import MEASURES, Stack, measure, stack
from coverage_lab.engine.minimum import Piece, minimum
from coverage_lab.probability import point, window
from coverage_lab.records import Array, Counts, Design, Method, Minimum, Outcomes, Part, Side


@dataclass(frozen=True)
class Listed:
    """One binomial part with the events that the range can produce and every method's limits for them."""

    part: Part
    events: Counts
    limits: Stack  # (methods, events)

    def piece(self, k: int) -> Piece:
        """Method k's limits as the minimum wants them."""
        limits = self.limits
        return Piece(self.part.trials, self.part.weight, int(self.events[0]), limits.lower[k], limits.upper[k])


def possible(part: Part, low: float, high: float, floor: float = 1e-18) -> Counts:
    """Every events count whose probability exceeds the floor somewhere in [low, high]."""
    first, last = window(part.trials, low, high, floor)
    return np.arange(first, last + 1)


def listed(
    design: Design, methods: Sequence[Method], n: int, between: tuple[float, float], side: Side, tail: float
) -> list[Listed]:
    """The design's parts at n with the methods' limits, evaluated for what the range can produce."""
    found = []
    for part in design.parts(n) or ():
        events = possible(part, *between)
        columns = {"events": events, "trials": np.array([part.trials])}
        found.append(Listed(part, events, stack([evaluate(method, columns, side, tail) for method in methods])))
    return found


def minimum_of(parts: Sequence[Listed], k: int, low: float, high: float) -> Minimum:
    """Method k's certified minimum over [low, high]."""
    return minimum([part.piece(k) for part in parts], low, high)


def means_of(parts: Sequence[Listed], over: Range, side: Side) -> dict[str, Array]:
    """Every method's means over the range, weighted over the parts; at a single proportion the exact values there."""
    total = {name: np.zeros(len(parts[0].limits.lower)) for name in MEASURES}
    for part in parts:
        for name, values in _means(part, over, side).items():
            total[name] = total[name] + part.part.weight * values
    return total


def _means(part: Listed, over: Range, side: Side) -> dict[str, Array]:
    """One part's means."""
    n = part.part.trials
    if over.low < over.high:
        return range_means(part.events, n, part.limits, over, side)
    outcomes = Outcomes({"trials": np.array([n])}, point_weights(part, over.low))
    values = measure(outcomes, part.limits, over.low, side)
    return {name: values[name] for name in MEASURES}


def point_weights(part: Listed, p: float) -> Array:
    """The part's probabilities of its events at p."""
    return point(part.events, part.part.trials, p)


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
        first, last = window(part.part.trials, low, high)
        rows = np.flatnonzero((part.events >= first) & (part.events <= last))
        found.append(replace(part, events=part.events[rows], limits=part.limits.at(rows)))
    return found
