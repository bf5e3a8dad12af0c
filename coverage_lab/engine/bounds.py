"""From a method's formula to the limits that are used: the one place that picks sides and truncates."""

from collections.abc import Iterable, Sequence

import numpy as np
from numpy.typing import ArrayLike

from coverage_lab.checks import InputFault
from coverage_lab.records import Array, Columns, Limits, Method, Side


def inapplicable(method: Method, columns: Sequence[str], n: int, side: Side) -> str | None:
    """Why the method cannot answer for these columns, this n and this side; None when it can."""
    missing = [name for name in method.needs if name not in columns]
    if missing:
        return f"needs {', '.join(missing)}, which this design does not give"
    if side not in method.sides:
        return "two-sided only" if "two-sided" in method.sides else "one-sided only"
    if method.largest_n is not None and n > method.largest_n:
        return f"computed only up to n = {method.largest_n}"
    return None


def evaluate(method: Method, columns: Columns, side: Side, tail: float) -> Limits:
    """Limits of one method on a list of samples, each array of the samples' length.

    Where nothing was evaluated (`trials` = 0) the interval is [0, 1]. A one-sided bound keeps its own limit at `tail`
    and the end of the scale on the other side.

    Raises:
        InputFault: the method returned another shape, a NaN, or lower > upper; the first offending sample is named.
    """
    trials = np.asarray(columns["trials"])
    size = max(len(values) for values in columns.values())
    empty = np.broadcast_to(trials == 0, (size,))
    needed = dict(columns) if not empty.any() else {**columns, "trials": np.where(trials == 0, 1, trials)}
    returned = method.function(*(needed[name] for name in method.needs), tail)
    lower, upper = _checked(method, returned, columns, size, side)
    if empty.any():
        lower, upper = np.where(empty, 0.0, lower), np.where(empty, 1.0, upper)
    if side == "upper":
        lower = np.zeros(size)
    if side == "lower":
        upper = np.ones(size)
    return Limits(lower, upper, np.clip(lower, 0.0, 1.0), np.clip(upper, 0.0, 1.0))


def _checked(method: Method, returned: object, columns: Columns, size: int, side: Side) -> tuple[Array, Array]:
    """The two arrays that were returned, or a fault that names the first sample they are wrong for."""
    try:
        if not isinstance(returned, Iterable):
            raise TypeError
        lower, upper = (np.broadcast_to(np.asarray(limit, dtype=float), (size,)) for limit in returned)
    except (TypeError, ValueError):
        raise InputFault(
            f"method {method.name!r}: expected (lower, upper), two arrays of length {size}, one value a sample; "
            f"came {_described(returned)}"
        ) from None
    bad = np.isnan(lower) | np.isnan(upper)
    what = "NaN"
    if not bad.any() and side == "two-sided":
        bad, what = lower > upper, "lower > upper"
    if bad.any():
        at = int(np.argmax(bad))
        sample = ", ".join(f"{name} = {_shown(values[at % len(values)])}" for name, values in columns.items())
        raise InputFault(f"method {method.name!r}: {what} at {sample}: ({lower[at]:.6g}, {upper[at]:.6g})")
    return lower, upper


def _shown(value: ArrayLike) -> str:
    """One sample's value of a column: a number, or one for every stratum."""
    return " ".join(f"{number:g}" for number in np.ravel(value))


def _described(returned: object) -> str:
    """What came, for an error line: the kind, and shapes when there are any."""
    if isinstance(returned, tuple | list):
        return "(" + ", ".join(_described(item) for item in returned) + ")"
    shape = getattr(returned, "shape", None)
    return type(returned).__name__ if shape is None else f"an array of shape {shape}"
