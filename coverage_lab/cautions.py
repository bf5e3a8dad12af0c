"""The sentences that stand beside a verdict: what the figures rest on, and what they cannot say."""

import pandas as pd

from coverage_lab.records import Measurements, Plan, Verdict
from coverage_lab.rounding import percent, proportion, whole
from coverage_lab.sentences import CONDITIONAL, OF_SIMULATION, OF_ZERO, of_side

ZERO_UNLIKELY = 5.0  # expected events from which zero is rarer than e^-5
DISAGREEMENT = 1e-3  # cross-check p-values below this are a warning of their own

ALWAYS = (
    CONDITIONAL,
    "Fix the method, the confidence and the side before data are seen, and report that interval whatever it shows.",
    "These results support, and never replace, qualified statistical review and the rules that apply where the study "
    "is done.",
)


def cautions(measured: Measurements, methods: pd.DataFrame, verdict: Verdict) -> tuple[str, ...]:
    """The cautions that this audit calls for, the gravest first."""
    plan = measured.plan
    found = [*_disagreement(measured), *_too_small(plan, verdict), *_outside(plan, methods, verdict)]
    found += [verdict.balance] if verdict.balance else []
    return (*found, of_side(plan.confidence, plan.alpha, plan.side), *_of_zero(plan), *_of_simulation(plan), *ALWAYS)


def _disagreement(measured: Measurements) -> list[str]:
    """The two routes do not agree: nothing else on the page counts."""
    check = measured.cross_check
    if check is None or min(check.p_value, check.chi_square_p) >= DISAGREEMENT:
        return []
    return [
        "The simulated and the enumerated route disagree more than chance allows "
        f"(p = {min(check.p_value, check.chi_square_p):.1g}): do not use this report before the cause is found."
    ]


def _too_small(plan: Plan, verdict: Verdict) -> list[str]:
    """Even the most extreme outcome excludes nothing in the planned range."""
    small = verdict.too_small
    if small is None:
        return []
    near_one = small["limit"] <= plan.outcome.low
    n = whole(verdict.n)
    events, word = (f"{n} events in {n}", "lower") if near_one else ("0 events", "upper")
    needed = f"; n = {whole(small['n_needed'])} would" if small["n_needed"] else ""
    limit = proportion(small["limit"], "down" if near_one else "up")
    return [
        f"n = {n} is too small to learn from: even {events} would give the {word} limit {limit} and exclude "
        f"nothing in the planned range{needed}."
    ]


def _outside(plan: Plan, methods: pd.DataFrame, verdict: Verdict) -> list[str]:
    """What happens when the true proportion is not in the planned range."""
    if verdict.method is None or verdict.holds_on is None:
        return []
    low, high = verdict.holds_on
    row = methods[(methods["n"] == verdict.n) & (methods["method"] == verdict.method)].iloc[0]
    if low <= 0 and high >= 1:
        return [f"The {row['label']} meets the standard at n = {whole(verdict.n)} for every true proportion."]
    claim = f"{percent(plan.outcome.low)} to {percent(plan.outcome.high)}"
    everywhere = row["everywhere_minimum_coverage"]
    worst = f"; over all proportions its coverage can fall to {percent(everywhere, 'down')}" if everywhere > 0 else ""
    return [
        f"The range {claim} is the plan's claim, not a finding. The {row['label']} meets the standard for true "
        f"proportions from {percent(low, 'up')} to {percent(high, 'down')}{worst}."
    ]


def _of_zero(plan: Plan) -> list[str]:
    """Zero events are likely, and not zero risk."""
    return [] if min(plan.sizes) * plan.outcome.low > ZERO_UNLIKELY else [OF_ZERO]


def _of_simulation(plan: Plan) -> list[str]:
    """What a simulated minimum is worth."""
    return [OF_SIMULATION] if "simulated" in plan.simulation.routes else []
