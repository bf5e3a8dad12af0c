"""A claim that the proportion lies on one side of a goal: by the exact test, and by every method's own interval.

The claim "above the goal" is made at c events or more, c the smallest with P(X >= c | goal) <= alpha; "below" is its
mirror. Power saws as n grows, because c jumps: the first n that has the power is often a lucky one.
"""

from collections.abc import Sequence
from typing import Literal

import numpy as np
import pandas as pd
from scipy.special import ndtri

from coverage_lab.engine.bounds import evaluate, inapplicable
from coverage_lab.engine.branch import Runs, branch_and_bound
from coverage_lab.engine.minimum import identity
from coverage_lab.probability import at_least, at_most, likely, point
from coverage_lab.records import Array, Counts, Decision, Method, Side
from coverage_lab.records_sizing import Decided, Found
from coverage_lab.sizing.far import Flags, Terrain, first_and_safe, look

TIES = 1e-12
WHOLE_TABLE_UP_TO = 20_000
FLOOR = 1e-18  # outcomes less likely than this under every p that matters are left out above that n

HALVINGS = 25.0  # evaluations that one n takes, for the search beyond the exact scan
METHOD_COLUMNS = ["method", "label", "critical", "worst_size", "power"]


def above(decision: Decision) -> bool:
    """Whether the claim is that the proportion lies above the goal."""
    return decision.believed > decision.goal


def claim(decision: Decision) -> Literal["above", "below"]:
    """The claim in a word."""
    return "above" if above(decision) else "below"


def _side(decision: Decision, method: Method) -> Side:
    """The bound that the claim needs, or the interval for a method that has no bounds."""
    wanted: Side = "lower" if above(decision) else "upper"
    return wanted if wanted in method.sides else "two-sided"


def critical(decision: Decision, n: Counts) -> Counts:
    """The exact test's critical count at each n; n + 1 or -1 where no outcome allows the claim; (n,)."""
    allowed = decision.alpha * (1 + TIES)
    low, high = np.zeros_like(n), n + 1  # the smallest number of steps from the far end that is too many, by halving
    while (open_ := low < high).any():
        middle = (low + high) // 2
        chance = at_least(middle, n, decision.goal) if above(decision) else at_most(n - middle, n, decision.goal)
        good = chance <= allowed
        low, high = np.where(open_ & ~good, middle + 1, low), np.where(open_ & good, middle, high)
    return high if above(decision) else n - high


def chance_of_claim(decision: Decision, count: Counts, n: Counts, p: float) -> Array:
    """P(the exact test makes the claim | p) with these critical counts; (n,)."""
    return at_least(count, n, p) if above(decision) else at_most(count, n, p)


def by_n(decision: Decision, n: Counts) -> pd.DataFrame:
    """The exact test at each n: n, critical, size, power."""
    count = critical(decision, n)
    size = chance_of_claim(decision, count, n, decision.goal)
    power = chance_of_claim(decision, count, n, decision.believed)
    return pd.DataFrame({"n": n, "critical": count, "size": size, "power": power})


def rough_size(decision: Decision) -> int:
    """The normal approximation's n: about where the exact test reaches its power."""
    p, q = decision.goal, decision.believed
    reach = -ndtri(decision.alpha) * np.sqrt(p * (1 - p)) + ndtri(decision.power) * np.sqrt(q * (1 - q))
    return max(1, int(np.ceil((reach / (q - p)) ** 2)))


def decide(decision: Decision, methods: Sequence[Method], horizon: int, top: int) -> Decided:
    """First and safe n of the exact test, and at the safe n the same claim by every method's interval.

    Every n up to the horizon is looked at; beyond it a bracket and its neighbourhood, up to `top`.
    """
    table = by_n(decision, np.arange(1, horizon + 1))
    n = table["n"].to_numpy()
    found = Found(*first_and_safe(n, _enough(decision, table)), f"every n from 1 to {n[-1]} checked")
    if found.safe_n is None and top > n[-1]:
        terrain = Terrain(min(decision.goal, 1 - decision.goal), lambda _: HALVINGS)
        far = look(lambda some: _enough(decision, by_n(decision, some)), int(n[-1]) + 1, top, terrain)
        found = Found(found.first_n or far.first_n, far.safe_n, f"{found.checked}; {far.checked}")
    if found.safe_n is None:
        return Decided(claim(decision), found, None, None, None, None, pd.DataFrame(columns=METHOD_COLUMNS), table)
    here = by_n(decision, np.array([found.safe_n])).iloc[0]
    compared = by_method(decision, methods, found.safe_n)
    figures = int(here["critical"]), float(here["size"]), float(here["power"])
    return Decided(claim(decision), found, found.safe_n, *figures, compared, table)


def _enough(decision: Decision, table: pd.DataFrame) -> Flags:
    """Which rows have the power."""
    return (table["power"] >= decision.power * (1 - TIES)).to_numpy(dtype=bool)


def by_method(decision: Decision, methods: Sequence[Method], n: int) -> pd.DataFrame:
    """The claim made when a method's limit at tail alpha clears the goal: critical, worst_size, power.

    worst_size is the largest chance of the claim over the whole wrong side of the goal. critical is <NA> where no count
    is such that it and all beyond it, and no others, make the claim.
    """
    rows = []
    for method in methods:
        side = _side(decision, method)
        if inapplicable(method, ("events", "trials"), n, side) is None:
            events = _events(decision, n)
            limits = evaluate(method, {"events": events, "trials": np.array([n])}, side, decision.alpha)
            claims = limits.lower >= decision.goal if above(decision) else limits.upper <= decision.goal
            rows.append((method.name, method.label, *_judged(decision, events, claims, n)))
    return pd.DataFrame(rows, columns=METHOD_COLUMNS).astype({"critical": "Int64", "worst_size": float, "power": float})


def _events(decision: Decision, n: int) -> Counts:
    """All outcomes; for very large n those that the goal and the belief can produce."""
    if n <= WHOLE_TABLE_UP_TO:
        return np.arange(n + 1)
    ends = [likely(n, p, FLOOR) for p in (decision.goal, decision.believed)]
    return np.arange(min(first for first, _ in ends), max(last for _, last in ends) + 1)


def _judged(decision: Decision, events: Counts, claims: Flags, n: int) -> tuple[int | None, float, float]:
    """Critical count, worst size and power of a rule that makes the claim at some of the events."""
    order = claims if above(decision) else claims[::-1]
    ranked = events if above(decision) else events[::-1]
    power = float(point(events, n, decision.believed)[claims].sum())
    if (np.diff(order.astype(int)) >= 0).all():
        count = int(ranked[np.argmax(order)]) if order.any() else None
        if count is None:
            return None, 0.0, 0.0
        at, size = np.array([count]), np.array([n])
        return count, float(chance_of_claim(decision, at, size, decision.goal)[0]), power
    return None, _worst_size(decision, events, claims, n), power


def _worst_size(decision: Decision, events: Counts, claims: Flags, n: int) -> float:
    """The largest chance of the claim over the wrong side: 1 less the smallest chance of none, by branch-and-bound."""
    change = np.diff(np.concatenate([[0], (~claims).astype(np.int8), [0]]))
    first, last = events[np.flatnonzero(change == 1)], events[np.flatnonzero(change == -1) - 1]
    if len(first) == 0:
        return 1.0
    nothing = np.zeros(len(first), dtype=np.int64)
    runs = Runs(1, nothing, nothing + n, np.ones(len(first)), first, last)
    ends = (0.0, decision.goal) if above(decision) else (decision.goal, 1.0)
    at_ends = [float(runs.total(runs.chances(np.array([p])))[0]) for p in ends]
    least, _ = branch_and_bound(runs, np.array([ends[0]]), np.array([ends[1]]), identity, min(at_ends))
    return 1.0 - least
