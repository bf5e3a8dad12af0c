"""The sentences of a sample-size verdict, made from the records that decided it."""

from collections.abc import Mapping, Sequence
from typing import Any

from coverage_lab.records import Decision, Plan, Rare
from coverage_lab.records_sizing import Decided, Ladder
from coverage_lab.rounding import percent
from coverage_lab.verdict import thresholds

TARGETS = {
    "expected_width": "the expected half-width",
    "assurance": "the assurance",
    "coverage": "the coverage standard",
}
NEEDS = {
    "interval": "the interval",
    "rare": "ruling out the rare outcome",
    "seen": "seeing enough events",
    "decision": "the claim about the goal",
}
RUNGS = {
    "design_effect": "for the design effect",
    "finite": "in the finite population",
    "loss": "to make up for losses",
    "units": "in whole clusters",
}
NEARLY_SURE = 0.9999


def points(value: float) -> str:
    """A difference of proportions: 0.02 -> '2 points', that is percentage points."""
    return f"{100 * value:.4g} points"


def chance(value: float) -> str:
    """A probability, never flattered: '91.7 %', 'over 99.99 %'."""
    return f"over {percent(NEARLY_SURE)}" if value > NEARLY_SURE else percent(value, "down")


def size(n: int, binding: str, needs: Mapping[str, int], ladder: Ladder) -> str:
    """How many, which target asks for it, and every rung that changes it."""
    asks = f", which {NEEDS[binding]} asks for" if len(needs) > 1 else ""
    steps, before = [], n
    for rung in ladder.rungs[1:]:
        if rung.ceiling != before:
            steps.append(f"{rung.ceiling} {RUNGS[rung.name]}")
        before = rung.ceiling
    return f"n = {n} units{asks}{'; then ' if steps else ''}{', '.join(steps)}."


def interval(plan: Plan, label: str, n: int, horizon: int) -> str:
    """What the recommended interval gives from its n on."""
    form = "interval" if plan.side == "two-sided" else f"{plan.side} bound"
    upto = f"and at every larger n up to {horizon}" if n < horizon else "and at the larger n that were looked at"
    goals = interval_goals(plan)
    return f"Report the {label} {form} at {percent(plan.confidence)} confidence. At n = {n} {upto}: {'; '.join(goals)}."


def interval_goals(plan: Plan) -> list[str]:
    """The interval's targets in words."""
    goals = []
    if plan.precision is not None:
        d = points(plan.precision.half_width)
        what = "half-width" if plan.side == "two-sided" else "distance from the true proportion"
        goals.append(f"expected {what} at most {d} at the worst proportion of the planned range")
        if plan.precision.assurance is not None:
            sure, p = percent(plan.precision.assurance), percent(plan.outcome.expected)
            goals.append(f"{what} at most {d} with probability at least {sure} at {p}")
    worst, mean = thresholds(plan)
    at_least, average = percent(1 - worst, "up"), percent(1 - mean, "up")
    return [*goals, f"coverage at least {at_least} everywhere in the range and {average} on average"]


def rare(target: Rare, row: Mapping[str, Any], confidence: float) -> str:
    """What the few events would show, one-sided."""
    events, success = int(row["events"]), row["probability_at_hoped_for"]
    allowed = "no event" if events == 0 else f"at most {events} event{'' if events == 1 else 's'}"
    said = f"With {allowed} in {int(row['n'])} units, a rate of {percent(target.limit or 0.0)} or more is ruled out "
    said += f"at {percent(confidence)} confidence (one-sided)"
    if target.hoped_for is not None and success == success:
        said += f"; at a true rate of {percent(target.hoped_for)} that happens with probability {chance(success)}"
    return said + "."


def decision(target: Decision, found: Decided) -> str:
    """The claim, its rule, and its two chances."""
    more = "or more" if found.claim == "above" else "or fewer"
    wrong, right = percent(found.size or 0.0, "up"), chance(found.power or 0.0)
    return (
        f"Claim that the proportion is {found.claim} {percent(target.goal)} at {found.critical} events {more} in "
        f"{found.n} units (exact test, one-sided): wrongly with probability at most {wrong}, rightly with {right} if "
        f"it is {percent(target.believed)}."
    )


def nothing(lacking: Sequence[str], labels: Sequence[str], horizon: int | None, best: Mapping[str, Any] | None) -> str:
    """Which target no n meets, and the best that was found."""
    if not lacking:
        return "The plan sets no target for n."
    failed = " and ".join(NEEDS[name] for name in lacking)
    upto = f" up to {horizon}" if horizon else ""
    said = f"No n{upto} meets the targets for {failed} there and at every larger n."
    if best is None:
        return said
    figures = [
        f"{words} {shown}"
        for words, shown in (
            ("worst coverage", best["minimum_coverage"] is not None and chance(best["minimum_coverage"])),
            ("expected half-width", best["half_width"] is not None and points(best["half_width"])),
            ("assurance", best["assurance"] is not None and chance(best["assurance"])),
        )
        if shown
    ]
    stated = ", ".join(labels)
    closest = f"closest is {best['label']} at n = {best['n']}: {', '.join(figures)}"
    return f"{said} Of the stated list ({stated}), {closest}."
