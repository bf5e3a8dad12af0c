"""Intervals for samples of whole clusters, from the totals and the sums of squares over the clusters.

k clusters with x_c events in m_c units: events X = Σx, trials M = Σm, events_squared Σx², events_by_size Σxm,
sizes_squared Σm². The proportion is X/M; its variance is estimated from the clusters' own deviations x - (X/M)·m, or
planned from an intraclass correlation.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy import special

from coverage_lab.intervals.exact import clopper_pearson
from coverage_lab.intervals.inputs import floats, pair, student_point
from coverage_lab.intervals.score import wilson, wilson_at
from coverage_lab.intervals.sources import COCHRAN, FRANCO, KORN_GRAUBARD
from coverage_lab.records import Array, Bounds, Method

_ESTIMATED = ("events", "trials", "clusters", "events_squared", "events_by_size", "sizes_squared")
_PLANNED = ("events", "trials", "sizes_squared", "planned_icc")
_LARGEST_SQUARE = 3.0e9  # two numbers up to this multiply within 64 bits


def cluster_wald(
    events: ArrayLike,
    trials: ArrayLike,
    clusters: ArrayLike,
    events_squared: ArrayLike,
    events_by_size: ArrayLike,
    sizes_squared: ArrayLike,
    tail: ArrayLike,
) -> Bounds:
    """The ratio estimate plus or minus Student's t with one degree of freedom less than there are clusters."""
    x, n, k = floats(events, trials, clusters)
    variance = _variance(events, trials, clusters, events_squared, events_by_size, sizes_squared)
    reach = _of_clusters(clusters, tail) * np.sqrt(variance)
    return _from_two_clusters(k, x / n - reach, x / n + reach)


def cluster_logit(
    events: ArrayLike,
    trials: ArrayLike,
    clusters: ArrayLike,
    events_squared: ArrayLike,
    events_by_size: ArrayLike,
    sizes_squared: ArrayLike,
    tail: ArrayLike,
) -> Bounds:
    """The same on the scale of log-odds; at 0 and n events Korn and Graubard's limits, there Clopper and Pearson's."""
    columns = (events, trials, clusters, events_squared, events_by_size, sizes_squared)
    x, n, k = floats(events, trials, clusters)
    inside = (x > 0) & (x < n)
    y = np.where(inside, x, n / 2)
    spread = np.sqrt(_variance(*columns)) / ((y / n) * ((n - y) / n))
    reach = _of_clusters(clusters, tail) * spread
    centre = np.log(y / (n - y))
    lower, upper = (np.array(special.expit(centre + sign * reach)) for sign in (-1, 1))
    end = ~inside
    if end.any():
        lower[end], upper[end] = clopper_pearson(x[end], n[end], tail)
    return _from_two_clusters(k, lower, upper)


def korn_graubard(
    events: ArrayLike,
    trials: ArrayLike,
    clusters: ArrayLike,
    events_squared: ArrayLike,
    events_by_size: ArrayLike,
    sizes_squared: ArrayLike,
    tail: ArrayLike,
) -> Bounds:
    """Clopper–Pearson with the effective number of trials, made smaller for the few clusters that it rests on."""
    x, n, k = floats(events, trials, clusters)
    size, known = _effective(events, trials, clusters, events_squared, events_by_size, sizes_squared)
    ratio = student_point(np.maximum(n - 1, 1), tail) / _of_clusters(clusters, tail)
    size = np.where(known, size * ratio**2, size)
    return _from_two_clusters(k, *clopper_pearson(*_scaled(x, n, size), tail))


def wilson_deff_estimated(
    events: ArrayLike,
    trials: ArrayLike,
    clusters: ArrayLike,
    events_squared: ArrayLike,
    events_by_size: ArrayLike,
    sizes_squared: ArrayLike,
    tail: ArrayLike,
) -> Bounds:
    """Wilson's interval with the effective number of trials and Student's t for the normal point."""
    x, n, k = floats(events, trials, clusters)
    size, _ = _effective(events, trials, clusters, events_squared, events_by_size, sizes_squared)
    return _from_two_clusters(k, *wilson_at(*_scaled(x, n, size), _of_clusters(clusters, tail)))


def wilson_deff_planned(
    events: ArrayLike, trials: ArrayLike, sizes_squared: ArrayLike, planned_icc: ArrayLike, tail: ArrayLike
) -> Bounds:
    """Wilson's interval with events and trials divided by the planned design effect, 1 + (m - 1)·ICC."""
    x, n, mm, icc = floats(events, trials, sizes_squared, planned_icc)
    deff = 1 + (mm / n - 1) * icc
    return wilson(x / deff, n / deff, tail)


def clopper_pearson_deff_planned(
    events: ArrayLike, trials: ArrayLike, sizes_squared: ArrayLike, planned_icc: ArrayLike, tail: ArrayLike
) -> Bounds:
    """Clopper–Pearson limits with events and trials divided by the planned design effect."""
    x, n, mm, icc = floats(events, trials, sizes_squared, planned_icc)
    deff = 1 + (mm / n - 1) * icc
    return clopper_pearson(x / deff, n / deff, tail)


def _of_clusters(clusters: ArrayLike, tail: ArrayLike) -> Array:
    """Student's t with one degree of freedom less than there are clusters."""
    return student_point(np.maximum(np.asarray(clusters) - 1, 1), tail)


def _scaled(x: Array, n: Array, size: Array) -> tuple[Array, Array]:
    """Events and trials for an effective size; the ends stay ends, whatever the rounding."""
    return np.where(x < n, np.minimum(size * (x / n), size), size), size


def _effective(
    events: ArrayLike,
    trials: ArrayLike,
    clusters: ArrayLike,
    events_squared: ArrayLike,
    events_by_size: ArrayLike,
    sizes_squared: ArrayLike,
) -> tuple[Array, NDArray[np.bool_]]:
    """Effective trials p̂q̂/v̂, and where that is known; elsewhere, with no variance or at an end, all the trials."""
    x, n = floats(events, trials)
    variance = _variance(events, trials, clusters, events_squared, events_by_size, sizes_squared)
    x, n, variance = np.broadcast_arrays(x, n, variance)
    known = (variance > 0) & (x > 0) & (x < n)
    return np.where(known, (x / n) * ((n - x) / n) / np.where(known, variance, 1.0), n), known


def _variance(
    events: ArrayLike,
    trials: ArrayLike,
    clusters: ArrayLike,
    events_squared: ArrayLike,
    events_by_size: ArrayLike,
    sizes_squared: ArrayLike,
) -> Array:
    """k/(k-1)·Σ(x - (X/M)·m)²/M², exactly 0 where every cluster has the same share of events; 0 for one cluster.

    The sum is [Σx²·Σm² - (Σxm)²]/Σm² + (X·Σm² - M·Σxm)²/(M²·Σm²): both numerators are whole numbers, none negative,
    so nothing cancels in floating point.
    """
    n, k = floats(trials, clusters)
    xx, xm, mm = _whole(events_squared, events_by_size, sizes_squared)
    whole_x, whole_n = _whole(events, trials)
    uneven = np.asarray(xx * mm - xm * xm, dtype=np.float64)
    tilted = np.asarray(whole_x * mm - whole_n * xm, dtype=np.float64)
    size = np.maximum(np.asarray(mm, dtype=np.float64), 1.0)
    total = uneven / size + (tilted / n) ** 2 / size
    return np.asarray(np.where(k > 1, k / np.maximum(k - 1, 1), 0.0) * total / n**2)


def _whole(*values: ArrayLike) -> tuple[NDArray[np.object_] | NDArray[np.int64], ...]:
    """The values as whole numbers whose products are exact: 64 bits, or Python's own where those do not suffice."""
    arrays = [np.asarray(value).astype(np.int64) for value in values]
    if max(array.max() for array in arrays) > _LARGEST_SQUARE:
        return tuple(array.astype(object) for array in arrays)
    return tuple(arrays)


def _from_two_clusters(clusters: Array, lower: ArrayLike, upper: ArrayLike) -> Bounds:
    """One cluster says nothing about the variance between clusters: [0, 1]."""
    return pair(np.where(clusters > 1, lower, 0.0), np.where(clusters > 1, upper, 1.0))


_SUMS = "v̂ = k/(k − 1)·Σ(x − p̂m)²/(Σm)²"
_FEW = "with few clusters the variance is hardly known; [0, 1] from a single evaluable cluster"
_ZERO = "where all clusters have the same share of events (few events: often) the design effect is taken as 1"

CLUSTER_WALD = Method(
    name="cluster-wald",
    function=cluster_wald,
    label="plus-or-minus (Wald), clusters",
    family="clusters",
    source=COCHRAN + ", chapters 9 and 10",
    formula=f"p̂ ± t(k − 1)·√v̂, p̂ = Σx/Σm, {_SUMS}",
    ends="zero width",
    faults=f"zero width where all clusters agree; leaves [0, 1]; {_FEW}",
    needs=_ESTIMATED,
)

CLUSTER_LOGIT = Method(
    name="cluster-logit",
    function=cluster_logit,
    label="logit, clusters",
    family="clusters",
    source=KORN_GRAUBARD,
    formula=f"logit p̂ ± t(k − 1)·√v̂/(p̂q̂), transformed back; {_SUMS}",
    ends="Korn–Graubard",
    faults=f"zero width where all clusters agree; {_FEW}",
    needs=_ESTIMATED,
)

KORN_GRAUBARD_LIMITS = Method(
    name="korn-graubard",
    function=korn_graubard,
    label="Korn–Graubard",
    family="clusters",
    source=KORN_GRAUBARD,
    formula=f"Clopper–Pearson for n* = p̂q̂/v̂·[t(n − 1)/t(k − 1)]² trials, not capped, and n*p̂ events; {_SUMS}",
    ends="Clopper–Pearson with all n trials",
    faults=f"{_ZERO}; {_FEW}",
    needs=_ESTIMATED,
)

WILSON_DEFF_ESTIMATED = Method(
    name="wilson-deff-estimated",
    function=wilson_deff_estimated,
    label="Wilson score, estimated design effect",
    family="clusters",
    source=FRANCO,
    formula=f"Wilson for p̂q̂/v̂ trials with t(k − 1) for z; {_SUMS}",
    ends="Wilson with all n trials and t for z",
    faults=f"{_ZERO}; {_FEW}",
    needs=_ESTIMATED,
)

WILSON_DEFF_PLANNED = Method(
    name="wilson-deff-planned",
    function=wilson_deff_planned,
    label="Wilson score, planned design effect",
    family="clusters",
    source="L. Kish, Survey Sampling, Wiley (1965); J. N. K. Rao & A. J. Scott, Biometrics 48:577 (1992)",
    formula="Wilson for n/deff trials, deff = 1 + (Σm²/Σm − 1)·ICC",
    ends="as Wilson's",
    faults="only as good as the planned correlation",
    needs=_PLANNED,
)

CLOPPER_PEARSON_DEFF_PLANNED = Method(
    name="clopper-pearson-deff-planned",
    function=clopper_pearson_deff_planned,
    label="Clopper–Pearson, planned design effect",
    family="clusters",
    source="L. Kish, Survey Sampling, Wiley (1965); J. N. K. Rao & A. J. Scott, Biometrics 48:577 (1992)",
    formula="Clopper–Pearson for n/deff trials, deff = 1 + (Σm²/Σm − 1)·ICC",
    ends="as Clopper–Pearson's",
    faults="only as good as the planned correlation",
    needs=_PLANNED,
)
