"""Numbers as words, and the phrases that several pages share, from a saved document (audit.json) alone."""

import math
from collections.abc import Iterable, Mapping
from typing import Any

from coverage_lab.report.design_words import design_words
from coverage_lab.rounding import Towards, percent, rounded

Document = Mapping[str, Any]
Row = Mapping[str, Any]

NOTHING = "–"

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
NOUNS = {"two-sided": "interval", "upper": "upper bound", "lower": "lower bound"}
WIDTHS = {
    "two-sided": "mean width",
    "upper": "mean excess of the bound over the true proportion",
    "lower": "mean excess of the true proportion over the bound",
}
SHORT_WIDTHS = {"two-sided": "mean width", "upper": "mean excess", "lower": "mean excess"}


def share(value: float | None, towards: Towards = "nearest") -> str:
    """A share in percent, or a dash: 0.93412 -> '93.4 %'."""
    return NOTHING if value is None else percent(value, towards)


def place(p: float | None, towards: Towards = "nearest") -> str:
    """A true proportion in percent, three significant digits of p or of 1 - p: 0.0062392 -> '0.624 %'."""
    if p is None:
        return NOTHING
    return percent(p, towards, place_places(p))


def place_places(p: float) -> int:
    """Decimals that three significant digits of p or of 1 - p take, in percent."""
    end = min(abs(p), abs(1 - p)) * 100
    return 1 if end == 0 else max(1, 2 - math.floor(math.log10(end)))


def points(value: float | None) -> str:
    """A difference of proportions in percentage points, three significant digits: 0.05234 -> '5.23 points'."""
    if value is None:
        return NOTHING
    return points_at(value, points_places(value))


def points_places(value: float) -> int:
    """Decimals that three significant digits of a difference in percentage points take."""
    hundred = abs(value) * 100
    return 0 if hundred == 0 else min(12, max(0, 2 - math.floor(math.log10(hundred))))


def points_at(value: float, places: int) -> str:
    """A difference in percentage points with so many decimals."""
    return f"{float(rounded(value * 100, places)):,.{places}f} points"


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
    """The worst interval coverage, rounded down: '93.4 %', or '94.1 % ± 0.3 points' when it was simulated."""
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
        f"interval coverage of at least {percent(1 - worst)} at every true proportion in the planned range and of at "
        f"least {percent(1 - mean)} on average over it"
    )


def weighting(document: Document) -> str:
    """How proportions are weighted in means over the range."""
    prior = document["plan"]["outcome"].get("prior") or [1.0, 1.0]
    if [float(weight) for weight in prior] == [1.0, 1.0]:
        return "every proportion of the range weighing the same"
    return f"proportions weighted by a Beta({prior[0]:g}, {prior[1]:g}) distribution cut to the range"


def how_averaged(document: Document, row: Row) -> str:
    """What the mean coverage of a method is a mean of."""
    if row["minimum_is"] == "simulated":
        return "simulated, over the grid"
    exact = "exact" if row["minimum_is"] == "certified" else "of exact values at many proportions"
    return f"{exact}, {weighting(document)}"


def simulation_words(row: Row, document: Document) -> str | None:
    """What the simulation of a method showed, or None when it was not simulated."""
    drawn = row["simulated"]
    if drawn["coverage_min"] is None:
        return None
    grid = sorted(document["plan"]["simulation"]["grid"])
    over = f" ({range_words(grid[0], grid[-1])})" if len(grid) > 1 else ""
    studies = (
        f"In {count(drawn['replicates'])} simulated studies at {each(len(grid))}{over}, each a "
        f"{design_words(document)}, n = {count(row['n'])}, "
    )
    what = f"{row['label']} {NOUNS[document['side']]}"
    if drawn["coverage_min"] == 1:
        return f"{studies}every {what} was right."
    return (
        f"{studies}the coverage of the {what} was {percent(drawn['coverage_min'])} at its lowest "
        f"(p = {place(drawn['coverage_min_at'])}) and {percent(drawn['coverage_mean'])} on average (Monte Carlo "
        f"standard error at most {points(drawn['standard_error'])}).{_missed(row, grid)}"
    )


def _missed(row: Row, grid: list[float]) -> str:
    """Why the simulation did not meet the exact minimum, when it lies between the proportions that were simulated."""
    known, at = row["minimum_is"] == "certified", row["minimum_at"]
    if (
        not known
        or row["simulated"]["coverage_min"] <= row["minimum_coverage"]
        or any(abs(p - at) < 1e-9 for p in grid)
    ):
        return ""
    return f" The exact minimum, at p = {place(at)}, is lower: it lies between the simulated proportions."


def each(cells: int) -> str:
    """'each of 11 true proportions'."""
    return "the one true proportion" if cells == 1 else f"each of {count(cells)} true proportions"


def steady_words(verdict: Row) -> str | None:
    """Whether the verdict survives a few units more or less."""
    if not verdict["steady"]:
        return None
    listed = [item["n"] for item in verdict["steady"]]
    failing = [count(item["n"]) for item in verdict["steady"] if not item["passes"]]
    around = f"{count(min(listed))} to {count(max(listed))}"
    if failing:
        return f"A few units more or fewer matter: of n = {around}, the standard is not met at n = {joined(failing)}."
    return f"A few units more or fewer change nothing: the standard is met at every n from {around}."


def agreement(document: Document) -> str:
    """What the cross-check found."""
    check = document["cross_check"]
    if check is None:
        return "No cross-check: the plan leaves out one of the two routes."
    largest = (
        "a cell whose exact coverage is 0 or 1 disagrees"
        if check["largest_z"] is None
        else f"the largest |z| is {check['largest_z']:.2f}"
    )
    return (
        f"Simulated against enumerated coverage, over {count(check['cells'])} cells (n, true proportion, method): "
        f"{largest}. The smallest of their exact "
        f"binomial p-values times their number (Bonferroni) is p = {check['p_value']:.2g}. The drawn samples against "
        f"their exact law: chi-square p = {check['chi_square_p']:.2g}."
    )
