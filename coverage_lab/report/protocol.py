"""The text for the protocol, from a saved document (audit.json) alone; what the plan leaves open is a marked blank."""

import re

from coverage_lab.report.design_words import design_words
from coverage_lab.report.words import (
    WIDTHS,
    Document,
    Row,
    count,
    how_averaged,
    how_sure,
    least,
    level,
    planned_range,
    points,
    range_words,
    row_of,
    share,
    simulation_words,
    standard_words,
    tail,
)
from coverage_lab.rounding import percent

BLANK = re.compile(r"\[[^\[\]]*: to be stated[^\[\]]*\]")
TARGETS = {
    "population": "the units of this population themselves",
    "process": "the process that produces such units",
}


def protocol_parts(document: Document) -> list[tuple[str, str]]:
    """The protocol text as (heading, paragraph); what the plan leaves open is a marked blank."""
    verdict = document["verdict"]
    row = row_of(document, verdict["method"], verdict["n"])
    return [
        ("Estimand", _estimand(document)),
        ("Interval", _interval(document, row)),
        ("Sample size", _sample_size(document)),
        ("Planned range", _range(document)),
        ("Standard", _standard(document)),
        ("What the method delivers", _delivers(document, row)),
        ("Fixed before data", _fixed(row)),
        ("Computation", _computation(document)),
    ]


def _stated(words: object, what: str) -> str:
    """The user's words, or a marked blank."""
    return one_line(words) if words else f"[{what}: to be stated]"


def _estimand(document: Document) -> str:
    study = document["plan"].get("study") or {}
    target = TARGETS.get(study.get("target") or "", "[target: to be stated, this population or the process behind it]")
    return (
        f"The true proportion with the outcome “{one_line(document['plan']['outcome']['name'])}”. "
        f"Population: {_stated(study.get('population'), 'population')}. Unit: {_stated(study.get('unit'), 'unit')}. "
        f"The proportion describes {target}."
    )


def _interval(document: Document, row: Row | None) -> str:
    alpha, side = document["alpha"], document["side"]
    error = f"α = {alpha:g}, {tail(document):g} per tail" if side == "two-sided" else f"α = {alpha:g}, all on one side"
    if row is None:
        return (
            f"A {level(document)} ({error}) by [interval method: to be stated; this audit names none]. "
            f"{document['verdict']['sentence']}"
        )
    ends = f" At 0 and at n events: {row['ends']}." if row["ends"] else ""
    source = f", {row['source']}" if row["source"] else ""
    return (
        f"The proportion will be reported with a {level(document)} ({error}) by the method “{one_line(row['label'])}” "
        f"({one_line(row['method'])}{source}).{ends}"
    )


def _sample_size(document: Document) -> str:
    return f"n = {count(document['verdict']['n'])}; sampling model: {design_words(document)}."


def _range(document: Document) -> str:
    low, high = planned_range(document)
    study = document["plan"].get("study") or {}
    return (
        f"The true proportion is expected to lie from {range_words(low, high)}. "
        f"Basis: {_stated(study.get('range_basis'), 'basis of the range')}."
    )


def _standard(document: Document) -> str:
    kind = document["standard"]["kind"]
    source = " (Bradley 1978: worst miss rate 1.5 α, mean miss rate 1.1 α)" if kind == "bradley" else ""
    return f"Set in advance: {standard_words(document)}{source}."


def _delivers(document: Document, row: Row | None) -> str:
    if row is None:
        return "No method is named, so nothing is claimed here."
    mean = how_averaged(document, row)
    found = [
        f"Over the planned range the worst interval coverage is {least(row)} ({how_sure(row)}) and the mean is "
        f"{share(row['mean_coverage'], 'down')} ({mean}); {WIDTHS[document['side']]} {points(row['mean_width'])}."
    ]
    if document["verdict"]["holds_on"]:
        low, high = document["verdict"]["holds_on"]
        found.append(f"The standard is met for true proportions from {percent(low, 'up')} to {percent(high, 'down')}.")
    simulated = simulation_words(row, document)
    return " ".join([*found, *([simulated] if simulated else [])])


def _fixed(row: Row | None) -> str:
    if row is None:
        return "[Method: to be stated before data are seen.]"
    return "Method, confidence, side and sample size were fixed before data were seen and will not be changed after."


def _computation(document: Document) -> str:
    made = document["provenance"]
    libraries = ", ".join(f"{name} {version}" for name, version in made["libraries"].items())
    return (
        f"coverage-lab {made['version']} ({libraries}); seed {made['seed']}; SHA-256 of the plan {made['plan_sha256']}."
    )


def one_line(words: object) -> str:
    """Somebody's words on one line."""
    return " ".join(str(words).split())


def pieces(text: str) -> list[tuple[str, bool]]:
    """The text cut at its marked blanks: (words, whether they are a blank)."""
    found, end = [], 0
    for blank in BLANK.finditer(text):
        found += [(text[end : blank.start()], False), (blank.group(), True)]
        end = blank.end()
    return [(words, marked) for words, marked in [*found, (text[end:], False)] if words]
