"""First n and safe n of every target: an exact scan of every n to the horizon; beyond it a bracketed neighbourhood.

Coverage and assurance saw up and down as n grows, so a halving search would land on a lucky n. Up to 20 000 every n is
looked at. Beyond, what is looked at is stated with the answer.
"""

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
import pandas as pd

from coverage_lab.engine.work import Progress
from coverage_lab.records import Plan
from coverage_lab.records_sizing import TARGETS, Found
from coverage_lab.sizing.far import Check, Flags, Terrain, bracket, first_and_safe, look
from coverage_lab.sizing.scan import COVERAGE_COLUMNS, Scanned, asked, cost, scan
from coverage_lab.sizing.widths import TIES
from coverage_lab.verdict import ROUNDING, thresholds

EXACT_UP_TO = 20_000
SHORTEST_HORIZON = 2_000
MARGIN = 1.5  # the default horizon, times the largest n of the targets
LARGEST_N = 10_000_000
NEEDED = {"expected_width": ("half_width",), "assurance": ("assurance",), "coverage": COVERAGE_COLUMNS}

ByTarget = dict[str, Found | None]


@dataclass(frozen=True)
class Targets:
    """What a size must reach; None where the plan sets no such target."""

    expected_width: float | None
    assurance: float | None
    coverage: tuple[float, float] | None  # largest worst miss rate, largest mean miss rate

    @property
    def names(self) -> tuple[str, ...]:
        """The targets that are set."""
        return tuple(name for name in TARGETS if getattr(self, name) is not None)

    def met(self, figures: pd.DataFrame, name: str) -> Flags:
        """Which rows meet the target; a figure that was not computed meets none."""
        if name == "expected_width" and self.expected_width is not None:
            return (figures["half_width"] <= self.expected_width * (1 + TIES)).to_numpy(dtype=bool)
        if name == "assurance" and self.assurance is not None:
            return (figures["assurance"] >= self.assurance * (1 - TIES)).to_numpy(dtype=bool)
        worst, mean = self.coverage or (0.0, 0.0)
        slack = figures["n"] * ROUNDING
        return ((figures["worst_miss"] <= worst + slack) & (figures["mean_miss"] <= mean + slack)).to_numpy(dtype=bool)


@dataclass(frozen=True)
class Search:
    """Everything that was looked at: the exact scan's figures, and for each method what was found for each target."""

    horizon: int
    figures: pd.DataFrame
    by_method: dict[str, ByTarget]


def targets_of(plan: Plan, coverage: bool) -> Targets:
    """The plan's targets for the n of an interval."""
    width = plan.precision.half_width if plan.precision else None
    assurance = plan.precision.assurance if plan.precision else None
    return Targets(width, assurance, thresholds(plan) if coverage else None)


def default_horizon(largest: int) -> int:
    """1.5 times the largest n of the targets other than coverage, within 2000 … 20 000."""
    return min(max(math.ceil(MARGIN * largest), SHORTEST_HORIZON), EXACT_UP_TO)


def search(
    plan: Plan,
    methods: Sequence[Scanned],
    targets: Targets,
    others: int = 0,
    workers: int = 1,
    progress: Progress | None = None,
) -> Search:
    """First and safe n of every method for every target.

    `others` is the largest n that rare outcomes and the decision ask for; it extends the default horizon.

    Raises:
        Interrupted: on Ctrl-C, with the n that were finished.
    """
    question = asked(plan)
    listed = [item for item in methods if item.method in plan.prefer]
    horizon = _horizon(plan, listed, targets, others)
    figures = scan(question, methods, np.arange(1, horizon + 1), workers, progress)
    if plan.horizon is None and (settled := _settled(figures, listed, targets, others)) != horizon:
        more = scan(question, methods, np.arange(horizon + 1, settled + 1), workers, progress)
        figures, horizon = pd.concat([figures[figures["n"] <= settled], more], ignore_index=True), settled
    by_method = {item.method.name: _exactly(figures, item, targets) for item in methods}
    for item in listed:
        by_method[item.method.name] = _farther(plan, item, targets, horizon, by_method[item.method.name])
    return Search(horizon, figures, by_method)


def _horizon(plan: Plan, listed: Sequence[Scanned], targets: Targets, others: int) -> int:
    """The stated horizon; else the default one from roughly where the listed methods reach the widths."""
    if plan.horizon is not None:
        return min(plan.horizon, EXACT_UP_TO)
    places = [
        bracket(_check(plan, item, targets, name), 1, item.method.largest_n or LARGEST_N)
        for item in listed
        for name in targets.names
        if name != "coverage"
    ]
    return default_horizon(max([others, *(n for n in places if n is not None and n <= EXACT_UP_TO)]))


def _settled(figures: pd.DataFrame, listed: Sequence[Scanned], targets: Targets, others: int) -> int:
    """The default horizon from the safe n that the scan found for the widths."""
    found = [_exactly(figures, item, targets)[name] for item in listed for name in targets.names if name != "coverage"]
    return default_horizon(max([others, *(item.safe_n or 0 for item in found if item is not None)]))


def _exactly(figures: pd.DataFrame, item: Scanned, targets: Targets) -> ByTarget:
    """What the exact scan found for one method, target by target."""
    mine = figures[figures["method"] == item.method.name]
    n = mine["n"].to_numpy(dtype=np.int64)
    found: ByTarget = dict.fromkeys(TARGETS)
    for name in targets.names:
        if len(n) and (name != "coverage" or item.coverage):
            found[name] = Found(*first_and_safe(n, targets.met(mine, name)), f"every n from 1 to {n[-1]} checked")
    return found


def _check(plan: Plan, item: Scanned, targets: Targets, name: str) -> Check:
    """Whether some n meet one target, computing no more than that takes."""
    question = replace(asked(plan), columns=NEEDED[name])
    alone = replace(item, coverage=name == "coverage")
    return lambda n: targets.met(scan(question, [alone], n), name)


def _farther(plan: Plan, item: Scanned, targets: Targets, horizon: int, found: ByTarget) -> ByTarget:
    """Beyond the exact scan: up to the plan's own horizon, or, without one, when a width is not reached within it.

    Targets that the scan did find are looked at again from the n that the others ask for.
    """
    top = LARGEST_N if plan.horizon is None else plan.horizon
    open_ = [name for name in targets.names if (known := found[name]) is not None and known.safe_n is None]
    urgent = open_ if plan.horizon is not None else [name for name in open_ if name != "coverage"]
    if top <= horizon or not urgent or item.method.largest_n is not None:
        return found
    answers = {name: _look(plan, item, targets, name, horizon + 1, top) for name in open_}
    places = [answer.safe_n for answer in answers.values() if answer.safe_n is not None]
    if len(places) == len(open_):
        rest = [name for name in targets.names if found[name] is not None and name not in open_]
        answers |= {name: _look(plan, item, targets, name, max(places), top) for name in rest}
    start = max(places, default=0)
    return {**found, **{name: _together(found[name], answer, start) for name, answer in answers.items()}}


def _look(plan: Plan, item: Scanned, targets: Targets, name: str, start: int, top: int) -> Found:
    """One target beyond the exact scan."""
    question = replace(asked(plan), columns=NEEDED[name])
    p = question.expected if name == "assurance" else min(question.low, 1 - question.high)
    terrain = Terrain(p, lambda n: float(cost(question, np.array([n]))[0]))
    return look(_check(plan, item, targets, name), start, top, terrain)


def _together(known: Found | None, answer: Found, start: int) -> Found:
    """The exact scan and the look beyond it as one; a safe n of the scan stands if the target holds from `start` on."""
    if known is None:
        return answer
    first = answer.first_n if known.first_n is None else known.first_n
    safe = known.safe_n if known.safe_n is not None and answer.safe_n == start else answer.safe_n
    return Found(first, safe, f"{known.checked}; {answer.checked}")
