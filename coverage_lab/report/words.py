"""Numbers as words, and the protocol text, all of it from a saved document (audit.json) alone."""

import math
import re
from collections.abc import Iterable, Mapping
from decimal import Decimal
from typing import Any

from coverage_lab.rounding import Towards, percent, rounded

Document = Mapping[str, Any]
Row = Mapping[str, Any]

NOTHING = "–"
BLANK = re.compile(r"\[[^\[\]]*: to be stated[^\[\]]*\]")

HOW_SURE = {
    "certified": "exact minimum",
    "searched": "lowest value found by search, not proven",
    "simulated": "lowest simulated value",
}
SIDES = {
    "two-sided": "two-sided interval",
    "upper": "one-sided upper bound",
    "lower": "one-sided lower bound",
}
WIDTHS = {
    "two-sided": "mean width",
    "upper": "mean excess of the bound over the true proportion",
    "lower": "mean excess of the true proportion over the bound",
}
SHORT_WIDTHS = {"two-sided": "mean width", "upper": "mean excess", "lower": "mean excess"}
TARGETS = {
    "population": "the units of this population themselves",
    "process": "the process that produces such units",
}


def share(value: float | None, towards: Towards = "nearest") -> str:
    """A share in percent, or a dash: 0.93412 -> '93.4 %'. An exact 95 % less the last digits of a double is 95 %."""
    if value is None:
        return NOTHING
    lacking = Decimal(f"{1 - value:.9g}") if value <= 1 else Decimal(0)
    return percent(float(1 - lacking) if 0 < value < 1 else value, towards)


def place(p: float | None, towards: Towards = "nearest") -> str:
    """A true proportion in percent, three significant digits of p or of 1 - p: 0.0062392 -> '0.624 %'."""
    if p is None:
        return NOTHING
    end = min(abs(p), abs(1 - p)) * 100
    return percent(p, towards, 1 if end == 0 else max(1, 2 - math.floor(math.log10(end))))


def points(value: float | None) -> str:
    """A difference of proportions in percentage points, three significant digits: 0.05234 -> '5.23 points'."""
    if value is None:
        return NOTHING
    hundred = value * 100
    places = 2 if hundred == 0 else max(0, 2 - math.floor(math.log10(abs(hundred))))
    return f"{float(rounded(hundred, min(places, 12))):,.{min(places, 12)}f} points"


def times(ratio: float | None) -> str:
    """A ratio as people say it: 1.07 -> '7 % wider', 0.98 -> '2 % narrower', 1.0 -> 'equal'."""
    if ratio is None or not math.isfinite(ratio):
        return NOTHING
    if abs(ratio - 1) < 5e-4:
        return "equal"
    word = "wider" if ratio > 1 else "narrower"
    places = 1 if abs(ratio - 1) < 0.1 else 0
    return f"{percent(abs(ratio - 1), 'nearest', places)} {word}"


def limit_places(n: int) -> int:
    """Decimals of a limit in percent: finer than one unit of the sample, never more than that can tell."""
    return min(9, max(1, math.floor(math.log10(max(n, 1)))))


def limit(value: float, towards: Towards, places: int) -> str:
    """A limit in percent with fixed decimals, to be rounded outward: ('down' for lower limits, 'up' for upper)."""
    if value in (0.0, 1.0):
        return percent(value)
    return f"{rounded(value, places + 2, towards) * 100:.{places}f} %"


def range_words(low: float, high: float) -> str:
    """A range of proportions: '0.5 % to 5 %', or one proportion."""
    return place(low) if low == high else f"{place(low)} to {place(high)}"


def joined(words: Iterable[str]) -> str:
    """A list in a sentence: 'a, b and c'."""
    listed = list(words)
    return " and ".join(listed) if len(listed) < 3 else f"{', '.join(listed[:-1])} and {listed[-1]}"


def count(value: int) -> str:
    """A whole number with thin groups of three: 20000 -> '20 000'."""
    return f"{value:,}".replace(",", "\u202f")


def one_line(words: object) -> str:
    """The user's words on one line, harmless in Markdown."""
    return " ".join(str(words).split()).replace("<", r"\<")


def level(document: Document) -> str:
    """'95 % two-sided interval', '95 % one-sided upper bound'."""
    return f"{percent(document['confidence'])} {SIDES[document['side']]}"


def tail(document: Document) -> float:
    """The error probability per side."""
    alpha = float(document["alpha"])
    return alpha / 2 if document["side"] == "two-sided" else alpha


def planned_range(document: Document) -> tuple[float, float]:
    """The planned range of the true proportion."""
    low, high = document["plan"]["outcome"]["range"]
    return float(low), float(high)


def sizes(document: Document) -> list[int]:
    """The planned sample sizes, smallest first."""
    return sorted({int(verdict["n"]) for verdict in document["by_n"]})


def row_of(document: Document, method: str | None, n: int) -> Row | None:
    """The method's entry at n, or None."""
    found = (row for row in document["methods"] if row["method"] == method and row["n"] == n)
    return next(found, None)


def label_of(document: Document, method: str) -> str:
    """The method's name for people."""
    return next((str(row["label"]) for row in document["methods"] if row["method"] == method), method)


def least(row: Row) -> str:
    """The worst interval coverage, rounded down, with its simulation error when it has one: '93.4 %', '94.1 % ± 0.3 points'."""
    figure = share(row["minimum_coverage"], "down")
    error = row["simulated"]["standard_error"]
    return f"{figure} ± {points(2 * error)}" if row["minimum_is"] == "simulated" and error is not None else figure


def how_sure(row: Row) -> str:
    """How the worst interval coverage was obtained: 'exact minimum, approached at p = 0.72 %'."""
    if row["minimum_is"] is None:
        return "not measured"
    where = "" if row["minimum_at"] is None else f", {_verb(row)} p = {place(row['minimum_at'])}"
    error = " (± 2 standard errors)" if row["minimum_is"] == "simulated" else ""
    return f"{HOW_SURE[row['minimum_is']]}{error}{where}"


def _verb(row: Row) -> str:
    """An exact infimum is approached, not always reached."""
    return "approached at" if row["minimum_is"] == "certified" else "at"


def standard_words(document: Document) -> str:
    """The standard in numbers."""
    standard, alpha = document["standard"], document["alpha"]
    worst, mean = standard["worst_miss"] * alpha, standard["mean_miss"] * alpha
    return (
        f"interval coverage of at least {percent(1 - worst)} at every true proportion in the planned range and of at least "
        f"{percent(1 - mean)} on average over it"
    )


def weighting(document: Document) -> str:
    """How proportions are weighted in means over the range."""
    prior = document["plan"]["outcome"].get("prior") or [1.0, 1.0]
    if [float(weight) for weight in prior] == [1.0, 1.0]:
        return "every proportion of the range weighing the same"
    return f"proportions weighted by a Beta({prior[0]:g}, {prior[1]:g}) distribution cut to the range"


def simulation_words(row: Row, document: Document) -> str | None:
    """What the simulation of a method showed, or None when it was not simulated."""
    drawn = row["simulated"]
    if drawn["coverage_min"] is None:
        return None
    where = "" if drawn["coverage_min_at"] is None else f" at p = {place(drawn['coverage_min_at'])}"
    return (
        f"In {count(drawn['replicates'])} simulated studies at each of {_cells(document, row)} true proportions, "
        f"coverage was lowest{where}, {percent(drawn['coverage_min'])}, and {percent(drawn['coverage_mean'])} on average "
        f"(Monte Carlo standard error at most {points(drawn['standard_error'])})."
    )


def _cells(document: Document, row: Row) -> int:
    """How many true proportions were simulated."""
    return len(document["plan"]["simulation"]["grid"])


def protocol(document: Document) -> str:
    """The text for the protocol, as Markdown."""
    title = one_line(document["plan"].get("title") or "Untitled plan")
    parts = [f"**{heading}.** {text}" for heading, text in protocol_parts(document)]
    cautions = [f"- {caution}" for caution in document["cautions"]]
    return (
        "\n\n".join(
            [f"# {title}: interval method, text for the protocol", *parts, "**Cautions.**", "\n".join(cautions)]
        )
        + "\n"
    )


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
    return f"n = {count(document['verdict']['n'])}; sampling model: {document['plan']['design']['kind']} random sample."


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
    mean = "simulated, over the grid" if row["minimum_is"] == "simulated" else f"exact, {weighting(document)}"
    low, high = document["verdict"]["holds_on"] or (None, None)
    reach = (
        ""
        if low is None or high is None
        else (f" The standard is met for true proportions from {percent(low, 'up')} to {percent(high, 'down')}.")
    )
    simulated = simulation_words(row, document) if row["minimum_is"] != "simulated" else None
    return (
        f"Over the planned range the worst interval coverage is {least(row)} ({how_sure(row)}) and the mean is "
        f"{share(row['mean_coverage'], 'down')} ({mean}); {WIDTHS[document['side']]} {points(row['mean_width'])}.{reach}"
        + (f" {simulated}" if simulated else "")
    )


def _fixed(row: Row | None) -> str:
    method = "The method" if row is not None else "[date and method: to be stated] The method"
    return f"{method}, the confidence, the side and the sample size were fixed before data were seen and will not be changed."


def _computation(document: Document) -> str:
    made = document["provenance"]
    libraries = ", ".join(f"{name} {version}" for name, version in made["libraries"].items())
    return (
        f"coverage-lab {made['version']} ({libraries}); seed {made['seed']}; SHA-256 of the plan {made['plan_sha256']}."
    )
