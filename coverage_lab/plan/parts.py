"""Sound tables become the records of a plan, their defaults filled in. Sums are decimal, as people do them."""

from decimal import Decimal

from coverage_lab.plan.check import Checked
from coverage_lab.plan.schema import Head, OutcomeTable, SimulationTable, StandardTable, StudyTable
from coverage_lab.plan.schema_targets import DecisionTable, PrecisionTable, RareTable
from coverage_lab.records import Decision, Outcome, Precision, Rare, Simulation, Standard, Study, tail_of

GRID_POINTS = 11
STANDARDS = {"bradley": (1.5, 1.1), "guaranteed": (1 + 1e-9, 1 + 1e-9)}


def study_of(checked: Checked) -> Study:
    """[study]."""
    table = checked.get(StudyTable)
    return Study(table.population, table.unit, table.target, table.range_basis)


def standard_of(checked: Checked) -> Standard:
    """[standard], with the numbers of a kind that has a name."""
    table = checked.get(StandardTable)
    worst, mean = STANDARDS.get(table.kind, (table.worst_miss or 0.0, table.mean_miss or 0.0))
    return Standard(table.kind, worst, mean)


def named(checked: Checked) -> float | None:
    """The expected proportion: of [outcome], else what is hoped for, else what is believed; None where none is named.

    Hopes and beliefs of 0 and 1 name no proportion to plan for.
    """
    outcome, rare, decision = checked.find(OutcomeTable), checked.find(RareTable), checked.find(DecisionTable)
    if outcome is not None and outcome.middle is not None:
        return outcome.middle
    others = rare.hoped_for if rare is not None else None, decision.believed if decision is not None else None
    return next((p for p in others if p is not None and 0 < p < 1), None)


def outcome_of(checked: Checked) -> Outcome:
    """[outcome] with the half of (expected, range) that was left out.

    Where no proportion is named, the one that is ruled out, seen or claimed takes its place; no figure rests on it.
    """
    table, p = checked.get(OutcomeTable), named(checked)
    p = p if p is not None else _anyway(checked)
    low, high = table.range if table.range is not None else _around(p)
    first, second = table.prior
    return Outcome(table.name, p, low, high, (first, second))


def _around(p: float) -> tuple[float, float]:
    """From half to double, and the mirror of that above one half."""
    exact = _decimal(p)
    return float(max(exact / 2, 2 * exact - 1)), float(min(2 * exact, (1 + exact) / 2))


def _anyway(checked: Checked) -> float:
    """A proportion that the plan's targets are about."""
    rare, decision = checked.find(RareTable), checked.find(DecisionTable)
    found = (rare.limit, rare.at_rate) if rare is not None else (decision.goal if decision is not None else None,)
    return next((p for p in found if p is not None), 0.5)


def precision_of(checked: Checked) -> Precision | None:
    """[precision], where there is one."""
    table = checked.find(PrecisionTable)
    return Precision(table.half_width or 0.0, table.assurance) if table is not None else None


def rare_of(checked: Checked) -> Rare | None:
    """[rare], where there is one; what is expected stands in for what is hoped for."""
    table, outcome = checked.find(RareTable), checked.get(OutcomeTable)
    if table is None:
        return None
    events = tuple(table.events or (0,)) if table.limit is not None else ()
    hoped_for = table.hoped_for if table.hoped_for is not None or table.limit is None else outcome.middle
    sure = table.with_probability or Rare.with_probability
    return Rare(table.limit, events, hoped_for, table.see_at_least, table.at_rate, sure)


def decision_of(checked: Checked) -> Decision | None:
    """[decision], where there is one; by default with the error probability that the confidence leaves on one side."""
    table, head = checked.find(DecisionTable), checked.get(Head)
    if table is None:
        return None
    alpha = table.alpha if table.alpha is not None else tail_of(head.confidence, head.side)
    return Decision(table.goal or 0.0, table.believed or 0.0, alpha, table.power)


def simulation_of(checked: Checked, outcome: Outcome) -> Simulation:
    """[simulation], by default over evenly spaced proportions of the range."""
    table = checked.get(SimulationTable)
    grid = _spread(outcome.low, outcome.high) if table.grid is None else tuple(table.grid)
    return Simulation(table.replicates, table.seed, grid, tuple(table.routes))


def _spread(low: float, high: float) -> tuple[float, ...]:
    """Evenly spaced proportions, both ends included; 0.0095 and not 0.009500000000000001."""
    start, step = _decimal(low), (_decimal(high) - _decimal(low)) / (GRID_POINTS - 1)
    inner = (float(start + k * step) for k in range(1, GRID_POINTS - 1))
    return tuple(dict.fromkeys([low, *(min(max(p, low), high) for p in inner), high]))


def _decimal(p: float) -> Decimal:
    """The number as it is written."""
    return Decimal(repr(p))
