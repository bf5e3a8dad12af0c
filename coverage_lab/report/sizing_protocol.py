"""The sample-size text for a protocol, from a saved document (sample-size.json) alone; what is open is marked."""

from collections.abc import Iterator

from coverage_lab.report.chapters import Chapter
from coverage_lab.report.protocol import one_line
from coverage_lab.report.sizing_words import (
    MADE_UP,
    as_audit,
    at_most,
    chance,
    claim_at_n,
    claimed,
    goal,
    half_words,
    looked_at,
    name_of,
    needs_words,
    rare_row,
    risk,
    rule,
    seen_words,
    taught,
)
from coverage_lab.report.words import Document, count, level, place, planned_range, range_words, share, standard_words
from coverage_lab.rounding import percent

LEADS = {"interval": "Interval", "rare": "Rare outcome", "seen": "Events to be seen", "decision": "Claim"}


def chapters(document: Document) -> tuple[Chapter, ...]:
    """The protocol's paragraphs and the cautions."""
    cautions = tuple(("", text) for text in document["cautions"])
    return (
        Chapter("protocol", "Sample size", tuple(protocol_parts(document))),
        Chapter("cautions", "Cautions", cautions, listed=True),
    )


def protocol_title(document: Document) -> str:
    """The heading over them."""
    return f"{one_line(document['title'])}: sample size"


def protocol_parts(document: Document) -> Iterator[tuple[str, str]]:
    """The text as (words that lead in, paragraph)."""
    if document["verdict"]["status"] != "recommended":
        yield "Sample size.", f"[n: to be stated; none was found.] {document['verdict']['sentence']}"
        return
    yield "Sample size.", _size(document)
    told = {"interval": _interval, "rare": _rare, "seen": seen_words, "decision": _claim}
    for name, words in told.items():
        text = words(document) if name in document["verdict"]["needs"] else None
        if text:
            yield f"{LEADS[name]}.", text
    formula = taught(document)
    if formula:
        yield "For comparison.", formula
    yield "Fixed before data.", "n, method, side and what will be claimed were fixed before data were seen."
    yield "Computation.", _computation(document)


def _size(document: Document) -> str:
    """n, who asks for it, and every rung."""
    verdict, ladder = document["verdict"], document["inflated"]
    listed = needs_words(document)
    asked = f": the largest of what the targets ask for ({listed})" if listed else ""
    said = f"n = {count(verdict['n'])}{asked}."
    steps = rung_words(document)
    if not steps:
        return f"{said} No design effect, finite population, loss or cluster was allowed for."
    return f"{said} From n to units: {'; '.join(steps)}. In all {count(ladder['units'])} units will be recruited."


def rung_words(document: Document) -> list[str]:
    """Every rung that was planned or that changes n, with its number."""
    ladder = document["inflated"]
    found, before = [], ladder["base"]
    for name, what in made_up_for(document).items():
        if what or ladder[name] != before:
            found.append(f"{count(ladder[name])} {what or MADE_UP[name]}")
        before = ladder[name]
    return found


def made_up_for(document: Document) -> dict[str, str]:
    """What each rung makes up for, in words; empty where the plan names nothing."""
    design = document["plan"].get("design") or {}
    ladder = document["inflated"]
    effect, population, clusters = design.get("design_effect"), design.get("population"), ladder["whole_clusters"]
    loss = (design.get("loss") or {}).get("rate")
    if (document["plan"].get("study") or {}).get("target") == "process":
        population = None
    return {
        "design_effect": f"for a design effect of {effect:g}" if effect else "",
        "finite": f"in a finite population of {count(population)}" if population else "",
        "loss": f"to make up for {place(loss)} lost" if loss else "",
        "units": f"in {count(clusters)} whole clusters" if clusters else "",
    }


def _interval(document: Document) -> str:
    """Method, precision, coverage, and from which n on."""
    verdict, alike = document["verdict"], as_audit(document)
    low, high = planned_range(alike)
    study = document["plan"].get("study") or {}
    basis = one_line(study["range_basis"]) if study.get("range_basis") else "[basis of the range: to be stated]"
    label = one_line(name_of(document, verdict["method"]))
    n = verdict["needs"]["interval"]
    return (
        f"The proportion with the outcome “{one_line(document['outcome']['name'])}” will be reported with a "
        f"{level(document)} by the method “{label}” ({one_line(verdict['method'])}). Over true proportions from "
        f"{range_words(low, high)} (basis: {basis}) it gives {_gives(document)}. That holds at n = {count(n)} and at "
        f"every larger n that was looked at: {_checked(document)}."
    )


def _gives(document: Document) -> str:
    """What is asked of the interval, target by target."""
    precision, said = document["targets"]["precision"], []
    if precision is not None:
        said.append(f"an expected {half_words(document)} of at most {goal(precision['half_width'])}")
        if precision["assurance"] is not None:
            what = f"the {half_words(document)} is at most {goal(precision['half_width'])}"
            at = f"at a true proportion of {place(document['outcome']['expected'])}"
            said.append(f"a probability of at least {share(precision['assurance'])} that {what}, {at}")
    row = _chosen(document)
    if row is None or row["by"]["coverage"] is not None:
        said.append(standard_words(as_audit(document)))
    return "; ".join(said)


def _chosen(document: Document) -> dict[str, dict[str, dict[str, str] | None]] | None:
    """The recommended method's entry."""
    return next((row for row in document["methods"] if row["method"] == document["verdict"]["method"]), None)


def _checked(document: Document) -> str:
    """Which n were looked at for the recommended method."""
    row = _chosen(document)
    by = row["by"].values() if row is not None else ()
    return "; ".join(dict.fromkeys(looked_at(item["checked"]) for item in by if item is not None))


def _rare(document: Document) -> str | None:
    """What few events will show."""
    row, target = rare_row(document), document["targets"]["rare"]
    if row is None:
        return None
    said = (
        f"With {at_most(row['events'])} in {count(row['n'])} units, a true rate of {place(target['limit'])} or more is "
        f"ruled out at {percent(document['confidence'])} confidence (exact, one-sided): the upper bound is then "
        f"{place(row['bound'], 'up')}."
    )
    if row["probability_at_hoped_for"] is None:
        return said
    return (
        f"{said} At a true rate of {place(target['hoped_for'])} that happens with probability "
        f"{chance(row['probability_at_hoped_for'])}."
    )


def _claim(document: Document) -> str:
    """The decision's rule and its two chances, at the recommended n."""
    found, target, here = document["decision"], document["targets"]["decision"], claim_at_n(document)
    first, safe = found["first_n"], found["safe_n"]
    lucky = (
        f" (it is first reached at n = {count(first)}, but not kept by the next larger ones)" if first != safe else ""
    )
    return (
        f"That {claimed(document)} will be claimed at {rule(found['claim'], here['critical'], here['n'])} (exact "
        f"binomial test, one-sided α = {percent(target['alpha'])}): with probability at most {risk(here['size'])} "
        f"wrongly, and {chance(here['power'])} rightly if it is {place(target['believed'])}. The power asked for, "
        f"{place(target['power'])}, holds from n = {count(safe)} on{lucky}. With another number of units evaluated, "
        "the critical count is that of the exact test at that number."
    )


def _computation(document: Document) -> str:
    made = document["provenance"]
    libraries = ", ".join(f"{name} {version}" for name, version in made["libraries"].items())
    return (
        f"coverage-lab {made['version']} ({libraries}); computed exactly, nothing was simulated; SHA-256 of the plan "
        f"{made['plan_sha256']}."
    )
