"""Normal intervals on a transformed scale, carried back."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike
from scipy import special

from coverage_lab.intervals.exact import clopper_pearson
from coverage_lab.intervals.inputs import floats, normal_point, pair
from coverage_lab.intervals.sources import BROWN_CAI_DASGUPTA
from coverage_lab.records import Bounds, Method


def arcsine(events: ArrayLike, trials: ArrayLike, tail: ArrayLike) -> Bounds:
    """Anscombe's variance-stabilising angle plus or minus z/(2√n), held in the quarter circle."""
    x, n, tail = floats(events, trials, tail)
    angle = np.arctan2(np.sqrt(x + 0.375), np.sqrt(n - x + 0.375))  # arcsin √p*, with its digits kept near 1
    reach = normal_point(tail) / (2 * np.sqrt(n))
    low, high = np.maximum(angle - reach, 0.0), np.minimum(angle + reach, np.pi / 2)
    return pair(np.sin(low) ** 2, np.sin(high) ** 2)


def logit(events: ArrayLike, trials: ArrayLike, tail: ArrayLike) -> Bounds:
    """Log-odds plus or minus z standard errors; the exact limits at 0 and n events."""
    x, n, tail = floats(events, trials, tail)
    inside = (x > 0) & (x < n)
    k, m = np.where(inside, x, 1.0), np.where(inside, n, 2.0)
    centre, reach = np.log(k / (m - k)), normal_point(tail) * np.sqrt(m / (k * (m - k)))
    low, high = clopper_pearson(np.where(inside, 0.0, x), n, tail)
    low = np.where(inside, special.expit(centre - reach), low)
    return pair(low, np.where(inside, special.expit(centre + reach), high))


def logit_half(events: ArrayLike, trials: ArrayLike, tail: ArrayLike) -> Bounds:
    """Log-odds with half an event and half a non-event added, plus or minus z of their own standard errors."""
    x, n, tail = floats(events, trials, tail)
    centre = np.log((x + 0.5) / (n - x + 0.5))
    reach = normal_point(tail) * np.sqrt((n + 1) * (n + 2) / (n * (x + 1) * (n - x + 1)))
    return pair(special.expit(centre - reach), special.expit(centre + reach))


def cloglog(events: ArrayLike, trials: ArrayLike, tail: ArrayLike) -> Bounds:
    """Logarithm of −log p̂ plus or minus z standard errors; the exact limits at 0 and n events."""
    x, n, tail = floats(events, trials, tail)
    inside = (x > 0) & (x < n)
    k, m = np.where(inside, x, 1.0), np.where(inside, n, 2.0)
    log_p = np.where(2 * k < m, np.log(k / m), np.log1p((k - m) / m))
    factor = np.exp(normal_point(tail) * np.sqrt((m - k) / (m * k)) / np.abs(log_p))
    low, high = clopper_pearson(np.where(inside, 0.0, x), n, tail)
    return pair(np.where(inside, np.exp(log_p * factor), low), np.where(inside, np.exp(log_p / factor), high))


_EXACT_ENDS = "the exact (Clopper–Pearson) limits at 0 and n events"


ARCSINE = Method(
    name="arcsine",
    function=arcsine,
    label="arcsine",
    family="transformed",
    source='F. J. Anscombe, "The transformation of Poisson, binomial and negative-binomial data", Biometrika 35:246 '
    "(1948)",
    formula="p* = (x + 3/8)/(n + 3/4); sin²(arcsin √p* ± z/(2√n)), the angle held in [0, π/2]",
    ends="finite at 0 and n events",
    faults="several variants exist under this name; the lower limit at 0 events is above 0 when z < 1.2247, so that "
    "coverage near p = 0 is 0",
    exemptions={"holds-estimate": "at low confidence the added 3/8 exceeds the reach at 0 and n events"},
)

_LOGIT_DIPS = "the standard error of the log-odds grows faster than they do next to 0 and n events"

LOGIT = Method(
    name="logit",
    function=logit,
    label="logit",
    family="transformed",
    source=BROWN_CAI_DASGUPTA,
    formula="logit p̂ ± z·√(n/(x(n − x))), carried back",
    ends=_EXACT_ENDS,
    faults="long for few events; not monotone in the events once z > 2.3665 (at 99 %: from n = 28)",
    exemptions={"monotone": _LOGIT_DIPS, "monotone-raw": _LOGIT_DIPS},
)

LOGIT_HALF = Method(
    name="logit-half",
    function=logit_half,
    label="logit, halves added",
    family="transformed",
    source='F. J. Anscombe, "On estimating binomial response relations", Biometrika 43:461 (1956)',
    formula="log((x + ½)/(n − x + ½)) ± z·√V, V = (n + 1)(n + 2)/(n(x + 1)(n − x + 1)), carried back",
    ends="finite at 0 and n events: never 0 or 1",
    faults="L(0) > 0 and U(n) < 1, so that coverage near 0 and 1 is 0 at every confidence; not monotone in the events "
    "at 99.99 % (from n = 32)",
    exemptions={
        "monotone": _LOGIT_DIPS,
        "monotone-raw": _LOGIT_DIPS,
        "holds-estimate": "the limits are never 0 or 1, the estimate at 0 and n events is",
    },
)

_CLOGLOG_DIPS = "the standard error on the complementary log-log scale grows too fast next to n events"

CLOGLOG = Method(
    name="cloglog",
    function=cloglog,
    label="complementary log-log",
    family="transformed",
    source="J. D. Kalbfleisch & R. L. Prentice, The Statistical Analysis of Failure Time Data, Wiley (1980)",
    formula="θ = log(−log p̂), se = √(q̂/(n·p̂))/|log p̂|; L = exp(−e^(θ + z·se)), U = exp(−e^(θ − z·se))",
    ends=_EXACT_ENDS,
    faults="treats events and non-events differently; not monotone in the events near n (at 99 %: from n = 10)",
    exemptions={
        "monotone": _CLOGLOG_DIPS,
        "monotone-raw": _CLOGLOG_DIPS,
        "mirror": "the scale is not symmetric: events and non-events are not treated alike",
    },
)
