"""What a plan may not ask of a sample size, one line each; and what a reader has to be warned of."""

from coverage_lab.checks import expected
from coverage_lab.records import Decision, Plan, Precision, Rare
from coverage_lab.records_sizing import Inflation, Sizing
from coverage_lab.rounding import percent
from coverage_lab.sizing.rare import marked
from coverage_lab.sizing.search import LARGEST_N
from coverage_lab.sizing.words import points

OPEN_SHARE = "a number strictly between 0 and 1"


def faults(plan: Plan, inflation: Inflation) -> list[str]:
    """Every fault of the targets; an empty list when they can be answered."""
    found = []
    if plan.design.kind != "simple":
        found.append(expected('"simple", which is all that is sized so far', plan.design.kind, "design.kind"))
    if plan.horizon is not None and not 1 <= plan.horizon <= LARGEST_N:
        found.append(expected(f"a whole number from 1 to {LARGEST_N}", plan.horizon, "sample.horizon"))
    if plan.precision is not None:
        found += precision_faults(plan.precision)
    if plan.rare is not None:
        found += rare_faults(plan.rare, inflation.population) + _too_many_events(plan)
    if plan.decision is not None:
        found += decision_faults(plan.decision)
    return found + inflation_faults(inflation)


def precision_faults(precision: Precision) -> list[str]:
    """Faults of [precision]."""
    found = []
    if not 0 < precision.half_width < 1:
        found.append(expected(OPEN_SHARE, precision.half_width, "precision.half_width"))
    if precision.assurance is not None and not 0 < precision.assurance < 1:
        more = "; no sample short of the whole population is certain" if precision.assurance == 1 else ""
        found.append(expected(OPEN_SHARE + more, precision.assurance, "precision.assurance"))
    return found


def rare_faults(rare: Rare, population: int | None) -> list[str]:
    """Faults of [rare], alone and against a population."""
    found = []
    if rare.limit is not None and not 0 < rare.limit < 1:
        found.append(expected(OPEN_SHARE, rare.limit, "rare.limit"))
    elif rare.limit is not None and rare.hoped_for is not None and not 0 <= rare.hoped_for < rare.limit:
        found.append(expected(f"a rate below rare.limit = {rare.limit}", rare.hoped_for, "rare.hoped_for"))
    for events in rare.events:
        if events < 0:
            found.append(expected("a whole number of at least 0", events, "rare.events"))
        elif population is not None and rare.limit is not None and 0 < rare.limit < 1:
            found += _cannot_rule_out(events, rare.limit, population)
    return found + _seen_faults(rare, population)


def _cannot_rule_out(events: int, limit: float, population: int) -> list[str]:
    """With so many events allowed even a census could not tell."""
    most = marked(limit, population)
    if events < most:
        return []
    what = f"fewer than {most}, which is {percent(limit)} of the population of {population}"
    return [expected(what, events, "rare.events")]


def _seen_faults(rare: Rare, population: int | None) -> list[str]:
    """Faults of the number of events to be seen."""
    if rare.see_at_least is None:
        return []
    found = []
    if rare.see_at_least < 1:
        found.append(expected("a whole number of at least 1", rare.see_at_least, "rare.see_at_least"))
    if rare.at_rate is None or not 0 < rare.at_rate <= 1:
        found.append(expected("a number above 0 and at most 1", rare.at_rate, "rare.at_rate"))
    elif population is not None and rare.see_at_least > marked(rare.at_rate, population):
        most = marked(rare.at_rate, population)
        what = f"at most {most}, which is {percent(rare.at_rate)} of the population of {population}"
        found.append(expected(what, rare.see_at_least, "rare.see_at_least"))
    if not 0 < rare.with_probability < 1:
        found.append(expected(OPEN_SHARE, rare.with_probability, "rare.with_probability"))
    return found


def _too_many_events(plan: Plan) -> list[str]:
    """As many events allowed as there are trials."""
    if plan.rare is None or not plan.sizes:
        return []
    largest = max(plan.sizes)
    return [expected(f"fewer than sample.n = {largest}", c, "rare.events") for c in plan.rare.events if c >= largest]


def decision_faults(decision: Decision) -> list[str]:
    """Faults of [decision]."""
    found = []
    if not 0 < decision.goal < 1:
        found.append(expected(OPEN_SHARE, decision.goal, "decision.goal"))
    if not 0 <= decision.believed <= 1 or decision.believed == decision.goal:
        what = f"a proportion other than decision.goal = {decision.goal}"
        found.append(expected(what, decision.believed, "decision.believed"))
    if not 0 < decision.alpha < 0.5:
        found.append(expected("a number strictly between 0 and 0.5", decision.alpha, "decision.alpha"))
    elif not decision.alpha < decision.power < 1:
        what = f"a number above decision.alpha = {decision.alpha} and below 1"
        found.append(expected(what, decision.power, "decision.power"))
    return found


def inflation_faults(inflation: Inflation) -> list[str]:
    """Faults of what the sample has to make up for."""
    found = []
    if inflation.population is not None and inflation.population < 1:
        found.append(expected("a whole number of at least 1", inflation.population, "population"))
    if not 0 <= inflation.loss < 1:
        found.append(expected("a share of at least 0 and below 1", inflation.loss, "loss"))
    if not 0 < inflation.design_effect < float("inf"):
        found.append(expected("a number above 0", inflation.design_effect, "design effect"))
    if inflation.cluster_size is not None and inflation.cluster_size < 1:
        found.append(expected("a whole number of at least 1", inflation.cluster_size, "cluster size"))
    return found


def cautions(answer: Sizing, inflation: Inflation, left_out: tuple[str, ...]) -> tuple[str, ...]:
    """What a reader has to know beside the numbers."""
    said = [*_truncated(answer.plan), *_census(answer, inflation.population)]
    for name, found in answer.by_method.items():
        if any(item is not None and "bracketed" in item.checked for item in found.values()):
            said.append(f"{name}: beyond n = {answer.horizon} only the n stated with its answer were looked at.")
    if answer.decision is not None and "bracketed" in answer.decision.found.checked:
        said.append(f"The exact test's n was {answer.decision.found.checked.split('; ')[-1]}.")
    if inflation.population is not None and answer.by_method:
        said.append(
            "Widths and coverage were computed as for an unlimited population; the finite one enters by the usual "
            "correction of n."
        )
    if left_out:
        said.append(
            f"Not scanned, because each of their limits takes a search of its own: {', '.join(left_out)}. "
            'Name them in [methods] "only" to have them scanned.'
        )
    return tuple(said)


def _truncated(plan: Plan) -> list[str]:
    """Where an interval of the wanted half-width would leave [0, 1]."""
    if plan.precision is None or plan.side != "two-sided":
        return []
    d, low, high = plan.precision.half_width, plan.outcome.low, plan.outcome.high
    ends = [(low, "0") for _ in range(1) if low - d < 0] + [(high, "1") for _ in range(1) if high + d > 1]
    return [
        f"Around {percent(p)} an interval of half-width {points(d)} would reach beyond {end}: intervals are cut there, "
        "and the width of what is left counts."
        for p, end in ends
    ]


def _census(answer: Sizing, population: int | None) -> list[str]:
    """Where the answer is the whole population."""
    if population is None:
        return []
    said = []
    if answer.inflated is not None and answer.inflated.census:
        said.append(f"With a population of {population} the answer is a census: every unit is needed.")
    for row in answer.rare.to_dict("records"):
        if row["census"]:
            said.append(f"Allowing {row['events']} events takes a census: all {population} units.")
    if answer.seen is not None and answer.seen.census:
        said.append(f"Seeing {answer.seen.events} events that surely takes a census: all {population} units.")
    return said
