"""What the page says, section by section, from the saved files alone."""

import re
from dataclasses import dataclass
from typing import Any

from coverage_lab.plan_text import plan_text
from coverage_lab.report import box, tables
from coverage_lab.report.chapters import chapters
from coverage_lab.report.folder import Saved
from coverage_lab.report.protocol import pieces
from coverage_lab.report.style import chief, stretched
from coverage_lab.report.view_study import beside_alpha, plan_rows, simulation_parts
from coverage_lab.report.words import (
    NOUNS,
    WIDTHS,
    Document,
    Row,
    agreement,
    count,
    how_averaged,
    how_sure,
    label_of,
    least,
    level,
    place,
    planned_range,
    points,
    range_words,
    row_of,
    share,
    simulation_words,
    sizes,
    steady_words,
)
from coverage_lab.rounding import percent
from coverage_lab.sentences import OF_SIMULATION

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
        "closest": closest(document),
        "notes": notes(document, main),
        "instead": tables.instead(document),
        "rulers": rulers(document),
        "bounds": tables.bounds(document),
        "by_n": tables.by_n(document),
        "brief_cautions": brief_cautions(document),
        "cautions": document["cautions"],
        "plan_rows": plan_rows(document),
        "plan_text": plan_text(document["plan"]),
        "methods": tables.methods(document),
        "worst_by_n": tables.worst_by_n(document),
        "described": [_described(row) for row in document["methods"] if row["n"] == verdict["n"]],
        "outcomes": tables.outcomes(saved),
        "outcome_words": outcome_words(saved),
        "box": box.answers(saved),
        "serves": box.serves(saved) if verdict["method"] is not None else "",
        "at_zero": box.at_zero(saved),
        "no_box": elsewhere(saved),
        "chapters": {
            chapter.name: [(lead, pieces(text)) for lead, text in chapter.parts]
            for chapter in chapters(document, saved.table)
        },
        "word_file": saved.word_file,
        "aims": simulation_parts(saved),
        "simulated": tables.simulated(saved),
        "agreement": agreement(document),
        "references": REFERENCES,
        "sources": sources(document),
        "provenance": document["provenance"],
    }


def brief_cautions(document: Document) -> list[str]:
    """What stands beside the verdict: first sentences, less those that stand where they belong."""
    placed = (beside_alpha(document), OF_SIMULATION)
    listed = [caution for caution in document["cautions"] if caution not in placed]
    return [SENTENCE.split(caution)[0] for caution in listed]


def _about(document: Document) -> list[str]:
    """The line below the title."""
    low, high = planned_range(document)
    listed = sizes(document)
    n = f"n = {count(listed[0])}"
    if len(listed) > 1:
        n = f"{len(listed)} sizes, {n} to {count(listed[-1])}"
    return [document["plan"]["outcome"]["name"], n, level(document), f"planned range {range_words(low, high)}"]


def headline(document: Document) -> str:
    """The answer in one line."""
    verdict = document["verdict"]
    if verdict["method"] is not None:
        name = label_of(document, verdict["method"])
        return f"{name[:1].upper()}{name[1:]} {NOUNS[document['side']]}, n = {count(verdict['n'])}"
    if verdict["status"] == "undecided":
        return "Undecided: more simulated draws are needed"
    return "No method on the list meets the standard"


def facts(document: Document, row: Row) -> list[Fact]:
    """The figures behind the answer: how good at worst, how sure, at what price, and on how wide a range."""
    mean = how_averaged(document, row)
    width = WIDTHS[document["side"]].capitalize()
    found = [
        Fact("Worst interval coverage in the planned range", least(row), how_sure(row)),
        Fact("Mean interval coverage", share(row["mean_coverage"], "down"), mean),
        Fact(width, points(row["mean_width"]), "percentage points, over the planned range"),
    ]
    holds = document["verdict"]["holds_on"]
    if holds:
        low, high = planned_range(document)
        wide = f"{percent(holds[0], 'up')} to {percent(holds[1], 'down')}"
        found.append(Fact("Standard is met for true proportions from", wide, f"planned: {range_words(low, high)}"))
    return found


def notes(document: Document, row: Row | None) -> list[str]:
    """Sentences below the figures: the simulation, plus-or-minus instead, steadiness."""
    verdict = document["verdict"]
    found = [simulation_words(row, document)] if row is not None else []
    found += [_plus_or_minus(document), steady_words(verdict)]
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


def closest(document: Document) -> str | None:
    """The closest method when none is named."""
    found = document["verdict"]["closest"]
    if found is None:
        return None
    name = label_of(document, found["method"])
    return f"Closest, not recommended: {name} at n = {count(found['n'])}. The figures below are its own."


def rulers(document: Document) -> list[dict[str, float]]:
    """For each row of `instead`: where worst, mean and nominal coverage lie on a ruler 0 … 100 long."""
    cells = tables.instead(document).rows
    alpha = document["alpha"]
    lowest = min([row[1].number for row in cells if row[1].number is not None] + [1 - 2 * alpha])
    low, high = (float(stretched(value, alpha)) for value in (lowest, 1.0))

    def at(value: float | None) -> float:
        return round(2 + 96 * (float(stretched(value or 0.0, alpha)) - low) / (high - low), 1)

    return [{"worst": at(row[1].number), "mean": at(row[3].number), "nominal": at(1 - alpha)} for row in cells]


def sources(document: Document) -> list[str]:
    """Where the methods come from, each source once."""
    cited = [str(row["source"] or "").split("; ") for row in document["methods"]]
    return sorted({source.strip() for listed in cited for source in listed if source.strip()})


def _described(row: Row) -> dict[str, str]:
    """A method for those who want to know: formula, ends, faults, source."""
    names = ("label", "method", "family", "formula", "ends", "faults", "source")
    verdict = tables.passes(row).text
    why = f"{verdict}: {row['why']}" if row["applies"] else f"not applicable: {row['reason'] or 'no reason given'}"
    return {"anchor": tables.anchor(row["method"]), "why": why, **{name: str(row[name] or "") for name in names}}


def outcome_words(saved: Saved) -> str:
    """What the interval table holds, or why there is none."""
    verdict = saved.document["verdict"]
    if verdict["method"] is None:
        return "No method is named, so there is no table of intervals."
    if saved.table.empty:
        return "The named method needs more than the events count, so there is no table of intervals."
    which = f"{box.serves(saved)}. Limits are rounded outward."
    if len(saved.table) <= verdict["n"]:
        which += " Only counts with a probability over 1e-12 somewhere in the planned range are listed."
    if len(saved.table) > tables.MOST_ROWS + 1:
        return f"{which} The table has {count(len(saved.table))} rows, too long to print here: it is in the file."
    return which


def elsewhere(saved: Saved) -> str:
    """Why the page holds no box, and the command that answers instead."""
    if saved.table.empty or len(saved.table) <= box.MOST_ANSWERS:
        return ""
    n = saved.document["verdict"]["n"]
    return f"At n = {count(n)} this page holds no box to read intervals from; the command that answers, in its folder:"
