"""The phrases of a sample-size report, from a saved document (sample-size.json) alone."""

from collections import Counter
from collections.abc import Iterator
from typing import Any

from coverage_lab.records import tail_of
from coverage_lab.report.words import Document, Row, count, joined, place, points_places, share, standard_words
from coverage_lab.rounding import percent, rounded
from coverage_lab.sentences import CONDITIONAL, OF_ZERO, of_side

WALD = "wald"
PLUS_OR_MINUS = "plus-or-minus (Wald)"
NEARLY_SURE = 0.9999
NEARLY_NEVER = 0.0001

HALVES = {
    "two-sided": "half-width",
    "upper": "distance of the bound from the true proportion",
    "lower": "distance of the bound from the true proportion",
}
NEEDS = {
    "interval": "the interval",
    "rare": "ruling out the rare outcome",
    "seen": "seeing enough events",
    "decision": "the claim about the goal",
}
RUNGS = {
    "base": "As calculated",
    "design_effect": "Design effect",
    "finite": "Finite population",
    "loss": "Losses",
    "units": "Units to recruit",
}
MADE_UP = {
    "design_effect": "for the design effect",
    "finite": "in the finite population",
    "loss": "to make up for losses",
    "units": "in whole clusters",
}

FIXED = (
    "Fix n, the method, the side and what will be claimed before data are seen. The number evaluated is seldom exactly "
    "the number planned; therefore the n from which every larger one holds is recommended, not the first."
)
QUALIFIED = (
    "These sizes support, and never replace, qualified statistical review and the rules that apply where the study is "
    "done."
)
OF_THE_MODEL = (
    "Every figure is conditional on the sampling model, in which each unit is an event independently of the others. "
    "None says anything about bias: who was not reached, what was misclassified, what was lost."
)
OF_CORRELATION = (
    "Chances of ruling out and of claiming are those of n independent units. The design effect and whole clusters only "
    "change how many units are taken: analyse such a sample by a method made for it."
)


OF_FINITE_CLAIMS = (
    "The claim's chances are those of an unlimited population; the finite one enters by the usual correction of n."
)


def as_audit(document: Document) -> dict[str, Any]:
    """The document with the keys of an audit's that phrases and looks of figures are made from; its only n is 0."""
    verdict = document["verdict"]
    brief = {"n": 0, "method": verdict["method"], "closest": verdict["best"]}
    brief |= {"prefer": verdict["prefer"], "alternatives": verdict["alternatives"]}
    judged = document["decision"]["by_method"] if document["decision"] else []
    families = document["families"]
    names = dict.fromkeys(str(row["method"]) for row in (*document["methods"], *judged))
    rows = [
        {"method": name, "n": 0, "label": name_of(document, name), "applies": True, "family": families.get(name, "")}
        for name in names
    ]
    plan = {**document["plan"], "outcome": document["outcome"]}
    return {**document, "plan": plan, "verdict": brief, "by_n": [brief], "methods": rows}


def name_of(document: Document, method: str) -> str:
    """A method's name for people."""
    return str(document["labels"].get(method, PLUS_OR_MINUS if method == WALD else method))


def capital(words: str) -> str:
    """The words as they begin a heading."""
    return f"{words[:1].upper()}{words[1:]}"


def half(value: float) -> str:
    """An expected half-width in percentage points, three significant digits, rounded up: never flattered."""
    places = points_places(value)
    return f"{rounded(100 * value, places, 'up'):f} points"


def goal(value: float) -> str:
    """A half-width as it was asked for: 0.02 -> '2 points'."""
    return f"{100 * value:.6g} points"


def chance(value: float) -> str:
    """A probability that one wants large, never flattered: '91.7 %', 'over 99.99 %'."""
    return f"over {percent(NEARLY_SURE)}" if value > NEARLY_SURE else share(value, "down")


def risk(value: float) -> str:
    """A probability that one wants small, never flattered: '2.4 %', 'under 0.01 %'."""
    return f"under {percent(NEARLY_NEVER)}" if 0 < value < NEARLY_NEVER else share(value, "up")


def half_words(document: Document) -> str:
    """What the plan's half-width limits: of a two-sided interval, or of a bound."""
    return HALVES[document["side"]]


def short_target(document: Document, target: str) -> str:
    """A target of the interval as a table's heading."""
    width = "half-width" if document["side"] == "two-sided" else "distance"
    return {"expected_width": f"Expected {width}", "assurance": "Assurance", "coverage": "Coverage"}[target]


def width_limit(document: Document) -> float:
    """The plan's half-width."""
    return float(document["targets"]["precision"]["half_width"])


def assured(document: Document) -> str:
    """'probability that the half-width is at most 2 points'."""
    return f"probability that the {half_words(document)} is at most {goal(width_limit(document))}"


def events(number: int) -> str:
    """'no event', '1 event', '3 events'."""
    return "no event" if number == 0 else f"{count(number)} event{'' if number == 1 else 's'}"


def at_most(number: int) -> str:
    """'no event', 'at most 1 event'."""
    return events(number) if number == 0 else f"at most {events(number)}"


def binding(document: Document) -> str | None:
    """The target that asks for the recommended n."""
    verdict = document["verdict"]
    return next((name for name, n in verdict["needs"].items() if n == verdict["n"]), None)


def rare_row(document: Document) -> Row | None:
    """The number of events allowed that was chosen: the row whose n the rare outcome asks for."""
    wanted = document["verdict"]["needs"].get("rare")
    return next((row for row in document["rare"] if wanted is not None and row["n"] == wanted), None)


def at_n(document: Document, method: str | None) -> Row | None:
    """The scan's figures of a method at the recommended n, or at the closest."""
    return next((row for row in document["at_n"] if row["method"] == method), None)


def chief_of(document: Document) -> str | None:
    """The recommended method, else the closest."""
    verdict = document["verdict"]
    found = verdict["method"] or (verdict["best"] or {}).get("method")
    return str(found) if found else None


def rule(claim: str, critical: int | None, n: int | None = None) -> str:
    """'109 events or more', of which n, or that no single count decides."""
    if critical is None:
        return "no single count"
    of = "" if n is None else f" in {count(n)} units"
    return f"{count(critical)} events or {'more' if claim == 'above' else 'fewer'}{of}"


def claim_at_n(document: Document) -> Row:
    """The exact test at the recommended n, else at its own: n, critical, size, power."""
    found = document["claim_at_n"] or document["decision"]
    return {name: found[name] for name in ("n", "critical", "size", "power")}


def claimed(document: Document) -> str:
    """'the proportion is above 90 %'."""
    return f"the proportion is {document['decision']['claim']} {place(document['targets']['decision']['goal'])}"


def target_heads(document: Document) -> dict[str, str]:
    """The interval's targets that are set, in words."""
    found: dict[str, str] = {}
    for row in document["methods"]:
        found |= {name: "" for name, item in row["by"].items() if item is not None}
    precision = document["targets"]["precision"]
    heads = {"coverage": capital(standard_words(as_audit(document)))}
    if precision is not None:
        heads["expected_width"] = f"Expected {half_words(document)} at most {goal(precision['half_width'])}"
        expected = place(document["outcome"]["expected"])
        sure = f"at least {share(precision['assurance'])} at a true proportion of {expected} (assurance)"
        heads["assurance"] = f"{capital(assured(document))}, {sure}"
    return {name: heads[name] for name in ("expected_width", "assurance", "coverage") if name in found}


def how_checked(document: Document) -> list[str]:
    """Which n were looked at: once for all that agree, then one by one."""
    said = [
        (row["method"], target, item["checked"])
        for row in document["methods"]
        for target, item in row["by"].items()
        if item is not None
    ]
    usual = Counter(checked for _, _, checked in said).most_common(1)[0][0]
    odd = [
        f"{capital(name_of(document, method))}, {short_target(document, target).lower()}: {looked_at(checked)}."
        for method, target, checked in said
        if checked != usual
    ]
    return [f"Looked at: {looked_at(usual)}{', unless stated otherwise' if odd else ''}.", *odd]


def looked_at(checked: str) -> str:
    """Which n were looked at: 'every n from 1 to 2000'."""
    return checked.replace(" checked", "")


def taught(document: Document) -> str | None:
    """What the taught formula gives, and what its n delivers with plus-or-minus."""
    formula = document["formula"]
    if formula is None:
        return None
    guess, worst = formula["guess"], formula["worst_case"]
    half_way = "" if guess == worst else f" and n = {count(worst)} at 50 %"
    said = f"The taught formula z²p(1 − p)/d² gives n = {count(guess)} at p = {place(formula['guess_at'])}{half_way}."
    plain = next((row for row in formula["delivers"] if row["method"] == WALD and row["n"] == guess), None)
    return said if plain is None else f"{said} {_delivered(document, plain)}"


def _delivered(document: Document, plain: Row) -> str:
    """What plus-or-minus really does at the formula's n."""
    nominal = percent(document["confidence"])
    said = (
        f"At n = {count(plain['n'])} plus-or-minus (Wald) claims {nominal} and its interval coverage falls to "
        f"{share(plain['minimum_coverage'], 'down')} at p = {place(plain['minimum_at'])}; its expected "
        f"{half_words(document)} is {half(plain['half_width'])}"
    )
    if document["targets"]["precision"]["assurance"] is None:
        return f"{said}."
    return f"{said}, and the {assured(document)} is {chance(plain['assurance'])}."


def plain_claim(document: Document) -> str | None:
    """What plus-or-minus would do to the claim; None without a claim or without plus-or-minus."""
    found = document["decision"]
    row = next((row for row in found["by_method"] if row["method"] == WALD), None) if found else None
    if found is None or row is None:
        return None
    alpha = document["targets"]["decision"]["alpha"]
    how = f"At n = {count(found['n'])}, plus-or-minus (Wald) would claim at {rule(found['claim'], row['critical'])}"
    if row["worst_size"] > alpha * (1 + 1e-9):
        return f"{how} and be wrong with probability up to {risk(row['worst_size'])}, where {place(alpha)} is allowed."
    return f"{how}: here it keeps α, with power {chance(row['power'])} against {chance(found['power'])}."


def seen_words(document: Document) -> str | None:
    """The n that sees some events."""
    found = document["seen"]
    if found is None:
        return None
    return (
        f"To see at least {events(found['events'])} at a true rate of {place(found['rate'])} takes {count(found['n'])} "
        f"units: that happens with probability {chance(found['probability'])}."
    )


def needs_words(document: Document) -> str | None:
    """What each target asks for, when there are several."""
    needs = document["verdict"]["needs"]
    if len(needs) < 2:
        return None
    return joined(f"{NEEDS[name]} asks for n = {count(n)}" for name, n in needs.items())


def standing_cautions(document: Document) -> list[str]:
    """Cautions that hold whatever the figures are."""
    rare, decision, said = document["targets"]["rare"], document["targets"]["decision"], []
    if document["methods"]:
        said.append(of_side(document["confidence"], document["alpha"], document["side"]))
    if rare is not None and rare["limit"] is not None:
        said.append(of_ruling_out(document["confidence"]))
    if rare is not None and 0 in rare["events"]:
        said.append(OF_ZERO)
    if decision is not None:
        said.append(of_claiming(decision["alpha"]))
    said += _of_the_ladder(document)
    return [*said, CONDITIONAL if document["methods"] else OF_THE_MODEL, FIXED, QUALIFIED]


def _of_the_ladder(document: Document) -> Iterator[str]:
    """What the steps from n to units leave as it was."""
    ladder, claim = document["inflated"], document["decision"]
    if ladder is None:
        return
    clustered = ladder["design_effect"] != ladder["base"] or ladder["whole_clusters"] is not None
    if clustered and (claim or document["rare"]):
        yield OF_CORRELATION
    if claim and ladder["finite"] != ladder["design_effect"]:
        yield OF_FINITE_CLAIMS


def of_ruling_out(confidence: float) -> str:
    """That ruling out is one-sided."""
    tail = tail_of(confidence, "upper")
    matching = f"; the bound is the upper limit of a two-sided {percent(1 - 2 * tail)} interval" if tail < 0.5 else ""
    return f"Ruling out a rate is one-sided at {percent(confidence)} confidence, whatever the plan's side{matching}."


def of_claiming(alpha: float) -> str:
    """That a claim is one-sided."""
    return (
        f"The claim about the goal is one-sided with α = {percent(alpha)}: it is made when the matching limit of a "
        f"two-sided {percent(1 - 2 * alpha)} interval clears the goal."
    )
