"""What the page says of the plan and of the simulation."""

from collections.abc import Sequence

from coverage_lab.report.design_words import design_words
from coverage_lab.report.folder import Saved
from coverage_lab.report.protocol import pieces
from coverage_lab.report.words import (
    WIDTHS,
    Document,
    Row,
    count,
    each,
    joined,
    label_of,
    level,
    place,
    planned_range,
    points,
    range_words,
    sizes,
    standard_words,
    weighting,
)
from coverage_lab.sentences import of_side


def plan_rows(document: Document) -> list[tuple[str, list[tuple[str, bool]]]]:
    """The plan as read, in words; blanks are marked."""
    plan = document["plan"]
    study, outcome, drawn = plan.get("study") or {}, plan["outcome"], plan["simulation"]
    low, high = planned_range(document)
    listed = joined(label_of(document, name) for name in document["verdict"]["prefer"])
    rows = [
        ("Outcome", outcome["name"]),
        ("Population", study.get("population") or "[population: to be stated]"),
        ("Unit", study.get("unit") or "[unit: to be stated]"),
        ("Target", study.get("target") or "[target: to be stated]"),
        ("Planned range", f"{range_words(low, high)}, expected {place(outcome['expected'])}"),
        ("Basis of the range", study.get("range_basis") or "[basis: to be stated]"),
        ("Weighting of the range", weighting(document)),
        ("n", joined(count(n) for n in sizes(document))),
        ("Confidence and side", f"{level(document)}; α = {document['alpha']:g}. {beside_alpha(document)}"),
        ("Standard", f"{document['standard']['kind']}: {standard_words(document)}"),
        ("Sampling model", design_words(document)),
        ("Simulation", f"{count(drawn['replicates'])} draws at {each(len(drawn['grid']))}, seed {drawn['seed']}"),
        ("Who may be named", f"{listed}, first choice first"),
    ]
    return [(name, pieces(str(words))) for name, words in rows]


def beside_alpha(document: Document) -> str:
    """What α means for the other kind of interval."""
    return of_side(document["confidence"], document["alpha"], document["side"])


def simulation_parts(saved: Saved) -> list[tuple[str, str]]:
    """The simulation in the usual order: aims, data-generating mechanisms, estimands, methods, performance measures."""
    document = saved.document
    applied = [row for row in document["methods"] if row["n"] == document["verdict"]["n"] and row["applies"]]
    names = joined(row["label"] for row in applied)
    measures = (
        f"Interval coverage, misses on each side, {WIDTHS[document['side']]}, the share of samples whose raw limits"
    )
    return [
        ("Aims", f"Find a method and n for which a {level(document)} delivers {standard_words(document)}."),
        ("Data-generating mechanisms", _mechanisms(saved)),
        (
            "Estimands",
            f"The true proportion with the outcome “{document['plan']['outcome']['name']}”, set in every cell.",
        ),
        ("Methods", f"{len(applied)} interval methods, limits truncated to [0, 1]: {names}."),
        ("Performance measures", f"{measures} leave [0, 1], the share of intervals without width.{_error(applied)}"),
    ]


def _mechanisms(saved: Saved) -> str:
    """How samples arose, by both routes."""
    plan, routes = saved.document["plan"], set(saved.cells["route"])
    drawn, grid = plan["simulation"], sorted(plan["simulation"]["grid"])
    told = []
    if "simulated" in routes:
        n = joined(count(size) for size in sizes(saved.document))
        told.append(
            f"At {each(len(grid))}, {range_words(grid[0], grid[-1])}, and each n ({n}), {count(drawn['replicates'])} "
            f"samples were drawn from the sampling model ({design_words(saved.document)}), seed "
            f"{drawn['seed']}; every method sees the same draws."
        )
    else:
        told.append("No samples were drawn: the plan asks for the enumerated route alone.")
    if "enumerated" in routes:
        told.append("The cells were also enumerated, from the exact probability of every sample.")
    return " ".join(told)


def _error(applied: Sequence[Row]) -> str:
    """The largest Monte Carlo standard error, as a sentence to add."""
    errors = [row["simulated"]["standard_error"] for row in applied if row["simulated"]["standard_error"] is not None]
    if not errors:
        return ""
    return (
        f" The Monte Carlo standard error of a simulated coverage is at most {points(max(errors))}, over all of them."
    )
