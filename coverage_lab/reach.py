"""How far a verdict carries: the range on which the named method holds, and what zero events would still say."""

import math
from collections.abc import Mapping
from typing import Any

import numpy as np
from scipy.optimize import brentq

from coverage_lab.engine.bounds import evaluate
from coverage_lab.engine.exact import Listed, listed, means_of, restricted
from coverage_lab.engine.means import Range
from coverage_lab.engine.minimum import Segments, segments
from coverage_lab.records import Limits, Method, Plan

WHOLE_UP_TO = 20_000  # up to this n the reach is sought over all of (0, 1), beyond it within a tenfold wider range
LARGEST_N = 10_000_000
PULL_BACK_STEPS = 200


def method_of(plan: Plan, name: str) -> Method:
    """The plan's method of that name."""
    return next(method for method in plan.methods if method.name == name)


def of_counts(plan: Plan, name: str) -> bool:
    """Whether the method needs no more than events and trials."""
    return set(method_of(plan, name).needs) <= {"events", "trials"}


def limits_at(plan: Plan, method: Method, n: int, events: list[int]) -> Limits:
    """The method's limits for a few events counts at n."""
    return evaluate(method, {"events": np.array(events), "trials": np.array([n])}, plan.side, plan.tail)


def bounds_at(plan: Plan, n: int, name: str) -> tuple[Mapping[str, Any], ...]:
    """For one-sided plans the bound at 0, 1, 2 events, or at n, n-1, n-2 for a lower one.

    None for methods that need more than events and trials.
    """
    if plan.side == "two-sided" or not of_counts(plan, name):
        return ()
    events = [k if plan.side == "upper" else n - k for k in range(min(3, n + 1))]
    limits = limits_at(plan, method_of(plan, name), n, events)
    bounds = limits.upper if plan.side == "upper" else limits.lower
    return tuple({"events": k, "bound": float(bound)} for k, bound in zip(events, bounds, strict=True))


def too_small(plan: Plan, n: int, name: str) -> Mapping[str, Any] | None:
    """When even the most extreme outcome excludes nothing in the planned range: that limit, and the n that would.

    The outcome is 0 events, or n events for a range nearer to 1.
    """
    method = method_of(plan, name)
    if not of_counts(plan, name):
        return None
    near_one = plan.side == "lower" or (plan.side == "two-sided" and plan.outcome.low + plan.outcome.high > 1)

    def extreme(size: int) -> float:
        limits = limits_at(plan, method, size, [size if near_one else 0])
        return float(limits.lower[0] if near_one else limits.upper[0])

    def excludes(size: int) -> bool:
        return extreme(size) >= plan.outcome.low if near_one else extreme(size) <= plan.outcome.high

    if excludes(n):
        return None
    enough = n
    while not excludes(enough):
        enough *= 2
        if enough > LARGEST_N or (method.largest_n is not None and enough > method.largest_n):
            return {"limit": extreme(n), "n_needed": None}
    below = enough // 2
    while enough - below > 1:
        middle = (below + enough) // 2
        below, enough = (below, middle) if excludes(middle) else (middle, enough)
    return {"limit": extreme(n), "n_needed": enough}


def holds_on(plan: Plan, n: int, name: str) -> tuple[float, float]:
    """The widest range around the planned one on which the method meets the standard at n.

    Either end moves out until the worst miss breaks the standard; if the mean over the result breaks it, both ends come
    back in proportion until it holds. Where covering sets are not runs the range stops short: what it states is proven.
    """
    low, high = plan.outcome.low, plan.outcome.high
    span = (0.0, 1.0) if n <= WHOLE_UP_TO else (low / 10, min(1.0, high * 10))
    parts = listed(plan.design, [method_of(plan, name)], n, span, plan.side, plan.tail)
    if len(parts) != 1 or parts[0].part.population is not None:
        return low, high
    piece = parts[0].piece(0)
    allowed = plan.standard.worst_miss * plan.alpha
    left = _reach_left(segments([piece], span[0], low), parts[0], allowed) if low > span[0] else low
    right = _reach_right(segments([piece], high, span[1]), parts[0], allowed) if high < span[1] else high
    return _pulled_back(plan, parts, (left, right))


def _reach_left(found: Segments, part: Listed, allowed: float) -> float:
    """The leftmost p to which the miss rate stays within what is allowed, coming from the right."""
    bad = ~found.ordered | (found.miss_left > allowed) | (found.miss_right > allowed)
    if not bad.any():
        return float(found.left[0])
    k = int(np.flatnonzero(bad)[-1])
    if not found.ordered[k] or found.miss_right[k] > allowed:
        return float(found.right[k])
    return _crossing(part, found.left[k], found.right[k], allowed, inside=found.right[k])


def _reach_right(found: Segments, part: Listed, allowed: float) -> float:
    """The rightmost p to which the miss rate stays within what is allowed, coming from the left."""
    bad = ~found.ordered | (found.miss_left > allowed) | (found.miss_right > allowed)
    if not bad.any():
        return float(found.right[-1])
    k = int(np.flatnonzero(bad)[0])
    if not found.ordered[k] or found.miss_left[k] > allowed:
        return float(found.left[k])
    return _crossing(part, found.left[k], found.right[k], allowed, inside=found.left[k])


def _crossing(part: Listed, left: float, right: float, allowed: float, inside: float) -> float:
    """Where, within one segment, the miss rate crosses what is allowed; `inside` is the end that holds."""
    piece = part.piece(0)
    middle = (left + right) / 2
    covers = np.flatnonzero((piece.lower <= middle) & (middle <= piece.upper)) + piece.first

    def excess(p: float) -> float:
        at = np.array([p])
        return float(piece.outside(covers[:1] - 1, covers[-1:] + 1, at)[0]) - allowed

    root = float(brentq(excess, left, right, xtol=1e-15))
    step = math.copysign(1e-12, inside - root)
    return root + step if min(left, right) <= root + step <= max(left, right) else inside


def _pulled_back(plan: Plan, parts: list[Listed], ends: tuple[float, float]) -> tuple[float, float]:
    """The ends, moved back towards the planned range until the mean miss over the range is within the standard."""
    allowed = plan.standard.mean_miss * plan.alpha
    low, high = plan.outcome.low, plan.outcome.high
    for step in range(PULL_BACK_STEPS + 1):
        share = 1 - step / PULL_BACK_STEPS
        left, right = low - share * (low - ends[0]), high + share * (ends[1] - high)
        means = means_of(restricted(parts, left, right), Range(left, right, plan.outcome.prior), plan.side)
        if means["missed_below"][0] + means["missed_above"][0] <= allowed:
            return left, right
    return low, high
