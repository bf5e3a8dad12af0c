"""Score intervals and the shifted estimates that imitate them."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from coverage_lab.intervals.inputs import floats, normal_point, pair
from coverage_lab.intervals.sources import AGRESTI_COULL as AGRESTI_COULL_1998
from coverage_lab.intervals.sources import NEWCOMBE
from coverage_lab.records import Array, Bounds, Method


def wilson(events: ArrayLike, trials: ArrayLike, tail: ArrayLike) -> Bounds:
    """Wilson's score interval: every p that a score test at `tail` does not reject."""
    x, n, tail = floats(events, trials, tail)
    return wilson_at(x, n, normal_point(tail))


def wilson_at(x: Array, n: Array, z: Array) -> Bounds:
    """The same at any point z, not only a normal one; x and n need not be whole."""
    return pair(_wilson_lower(x, n, z), _wilson_upper(x, n, z))


def wilson_cc(events: ArrayLike, trials: ArrayLike, tail: ArrayLike) -> Bounds:
    """Wilson's interval for half an event less (lower limit) and half an event more (upper limit), n unchanged.

    The usual expanded quadratic is not this interval at 0 events: it has no real root there when z² < 2 + 1/n.
    """
    x, n, tail = floats(events, trials, tail)
    z = normal_point(tail)
    return pair(_wilson_lower(np.maximum(x - 0.5, 0), n, z), _wilson_upper(np.minimum(x + 0.5, n), n, z))


def agresti_coull(events: ArrayLike, trials: ArrayLike, tail: ArrayLike) -> Bounds:
    """The plus-or-minus formula after adding z²/2 events and z²/2 non-events."""
    x, n, tail = floats(events, trials, tail)
    z = normal_point(tail)
    return pair(*_shifted_wald(x + z * z / 2, n - x + z * z / 2, z))


def plus_four(events: ArrayLike, trials: ArrayLike, tail: ArrayLike) -> Bounds:
    """The plus-or-minus formula after adding two events and two non-events, at every confidence."""
    x, n, tail = floats(events, trials, tail)
    return pair(*_shifted_wald(x + 2, n - x + 2, normal_point(tail)))


def second_order(events: ArrayLike, trials: ArrayLike, tail: ArrayLike) -> Bounds:
    """One-sided bounds whose coverage error is of second order, from an Edgeworth expansion."""
    x, n, tail = floats(events, trials, tail)
    z = normal_point(tail)
    eta = z * z / 3 + 1 / 6
    slope, level = -(13 * z * z + 17) / 18, z * z / 18 + 7 / 36
    pq = (x / n) * ((n - x) / n)
    reach = z * np.sqrt(np.maximum(pq + (slope * pq + level) / n, 0) / n)
    middle = (x + eta) / (n + 2 * eta)
    return pair(middle - reach, middle + reach)


def _wilson_lower(x: Array, n: Array, z: Array) -> Array:
    """The smaller root by the conjugate form: no cancellation at few events, exactly 0 at none."""
    root = np.sqrt(x * ((n - x) / n) + z * z / 4)
    return np.where(x > 0, (x * (x / n)) / np.where(x > 0, x + z * z / 2 + z * root, 1.0), 0.0)


def _wilson_upper(x: Array, n: Array, z: Array) -> Array:
    root = np.sqrt(x * ((n - x) / n) + z * z / 4)
    return np.where(x < n, (x + z * z / 2 + z * root) / (n + z * z), 1.0)


def _shifted_wald(events: Array, others: Array, z: Array) -> tuple[Array, Array]:
    total = events + others
    middle = events / total
    reach = z * np.sqrt(middle * (others / total) / total)
    return middle - reach, middle + reach


_LEAVES = "raw limits leave [0, 1] at 0 and n events"

WILSON = Method(
    name="wilson",
    function=wilson,
    label="Wilson score",
    family="score",
    source='E. B. Wilson, "Probable inference, the law of succession, and statistical inference", Journal of the '
    "American Statistical Association 22:209 (1927)",
    formula="[p̂ + z²/2n ± z·√(p̂q̂/n + z²/4n²)] / (1 + z²/n)",
    ends="exactly 0 at 0 events and 1 at n events; the other end is z²/(n + z²) from it",
    faults="coverage dips to .838 near p = .18/n for large n at 95 % (.820 at n = 2); one-sided bounds are biased",
)

WILSON_CC = Method(
    name="wilson-cc",
    function=wilson_cc,
    label="Wilson score, continuity-corrected",
    family="score",
    source=f"{NEWCOMBE}, method 4; "
    'S. E. Vollset, "Confidence intervals for a binomial proportion", Statistics in Medicine 12:809 (1993)',
    formula="Wilson lower limit at p̂ − 1/2n, Wilson upper limit at p̂ + 1/2n; 0 or 1 where the shifted value leaves "
    "(0, 1)",
    ends="0 at 0 events, 1 at n events",
    faults="nearly exact-like coverage, but without a guarantee (.949 at n = 30)",
)

AGRESTI_COULL = Method(
    name="agresti-coull",
    function=agresti_coull,
    label="Agresti–Coull",
    family="score",
    source=AGRESTI_COULL_1998,
    formula="ñ = n + z², p̃ = (x + z²/2)/ñ, p̃ ± z·√(p̃q̃/ñ)",
    ends=_LEAVES,
    faults="never shorter than Wilson's interval",
)

PLUS_FOUR = Method(
    name="plus-four",
    function=plus_four,
    label="plus four",
    family="score",
    source=AGRESTI_COULL_1998,
    formula="ñ = n + 4, p̃ = (x + 2)/ñ, p̃ ± z·√(p̃q̃/ñ), at every confidence",
    ends=_LEAVES,
    faults="four are too few at 99 %; at 80 % (and at 90 % for n ≤ 3) the lower limit at 0 events is above 0, so that "
    "coverage near p = 0 is 0",
    exemptions={
        "monotone-raw": "the raw lower limit dips below zero: L(1) < L(0)",
        "holds-estimate": "at low confidence the shift of two events exceeds the reach at 0 and n events",
    },
)

SECOND_ORDER = Method(
    name="second-order",
    function=second_order,
    label="second-order corrected",
    family="score",
    source='T. T. Cai, "One-sided confidence intervals in discrete distributions", Journal of Statistical Planning and '
    "Inference 131:63 (2005)",
    formula="η = z²/3 + 1/6, γ₁ = −(13z²/18 + 17/18), γ₂ = z²/18 + 7/36; U = (x + η)/(n + 2η) + "
    "z·√(p̂q̂ + (γ₁p̂q̂ + γ₂)/n)/√n; L by mirror; a negative radicand counts as 0",
    ends="finite at 0 and n events",
    faults="approximate; the upper bound at n events is below 1 from n = 21 (95 %), 34 (90 %), 20 (99 %), so that "
    "coverage near 1 is 0; not nested in confidence; not monotone above 95 %",
    sides=("upper", "lower"),
    exemptions={
        "monotone": "the correction of the variance outruns the shift at high confidence",
        "monotone-raw": "the correction of the variance outruns the shift at high confidence",
        "nested": "the correction changes with z faster than the reach does at few trials",
        "holds-estimate": "the shifted centre leaves 0 and 1 farther than the reach brings it back",
    },
)
