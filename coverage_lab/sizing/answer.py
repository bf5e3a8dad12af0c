"""How many? The straight line: check the targets, count for rare outcomes, scan for the interval, decide, recommend."""

from dataclasses import replace

import numpy as np
import pandas as pd
from scipy.special import ndtri

from coverage_lab.checks import InputFault
from coverage_lab.engine.bounds import inapplicable
from coverage_lab.engine.work import Progress
from coverage_lab.intervals import CATALOGUE
from coverage_lab.records import Plan
from coverage_lab.records_sizing import TARGETS, Baseline, Decided, Inflation, Sizing
from coverage_lab.sizing.decision import decide, rough_size
from coverage_lab.sizing.formula import ceiling, margin_of_error, nearest_half
from coverage_lab.sizing.rare import characteristic, rare_table, seen, zero_statement
from coverage_lab.sizing.recommend import Gathered, first_for_all, recommend, safe_for_all
from coverage_lab.sizing.scan import COLUMNS, Scanned, asked, cost, scan, scanned
from coverage_lab.sizing.search import EXACT_UP_TO, LARGEST_N, Search, Targets, default_horizon, search, targets_of
from coverage_lab.sizing.targets import cautions, faults

WALD = "wald"  # always scanned: the taught formula stands and falls with it
DELIVERED_EVENTS = 5_000_000  # a formula's n that brings more outcomes than this is not measured


def size(
    plan: Plan,
    inflation: Inflation | None = None,
    coverage: bool | None = None,
    workers: int = 1,
    progress: Progress | None = None,
) -> Sizing:
    """Choose n for the plan's targets: precision, coverage, rare outcomes, a claim about a goal.

    Args:
        plan: from `read_plan` or `make_plan`; its `sizes` may be empty.
        inflation: what the sample has to make up for. A population also counts for rare outcomes; it is left out when
            the plan's target is the process behind the units.
        coverage: whether the standard is a target for n; by default when the plan sets [precision], or no other target.
        workers: processes for the scan, used when it takes more than a few seconds; they change no digit.
        progress: called with what is being done and the share that is done.

    Raises:
        InputFault: targets that cannot be answered, one line each.
        Interrupted: on Ctrl-C, with what was finished.
    """
    inflation = for_target(plan, inflation or Inflation())
    if found := faults(plan, inflation):
        raise InputFault(*found)
    if coverage is None:
        coverage = plan.precision is not None or (plan.rare is None and plan.decision is None)
    targets = targets_of(plan, coverage)
    methods, left_out = chosen(plan, coverage) if targets.names else ((), ())
    rare = rare_table(plan.rare, plan.confidence, inflation.population)
    events = seen(plan.rare, inflation.population) if plan.rare else None
    others = max([_decision_size(plan), events.n if events else 0, *(int(n) for n in rare["n"].dropna())])
    searched = search(plan, methods, targets, others, workers, progress) if targets.names else None
    horizon = searched.horizon if searched else min(plan.horizon or default_horizon(others), EXACT_UP_TO)
    gathered = Gathered(plan, targets, inflation, searched, rare, events, _decided(plan, horizon))
    return _assembled(gathered, horizon, left_out)


def _assembled(gathered: Gathered, horizon: int, left_out: tuple[str, ...]) -> Sizing:
    """The answers with the recommendation that follows from them."""
    plan, searched, population = gathered.plan, gathered.search, gathered.inflation.population
    verdict, steps = recommend(gathered)
    answer = Sizing(
        plan=plan,
        horizon=horizon if searched or gathered.decision else None,
        by_method=searched.by_method if searched else {},
        methods=_methods(searched, gathered.targets),
        scan=_scan_table(searched),
        rare=gathered.rare,
        characteristic=characteristic(gathered.rare, plan.rare, population),
        formula=baseline(plan, verdict.method),
        zero_events=zero_statement(gathered.rare, plan.confidence, population),
        seen=gathered.seen,
        decision=gathered.decision,
        inflated=steps,
        verdict=verdict,
        cautions=(),
    )
    return replace(answer, cautions=cautions(answer, gathered.inflation, left_out))


def for_target(plan: Plan, inflation: Inflation) -> Inflation:
    """Without the population when the process behind the units is what is studied."""
    return replace(inflation, population=None) if plan.study.target == "process" else inflation


def chosen(plan: Plan, coverage: bool) -> tuple[tuple[Scanned, ...], tuple[str, ...]]:
    """The methods to be scanned, and the names of those left out because each of their limits takes a search.

    Coverage is scanned for the preference list, plus-or-minus and the methods that the plan names in `only`.
    """
    only = (plan.document.get("methods") or {}).get("only") or ()
    named = {method.name for method in plan.prefer} | {WALD} | set(only)
    present = [*plan.methods, *plan.prefer, CATALOGUE[WALD]]
    methods = {method.name: method for method in reversed(present)}
    names = dict.fromkeys(method.name for method in present)
    usable = [methods[name] for name in names if inapplicable(methods[name], plan.design.columns, 1, plan.side) is None]
    items = tuple(scanned(m, coverage and m.name in named) for m in usable if m.name in named or not m.slow)
    return items, tuple(m.name for m in usable if m.slow and m.name not in named)


def baseline(plan: Plan, method: str | None) -> Baseline | None:
    """The taught formula, and what its two n deliver with plus-or-minus and with the recommended method."""
    if plan.precision is None:
        return None
    d, z = plan.precision.half_width, float(-ndtri(plan.tail))
    guess_at = nearest_half(plan.outcome.low, plan.outcome.high)
    worst_case, guess = margin_of_error(0.5, d, z), margin_of_error(guess_at, d, z)
    sizes = ceiling(worst_case), ceiling(guess)
    return Baseline(d, worst_case, guess, guess_at, *sizes, delivers=_delivered(plan, sizes, method))


def _delivered(plan: Plan, sizes: tuple[int, int], method: str | None) -> pd.DataFrame:
    """Coverage, expected half-width and assurance of plus-or-minus and the recommended method at some n."""
    known = {m.name: m for m in (CATALOGUE[WALD], *plan.methods, *plan.prefer)}
    names = [name for name in dict.fromkeys([WALD, method]) if name in known]
    question = replace(asked(plan), columns=COLUMNS)
    n = np.array(sorted({n for n in sizes if cost(question, np.array([n]))[0] <= DELIVERED_EVENTS}), dtype=np.int64)
    items = [scanned(known[name], coverage=True) for name in names if name is not None]
    usable = [item for item in items if inapplicable(item.method, plan.design.columns, 1, plan.side) is None]
    return _shown(scan(question, usable, n)) if len(n) else _shown(pd.DataFrame(columns=["n", "method", *COLUMNS]))


def _decision_size(plan: Plan) -> int:
    """The exact test's n, before the horizon is known; 0 without a decision."""
    if plan.decision is None:
        return 0
    found = _decided(plan, default_horizon(rough_size(plan.decision)))
    return found.n or 0 if found is not None else 0


def _decided(plan: Plan, horizon: int) -> Decided | None:
    """The claim about a goal, every n up to the horizon looked at."""
    if plan.decision is None:
        return None
    return decide(plan.decision, plan.methods, horizon, LARGEST_N if plan.horizon is None else plan.horizon)


def _methods(searched: Search | None, targets: Targets) -> pd.DataFrame:
    """One row a method: first_n and safe_n for all targets at once, and for each target alone."""
    rows = []
    for name, by in (searched.by_method if searched else {}).items():
        row: dict[str, object] = {"method": name, "first_n": None, "safe_n": safe_for_all(by, targets.names)}
        row["first_n"] = first_for_all(searched, name, targets) if searched else None
        for target in TARGETS:
            found = by[target]
            row[f"{target}_first_n"] = found.first_n if found else None
            row[f"{target}_safe_n"] = found.safe_n if found else None
        rows.append(row)
    sizes = [f"{target}_{which}" for target in TARGETS for which in ("first_n", "safe_n")]
    columns = ["method", "first_n", "safe_n", *sizes]
    return pd.DataFrame(rows, columns=columns).astype(dict.fromkeys(columns[1:], "Int64"))


def _scan_table(searched: Search | None) -> pd.DataFrame:
    """The exact scan with coverages for misses."""
    return _shown(searched.figures if searched else pd.DataFrame(columns=["n", "method", *COLUMNS]))


def _shown(figures: pd.DataFrame) -> pd.DataFrame:
    """n, method, minimum_coverage, minimum_at, mean_coverage, half_width, assurance."""
    return pd.DataFrame(
        {
            "n": figures["n"],
            "method": figures["method"],
            "minimum_coverage": 1 - figures["worst_miss"],
            "minimum_at": figures["minimum_at"],
            "mean_coverage": 1 - figures["mean_miss"],
            "half_width": figures["half_width"],
            "assurance": figures["assurance"],
        }
    )
