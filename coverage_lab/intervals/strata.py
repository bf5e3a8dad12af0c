"""Intervals for stratified samples: events, units and population weights by stratum, arrays (samples, strata).

A stratum without evaluable units is left out and the other weights are raised in proportion; one with a single unit
adds no variance.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from coverage_lab.intervals.exact import clopper_pearson
from coverage_lab.intervals.inputs import floats, normal_point, pair, student_point
from coverage_lab.intervals.score import wilson
from coverage_lab.intervals.sources import COCHRAN, FRANCO, KORN_GRAUBARD
from coverage_lab.records import Array, Bounds, Method

_NEEDS = ("stratum_events", "stratum_trials", "stratum_weights")


def stratified_wald(
    stratum_events: ArrayLike, stratum_trials: ArrayLike, stratum_weights: ArrayLike, tail: ArrayLike
) -> Bounds:
    """The weighted mean plus or minus the normal point times its standard error."""
    p, variance, _, _ = _moments(stratum_events, stratum_trials, stratum_weights)
    reach = normal_point(np.asarray(tail)) * np.sqrt(variance)
    return pair(p - reach, p + reach)


def stratified_wilson(
    stratum_events: ArrayLike, stratum_trials: ArrayLike, stratum_weights: ArrayLike, tail: ArrayLike
) -> Bounds:
    """Wilson's interval with the effective number of trials."""
    p, size, _, _ = _effective(stratum_events, stratum_trials, stratum_weights)
    return wilson(p * size, size, tail)


def stratified_korn_graubard(
    stratum_events: ArrayLike, stratum_trials: ArrayLike, stratum_weights: ArrayLike, tail: ArrayLike
) -> Bounds:
    """Clopper–Pearson with the effective number of trials, made smaller for the degrees of freedom it rests on."""
    p, size, known, freedom = _effective(stratum_events, stratum_trials, stratum_weights)
    n = _units(stratum_trials)
    tail = np.asarray(tail, dtype=np.float64)
    ratio = student_point(np.maximum(n - 1, 1), tail) / student_point(np.maximum(freedom, 1), tail)
    size = np.where(known, size * ratio**2, size)
    return clopper_pearson(p * size, size, tail)


def _units(stratum_trials: ArrayLike) -> Array:
    """Evaluable units in all strata."""
    return np.asarray(np.asarray(stratum_trials, dtype=np.float64).sum(axis=-1))


def _moments(events: ArrayLike, trials: ArrayLike, weights: ArrayLike) -> tuple[Array, Array, NDArray[np.bool_], Array]:
    """Weighted proportion, its variance, whether any stratum shows both outcomes, and degrees of freedom."""
    x, n, w = floats(events, trials, weights)
    there = n > 0
    w = np.where(there, w, 0.0)
    w = w / np.where(there.any(axis=-1), w.sum(axis=-1), 1.0)[..., None] if not there.all() else w
    units = np.where(there, n, 1.0)
    share, rest = x / units, (units - x) / units
    p = np.where((x == n).all(axis=-1), 1.0, np.minimum((w * share).sum(axis=-1), 1.0))
    variance = (w * w * share * rest * there / np.maximum(n - 1, 1)).sum(axis=-1)
    shows = np.asarray(((x > 0) & (x < n)).any(axis=-1))
    return np.asarray(p), np.asarray(variance), shows, np.asarray((n - there).sum(axis=-1))


def _effective(
    events: ArrayLike, trials: ArrayLike, weights: ArrayLike
) -> tuple[Array, Array, NDArray[np.bool_], Array]:
    """Weighted proportion, effective trials p̂q̂/v̂ or all the trials without variance, where known, freedom."""
    p, variance, known, freedom = _moments(events, trials, weights)
    size = np.where(known, p * (1 - p) / np.where(known, variance, 1.0), np.maximum(_units(trials), 1.0))
    return p, size, known, freedom


_MOMENTS = "p̂ = ΣW·p̂_h, v̂ = ΣW²·p̂_h·q̂_h/(n_h − 1)"
_ZERO = "without variance within the strata all n trials count"

STRATIFIED_WILSON = Method(
    name="stratified-wilson",
    function=stratified_wilson,
    label="Wilson score, stratified",
    family="strata",
    source=FRANCO,
    formula=f"Wilson for p̂q̂/v̂ trials, {_MOMENTS}",
    ends="Wilson with all n trials",
    faults=f"{_ZERO}; one-sided bounds are biased",
    needs=_NEEDS,
)

STRATIFIED_KORN_GRAUBARD = Method(
    name="stratified-korn-graubard",
    function=stratified_korn_graubard,
    label="Korn–Graubard, stratified",
    family="strata",
    source=KORN_GRAUBARD,
    formula=f"Clopper–Pearson for p̂q̂/v̂·[t(n − 1)/t(n − H)]² trials, {_MOMENTS}",
    ends="Clopper–Pearson with all n trials",
    faults=_ZERO,
    needs=_NEEDS,
)

STRATIFIED_WALD = Method(
    name="stratified-wald",
    function=stratified_wald,
    label="plus-or-minus (Wald), stratified",
    family="strata",
    source=COCHRAN + ", chapter 5",
    formula=f"p̂ ± z·√v̂, {_MOMENTS}",
    ends="zero width",
    faults="zero width where no stratum shows both outcomes; leaves [0, 1]",
    needs=_NEEDS,
)
