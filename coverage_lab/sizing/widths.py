"""Expected half-width at the worst p of a range, and assurance at one p, for many n at once.

The half-width is (U - L)/2 of the truncated interval; of a one-sided bound its excess over the truth, whose mean is
that of U - x/n (or x/n - L).
"""

import numpy as np
from numpy.typing import NDArray

from coverage_lab.probability import point
from coverage_lab.records import Array, Side
from coverage_lab.sizing.rows import Rows

TIES = 1e-12  # a width this close to the limit, relatively, is at it
FLAT = 1e-9  # a slope this small beside the sum of its terms' sizes is none
HALVINGS = 50


class Chances:
    """P(X = x) of all events of the rows at some p, each p computed once and shared by all methods."""

    def __init__(self, rows: Rows) -> None:
        self.rows = rows
        self._at: dict[tuple[float, int], Array] = {}

    def at(self, p: float, fewer: int = 0) -> Array:
        """P(X = x) for n - fewer trials; (flat,)."""
        key = p, fewer
        if key not in self._at:
            self._at[key] = point(self.rows.events, self.rows.trials - fewer, p)
        return self._at[key]


def half_widths(rows: Rows, lower: Array, upper: Array, side: Side) -> Array:
    """What is averaged, for every event; (flat,)."""
    if side == "two-sided":
        return (upper - lower) / 2
    estimate = rows.events / rows.trials
    return upper - estimate if side == "upper" else estimate - lower


def assurance(chances: Chances, lower: Array, upper: Array, side: Side, half_width: float, p: float) -> Array:
    """P(half-width <= d) of every row at p; one-sided: P(the bound lies at most d from p); (rows,)."""
    spread = {"two-sided": (upper - lower) / 2, "upper": upper - p, "lower": p - lower}[side]
    return chances.rows.total(chances.at(p) * (spread <= half_width * (1 + TIES)))


def expected(chances: Chances, values: Array, p: float) -> Array:
    """E[value] at p of every row; (rows,)."""
    return chances.rows.total(chances.at(p) * values)


def peaks_at(chances: Chances, values: Array, p: float, low: float, high: float) -> NDArray[np.bool_]:
    """Which rows have their largest E[value] over [low, high] at p, the value of the range nearest ½; (rows,).

    dE/dp = n·Σ [value(x+1) - value(x)]·P(X = x | n-1). A mean over a binomial has no more turns than the values
    themselves (variation diminishing), and widths rise, then fall: one look at the slope settles it.
    """
    if low == high:
        return np.ones(len(chances.rows.n), dtype=bool)
    terms = chances.at(p, fewer=1) * chances.rows.steps(values)
    slope = chances.rows.total(terms)
    slack = FLAT * chances.rows.total(np.abs(terms))
    rising, falling = slope >= -slack, slope <= slack
    return np.asarray(rising if p == high else falling if p == low else rising & falling)


def largest_expected(rows: Rows, values: Array, low: float, high: float) -> Array:
    """The largest E[value] over [low, high] of every row: at an end, or where the slope turns between them; (rows,).

    The events must be all that the range can produce.
    """
    steps = rows.steps(values)
    left, right = np.full(len(rows.n), low), np.full(len(rows.n), high)
    best = np.maximum(_mean(rows, values, left), _mean(rows, values, right))
    turns = (_slope(rows, steps, left) > 0) & (_slope(rows, steps, right) < 0)
    for _ in range(HALVINGS if turns.any() else 0):
        middle = (left + right) / 2
        rising = _slope(rows, steps, middle) > 0
        left, right = np.where(rising, middle, left), np.where(rising, right, middle)
    return np.where(turns, np.maximum(best, _mean(rows, values, left)), best)


def _mean(rows: Rows, values: Array, p: Array) -> Array:
    return rows.total(point(rows.events, rows.trials, p[rows.row]) * values)


def _slope(rows: Rows, steps: Array, p: Array) -> Array:
    return rows.total(point(rows.events, rows.trials - 1, p[rows.row]) * steps)
