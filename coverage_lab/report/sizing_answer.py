"""The first screen of a sample-size page: the answer, the figures behind it, and why; from the saved document alone."""

from collections.abc import Iterator

from coverage_lab.report.sizing_protocol import rung_words
from coverage_lab.report.sizing_words import (
    assured,
    at_most,
    at_n,
    binding,
    capital,
    chance,
    chief_of,
    claim_at_n,
    claimed,
    events,
    goal,
    half,
    half_words,
    name_of,
    needs_words,
    plain_claim,
    rare_row,
    risk,
    rule,
    seen_words,
    taught,
)
from coverage_lab.report.view import Fact
from coverage_lab.report.words import NOUNS, Document, Row, count, joined, place, share
from coverage_lab.rounding import percent


def notes(document: Document) -> list[str]:
    """Sentences below the figures: why this method, what each target asks for, what plus-or-minus would have done."""
    told = (closest, seen_note, why, needs, taught, plain_claim)
    return [sentence for sentence in (say(document) for say in told) if sentence]


def headline(document: Document) -> str:
    """The answer in one line."""
    verdict, needs_ = document["verdict"], document["verdict"]["needs"]
    if verdict["status"] != "recommended":
        return "No n meets the targets"
    n = f"n = {count(verdict['n'])}"
    if "interval" in needs_:
        return f"{n} with the {name_of(document, verdict['method'])} {NOUNS[document['side']]}"
    if "decision" in needs_ and binding(document) == "decision":
        found = document["decision"]
        return f"{n}: claim at {rule(found['claim'], found['critical'])}"
    row = rare_row(document)
    return f"{n} units" if row is None else f"{n} units, {at_most(row['events'])}"


def closest(document: Document) -> str | None:
    """That the figures are of the closest method when none is named."""
    best = document["verdict"]["best"]
    if best is None:
        return None
    return f"Closest, not recommended: {best['label']} at n = {count(best['n'])}. The figures above are its own."


def needs(document: Document) -> str | None:
    """What each target asks for, as a sentence."""
    words = needs_words(document)
    return f"{capital(words)}; the largest, with what the sample has to make up for, decides." if words else None


def why(document: Document) -> str | None:
    """Why this method: what the others that may be named would ask for."""
    verdict = document["verdict"]
    if "interval" not in verdict["needs"] or verdict["method"] is None:
        return None
    listed = [item for item in verdict["alternatives"] if item["method"] in verdict["prefer"]]
    if not listed:
        return f"{capital(name_of(document, verdict['method']))} is the only method that the plan lets be named."
    others = joined(_other(document, item) for item in listed)
    return (
        "Of the methods that may be named the one with the smallest n is taken; an earlier one on the list wins when "
        f"its n is at most 5 % larger. {capital(others)}."
    )


def _other(document: Document, item: Row) -> str:
    """What another method that may be named asks for."""
    name = name_of(document, item["method"])
    return f"{name} asks for n = {count(item['safe_n'])}" if item["safe_n"] else f"{name} meets the targets at no n"


def seen_note(document: Document) -> str | None:
    """What seeing enough events takes, where it sets n."""
    return seen_words(document) if binding(document) == "seen" else None


def facts(document: Document) -> Iterator[Fact]:
    """The figures behind the answer."""
    verdict, ladder = document["verdict"], document["inflated"]
    if ladder is not None and verdict["units"] != verdict["n"]:
        yield Fact(
            "Units to recruit", count(verdict["units"]), f"n = {count(verdict['n'])}; {'; '.join(rung_words(document))}"
        )
    yield from _interval_facts(document)
    row, target = rare_row(document), document["targets"]["rare"]
    if row is not None and row["probability_at_hoped_for"] is not None:
        name = f"Probability of {at_most(row['events'])} at a true rate of {place(target['hoped_for'])}"
        yield Fact(name, chance(row["probability_at_hoped_for"]), f"in {count(row['n'])} units")
    if row is not None:
        name = f"Upper bound after {events(row['events'])} in {count(row['n'])} units"
        yield Fact(name, place(row["bound"], "up"), f"{percent(document['confidence'])} confidence, one-sided")
    seen = document["seen"]
    if seen is not None:
        name = f"Probability to see at least {events(seen['events'])} at {place(seen['rate'])}"
        yield Fact(name, chance(seen["probability"]), f"in {count(seen['n'])} units")
    if document["decision"] is not None and document["decision"]["n"] is not None:
        yield from _claim_facts(document)


def _interval_facts(document: Document) -> Iterator[Fact]:
    """Coverage and width at the recommended n, or at the closest."""
    row = at_n(document, chief_of(document))
    if row is None:
        return
    entry = next(item for item in document["methods"] if item["method"] == row["method"])
    n = count(row["n"])
    if row["half_width"] is not None:
        note = f"at n = {n}, worst proportion of the planned range; asked: at most {_asked(document)}"
        yield Fact(f"Expected {half_words(document)}", half(row["half_width"]), note)
    if row["assurance"] is not None and document["targets"]["precision"]["assurance"] is not None:
        asked = share(document["targets"]["precision"]["assurance"])
        note = f"at n = {n} and a true proportion of {place(document['outcome']['expected'])}; asked: at least {asked}"
        yield Fact(capital(assured(document)), chance(row["assurance"]), note)
    if row["minimum_coverage"] is not None:
        covers = entry["by"]["coverage"]
        held = f"; the standard holds from n = {count(covers['safe_n'])} on" if covers and covers["safe_n"] else ""
        note = f"at n = {n}; exact minimum, approached at p = {place(row['minimum_at'])}{held}"
        yield Fact("Worst interval coverage", share(row["minimum_coverage"], "down"), note)


def _asked(document: Document) -> str:
    return goal(document["targets"]["precision"]["half_width"])


def _claim_facts(document: Document) -> Iterator[Fact]:
    """The exact test's rule and its chances, at the recommended n."""
    claim, target, here = document["decision"]["claim"], document["targets"]["decision"], claim_at_n(document)
    yield Fact(f"Claim that {claimed(document)} at", rule(claim, here["critical"]), f"of {count(here['n'])}")
    yield Fact(
        "Claimed wrongly, at most", risk(here["size"]), f"attained size; α = {percent(target['alpha'])}, one-sided"
    )
    name = f"Claimed rightly, if the proportion is {place(target['believed'])}"
    yield Fact(name, chance(here["power"]), f"power at n = {count(here['n'])}; asked: {place(target['power'])}")
