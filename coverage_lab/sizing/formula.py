"""The taught formula, Wilson's closed form, and the ladder from a calculated n to the units to be recruited."""

import math
from collections.abc import Callable

from coverage_lab.records_sizing import Inflation, Ladder, Rung

ROUND_OFF = 1e-12  # 2.576²·¼/.046² evaluates to 588.0000000000001: that is 588, not 589


def ceiling(value: float) -> int:
    """The whole number of units that `value` asks for, blind to its last rounding."""
    return math.ceil(value * (1 - ROUND_OFF))


def margin_of_error(p: float, half_width: float, z: float) -> float:
    """The taught formula z²p(1-p)/d², unrounded: the plus-or-minus interval then has half-width d (common practice)."""
    return z * z * p * (1 - p) / (half_width * half_width)


def wilson_size(p: float, half_width: float, z: float) -> float:
    """The n, unrounded, at which Wilson's interval around an estimate equal to p has half-width d < ½.

    n = z²[(pq - 2d²) + √((pq - 2d²)² - d²(4d² - 1))]/(2d²), the root of d(1 + z²/n) = z√(pq/n + z²/4n²).
    """
    d = half_width
    middle = p * (1 - p) - 2 * d * d
    return z * z * (middle + math.sqrt(middle * middle - d * d * (4 * d * d - 1))) / (2 * d * d)


def nearest_half(low: float, high: float) -> float:
    """The value of the range nearest ½, where an estimate is least precise."""
    return min(max(0.5, low), high)


def ladder(base: float, inflation: Inflation, finite: bool = True) -> Ladder:
    """From a calculated n to units, in this order: design effect, finite population, losses, whole clusters.

    n₁ = deff·n₀; n₂ = n₁/(1 + (n₁ - 1)/N) (Cochran 1977, Sampling Techniques, §4.4); n₃ = n₂/(1 - l); clusters rounded
    up; never above N. The order matters. Values stay unrounded from rung to rung; each rung prints its ceiling.
    `finite` is False for a base that was computed for the finite population.
    """
    population = inflation.population
    limited = _limit(population)
    widened = base * inflation.design_effect
    corrected = widened / (1 + (widened - 1) / population) if finite and population is not None else widened
    lossy = corrected / (1 - inflation.loss)
    clusters = None if inflation.cluster_size is None else ceiling(lossy / inflation.cluster_size)
    units = lossy if clusters is None or inflation.cluster_size is None else float(clusters * inflation.cluster_size)
    values = {"base": base, "design_effect": widened, "finite": corrected, "loss": lossy, "units": units}
    rungs = tuple(Rung(name, value, limited(ceiling(value))) for name, value in values.items())
    return Ladder(rungs, clusters, census=population is not None and rungs[-1].ceiling >= population)


def _limit(population: int | None) -> Callable[[int], int]:
    """Never more units than there are."""
    return (lambda n: n) if population is None else (lambda n: min(n, population))
