"""First n and safe n of every target: an exact scan of every n to the horizon; beyond it a bracket and its neighbourhood.

Coverage, assurance and power saw up and down as n grows, so a halving search would land on a lucky n. Up to 20 000 every
n is looked at. Beyond, a bracket only says where to look; what is then looked at is stated with the answer.
"""

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from coverage_lab.records import Counts, Method, Plan
from coverage_lab.records_sizing import TARGETS, Found
from coverage_lab.sizing.pool import Progress
from coverage_lab.sizing.rows import reach
from coverage_lab.sizing.scan import COVERAGE_COLUMNS, Asked, Scanned, asked, scan, scanned
from coverage_lab.sizing.widths import TIES
from coverage_lab.verdict import thresholds

EXACT_UP_TO = 20_000
SHORTEST_HORIZON = 2_000
BEYOND = 1.5  # the default horizon, times the largest n of the targets
LARGEST_N = 10_000_000
SPREAD = 64  # sizes looked at on the way to the end of what is checked beyond the exact scan
WORK = 2_000_000  # events that a neighbourhood may take
STEPS = 40  # how often a neighbourhood may move on

Flags = NDArray[np.bool_]
Check = Callable[[Counts], Flags]


@dataclass(frozen=True)
class Targets:
    """What a size must reach; None where the plan sets no such target."""

    half_width: float | None
    assurance: float | None
    coverage: tuple[float, float] | None  # largest worst miss rate, largest mean miss rate

    @property
    def names(self) -> tuple[str, ...]:
        """The targets that are set."""
        values = (self.half_width, self.assurance, self.coverage)
        return tuple(name for name, value in zip(TARGETS, values, strict=True) if value is not None)

    def met(self, figures: pd.DataFrame, name: str) -> Flags:
        """Which rows meet the target; a figure that was not computed meets none."""
        if name == "expected_width" and self.half_width is not None:
            return (figures["half_width"] <= self.half_width * (1 + TIES)).to_numpy(dtype=bool)
        if name == "assurance" and self.assurance is not None:
            return (figures["assurance"] >= self.assurance * (1 - TIES)).to_numpy(dtype=bool)
        assert self.coverage is not None
        worst, mean = self.coverage
        return ((figures["worst_miss"] <= worst) & (figures["mean_miss"] <= mean)).to_numpy(dtype=bool)


@dataclass(frozen=True)
class Search:
    """Everything that was looked at: the exact scan's figures, and for each method what was found for each target."""

    horizon: int
    figures: pd.DataFrame
    by_method: dict[str, dict[str, Found | None]]


def targets_of(plan: Plan, coverage: bool) -> Targets:
    """The plan's targets for n of an interval."""
    width = plan.precision.half_width if plan.precision else None
    assurance = plan.precision.assurance if plan.precision else None
    return Targets(width, assurance, thresholds(plan) if coverage else None)


def first_and_safe(n: Counts, met: Flags) -> tuple[int | None, int | None]:
    """The smallest n that meets the target, and the smallest from which every later one on the list does."""
    if not met.any():
        return None, None
    failing = np.flatnonzero(~met)
    safe = 0 if len(failing) == 0 else int(failing[-1]) + 1
    return int(n[np.argmax(met)]), int(n[safe]) if safe < len(n) else None


def search(
    plan: Plan,
    methods: Sequence[Scanned],
    coverage: bool,
    others: int,
    workers: int = 1,
    progress: Progress | None = None,
) -> Search:
    """First and safe n of every method for every target that the plan sets.

    Args:
        methods: what is scanned, coverage included where it is asked for.
        coverage: whether the verdict's standard is a target.
        others: the largest n that rare outcomes and the decision ask for; it extends the default horizon.

    Raises:
        Interrupted: on Ctrl-C, with the n that were finished.
    """
    targets, question = targets_of(plan, coverage), asked(plan)
    listed = [item for item in methods if item.method in plan.prefer]
    horizon = _horizon(plan, question, listed, targets, others)
    figures = scan(question, methods, np.arange(1, horizon + 1), workers, progress)
    if plan.horizon is None:
        longer = _reached(figures, listed, targets, others)
        if longer > horizon:
            more = scan(question, methods, np.arange(horizon + 1, longer + 1), workers, progress)
            figures, horizon = pd.concat([figures, more], ignore_index=True), longer
    by_method = {item.method.name: _exactly(figures, item, targets, horizon) for item in methods}
    _farther(plan, question, listed, targets, horizon, by_method)
    return Search(horizon, figures, by_method)


def _horizon(plan: Plan, question: Asked, listed: Sequence[Scanned], targets: Targets, others: int) -> int:
    """The stated horizon; else 1.5 times where the targets are met, roughly, within 2000 … 20 000."""
    if plan.horizon is not None:
        return min(plan.horizon, EXACT_UP_TO)
    largest = others
    for item in listed:
        for name in set(targets.names) - {"coverage"}:
            found = bracket(_check(question, item, targets, name), 1, LARGEST_N)
            largest = max(largest, found if found is not None and found <= EXACT_UP_TO else 0)
    return default_horizon(largest)


def default_horizon(largest: int) -> int:
    """1.5 times the largest n of the targets, within 2000 … 20 000."""
    return min(max(math.ceil(BEYOND * largest), SHORTEST_HORIZON), EXACT_UP_TO)


def _reached(figures: pd.DataFrame, listed: Sequence[Scanned], targets: Targets, others: int) -> int:
    """The default horizon that follows from the safe n that the scan found for widths."""
    largest = others
    for item in listed:
        mine = figures[figures["method"] == item.method.name]
        for name in set(targets.names) - {"coverage"}:
            safe = first_and_safe(mine["n"].to_numpy(dtype=np.int64), targets.met(mine, name))[1]
            largest = max(largest, safe or 0)
    return default_horizon(largest)


def _exactly(figures: pd.DataFrame, item: Scanned, targets: Targets, horizon: int) -> dict[str, Found | None]:
    """What the exact scan found for one method, target by target."""
    mine = figures[figures["method"] == item.method.name]
    n = mine["n"].to_numpy(dtype=np.int64)
    found: dict[str, Found | None] = dict.fromkeys(TARGETS)
    for name in targets.names:
        if len(n) and (name != "coverage" or item.coverage):
            found[name] = Found(*first_and_safe(n, targets.met(mine, name)), f"every n from 1 to {n[-1]}")
    return found


def _check(question: Asked, item: Scanned, targets: Targets, name: str) -> Check:
    """Whether some n meet one target, computing no more than that takes."""
    columns = {"expected_width": ("half_width",), "assurance": ("assurance",), "coverage": COVERAGE_COLUMNS}[name]
    narrowed = replace(question, columns=columns)
    alone = replace(item, coverage=name == "coverage")

    def check(n: Counts) -> Flags:
        return targets.met(scan(narrowed, [alone], n), name)

    return check


def bracket(check: Check, start: int, top: int) -> int | None:
    """Roughly where the target is met: doubling from `start`, then halving. A place to look, never an answer."""
    high = start
    while not check(np.array([high]))[0]:
        if high == top:
            return None
        high = min(2 * high, top)
    low = max(start - 1, high // 2)
    while high - low > max(1, low // 200):
        middle = (low + high) // 2
        low, high = (low, middle) if check(np.array([middle]))[0] else (middle, high)
    return high


def _farther(
    plan: Plan,
    question: Asked,
    listed: Sequence[Scanned],
    targets: Targets,
    horizon: int,
    by_method: dict[str, dict[str, Found | None]],
) -> None:
    """Beyond the exact scan, when no listed method met every target within it and the plan does not forbid it."""
    top = LARGEST_N if plan.horizon is None else plan.horizon
    if top <= horizon or any(_complete(by_method[item.method.name], targets) for item in listed):
        return
    for item in listed:
        found = by_method[item.method.name]
        if plan.horizon is None and not _only_width_lacks(found):
            continue
        for name in targets.names:
            if (known := found[name]) is not None and known.safe_n is None and item.method.largest_n is None:
                check = _check(question, item, targets, name)
                found[name] = beyond(check, horizon, top, lambda n: _events(question, n)) or known
"""
