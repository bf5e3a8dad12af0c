"""Whether a plan says enough: for a sample size, for an audit; and faults between its targets and its other tables."""

from collections.abc import Iterator, Mapping
from typing import Any

from coverage_lab.plan.check import Checked
from coverage_lab.plan.faults import Fault, Source
from coverage_lab.plan.lines import KeyPath
from coverage_lab.plan.parts import named
from coverage_lab.plan.schema import Head, OutcomeTable, SampleTable
from coverage_lab.plan.schema_targets import DecisionTable, RareTable
from coverage_lab.records import Plan, tail_of

SUFFICIENT: tuple[KeyPath, ...] = (
    *(("outcome", "expected"), ("outcome", "range"), ("rare", "limit"), ("rare", "see_at_least")),
    ("decision", "goal"),
)
STATED = "expected the key range or expected"
ONLY_SIZED = ("population", "design_effect", "cluster_size")  # of a simple [design]: what an audit does not simulate
NOT_AUDITED = "to be left out of an audit of a simple random sample; sample-size takes it, or another kind of design"


def audit_faults(plan: Plan) -> tuple[str, ...]:
    """A line for everything that an audit lacks in a plan which is otherwise sound."""
    return tuple(Source().line(fault) for fault in for_audit(plan.document))


def for_audit(document: Mapping[str, Any]) -> Iterator[Fault]:
    """What an audit needs, and what it cannot take."""
    if not any(_has(document, ("outcome", key)) for key in ("range", "expected")):
        yield Fault(("outcome",), f"{STATED}, which an audit needs", where="[outcome]")
    if not any(_has(document, ("sample", key)) for key in ("n", "candidates")):
        yield Fault(("sample",), "expected the key n or candidates, which an audit needs", where="[sample]")
    design = document.get("design")
    given = design if isinstance(design, Mapping) and design.get("kind", "simple") == "simple" else {}
    yield from (Fault(("design", key), NOT_AUDITED, given[key]) for key in ONLY_SIZED if key in given)


def for_any(document: Mapping[str, Any], checked: Checked) -> Iterator[Fault]:
    """What every plan needs, and what a target for the width of an interval needs."""
    if not any(_has(document, path) for path in SUFFICIENT):
        what = f"{STATED}, or [rare] limit, or [decision] goal"
        yield Fault(("outcome",), what, where="[outcome]", instead="--range, --expected, --rule-out or --goal")
    sound = all(name in checked.tables or name not in document for name in ("outcome", "rare", "decision"))
    if "precision" in document and sound and named(checked) is None:
        yield Fault(("outcome",), f"{STATED}, since [precision] is given", where="[outcome]")


def between_targets(checked: Checked) -> Iterator[Fault]:
    """Targets that other tables contradict."""
    rare, outcome, sample = checked.find(RareTable), checked.find(OutcomeTable), checked.find(SampleTable)
    if rare is not None and rare.limit is not None:
        if outcome is not None and rare.hoped_for is None:
            yield from _hopeless(rare.limit, outcome)
        if sample is not None and sample.sizes:
            yield from _too_many(rare.events or [], max(sample.sizes))
    head, decision = checked.find(Head), checked.find(DecisionTable)
    if head is not None and decision is not None and decision.alpha is None:
        yield from _without_alpha(tail_of(head.confidence, head.side), decision.power)


def _hopeless(limit: float, outcome: OutcomeTable) -> Iterator[Fault]:
    """What is expected stands in for what is hoped for, and cannot be ruled out."""
    p = outcome.middle
    if p is not None and p >= limit:
        what = f"a rate above the expected proportion, {p}, or the key hoped_for with a rate below this one"
        yield Fault(("rare", "limit"), what, limit)


def _too_many(events: list[int], largest: int) -> Iterator[Fault]:
    """As many events allowed as there are units."""
    for k, count in enumerate(events):
        if count >= largest:
            yield Fault(("rare", "events", k), f"fewer than the {largest} units of [sample]", count)


def _without_alpha(tail: float, power: float) -> Iterator[Fault]:
    """The plan's own error probability, where no decision could be made by it."""
    if not tail < min(0.5, power):
        what = f"expected the key alpha, since {tail}, which the confidence leaves, is not below 0.5 and the power"
        yield Fault(("decision",), what, where="[decision]", instead="--alpha")


def _has(document: Mapping[str, Any], path: KeyPath) -> bool:
    """Whether a key is there, whatever it says; a table that is none is a fault of its own."""
    inside: Any = document
    for name in path:
        if not isinstance(inside, Mapping):
            return True
        if name not in inside:
            return False
        inside = inside[name]
    return True
