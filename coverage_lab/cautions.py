"""The sentences that stand beside a verdict: what the figures rest on, and what they cannot say."""

import math
from collections.abc import Mapping
from typing import Any

import pandas as pd

from coverage_lab.records import Measurements, Plan, Verdict
from coverage_lab.rounding import percent, proportion, whole
from coverage_lab.sentences import CONDITIONAL, OF_SIMULATION, OF_ZERO, of_side

ZERO_UNLIKELY = 5.0  # expected events from which zero is rarer than e^-5
DISAGREEMENT = 1e-3  # cross-check p-values below this are a warning of their own

MANY_CLUSTERS = 30
DROPPED = (
    "The target is the process that produces such units: the stated population is not all that it will produce, and "
    "the finite correction is left out."
)
OF_CLUSTERS = (
    "Clusters are taken as exchangeable, with one intraclass correlation for all (beta-binomial). Where clusters "
    "differ in kind, or the correlation is larger than planned, coverage is lower than stated."
)
CLUSTERS_WITHOUT_CORRECTION = (
    "The finite population does not enter the figures of clustered samples: they are those of a population without end."
)
FEW_CLUSTERS = (
    f"With fewer than {MANY_CLUSTERS} clusters the variance between them is hardly known. Where all clusters show the "
    "same share of events, as with few events they often do, methods with an estimated variance see none: they fall "
    "back on independent units, or give an interval without width."
)
OF_STRATA = "The weights of the strata are taken as known, and the ratios of their odds as planned."
OF_TEST = (
    "The test is taken to err independently from unit to unit, with the same sensitivity and specificity for all: "
    "errors that several units share, as of one instrument, are not covered."
)
ESTIMATED = (
    "Sensitivity and specificity are estimates here: methods that take them as known leave their uncertainty out, and "
    "their figures show what that costs."
)
LOST_ALIKE = (
    "Units are taken to be lost whatever their outcome. If events are lost more or less often than others, the figures "
    "do not hold; rate_events and rate_others in [design.loss] show by how much."
)

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
    found += of_design(plan)
    return (*found, of_side(plan.confidence, plan.alpha, plan.side), *_of_zero(plan), *_of_simulation(plan), *ALWAYS)


def of_design(plan: Plan) -> list[str]:
    """What the design takes for granted."""
    said = plan.document.get("design", {})
    kind, process = said.get("kind", "simple"), plan.study.target == "process"
    found = [DROPPED] if kind in ("finite", "clustered") and process and said.get("population") else []
    if kind == "clustered":
        found += _of_clusters(plan, said)
    if kind == "stratified":
        found.append(OF_STRATA)
    if "classification" in said:
        found += _of_test(plan, said["classification"])
    if "loss" in said:
        found += _of_loss(said["loss"])
    return found


def _of_clusters(plan: Plan, said: Mapping[str, Any]) -> list[str]:
    """Exchangeable clusters of one correlation, perhaps few of them."""
    found = [OF_CLUSTERS]
    if said.get("population") and plan.study.target != "process":
        found.append(CLUSTERS_WITHOUT_CORRECTION)
    if isinstance(said["cluster_size"], list):
        return [*found, FEW_CLUSTERS] if len(said["cluster_size"]) < MANY_CLUSTERS else found
    size = said["cluster_size"]
    for n in plan.sizes:
        clusters = math.ceil(n / size)
        if clusters * size != n:
            found.append(
                f"n = {whole(n)} is filled up to {whole(clusters)} whole clusters, {whole(clusters * size)} units."
            )
    if math.ceil(min(plan.sizes) / size) < MANY_CLUSTERS:
        found.append(FEW_CLUSTERS)
    return found


def _of_test(plan: Plan, said: Mapping[str, Any]) -> list[str]:
    """Errors of the test, and the share of positives that they alone give."""
    floor = 1 - said["specificity"]
    found = [OF_TEST]
    if floor > 0:
        rest = said["sensitivity"] + said["specificity"] - 1
        low, high = (percent(floor + p * rest) for p in (plan.outcome.low, plan.outcome.high))
        found.append(
            f"False positives set a floor: without a single true event {percent(floor)} of the results are positive, "
            f"and over the planned range {low} to {high} are. A method that takes results for truths covers the "
            "apparent proportion, not the true one."
        )
    return [*found, ESTIMATED] if "diseased_tested" in said else found


def _of_loss(said: Mapping[str, Any]) -> list[str]:
    """Whether losses depend on the outcome, and what is done with them."""
    events, others = said.get("rate_events", said.get("rate")), said.get("rate_others", said.get("rate"))
    if events != others:
        return [
            f"Losses depend on the outcome here ({percent(events)} of events, {percent(others)} of the others): what "
            "is left is no fair sample, and no interval method that looks at it alone can repair that."
        ]
    if said.get("treat_as", "excluded") != "excluded":
        return [f"Lost units are counted as {said['treat_as']}: that shifts the proportion, at any n."]
    return [LOST_ALIKE]


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
