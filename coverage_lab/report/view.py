"""What the page says, section by section, from the saved files alone."""

import re
from dataclasses import dataclass
from typing import Any

from coverage_lab.plan_text import plan_text
from coverage_lab.report import tables
from coverage_lab.report.folder import Saved
from coverage_lab.report.style import chief, stretched
from coverage_lab.report.words import (
    BLANK,
    NOTHING,
    WIDTHS,
    Document,
    Row,
    count,
    how_sure,
    joined,
    label_of,
    least,
    level,
    place,
    planned_range,
    points,
    protocol_parts,
    range_words,
    row_of,
    share,
    simulation_words,
    sizes,
    standard_words,
    weighting,
)
from coverage_lab.rounding import percent

REFERENCES = (
    "Bradley JV (1978). Robustness? British Journal of Mathematical and Statistical Psychology 31:144–152. "
    "(The criteria behind the default standard.)",
    "Morris TP, White IR, Crowther MJ (2019). Using simulation studies to evaluate statistical methods. Statistics in "
    "Medicine 38:2074–2102. (The order in which the simulation is reported; Monte Carlo standard errors.)",
    "Wang H (2007). Exact confidence coefficients of confidence intervals for a binomial proportion. Statistica Sinica "
    "17:361–368. (Why finitely many points decide the exact minimum.)",
)
SENTENCE = re.compile(r"(?<=[.!?]) (?=[A-Z])")


@dataclass(frozen=True)
class Fact:
    """One figure of the first screen."""

    name: str
    value: str
    note: str


def page_content(saved: Saved) -> dict[str, Any]:
    """Everything the templates print, as plain words and tables."""
    document = saved.document
    verdict = document["verdict"]
    main = row_of(document, chief(document), verdict["n"])
    return {
        "title": document["plan"].get("title") or "Untitled plan",
        "about": _about(document),
        "claimed": percent(document["confidence"]),
        "verdict": verdict,
        "headline": headline(document),
        "facts": facts(document, main) if main is not None else [],
        "notes": notes(document, main),
        "instead": tables.instead(document),
        "rulers": rulers(document),
        "bounds": tables.bounds(document),
        "by_n": tables.by_n(document),
        "brief_cautions": [SENTENCE.split(caution)[0] for caution in document["cautions"]],
        "cautions": document["cautions"],
        "plan_rows": plan_rows(document),
        "plan_text": plan_text(document["plan"]),
        "methods": tables.methods(document),
        "worst_by_n": tables.worst_by_n(document),
        "described": [_described(row) for row in document["methods"] if row["n"] == verdict["n"]],
        "outcomes": tables.outcomes(saved),
        "outcome_words": outcome_words(saved),
        "protocol": [(heading, pieces(text)) for heading, text in protocol_parts(document)],
        "aims": simulation_parts(saved),
        "simulated": tables.simulated(saved),
        "agreement": agreement(document),
        "references": REFERENCES,
        "provenance": document["provenance"],
    }


def _about(document: Document) -> list[str]:
    """The line below the title."""
    low, high = planned_range(document)
    listed = sizes(document)
    n = f"n = {count(listed[0])}" if len(listed) == 1 else f"{len(listed)} sizes, n = {count(listed[0])} to {count(listed[-1])}"
    return [document["plan"]["outcome"]["name"], n, level(document), f"planned range {range_words(low, high)}"]


def headline(document: Document) -> str:
    """The answer in one line."""
    verdict = document["verdict"]
    if verdict["method"] is not None:
        return f"{label_of(document, verdict['method'])}, n = {count(verdict['n'])}"
    if verdict["status"] == "undecided":
        return "Undecided: more simulated draws are needed"
    return "No method on the list meets the standard"


def facts(document: Document, row: Row) -> list[Fact]:
    """The figures behind the answer: how good at worst, how sure, at what price, and on how wide a range."""
    mean = "simulated, over the grid" if row["minimum_is"] == "simulated" else f"exact, {weighting(document)}"
    found = [
        Fact("Worst interval coverage in the planned range", least(row), how_sure(row)),
        Fact("Mean interval coverage", share(row["mean_coverage"], "down"), mean),
        Fact(WIDTHS[document["side"]].capitalize(), points(row["mean_width"]), "percentage points, over the planned range"),
    ]
    holds = document["verdict"]["holds_on"]
    if holds:
        low, high = planned_range(document)
        wide = f"{percent(holds[0], 'up')} to {percent(holds[1], 'down')}"
        found.append(Fact("Standard is met for true proportions from", wide, f"planned: {range_words(low, high)}"))
    return found


def notes(document: Document, row: Row | None) -> list[str]:
    """Sentences below the figures: the simulation, plus-or-minus instead, steadiness, balance, what is too small."""
    verdict = document["verdict"]
    found = [simulation_words(row, document)] if row is not None else []
    found += [_plus_or_minus(document), _steady(verdict), _closest(document), verdict["balance"]]
    return [sentence for sentence in found if sentence]


def _plus_or_minus(document: Document) -> str | None:
    """What plus-or-minus would have done."""
    row = row_of(document, "wald", document["verdict"]["n"])
    if row is None or row["minimum_coverage"] is None or chief(document) == "wald":
        return None
    return (
        f"Plus-or-minus (Wald) would have claimed {percent(document['confidence'])} and delivered {least(row)} at p = "
        f"{place(row['minimum_at'])}, {share(row['mean_coverage'], 'down')} on average."
    )


def _steady(verdict: Row) -> str | None:
    """Whether the verdict survives a few units more or less."""
    if not verdict["steady"]:
        return None
    listed = [item["n"] for item in verdict["steady"]]
    failing = [count(item["n"]) for item in verdict["steady"] if not item["passes"]]
    met = f"not met at n = {joined(failing)}" if failing else "met at each of them too"
    return f"A few units more or less: at n = {count(min(listed))} to {count(max(listed))} the standard is {met}."


def _closest(document: Document) -> str | None:
    """The closest method when none is named."""
    closest = document["verdict"]["closest"]
    if closest is None:
        return None
    return (
        f"Closest, not recommended: {label_of(document, closest['method'])} at n = {count(closest['n'])}, whose worst interval "
        f"coverage is {share(closest['minimum_coverage'], 'down')} (worst miss {share(closest['worst_miss'], 'up')})."
    )


def rulers(document: Document) -> list[dict[str, float]]:
    """For each row of `instead`: where worst, mean and nominal coverage lie on a ruler 0 … 100 long."""
    cells = tables.instead(document).rows
    alpha = document["alpha"]
    lowest = min([row[1].number for row in cells if row[1].number is not None] + [1 - 2 * alpha])
    low, high = (float(stretched(value, alpha)) for value in (lowest, 1.0))

    def at(value: float | None) -> float:
        return round(2 + 96 * (float(stretched(value or 0.0, alpha)) - low) / (high - low), 1)

    return [{"worst": at(row[1].number), "mean": at(row[3].number), "nominal": at(1 - alpha)} for row in cells]


def plan_rows(document: Document) -> list[tuple[str, list[tuple[str, bool]]]]:
    """The plan as read, in words; blanks are marked."""
    plan = document["plan"]
    study, outcome, drawn = plan.get("study") or {}, plan["outcome"], plan["simulation"]
    low, high = planned_range(document)
    grid = drawn["grid"]
    rows = [
        ("Outcome", outcome["name"]),
        ("Population", study.get("population") or "[population: to be stated]"),
        ("Unit", study.get("unit") or "[unit: to be stated]"),
        ("Target", study.get("target") or "[target: to be stated]"),
        ("Planned range", f"{range_words(low, high)}, expected {place(outcome['expected'])}"),
        ("Basis of the range", study.get("range_basis") or "[basis: to be stated]"),
        ("Weighting of the range", weighting(document)),
        ("n", joined(count(n) for n in sizes(document))),
        ("Confidence and side", f"{level(document)}; α = {document['alpha']:g}"),
        ("Standard", f"{document['standard']['kind']}: {standard_words(document)}"),
        ("Sampling model", f"{plan['design']['kind']} random sample"),
        ("Simulation", f"{count(drawn['replicates'])} draws at each of {len(grid)} true proportions, seed {drawn['seed']}"),
        ("Who may be named", f"{joined(label_of(document, name) for name in document['verdict']['prefer'])}, first choice first"),
    ]
    return [(name, pieces(str(words))) for name, words in rows]


def pieces(text: str) -> list[tuple[str, bool]]:
    """The text cut at its marked blanks: (words, whether they are a blank)."""
    found, end = [], 0
    for blank in BLANK.finditer(text):
        found += [(text[end : blank.start()], False), (blank.group(), True)]
        end = blank.end()
    return [(words, marked) for words, marked in [*found, (text[end:], False)] if words]


def _described(row: Row) -> dict[str, str]:
    """A method for those who want to know: formula, ends, faults, source."""
    names = ("label", "method", "family", "formula", "ends", "faults", "source")
    return {"anchor": tables.anchor(row["method"]), **{name: str(row[name] or "") for name in names}}


def outcome_words(saved: Saved) -> str:
    """What the interval table holds, or why there is none."""
    verdict = saved.document["verdict"]
    if verdict["method"] is None:
        return "No method is named, so there is no table of intervals."
    if saved.table.empty:
        return "The named method needs more than the events count, so there is no table of intervals."
    name, n = label_of(saved.document, verdict["method"]), verdict["n"]
    which = f"{name}, {level(saved.document)}, n = {count(n)} and no other n. Limits are rounded outward."
    if len(saved.table) > tables.MOST_ROWS + 1:
        return f"{which} The table has {count(len(saved.table))} rows: too long for a page."
    return which


def simulation_parts(saved: Saved) -> list[tuple[str, str]]:
    """The simulation in the usual order: aims, data-generating mechanisms, estimands, methods, performance measures."""
    document = saved.document
    drawn, routes = document["plan"]["simulation"], set(saved.cells["route"])
    grid, listed = sorted(drawn["grid"]), sizes(document)
    how = " The same cells were also enumerated from the exact probabilities of every sample." if "enumerated" in routes else ""
    literal = (
        f"At each of {len(grid)} true proportions from {range_words(grid[0], grid[-1])} and each n ({joined(map(count, listed))}), "
        f"{count(drawn['replicates'])} samples were drawn from the sampling model ({document['plan']['design']['kind']} random "
        f"sample), seed {drawn['seed']}; every method sees the same draws.{how}"
        if "simulated" in routes
        else f"No samples were drawn: the plan asks for the enumerated route alone.{how}"
    )
    applied = [row for row in document["methods"] if row["n"] == document["verdict"]["n"] and row["applies"]]
    width = WIDTHS[document["side"]]
    errors = [row["simulated"]["standard_error"] for row in applied if row["simulated"]["standard_error"] is not None]
    error = f" The Monte Carlo standard error of a simulated coverage is at most {points(max(errors))} (all methods and cells)." if errors else ""
    return [
        ("Aims", f"Find a method and n for which a {level(document)} delivers {standard_words(document)}."),
        ("Data-generating mechanisms", literal),
        ("Estimands", f"The true proportion with the outcome “{document['plan']['outcome']['name']}”, set in every cell."),
        ("Methods", f"{len(applied)} interval methods, limits truncated to [0, 1]: {joined(row['label'] for row in applied)}."),
        (
            "Performance measures",
            f"Interval coverage, misses on each side, {width}, the share of samples whose raw limits leave [0, 1] and the share "
            f"of intervals without width.{error}",
        ),
    ]


def agreement(document: Document) -> str:
    """What the cross-check found."""
    check = document["cross_check"]
    if check is None:
        return "No cross-check: the plan leaves out one of the two routes."
    if check["largest_z"] is None:
        largest = "a cell whose exact coverage is 0 or 1 disagrees"
    else:
        largest = f"the largest |z| is {check['largest_z']:.2f}"
    return (
        f"Over {count(check['cells'])} cells (n, true proportion, method) {largest}; the chance of one so large if the routes "
        f"agree is p = {_p(check['p_value'])} (Bonferroni). The drawn samples against their exact law: chi-square "
        f"p = {_p(check['chi_square_p'])}."
    )


def _p(value: float | None) -> str:
    """A p-value with two significant digits."""
    return NOTHING if value is None else f"{value:.2g}"
