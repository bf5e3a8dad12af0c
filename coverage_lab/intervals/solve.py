"""The one vectorised bracketed root finder: Chandrupatla's method on a whole array at once."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import ArrayLike, NDArray

from coverage_lab.records import Array

_EPSILON = float(np.finfo(np.float64).eps)
_ROUNDS = 5000  # halving the widest bracket of doubles to its last bit takes about 2200


def root(
    function: Callable[..., Array], low: ArrayLike, high: ArrayLike, *parameters: ArrayLike, absolute: float = 0.0
) -> Array:
    """Where `function(x, *parameters)` crosses zero between `low` and `high`, element by element.

    T. R. Chandrupatla, "A new hybrid quadratic/bisection algorithm for finding the zero of a nonlinear function",
    Adv. Eng. Softw. 28:145 (1997). Converges to about one ulp of the root, or to `absolute` if that is more; finished
    elements drop out and cost no more evaluations.

    The function receives 1-d arrays; infinite values are allowed. The caller guarantees a change of sign; where
    rounding at an end hides it, the end whose value is nearer to zero is the root.

    Returns:
        array of the common broadcast shape.

    Raises:
        ArithmeticError: the function is not a number somewhere, or a bracket did not close.
    """
    arrays = np.broadcast_arrays(*(np.asarray(value, dtype=np.float64) for value in (low, high, *parameters)))
    b, a, *rest = (array.ravel() for array in arrays)
    fb, fa = _checked(function(b, *rest)), _checked(function(a, *rest))
    found = np.where(np.abs(fa) < np.abs(fb), a, b)
    active = np.flatnonzero(np.sign(fa) * np.sign(fb) < 0)
    state = np.stack((a, b, a, fa, fb, fa))[:, active]
    t = np.full(active.size, 0.5)
    for _ in range(_ROUNDS):
        if active.size == 0:
            return found.reshape(arrays[0].shape)
        x = state[0] + t * (state[1] - state[0])
        state = _narrowed(state, x, _checked(function(x, *(values[active] for values in rest))))
        best, least, done = _progress(state, absolute)
        found[active] = best
        keep = ~done
        active, state = active[keep], state[:, keep]
        t = _next_step(state, least[keep])
    raise ArithmeticError(f"{active.size} brackets did not close in {_ROUNDS} rounds")


def _checked(values: Array) -> Array:
    if np.isnan(values).any():
        raise ArithmeticError("the function of a root is not a number inside its bracket")
    return values


def _narrowed(state: Array, x: Array, fx: Array) -> Array:
    """The state (a, b, c, fa, fb, fc) after the newest point: a is newest, [a, b] brackets, c is the point before."""
    a, b, _, fa, fb, _ = state
    same = np.sign(fx) == np.sign(fa)
    return np.stack((x, np.where(same, b, a), np.where(same, a, b), fx, np.where(same, fb, fa), np.where(same, fa, fb)))


def _progress(state: Array, absolute: float) -> tuple[Array, Array, NDArray[np.bool_]]:
    """Best end so far, the smallest useful step as a share of the bracket, and which brackets are closed."""
    a, b, _, fa, fb, _ = state
    best = np.where(np.abs(fa) < np.abs(fb), a, b)
    tolerance = np.maximum(2 * _EPSILON * np.abs(best), absolute)
    done = (fa == 0) | (2 * tolerance >= np.abs(b - a))
    return best, tolerance / np.where(done, np.inf, np.abs(b - a)), done


def _next_step(state: Array, least: Array) -> Array:
    """Inverse quadratic interpolation where the three points promise it is safe, else bisection."""
    a, b, c, fa, fb, fc = state
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):  # a flat or infinite function bisects
        xi, phi = (a - b) / (c - b), (fa - fb) / (fc - fb)
        safe = (phi * phi < xi) & ((1 - phi) ** 2 < 1 - xi)
        t = fa / (fb - fa) * fc / (fb - fc) + (c - a) / (b - a) * fa / (fc - fa) * fb / (fc - fb)
    return np.where(safe, np.clip(np.where(safe, t, 0.5), least, 1 - least), 0.5)
