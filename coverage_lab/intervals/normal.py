"""Intervals from the normal approximation at the estimate: the plus-or-minus formula and its correction."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from coverage_lab.intervals.inputs import floats, normal_point, pair
from coverage_lab.intervals.sources import BROWN_CAI_DASGUPTA, NEWCOMBE
from coverage_lab.records import Bounds, Method


def wald(events: ArrayLike, trials: ArrayLike, tail: ArrayLike) -> Bounds:
    """Estimate plus or minus z estimated standard errors; no width at 0 and n events."""
    x, n, tail = floats(events, trials, tail)
    reach = normal_point(tail) * np.sqrt((x / n) * ((n - x) / n) / n)
    return pair(x / n - reach, x / n + reach)


def wald_cc(events: ArrayLike, trials: ArrayLike, tail: ArrayLike) -> Bounds:
    """The plus-or-minus formula with half an event more on either side."""
    x, n, tail = floats(events, trials, tail)
    reach = normal_point(tail) * np.sqrt((x / n) * ((n - x) / n) / n) + 1 / (2 * n)
    return pair(x / n - reach, x / n + reach)


_DIPS = "the raw lower limit falls below zero and dips there: L(1) < L(0)"

WALD = Method(
    name="wald",
    function=wald,
    label="plus-or-minus (Wald)",
    family="normal approximation",
    source=f"P.-S. Laplace, Théorie analytique des probabilités (1812); {BROWN_CAI_DASGUPTA}",
    formula="p̂ ± z·√(p̂q̂/n)",
    ends="no width at all at 0 and n events",
    faults="worst coverage over all proportions is 0; limits leave [0, 1]; coverage jumps erratically with n",
    exemptions={"monotone-raw": _DIPS},
)

WALD_CC = Method(
    name="wald-cc",
    function=wald_cc,
    label="plus-or-minus, continuity-corrected",
    family="normal approximation",
    source=f"J. L. Fleiss, Statistical Methods for Rates and Proportions, 2nd ed., Wiley (1981); {NEWCOMBE}",
    formula="p̂ ± [z·√(p̂q̂/n) + 1/(2n)]",
    ends="half-width 1/(2n) at 0 and n events",
    faults="still fails near 0 and 1; limits leave [0, 1]",
    exemptions={"monotone-raw": _DIPS},
)
