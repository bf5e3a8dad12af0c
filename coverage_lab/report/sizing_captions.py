"""What stands below each figure of a sample size, and what a reader who cannot see it is told: the finding."""

from coverage_lab.report.captions import SCALE, Words
from coverage_lab.report.sizing_figures import found_at
from coverage_lab.report.sizing_folder import SavedSizing
from coverage_lab.report.sizing_words import (
    as_audit,
    at_most,
    capital,
    chance,
    claimed,
    goal,
    half_words,
    name_of,
    risk,
    rule,
)
from coverage_lab.report.words import Document, count, place, planned_range, range_words, share

MARKS = "Open marks: the first n that meets the target; filled ones: the n from which every larger one checked does."


def _held(document: Document, method: str, target: str) -> str:
    """'Wilson score first at n = 270, from n = 286 on'."""
    first, safe = found_at(document, method, target)
    name = capital(name_of(document, method))
    if first is None:
        return f"{name} at no n"
    n = count(first)
    return f"{name} first at n = {n}, {_safe(document, safe)}"


def _safe(document: Document, n: int | None) -> str:
    """'from n = 286 on', or that it does not hold."""
    return f"not for good up to n = {count(document['horizon'])}" if n is None else f"from n = {count(n)} on"


def _all_held(document: Document, target: str) -> str:
    """The methods that may be named, and plus-or-minus."""
    names = dict.fromkeys((*document["verdict"]["prefer"], "wald"))
    known = {row["method"] for row in document["methods"] if row["by"][target] is not None}
    return "; ".join(_held(document, name, target) for name in names if name in known)


def worst_coverage(saved: SavedSizing) -> Words:
    """Worst coverage against n."""
    document = saved.document
    low, high = planned_range(as_audit(document))
    caption = (
        f"Worst interval coverage over true proportions from {range_words(low, high)} at every n, exact at each. "
        f"{MARKS} Dotted: what the standard asks everywhere; the mean over the range, not drawn, has to meet its own "
        f"limit too. {SCALE}"
    )
    return caption, f"The coverage standard is met by: {_all_held(document, 'coverage')}."


def precision(saved: SavedSizing) -> Words:
    """Half-width and assurance against n."""
    document = saved.document
    what, limit = half_words(document), goal(document["targets"]["precision"]["half_width"])
    caption = (
        f"The expected {what} at the worst proportion of the planned range, at every n. {MARKS} Grey: other methods."
    )
    found = f"An expected {what} of at most {limit}: {_all_held(document, 'expected_width')}."
    asked = document["targets"]["precision"]["assurance"]
    if asked is None:
        return caption, found
    below = (
        f" Below: the probability that the {what} is at most {limit} at the expected proportion, which saws as n grows."
    )
    met = f" Probability of at least {share(asked)} that it is at most {limit}: {_all_held(document, 'assurance')}."
    return caption + below, found + met


def operating(saved: SavedSizing) -> Words:
    """Operating characteristics."""
    document = saved.document
    target = document["targets"]["rare"]
    hoped = target["hoped_for"]
    caption = (
        "The probability of seeing no more than the allowed events, for each number allowed and its n, by the true "
        "rate: "
        f"at {place(target['limit'])} it is at most α by design. More events allowed cost units and pay in success"
        f"{' at the hoped-for rate (marks)' if hoped is not None else ''}."
    )
    told = []
    for row in document["rare"]:
        if row["n"] is not None:
            at = row["probability_at_hoped_for"]
            chance_ = "" if at is None else f", {chance(at)} at {place(hoped)}"
            told.append(f"{capital(at_most(row['events']))} in {count(row['n'])} units{chance_}")
    return caption, f"{'; '.join(told)}."


def power(saved: SavedSizing) -> Words:
    """Power and size against n."""
    document = saved.document
    found, target = document["decision"], document["targets"]["decision"]
    caption = (
        f"Power and attained size of the exact test that {claimed(document)}, at every n. {MARKS} Both saw because the "
        "critical count moves in whole events."
    )
    if found["n"] is None:
        return caption, f"No n up to {count(int(saved.decision['n'].max()))} keeps a power of {place(target['power'])}."
    made = rule(found["claim"], found["critical"], found["n"])
    return caption, (
        f"A power of {place(target['power'])} is first reached at n = {count(found['first_n'])} and holds from "
        f"n = {count(found['safe_n'])} on: claimed at {made}, power {chance(found['power'])}, size "
        f"{risk(found['size'])}."
    )
