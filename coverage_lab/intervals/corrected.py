"""Intervals for the true proportion behind a test that errs: what is counted are test results, not true states."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import replace
from functools import partial

import numpy as np
from numpy.typing import ArrayLike

from coverage_lab.intervals.inputs import floats, normal_point, pair
from coverage_lab.intervals.sources import ROGAN_GLADEN
from coverage_lab.records import Bounds, Method

_ESTIMATED = (
    *("events", "trials"),
    *("diseased_positive", "diseased_tested", "healthy_negative", "healthy_tested"),
)


def corrected(method: Method) -> Method:
    """The method for the apparent proportion, each limit mapped back through sensitivity and specificity.

    These are taken as known: with estimates in their place the interval is too short.
    """
    mirror = "events and non-events are not mistaken alike unless sensitivity and specificity are equal"
    return replace(
        method,
        name=f"corrected-{method.name}",
        function=partial(_mapped, method.function),
        label=f"{method.label}, corrected for test errors",
        family="test errors",
        source=f"{ROGAN_GLADEN}; J. Reiczigel, J. Földi & L. Ózsvári, Epidemiology and Infection 138:1674 (2010)",
        formula=f"limits a of {method.name} for the apparent proportion, mapped to (a + Sp − 1)/(Se + Sp − 1)",
        ends="as mapped: they leave [0, 1] when the apparent proportion is below 1 − Sp or above Se",
        faults="takes sensitivity and specificity as known: with estimates plugged in its coverage is far too low",
        needs=(*method.needs, "sensitivity", "specificity"),
        exemptions={**method.exemptions, "mirror": mirror},
    )


def corrected_all(methods: Iterable[Method]) -> tuple[Method, ...]:
    """All of them, corrected."""
    return tuple(corrected(method) for method in methods)


def corrected_delta(
    events: ArrayLike,
    trials: ArrayLike,
    diseased_positive: ArrayLike,
    diseased_tested: ArrayLike,
    healthy_negative: ArrayLike,
    healthy_tested: ArrayLike,
    tail: ArrayLike,
) -> Bounds:
    """The corrected estimate plus or minus z standard errors, those of sensitivity and specificity included.

    [0, 1] where the estimates say that the test tells nothing.
    """
    x, n, a, m1, b, m0, tail = floats(
        events, trials, diseased_positive, diseased_tested, healthy_negative, healthy_tested, tail
    )
    se, sp, share = a / m1, b / m0, x / n
    gain = (a * m0 - (m0 - b) * m1) / (m1 * m0)
    tells = gain > 0
    gain = np.where(tells, gain, 1.0)
    p = (share - (m0 - b) / m0) / gain
    variance = share * (1 - share) / n + p**2 * se * (1 - se) / m1 + (1 - p) ** 2 * sp * (1 - sp) / m0
    reach = normal_point(tail) * np.sqrt(variance) / gain
    return pair(np.where(tells, p - reach, 0.0), np.where(tells, p + reach, 1.0))


def corrected_adjusted(
    events: ArrayLike,
    trials: ArrayLike,
    diseased_positive: ArrayLike,
    diseased_tested: ArrayLike,
    healthy_negative: ArrayLike,
    healthy_tested: ArrayLike,
    tail: ArrayLike,
) -> Bounds:
    """Lang and Reiczigel's interval: pseudo-counts in all three samples, and a shift of the centre.

    [0, 1] where the estimates say that the test tells nothing. The formula is given from memory.
    """
    x, n, a, m1, b, m0, tail = floats(
        events, trials, diseased_positive, diseased_tested, healthy_negative, healthy_tested, tail
    )
    z = normal_point(tail)
    se, sp, share = (a + 1) / (m1 + 2), (b + 1) / (m0 + 2), (x + z * z / 2) / (n + z * z)
    gain = se + sp - 1
    tells = ((a + 1) * (m0 + 2) > (m0 + 1 - b) * (m1 + 2)) & (gain > 0)
    gain = np.where(tells, gain, 1.0)
    p = (share + sp - 1) / gain
    of_events, of_others = se * (1 - se) / (m1 + 2), sp * (1 - sp) / (m0 + 2)
    centre = p + 2 * z * z * (p * of_events - (1 - p) * of_others)
    variance = share * (1 - share) / (n + z * z) + p**2 * of_events + (1 - p) ** 2 * of_others
    reach = z * np.sqrt(variance) / gain
    return pair(np.where(tells, centre - reach, 0.0), np.where(tells, centre + reach, 1.0))


def _mapped(function: Callable[..., Bounds], *columns: ArrayLike) -> Bounds:
    """The limits of `function`, whose columns come first, as true proportions: false positives off, over the gain.

    (a - (1 - Sp))/(Se - (1 - Sp)) leaves a limit untouched, digit for digit, when the test does not err. [0, 1] where
    the two chances say that the test tells nothing, as estimates can.
    """
    *own, sensitivity, specificity, tail = columns
    lower, upper = function(*own, tail)
    se, sp = floats(sensitivity, specificity)
    false = 1 - sp
    tells = se > false
    gain = np.where(tells, se - false, 1.0)
    return pair(np.where(tells, (lower - false) / gain, 0.0), np.where(tells, (upper - false) / gain, 1.0))


CORRECTED_ADJUSTED = Method(
    name="corrected-adjusted",
    function=corrected_adjusted,
    label="Lang–Reiczigel, estimated test errors",
    family="test errors",
    source='Z. Lang & J. Reiczigel, "Confidence limits for prevalence of disease adjusted for estimated sensitivity '
    'and specificity", Preventive Veterinary Medicine 113:13 (2014); formula from memory',
    formula="Se′ = (a + 1)/(m₁ + 2), Sp′ = (b + 1)/(m₀ + 2), A′ = (x + z²/2)/(n + z²), P′ = (A′ + Sp′ − 1)/J′, "
    "J′ = Se′ + Sp′ − 1; P′ + 2z²[P′Se′(1 − Se′)/(m₁ + 2) − (1 − P′)Sp′(1 − Sp′)/(m₀ + 2)] ± z·√[A′(1 − A′)/(n + z²) + "
    "P′²Se′(1 − Se′)/(m₁ + 2) + (1 − P′)²Sp′(1 − Sp′)/(m₀ + 2)]/J′",
    ends="finite; raw limits leave [0, 1]",
    faults="approximate; not nested in confidence when validation counts are few; [0, 1] where J′ ≤ 0",
    needs=_ESTIMATED,
    exemptions={
        "mirror": "events and non-events are not mistaken alike unless the validation counts are equal",
        "nested": "the centre shifts with z², for few validation counts faster than the reach grows",
    },
)

CORRECTED_DELTA = Method(
    name="corrected-delta",
    function=corrected_delta,
    label="delta method, estimated test errors",
    family="test errors",
    source=ROGAN_GLADEN,
    formula="P = (A + Sp − 1)/J, not clipped, J = Se + Sp − 1; P ± z·√{[A(1 − A)/n + P²Se(1 − Se)/m₁ + "
    "(1 − P)²Sp(1 − Sp)/m₀]/J²}",
    ends="raw limits leave [0, 1]",
    faults="a normal approximation: too short where no errors were seen in validation; [0, 1] where J ≤ 0",
    needs=_ESTIMATED,
    exemptions={"mirror": "events and non-events are not mistaken alike unless the validation counts are equal"},
)
