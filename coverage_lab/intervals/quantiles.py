"""Beta quantiles at a tail probability, for either tail, without ever forming 1 - tail."""

from __future__ import annotations

import numpy as np
from scipy import special

from coverage_lab.records import Array

_SMALL = 0.01  # below this the library's upper quantile has its error in absolute terms


def beta_lower(a: Array, b: Array, tail: Array) -> Array:
    """The l with P(B < l) = tail for B ~ Beta(a, b)."""
    return np.asarray(special.betaincinv(a, b, tail))


def beta_upper(a: Array, b: Array, tail: Array) -> Array:
    """The u with P(B > u) = tail for B ~ Beta(a, b); one Newton step gives a small u its relative digits back."""
    a, b, tail = np.broadcast_arrays(a, b, tail)
    u = np.array(special.betainccinv(a, b, tail), dtype=np.float64)
    small = (u > 0) & (u < _SMALL)
    u[small] = _newton_step(a[small], b[small], tail[small], u[small])
    return u


def beta_upper_and_rest(a: Array, b: Array, tail: Array) -> tuple[Array, Array]:
    """The upper quantile u and 1 - u, each with its own relative digits."""
    a, b, tail = np.broadcast_arrays(a, b, tail)
    u = beta_upper(a, b, tail)
    rest, large = np.array(1 - u), u > 0.5
    rest[large] = beta_lower(b[large], a[large], tail[large])
    return u, rest


def _newton_step(a: Array, b: Array, tail: Array, u: Array) -> Array:
    log_density = (a - 1) * np.log(u) + (b - 1) * np.log1p(-u) - special.betaln(a, b)
    return np.asarray(u + (special.betaincc(a, b, u) - tail) / np.exp(log_density))
