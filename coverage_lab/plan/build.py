"""A document becomes a `Plan`: checked by the schema and against the catalogues, its defaults filled in."""

from collections.abc import Iterator, Mapping
from pathlib import Path
from typing import Any

from scipy.special import betainc

from coverage_lab import designs
from coverage_lab.checks import InputFault, expected, unknown
from coverage_lab.plan.check import Checked, check, check_head
from coverage_lab.plan.design import Design, design_faults, design_of, sound_design
from coverage_lab.plan.faults import Fault, Source
from coverage_lab.plan.lines import KeyPath, lines_of
from coverage_lab.plan.needs import between_targets, for_any, for_audit
from coverage_lab.plan.overrides import overridden
from coverage_lab.plan.own import Extra, known_methods
from coverage_lab.plan.parts import (
    decision_of,
    named,
    outcome_of,
    precision_of,
    rare_of,
    simulation_of,
    standard_of,
    study_of,
)
from coverage_lab.plan.reading import parsed, plain
from coverage_lab.plan.schema import (
    Head,
    MethodsTable,
    OutcomeTable,
    SampleTable,
    StandardTable,
    Table,
)
from coverage_lab.records import Method, Outcome, Plan, Rare, Side, alpha_of

LEAST_WEIGHT = 1e-6  # the prior's weight of the planned range, relative to the range's width, that means can bear


def read_plan(
    path: str | Path,
    *,
    extra: Extra | None = None,
    overrides: Mapping[str, Any] | None = None,
    audited: bool = False,
) -> Plan:
    """The plan in a TOML file.

    Args:
        path: the file; its name without suffix is the title of a plan that has none.
        extra: methods of your own, as in `make_plan`.
        overrides: as in `make_plan`.
        audited: as in `make_plan`.

    Raises:
        InputFault: one line per fault, with file, line, key, what was expected and what came.
    """
    text, document = parsed(path)
    document, options = overridden(document, overrides or {})
    source = Source(str(path), lines_of(text), options, by_command=overrides is not None)
    return _plan(document, source, Path(path).stem, extra, audited)


def make_plan(
    mapping: Mapping[str, Any],
    extra: Extra | None = None,
    overrides: Mapping[str, Any] | None = None,
    audited: bool = False,
) -> Plan:
    """The plan in a mapping with the plan file's own keys.

    Args:
        mapping: such as {"outcome": {"range": [0.005, 0.05]}, "sample": {"n": 250}}.
        extra: methods of your own, name -> function (events, trials, tail) -> (lower, upper).
        overrides: values of command-line options by the option's name without dashes (`n`: a list); None is no value.
        audited: whether the plan has to say what an audit needs, too: a range or an expected proportion, and n.

    Raises:
        InputFault: one line per fault, with key, what was expected and what came.
    """
    if not isinstance(mapping, Mapping):
        raise InputFault(expected("a mapping with the keys of a plan file", mapping, "plan"))
    document = {key: plain(value) for key, value in mapping.items()}
    document, options = overridden(document, overrides or {})
    return _plan(document, Source(options=options, by_command=overrides is not None), "Untitled plan", extra, audited)


def make_level(overrides: Mapping[str, Any]) -> tuple[float, Side]:
    """Confidence and side for data in hand, from the options of those names.

    Raises:
        InputFault: one line per fault.
    """
    document, options = overridden({}, overrides)
    checked = check_head(document)
    if checked.faults:
        raise InputFault(*(Source(options=options).line(fault) for fault in checked.faults))
    head = checked.get(Head)
    return head.confidence, head.side


def _plan(document: Mapping[str, Any], source: Source, title: str, extra: Extra | None, audited: bool) -> Plan:
    """The plan, or every fault of it in the order of the file."""
    checked = check(document)
    known, own_faults = known_methods(extra or {})
    lacking = [*(for_audit(document) if audited else ()), *for_any(document, checked)]
    found: dict[KeyPath, Fault] = {}
    for fault in (*checked.faults, *lacking, *_beyond_schema(document, checked, known)):
        found.setdefault(fault.path, fault)
    faults = sorted(found.values(), key=source.rank)
    if faults or own_faults:
        raise InputFault(*(source.line(fault) for fault in faults), *own_faults)
    return _built(checked, known, title)


def _beyond_schema(document: Mapping[str, Any], checked: Checked, known: Mapping[str, Method]) -> Iterator[Fault]:
    """Faults that need the catalogues, or two tables at once; each looked for when what it needs is sound."""
    head, design, outcome = checked.find(Head), sound_design(checked), checked.find(OutcomeTable)
    yield from design_faults(checked)
    for key in ("only", "prefer"):
        names = _items(document, "methods", key)
        yield from _method_faults(key, names, None if head is None else head.side, known)
    if design is not None:
        yield from _unanswered(document, design, known)
    yield from _unreachable(_items(document, "methods", "only"), checked.find(SampleTable), known)
    yield from _vacuous(checked.find(StandardTable), head)
    yield from between_targets(checked)
    grid = _items(document, "simulation", "grid")
    if outcome is not None and named(checked) is not None:
        found = outcome_of(checked)
        yield from _prior_faults(found)
        yield from _grid_faults(grid, found)
    elif outcome is not None and grid:
        yield Fault(("simulation", "grid"), "to be left out where no range is planned", grid)


def _items(document: Mapping[str, Any], table: str, key: str) -> list[Any]:
    """A list of the document as it stands, so that one wrong item hides no other."""
    inside = document.get(table)
    items = inside.get(key) if isinstance(inside, Mapping) else None
    return items if isinstance(items, list) else []


def _method_faults(key: str, names: list[Any], side: Side | None, known: Mapping[str, Method]) -> Iterator[Fault]:
    """Names that are no method's, and methods that cannot give what is asked."""
    for k, name in enumerate(names):
        if not isinstance(name, str):
            continue
        if name not in known:
            yield Fault(("methods", key, k), unknown("method", name, known), where=f"[methods] {key}")
        elif side is not None and side not in known[name].sides:
            can = " or ".join(known[name].sides)
            yield Fault(("methods", key, k), f'a method for side = "{side}"; this one is for {can} only', name)


def _unanswered(document: Mapping[str, Any], design: Design, known: Mapping[str, Method]) -> Iterator[Fault]:
    """Methods that may be named and need what the design does not give; or not one to be measured that does not."""
    only = [name for name in _items(document, "methods", "only") if isinstance(name, str) and name in known]
    if only and not any(_answers(known[name], design) for name in only):
        yield Fault(("methods", "only"), "a method that can be computed from what this design gives", only)
    for k, name in enumerate(_items(document, "methods", "prefer")):
        if isinstance(name, str) and name in known and not _answers(known[name], design):
            missing = ", ".join(column for column in known[name].needs if column not in design.columns)
            what = f"a method for this design, which does not give {missing}"
            yield Fault(("methods", "prefer", k), what, name)


def _answers(method: Method, design: Design) -> bool:
    """Whether the design gives what the method needs."""
    return all(column in design.columns for column in method.needs)


def _unreachable(only: list[Any], sample: SampleTable | None, known: Mapping[str, Method]) -> Iterator[Fault]:
    """A size for which not one of the methods to be measured can be computed."""
    reaches = [known[name].largest_n for name in only if isinstance(name, str) and name in known]
    bounded = [reach for reach in reaches if reach is not None]
    if sample is None or not reaches or len(bounded) < len(reaches):
        return
    beyond = [n for n in sample.sizes if n > max(bounded)]
    if beyond:
        what = f"a method that can be computed at n = {beyond[0]}; these go up to n = {max(bounded)}"
        yield Fault(("methods", "only"), what, only)


def _vacuous(standard: StandardTable | None, head: Head | None) -> Iterator[Fault]:
    """A standard of the user's own that no interval could miss."""
    if standard is None or head is None:
        return
    most = 1 / alpha_of(head.confidence)
    for key in ("worst_miss", "mean_miss"):
        factor = getattr(standard, key)
        if factor is not None and factor >= most:
            yield Fault(("standard", key), f"a number below {most:g}, or every interval would pass", factor)


def _prior_faults(outcome: Outcome) -> Iterator[Fault]:
    """A prior that leaves the planned range without weight has no mean over it."""
    low, high, prior = outcome.low, outcome.high, outcome.prior
    weight = float(betainc(*prior, high) - betainc(*prior, low))
    if low < high and not weight >= LEAST_WEIGHT * (high - low):
        what = f"weights that do not vanish over the planned range, {low} to {high}"
        yield Fault(("outcome", "prior"), what, list(prior))


def _grid_faults(grid: list[Any], outcome: Outcome) -> Iterator[Fault]:
    """True proportions to simulate that are not planned for."""
    for k, p in enumerate(grid):
        if isinstance(p, int | float) and not outcome.low <= p <= outcome.high:
            what = f"a proportion within the planned range, {outcome.low} to {outcome.high}"
            yield Fault(("simulation", "grid", k), what, p)


def _built(checked: Checked, known: Mapping[str, Method], title: str) -> Plan:
    """The plan from sound tables."""
    head, asked = checked.get(Head), checked.get(MethodsTable)
    outcome, sample = outcome_of(checked), checked.get(SampleTable)
    simulation = simulation_of(checked, outcome)
    design = design_of(checked)
    only = asked.only or [name for name, method in known.items() if _answers(method, design)]
    prefer = [name for name in asked.prefer or designs.preferred(design, head.side) if name in only] or only
    rare, decision = rare_of(checked), decision_of(checked)
    filled: dict[str, dict[str, Any]] = {
        "": {"title": head.title or title},
        "rare": _rare_filled(rare),
        "decision": {"alpha": decision.alpha} if decision else {},
        "methods": {"prefer": prefer},
    }
    if checked.get(OutcomeTable).stated:
        filled["outcome"] = {"expected": outcome.expected, "range": [outcome.low, outcome.high]}
        filled["simulation"] = {"grid": list(simulation.grid)}
    return Plan(
        title=head.title or title,
        confidence=head.confidence,
        side=head.side,
        study=study_of(checked),
        outcome=outcome,
        sizes=sample.sizes,
        standard=standard_of(checked),
        design=design,
        simulation=simulation,
        methods=tuple(method for name, method in known.items() if name in only),
        prefer=tuple(known[name] for name in prefer),
        document=_document(checked, filled),
        precision=precision_of(checked),
        rare=rare,
        decision=decision,
        horizon=sample.horizon,
    )


def _document(checked: Checked, filled: Mapping[str, Mapping[str, Any]]) -> dict[str, Any]:
    """The plan with the file's own keys and every default filled in; it reads back to the same plan."""
    document: dict[str, Any] = {}
    for name, table in checked.tables.items():
        found = _filled(table, filled.get(name, {}))
        *outer, last = name.split(".")
        around = document
        for part in outer:
            around = around.setdefault(part, {})
        around.update(found if not name else {last: found} if found else {})
    return document


def _filled(table: Table, filled: Mapping[str, Any]) -> dict[str, Any]:
    """What a table says, in the order of the schema."""
    said = {**table.model_dump(), **filled}
    return {key: value for key, value in said.items() if value is not None}


def _rare_filled(rare: Rare | None) -> dict[str, Any]:
    """What was left out of [rare]; nothing for a part of it that is not asked."""
    if rare is None:
        return {}
    ruled_out = {"events": list(rare.events), "hoped_for": rare.hoped_for} if rare.limit is not None else {}
    return ruled_out | ({"with_probability": rare.with_probability} if rare.see_at_least is not None else {})
