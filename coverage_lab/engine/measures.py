"""What is measured on a weighted list of samples, written once for both routes.

Limits are arrays (methods, samples); weights are (samples,); every measure is (methods,).
"""

from dataclasses import dataclass

import numpy as np

from coverage_lab.records import Array, Limits, Outcomes, Side

MEASURES = ("missed_below", "missed_above", "mean_width", "outside_unit_rate", "zero_width_rate")
ERRORS = ("standard_error", *(f"{name}_error" for name in MEASURES))


@dataclass(frozen=True)
class Stack:
    """Limits of several methods on the same samples, with the shares that do not depend on p ready to be weighted."""

    lower: Array  # (methods, samples), truncated
    upper: Array
    outside: Array  # 1.0 where a raw limit leaves [0, 1]
    zero: Array  # 1.0 where the interval has no width

    def at(self, samples: np.ndarray) -> "Stack":
        """The same methods on some of the samples."""
        return Stack(self.lower[:, samples], self.upper[:, samples], self.outside[:, samples], self.zero[:, samples])


def stack(limits: list[Limits]) -> Stack:
    """Several methods' limits as one stack."""
    raw_lower, raw_upper = np.stack([k.raw_lower for k in limits]), np.stack([k.raw_upper for k in limits])
    lower, upper = np.stack([k.lower for k in limits]), np.stack([k.upper for k in limits])
    outside = ((raw_lower < 0) | (raw_upper > 1)).astype(float)
    return Stack(lower, upper, outside, (lower == upper).astype(float))


def width(lower: Array, upper: Array, p: float, side: Side) -> Array:
    """Upper - lower; for a one-sided bound its signed excess over the truth p."""
    if side == "two-sided":
        return upper - lower
    return upper - p if side == "upper" else p - lower


def measure(outcomes: Outcomes, limits: Stack, p: float, side: Side) -> dict[str, Array]:
    """Coverage, the measures of `MEASURES` and no_data_rate; simulated ones with their Monte Carlo standard errors.

    Shares of a simulation are counted in whole draws, so that no order of summation changes a digit. The standard
    error of a share s over R draws is sqrt(s(1-s)/R) (Morris, White & Crowther 2019, Stat. Med. 38:2074).
    """
    draws = outcomes.draws
    weight = outcomes.weight if draws is None else np.rint(outcomes.weight * draws)
    total = 1.0 if draws is None else float(draws)
    flags = np.stack([limits.upper < p, limits.lower > p, limits.outside, limits.zero])
    if draws is not None:  # whole counts add up alike in any shape, and flat ones quickly
        flags = flags.reshape(-1, flags.shape[-1])
    shares = (flags @ weight).reshape(4, -1) / total
    widths = width(limits.lower, limits.upper, p, side)
    mean_width = widths @ weight / total
    below, above, outside, zero = shares
    empty = (np.asarray(outcomes.columns["trials"]) == 0) * weight
    values = {
        "coverage": 1.0 - (below + above),
        "missed_below": below,
        "missed_above": above,
        "mean_width": mean_width,
        "outside_unit_rate": outside,
        "zero_width_rate": zero,
        "no_data_rate": np.full(len(below), empty.sum() / total),
    }
    if draws is not None:
        values |= _errors(values, (widths**2) @ weight / total, draws)
    return values


def _errors(values: dict[str, Array], mean_square: Array, draws: int) -> dict[str, Array]:
    """Monte Carlo standard errors: `standard_error` is the coverage's, the others carry their measure's name."""
    errors = {"standard_error": share_error(values["coverage"], draws)}
    for name in MEASURES:
        errors[f"{name}_error"] = share_error(values[name], draws)
    variance = np.maximum(mean_square - values["mean_width"] ** 2, 0.0)
    errors["mean_width_error"] = np.sqrt(variance / draws)
    return errors


def share_error(share: Array, draws: int) -> Array:
    """sqrt(s(1-s)/R)."""
    return np.sqrt(np.maximum(share * (1.0 - share), 0.0) / draws)
