"""From measurements to a recommendation: measure all, name few.

Only a method of the plan's preference list can be named, and only when it meets the standard at n and at n-3 … n+3:
"the shortest of all that pass" would, by the luck of the saw, name methods that no reviewer signs, and change its mind
with n.
"""

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any, Literal

import pandas as pd

from coverage_lab import reach
from coverage_lab.records import Measurements, Plan, Verdict
from coverage_lab.rounding import percent, whole

WIDER = 1.05  # a method gives way to a later one on the list that is this much narrower on average
SIMULATION_MARGIN = 3.0  # standard errors a simulated figure must clear to pass or to fail
ROUNDING = 2.3e-16  # a limit near 1 is off by this much, and coverage moves at most n times as fast as p
MOST_REPLICATES = 100_000_000  # more than these nobody waits for
NEEDS_DRAWS = "samples of this design cannot be listed, so that the simulated route is needed"
LOPSIDED = 1.25  # times the tail: beyond this, misses on one side are said to dominate


Row = Mapping[str, Any]  # one row of the judged methods table
Steady = Mapping[str, Sequence[Row]]  # method -> {n, passes} at each neighbour
Status = Literal["recommended", "none", "undecided"]


@dataclass(frozen=True)
class Judgement:
    """Whether a method meets the standard at one n: True, False, or None when that cannot be said, and why."""

    passes: bool | None
    why: str


def thresholds(plan: Plan) -> tuple[float, float]:
    """The largest worst miss rate and the largest mean miss rate that the standard allows."""
    return plan.standard.worst_miss * plan.alpha, plan.standard.mean_miss * plan.alpha


def meets(plan: Plan, n: int, worst_miss: float, mean_miss: float) -> bool:
    """Whether exact figures meet the standard, but for what the rounding of a limit can do to them."""
    worst, mean = thresholds(plan)
    return bool(worst_miss <= worst + n * ROUNDING and mean_miss <= mean + n * ROUNDING)


def judge(plan: Plan, row: Row) -> Judgement:
    """One row of the methods table against the standard; simulated figures decide only beyond 3 standard errors."""
    if not row["applies"]:
        return Judgement(None, str(row["reason"]))
    if row["worst_miss"] != row["worst_miss"]:
        return Judgement(None, f"not computed; {NEEDS_DRAWS}")
    worst, mean = thresholds(plan)
    exact = row["minimum_is"] != "simulated"
    margin = 0.0 if exact else SIMULATION_MARGIN * row["simulated_standard_error"]
    excess = max(row["worst_miss"] - worst, row["mean_miss"] - mean)
    figures = (
        f"worst miss {percent(row['worst_miss'], 'up')} (at most {percent(worst)} allowed), "
        f"mean miss {percent(row['mean_miss'], 'up')} (at most {percent(mean)} allowed)"
    )
    if excess <= -margin or (exact and meets(plan, row["n"], row["worst_miss"], row["mean_miss"])):
        return Judgement(True, figures)
    if excess > margin:
        return Judgement(False, figures)
    return Judgement(
        None, f"{figures}: within 3 Monte Carlo standard errors of the limit; {_what_it_takes(row, excess, margin)}"
    )


def _what_it_takes(row: Row, excess: float, margin: float) -> str:
    """How many replicates would decide, if the figure stayed where it is: errors shrink with their square root."""
    share = (margin / abs(excess)) ** 2 if excess else math.inf
    needed = row["simulated_replicates"] * share
    if needed > MOST_REPLICATES:
        return f"even {whole(MOST_REPLICATES)} replicates would hardly decide"
    return f"about {whole(math.ceil(needed / 1000) * 1000)} replicates would decide if the figures stayed"


def rows_of(frame: pd.DataFrame) -> list[Row]:
    """The rows of a frame as plain mappings."""
    return [{str(name): value for name, value in row.items()} for row in frame.to_dict("records")]


def judged(measured: Measurements) -> pd.DataFrame:
    """The methods table with `passes` and `why`."""
    judgements = [judge(measured.plan, row) for row in rows_of(measured.methods)]
    passes = pd.Series([item.passes for item in judgements], dtype=object)
    return measured.methods.assign(passes=passes, why=[item.why for item in judgements])


def steadiness(measured: Measurements, n: int) -> Steady:
    """For every method whether it meets the standard at each n-3 … n+3 that was looked at."""
    found: dict[str, list[Row]] = {}
    for row in rows_of(measured.steady[measured.steady["planned"] == n]):
        passes = meets(measured.plan, int(row["n"]), row["worst_miss"], row["mean_miss"])
        found.setdefault(row["method"], []).append({"n": int(row["n"]), "passes": passes})
    return found


def decide(measured: Measurements, methods: pd.DataFrame, n: int) -> Verdict:
    """The verdict for one planned n; `methods` is the judged table."""
    plan = measured.plan
    here = {row["method"]: row for row in rows_of(methods[methods["n"] == n])}
    listed = [method.name for method in plan.prefer if here[method.name]["applies"]]
    steady = steadiness(measured, n)
    holding = [name for name in listed if _holds_up(here, steady, name)]
    named = _first_not_wide(here, holding)
    status: Status = "recommended" if named else _without_name(here, listed)
    row = here[named] if named else None
    return Verdict(
        n=n,
        status=status,
        method=named,
        sentence=_why_named(plan, here, listed, holding, named) if named else _why_not(plan, n, here, listed, status),
        prefer=tuple(method.name for method in plan.prefer),
        steady=tuple(steady.get(named, ())) if named else (),
        alternatives=_alternatives(plan, here, steady, named),
        closest=_closest(here, listed, n) if named is None else None,
        too_small=reach.too_small(plan, n, named) if named else None,
        holds_on=reach.holds_on(plan, n, named)
        if named and row is not None and row["minimum_is"] == "certified"
        else None,
        balance=_balance(plan, row) if row is not None else None,
        bounds_at=reach.bounds_at(plan, n, named) if named else (),
    )


def overall(by_n: Sequence[Verdict]) -> Verdict:
    """The verdict at the smallest n whose recommendation is as precise as the plan asks; else at the smallest with one.

    Without any recommendation, an undecided one, else the last.
    """
    ordered = sorted(by_n, key=lambda item: item.n)
    named = [verdict for verdict in ordered if verdict.status == "recommended"]
    precise = [verdict for verdict in named if verdict.precision is None or verdict.precision["meets"]]
    undecided = [verdict for verdict in ordered if verdict.status == "undecided"]
    return next(iter([*precise, *named, *undecided]), ordered[-1])


def _holds_up(here: Mapping[str, Row], steady: Steady, name: str) -> bool:
    """Meets the standard at n and, where that can be computed exactly, at every neighbour."""
    return here[name]["passes"] is True and all(item["passes"] for item in steady.get(name, ()))


def _first_not_wide(here: Mapping[str, Row], holding: Sequence[str]) -> str | None:
    """The first that is at most 5 % wider on average than every later one."""
    width = {name: here[name]["mean_width"] for name in holding}
    for k, name in enumerate(holding):
        if all(width[name] <= WIDER * width[later] for later in holding[k + 1 :]):
            return name
    return None


def _without_name(here: Mapping[str, Row], listed: Sequence[str]) -> Status:
    """Why nothing is named: undecided while a listed method could still pass."""
    return "undecided" if any(here[name]["passes"] is None for name in listed) else "none"


def _alternatives(
    plan: Plan, here: Mapping[str, Row], steady: Steady, named: str | None
) -> tuple[Mapping[str, Any], ...]:
    """Every other method that meets the standard at n, its relative mean width, and what speaks against it."""
    found = []
    for row in here.values():
        if row["passes"] is not True or row["method"] == named:
            continue
        relative = float(row["mean_width"] / here[named]["mean_width"]) if named else None
        against = _against(plan, steady, row["method"], relative)
        found.append({"method": row["method"], "relative_width": relative, "against": against})
    return tuple(found)


def _against(plan: Plan, steady: Steady, name: str, relative: float | None) -> str:
    """What speaks against naming this method."""
    method = next(method for method in plan.methods if method.name == name)
    points = []
    failing = [str(item["n"]) for item in steady.get(name, ()) if not item["passes"]]
    if failing:
        points.append(f"fails at n = {', '.join(failing)}")
    if name not in [method.name for method in plan.prefer]:
        points.append("not on the preference list")
    elif not failing and relative is not None:
        points.append(f"{percent(relative - 1)} wider on average" if relative > 1 else "later on the preference list")
    if "upper" not in method.sides:
        points.append("two-sided only")
    return "; ".join(points)


def _closest(here: Mapping[str, Row], listed: Sequence[str], n: int) -> Mapping[str, Any] | None:
    """The listed method with the smallest worst miss: closest, not recommended."""
    measured = [here[name] for name in listed if here[name]["worst_miss"] == here[name]["worst_miss"]]
    if not measured:
        return None
    row = min(measured, key=lambda item: float(item["worst_miss"]))
    figures = {name: float(row[name]) for name in ("worst_miss", "minimum_coverage", "minimum_at", "mean_coverage")}
    return {"method": row["method"], "n": n, **figures}


def _balance(plan: Plan, row: Row) -> str | None:
    """A sentence when misses on one side dominate; two-sided intervals only."""
    if plan.side != "two-sided":
        return None
    for name, words in (("missed_below", "too low"), ("missed_above", "too high")):
        if row[name] > LOPSIDED * plan.tail:
            return (
                f"The interval is {words} in {percent(row[name])} of samples on average, against {percent(plan.tail)} "
                "per side if misses were shared evenly; a question with one decisive end calls for a one-sided bound."
            )
    return None


def _why_named(plan: Plan, here: Mapping[str, Row], listed: Sequence[str], holding: Sequence[str], named: str) -> str:
    """The recommendation in words, from the record that decided it."""
    row = here[named]
    return (
        f"At n = {whole(row['n'])}, report the {row['label']} {_form(plan)}: its interval coverage is "
        f"{_lowest(row)} and "
        f"{percent(row['mean_coverage'], 'down')} on average; the standard asks {_standard(plan)}; "
        f"{_place(here, listed, holding, named)}."
    )


def _lowest(row: Row) -> str:
    """The lowest coverage, claimed no further than it was looked for."""
    coverage = percent(row["minimum_coverage"], "down")
    if row["minimum_is"] == "certified":
        return f"at least {coverage} everywhere in the planned range"
    if row["minimum_is"] == "searched":
        return f"{coverage} at the lowest point that a search of the planned range found (not proven)"
    return f"{coverage} at the lowest of the simulated proportions"


def _place(here: Mapping[str, Row], listed: Sequence[str], holding: Sequence[str], named: str) -> str:
    """What the named method is among the listed ones."""
    if len(listed) == 1:
        return "it is the only one on the stated list, and it holds"
    first = f"it is the first of the stated list ({_labels(here, listed)}) that holds"
    if named == holding[0]:
        return first
    wider = here[holding[0]]["mean_width"] / here[named]["mean_width"] - 1
    passed = f"the {here[holding[0]]['label']} holds too, but is {percent(wider)} wider on average"
    return f"{first} and is at most {percent(WIDER - 1)} wider than every later one ({passed})"


def _why_not(plan: Plan, n: int, here: Mapping[str, Row], listed: Sequence[str], status: str) -> str:
    """Why nothing is named, in words."""
    stated = f"stated list ({_labels(here, listed)})"
    if status == "undecided":
        lie = f"simulated figures of the {stated} lie within 3 Monte Carlo standard errors"
        takes = next(here[name]["why"].rpartition("; ")[2] for name in listed if here[name]["passes"] is None)
        return f"Undecided at n = {whole(n)}: {lie} of the standard, {_standard(plan)}; {takes}."
    beside = " and its neighbours" if all(here[name]["minimum_is"] == "certified" for name in listed) else ""
    return f"No method on the {stated} meets the standard at n = {whole(n)}{beside}: {_standard(plan)}."


def _standard(plan: Plan) -> str:
    """The standard in numbers."""
    worst, mean = thresholds(plan)
    least, average = (max(0.0, 1 - miss) for miss in (worst, mean))
    return f"at least {percent(least)} everywhere in the planned range and {percent(average)} on average"


def _labels(here: Mapping[str, Row], listed: Sequence[str]) -> str:
    """The listed methods as people know them."""
    return ", ".join(here[name]["label"] for name in listed)


def _form(plan: Plan) -> str:
    """What is reported: an interval or a bound, with its confidence."""
    level = percent(plan.confidence)
    return f"interval at {level} confidence" if plan.side == "two-sided" else f"{plan.side} bound at {level} confidence"
