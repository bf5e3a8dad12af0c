"""What a sample-size page says, section by section, from the saved files alone."""

from collections.abc import Iterator
from typing import Any

from coverage_lab.plan_text import plan_text
from coverage_lab.report import sizing_tables
from coverage_lab.report.protocol import pieces
from coverage_lab.report.sizing_answer import facts, headline, notes
from coverage_lab.report.sizing_folder import OPTIONAL, SavedSizing
from coverage_lab.report.sizing_protocol import chapters, made_up_for
from coverage_lab.report.sizing_words import (
    as_audit,
    claimed,
    events,
    how_checked,
    looked_at,
    name_of,
    of_claiming,
    of_ruling_out,
    plain_claim,
    seen_words,
    target_heads,
)
from coverage_lab.report.view import REFERENCES as OF_COVERAGE
from coverage_lab.report.view import SENTENCE
from coverage_lab.report.words import (
    Document,
    count,
    joined,
    level,
    place,
    planned_range,
    range_words,
    standard_words,
    weighting,
)
from coverage_lab.rounding import percent
from coverage_lab.sentences import of_side

SECTIONS = {
    "verdict": "Answer",
    "formula": "The taught formula",
    "targets": "Precision and coverage",
    "ladder": "From n to units",
    "rare": "Rare outcomes",
    "claim": "The claim",
    "alternatives": "Alternatives",
    "plan": "Plan",
    "protocol": "Protocol text",
    "cautions": "Cautions",
    "references": "References",
    "provenance": "Provenance",
}
COCHRAN = (
    "Cochran WG (1977). Sampling Techniques, 3rd ed. Wiley. (Section 4.4: the correction for a finite population.)"
)
HANLEY = (
    "Hanley JA, Lippman-Hand A (1983). If nothing goes wrong, is everything all right? Journal of the American Medical "
    "Association 249:1743–1745. (What zero events allow to say.)"
)
CHERNICK = (
    "Chernick MR, Liu CY (2002). The saw-toothed behavior of power versus sample size and software solutions. The "
    "American Statistician 56:149–155. (Why the first n that has the power is often a lucky one.)"
)
CLOPPER = (
    "Clopper CJ, Pearson ES (1934). The use of confidence or fiducial limits illustrated in the case of the binomial. "
    "Biometrika 26:404–413. (The exact one-sided bound and the exact test.)"
)


def page_content(saved: SavedSizing) -> dict[str, Any]:
    """Everything the template prints, as plain words and tables."""
    document = saved.document
    tables = _tables(saved)
    absent = {name for name in ("formula", "targets", "ladder", "rare", "claim", "alternatives") if not tables[name]}
    return {
        "title": document["title"],
        "about": about(document),
        "sections": {name: title for name, title in SECTIONS.items() if name not in absent},
        "verdict": document["verdict"],
        "headline": headline(document),
        "facts": list(facts(document)),
        "notes": notes(document),
        "brief_cautions": [SENTENCE.split(caution)[0] for caution in document["cautions"]],
        "cautions": document["cautions"],
        "tables": tables,
        "targets": list(target_heads(document).values()),
        "checked": how_checked(document) if document["methods"] else [],
        "horizon": None if document["horizon"] is None else count(document["horizon"]),
        "zero_events": document["zero_events"],
        "seen": seen_words(document),
        "one_sided": of_ruling_out(document["confidence"]) if document["rare"] else None,
        "claim_words": list(claim_words(document)),
        "plain_claim": plain_claim(document),
        "plan_rows": [(name, pieces(words)) for name, words in plan_rows(document)],
        "plan_text": plan_text(document["plan"]),
        "chapters": {
            chapter.name: [(lead, pieces(text)) for lead, text in chapter.parts] for chapter in chapters(document)
        },
        "references": list(references(document)),
        "provenance": document["provenance"],
        "files": files(saved),
        "word_file": saved.word_file,
    }


def _tables(saved: SavedSizing) -> dict[str, Any]:
    """The tables by their section; None where the plan does not ask."""
    document = saved.document
    test = sizing_tables.exact_test(saved)
    return {
        "formula": sizing_tables.delivers(document),
        "targets": sizing_tables.targets(document),
        "ladder": sizing_tables.ladder(document),
        "rare": sizing_tables.rare(document) or bool(document["seen"]),
        "claim": test or document["decision"] is not None,
        "test": test,
        "by_method": sizing_tables.by_method(document),
        "alternatives": sizing_tables.alternatives(document),
    }


def about(document: Document) -> list[str]:
    """The line below the title."""
    found = [document["outcome"]["name"]]
    if document["methods"]:
        low, high = planned_range(as_audit(document))
        return [*found, level(document), f"planned range {range_words(low, high)}"]
    return [*found, f"{percent(document['confidence'])} confidence"]


def claim_words(document: Document) -> Iterator[str]:
    """What the two tables of the claim show."""
    found = document["decision"]
    if found is None:
        return
    if found["n"] is None:
        yield f"No n reaches the power for good; looked at: {looked_at(found['checked'])}."
        return
    yield f"Looked at: {looked_at(found['checked'])}."
    if found["first_n"] != found["safe_n"]:
        asked = place(document["targets"]["decision"]["power"])
        yield (
            f"The first n with the power, {count(found['first_n'])}, is a lucky one: the critical count moves in whole "
            f"events, so power falls back below {asked} at larger n. It holds from n = {count(found['safe_n'])} on."
        )
    yield of_claiming(document["targets"]["decision"]["alpha"])


def plan_rows(document: Document) -> Iterator[tuple[str, str]]:
    """The plan as read, in words; what it leaves open is a marked blank."""
    study, alike = document["plan"].get("study") or {}, as_audit(document)
    yield "Outcome", document["outcome"]["name"]
    yield "Population", study.get("population") or "[population: to be stated]"
    yield "Unit", study.get("unit") or "[unit: to be stated]"
    yield "Target", study.get("target") or "[target: to be stated]"
    if document["methods"]:
        low, high = planned_range(alike)
        yield "Planned range", f"{range_words(low, high)}, expected {place(document['outcome']['expected'])}"
        yield "Basis of the range", study.get("range_basis") or "[basis: to be stated]"
        yield "Weighting of the range", weighting(alike)
        side = of_side(document["confidence"], document["alpha"], document["side"])
        yield "Confidence and side", f"{level(document)}; α = {document['alpha']:g}. {side}"
        yield "Standard", f"{document['standard']['kind']}: {standard_words(alike)}"
        listed = joined(name_of(document, name) for name in document["verdict"]["prefer"])
        yield "Who may be named", f"{listed}, first choice first"
    else:
        yield "Confidence", percent(document["confidence"])
    yield from _target_rows(document)
    if document["horizon"] is not None:
        yield "Horizon", f"every larger n was looked at up to {count(document['horizon'])}"


def _target_rows(document: Document) -> Iterator[tuple[str, str]]:
    """The targets and what the sample has to make up for."""
    rare, decision = document["targets"]["rare"], document["targets"]["decision"]
    heads = [words for name, words in target_heads(document).items() if name != "coverage"]
    if heads:
        yield "Precision", "; ".join(heads)
    if rare is not None and rare["limit"] is not None:
        hoped = "" if rare["hoped_for"] is None else f", hoping for {place(rare['hoped_for'])}"
        allowed = joined(count(c) for c in rare["events"])
        yield "To be ruled out", f"{place(rare['limit'])}, with {allowed} events allowed{hoped}; one-sided"
    if rare is not None and rare["see_at_least"] is not None:
        at, sure = place(rare["at_rate"]), place(rare["with_probability"])
        yield "To be seen", f"at least {events(rare['see_at_least'])} at a true rate of {at}, with probability {sure}"
    if decision is not None:
        believed, alpha = place(decision["believed"]), percent(decision["alpha"])
        chances = f"one-sided α = {alpha}, power {place(decision['power'])}"
        yield "Claim", f"{claimed(document)}; believed {believed}, {chances}"
    if document["inflated"] is not None:
        planned = [words for words in made_up_for(document).values() if words]
        yield "To be made up for", "; ".join(planned) or "nothing"


def references(document: Document) -> Iterator[str]:
    """Where the rules come from, for what the plan asks."""
    if document["rare"] or document["decision"]:
        yield CLOPPER
    if document["decision"]:
        yield CHERNICK
    if document["inflated"] and made_up_for(document)["finite"]:
        yield COCHRAN
    if document["zero_events"]:
        yield HANLEY
    if document["methods"]:
        yield from (source for source in OF_COVERAGE if source.startswith(("Bradley", "Wang")))


def files(saved: SavedSizing) -> list[str]:
    """The files beside the page."""
    document = saved.document
    held = {
        "scan.csv": not saved.scan.empty,
        "rare.csv": bool(document["rare"]),
        "characteristic.csv": not saved.characteristic.empty,
        "decision.csv": not saved.decision.empty,
        "protocol.docx": saved.word_file,
    }
    return ["sample-size.json", *(name for name in OPTIONAL if held[name]), "plan.toml", "protocol.md"]
