"""Answers to a sceptical reviewer and a summary in plain language, from the saved figures alone."""

from collections.abc import Iterator

import pandas as pd

from coverage_lab.report.protocol import one_line
from coverage_lab.report.words import (
    HOW_SURE,
    NOUNS,
    SHORT_WIDTHS,
    Document,
    Row,
    agreement,
    count,
    label_of,
    least,
    limit,
    limit_places,
    place,
    planned_range,
    points,
    row_of,
    share,
    simulation_words,
    standard_words,
    steady_words,
)
from coverage_lab.rounding import percent
from coverage_lab.sentences import CONDITIONAL

LIKELY = 5.0  # expected events, or units without, up to which a sample may well show none
GUARANTEE = 1e-12  # what rounding may take from an exact method's minimum


def answers(document: Document) -> Iterator[tuple[str, str]]:
    """Questions that a reviewer asks, each with its answer."""
    row = row_of(document, document["verdict"]["method"], document["verdict"]["n"])
    if row is None:
        yield "Why is no method named?", _unnamed(document)
    else:
        yield from _against_plain(document, row)
        yield "Why this method and not another?", _why_this(document)
        yield from _below_nominal(document, row)
        yield from _robustness(document, row)
    yield "How sure are these figures?", _how_sure(document, row)
    yield "What do they not show?", CONDITIONAL
    made = document["provenance"]
    yield (
        "Can this be checked?",
        f"Yes: coverage-lab {made['version']} computes the same figures from the same plan (SHA-256 "
        f"{made['plan_sha256']}) and seed ({made['seed']}); every cell is in cells.csv.",
    )


def _unnamed(document: Document) -> str:
    """What the verdict says, and what came closest."""
    verdict = document["verdict"]
    found = verdict["closest"]
    if found is None:
        return str(verdict["sentence"])
    return (
        f"{verdict['sentence']} Closest, not recommended: {label_of(document, found['method'])}, whose worst interval "
        f"coverage is {share(found['minimum_coverage'], 'down')} at p = {place(found['minimum_at'])}."
    )


def _against_plain(document: Document, row: Row) -> Iterator[tuple[str, str]]:
    """What plus-or-minus would have done."""
    plain = row_of(document, "wald", row["n"])
    if plain is None or plain["minimum_coverage"] is None or row["method"] == "wald":
        return
    fails = "" if plain["passes"] else "; it does not meet the standard"
    yield (
        "Why not the usual plus-or-minus interval?",
        f"At n = {count(row['n'])} its interval coverage falls to {least(plain)} at p = {place(plain['minimum_at'])} "
        f"({HOW_SURE[plain['minimum_is']]}) and is {share(plain['mean_coverage'], 'down')} on average over the planned "
        f"range, where {percent(document['confidence'])} is claimed{fails}. The {row['label']} {_noun(document)} keeps "
        f"at least {least(row)}, at a {SHORT_WIDTHS[document['side']]} of {points(row['mean_width'])} instead of "
        f"{points(plain['mean_width'])}.",
    )


def _why_this(document: Document) -> str:
    """The list, its order, and who else passes."""
    verdict = document["verdict"]
    here = [row for row in document["methods"] if row["n"] == verdict["n"] and row["applies"]]
    passing = sum(row["passes"] is True for row in here)
    return (
        f"The methods that may be named, and their order, were stated in advance. {verdict['sentence']} Of "
        f"{len(here)} methods measured, {passing} meet the standard at this n. Those not on the list are shown but "
        "cannot be named: to pick the narrowest of all would let the luck of one n decide."
    )


def _below_nominal(document: Document, row: Row) -> Iterator[tuple[str, str]]:
    """Why a worst case below the stated confidence was accepted, and what a guarantee would cost."""
    nominal = 1 - document["alpha"]
    if row["minimum_coverage"] >= nominal - GUARANTEE:
        return
    others = [
        other
        for other in document["methods"]
        if other["n"] == row["n"] and (other["minimum_coverage"] or 0.0) >= nominal - GUARANTEE
    ]
    listed = [other for name in document["verdict"]["prefer"] for other in others if other["method"] == name]
    safe = next(iter([*listed, *sorted(others, key=lambda other: float(other["mean_width"]))]), None)
    price = ""
    if safe is not None:
        price = (
            f" A guarantee has its price: the {safe['label']} {_noun(document)} never falls below {percent(nominal)} "
            f"in the planned range; its {SHORT_WIDTHS[document['side']]} is {points(safe['mean_width'])} instead of "
            f"{points(row['mean_width'])}."
        )
    yield (
        f"The worst interval coverage is below {percent(nominal)}. Is that good enough?",
        f"It meets the standard that was set in advance: {standard_words(document)}. Events are whole numbers, so "
        f"interval coverage jumps as the true proportion moves; it cannot be {percent(nominal)} everywhere.{price}",
    )


def _robustness(document: Document, row: Row) -> Iterator[tuple[str, str]]:
    """Other true proportions and other n."""
    verdict, everywhere = document["verdict"], row["everywhere"]
    if verdict["holds_on"]:
        low, high = verdict["holds_on"]
        worst = (
            f" Over all proportions its interval coverage can fall to {share(everywhere['minimum_coverage'], 'down')}, "
            f"near p = {place(everywhere['minimum_at'])}."
            if everywhere["minimum_coverage"] is not None
            else ""
        )
        yield (
            "What if the true proportion lies outside the planned range?",
            f"The standard is met for true proportions from {percent(low, 'up')} to {percent(high, 'down')}.{worst}",
        )
    steady = steady_words(verdict)
    if steady:
        yield "What if a few units more or fewer are evaluated?", steady


def _how_sure(document: Document, row: Row | None) -> str:
    """By which routes the figures were had, and how well these agree."""
    found = []
    if "enumerated" in (document["plan"]["simulation"].get("routes") or ("enumerated",)) and (
        row is None or row["minimum_is"] != "simulated"
    ):
        found.append(
            "For a given true proportion the probability of every count is known, and so is the interval that each "
            "count would give: interval coverage is the sum of the probabilities of the counts whose interval contains "
            "the true proportion. It is computed exactly."
        )
    if row is not None and row["minimum_is"] == "certified":
        found.append(
            "The worst value over the planned range is an exact minimum: between neighbouring limits the counts that "
            "cover stay the same, so that no grid has to be trusted."
        )
    simulated = simulation_words(row, document) if row is not None else None
    found += [simulated] if simulated else []
    return " ".join([*found, agreement(document)])


def summary(document: Document, table: pd.DataFrame) -> list[str]:
    """The plan and its promise, in paragraphs for readers without statistics."""
    verdict = document["verdict"]
    row = row_of(document, verdict["method"], verdict["n"])
    name = one_line(document["plan"]["outcome"]["name"])
    opening = (
        f"The study will examine {count(verdict['n'])} units and report the share of them with the outcome “{name}”."
    )
    if row is None:
        return [
            f"{opening} The formulas that were allowed for its margin of error do not keep, or are not known to keep, "
            "what the study asks of them: the number of units, the list of formulas or the demand has to change before "
            "the study starts."
        ]
    promised = percent(document["confidence"])
    return [
        f"{opening} A sample does not show the true share exactly, so the result comes with {_limits(document)}.",
        _kept(document, row, promised),
        *_examples(document, table),
        "The formula was fixed before any data were seen and will not be changed because of the result. All this "
        "assumes that every unit had the same chance to be examined; it says nothing about units that could not be "
        "reached, were judged wrongly or were lost.",
    ]


def _noun(document: Document) -> str:
    return NOUNS[document["side"]]


def _limits(document: Document) -> str:
    """What will be reported, in plain words."""
    promised = percent(document["confidence"])
    if document["side"] == "two-sided":
        return f"a range of values, a {promised} confidence interval: the true share should lie within it"
    most = "larger" if document["side"] == "upper" else "smaller"
    return f"a limit, a {promised} confidence bound: the true share should not be {most} than it"


def _kept(document: Document, row: Row, promised: str) -> str:
    """How often the promise is kept, beside plus-or-minus."""
    low, high = planned_range(document)
    where = f"lies between {place(low)} and {place(high)}" if low < high else f"is {place(low)}"
    found = {"simulated": " in simulated studies", "searched": ", the lowest that a search found"}
    simulated = found.get(row["minimum_is"], "")
    kept = (
        f"If such a study were repeated many times, the {_noun(document)} would be right in at least {least(row)} of "
        f"the repetitions{simulated}, and in {share(row['mean_coverage'], 'down')} on average, provided that the true "
        f"share {where}. The formula used is called {one_line(row['label'])}; the promise is {promised}."
    )
    plain = row_of(document, "wald", row["n"])
    if plain is None or plain["minimum_coverage"] is None or row["method"] == "wald":
        return kept
    return f"{kept} The plus-or-minus formula of most textbooks could be right in as few as {least(plain)}."


def _examples(document: Document, table: pd.DataFrame) -> list[str]:
    """What the report will say for the expected count, and for none or all where that may well happen."""
    n, (low, high) = document["verdict"]["n"], planned_range(document)
    likely = round(n * document["plan"]["outcome"]["expected"])
    wanted = {likely: f"{count(likely)} of {count(n)} units have"}
    if n * low <= LIKELY:
        wanted[0] = "no unit has"
    if n * (1 - high) <= LIKELY:
        wanted[n] = "every unit has"
    rows = {int(k): (lower, upper) for k, lower, upper in table.to_numpy(float) if k in wanted}
    told = [f"if {words} the outcome, {_reported(document, *rows[k])}" for k, words in wanted.items() if k in rows]
    if not told:
        return []
    risk = " No events found does not mean no risk." if 0 in wanted else ""
    return [f"The report will say, for example: {'; '.join(told)}.{risk}"]


def _reported(document: Document, lower: float, upper: float) -> str:
    """One outcome's limits, rounded outward."""
    places = limit_places(document["verdict"]["n"])
    low, high = limit(lower, "down", places), limit(upper, "up", places)
    said = {"two-sided": f"{low} to {high}", "upper": f"at most {high}", "lower": f"at least {low}"}
    return said[document["side"]]
