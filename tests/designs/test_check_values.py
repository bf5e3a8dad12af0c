"""Every row of designs.csv: published and derived figures of the methods that know the design."""

import csv
from collections.abc import Callable
from fractions import Fraction
from pathlib import Path

import numpy as np
import pytest
from scipy.special import ndtr

from coverage_lab.designs import Classification, Clustered, Finite, Layered, Simple
from coverage_lab.engine.bounds import evaluate
from coverage_lab.engine.measures import measure, stack
from coverage_lab.intervals import EVERY
from coverage_lab.intervals.corrected import corrected
from coverage_lab.intervals.inputs import student_point
from coverage_lab.records import Design, Method, tail_of

PATH = Path(__file__).parents[1] / "check_values" / "designs.csv"
with PATH.open(newline="", encoding="utf-8") as file:
    ROWS = list(csv.DictReader(file))

Given = dict[str, str]


def number(text: str) -> float:
    return float(Fraction(text))


def counts(text: str) -> np.ndarray:
    return np.array([[int(part) for part in text.split(",")]])


def tail(given: Given) -> float:
    return float(ndtr(-float(given["z"]))) if "z" in given else tail_of(float(given["confidence"]), "two-sided")


def limits(member: str, given: Given) -> list[float]:
    columns = [np.array([number(given[name])]) for name in EVERY[member].needs]
    return [float(limit[0]) for limit in EVERY[member].function(*columns, tail(given))]


def with_half_a_unit(member: str, given: Given) -> list[float]:
    lower, upper = limits(member, given)
    half = 1 / (2 * int(given["trials"]))
    return [lower - half, upper + half]


def as_counts(member: str, given: Given) -> list[float]:
    return [round(limit * int(given["population"]), 6) for limit in limits(member, given)]


def first_excluded(member: str, given: Given) -> list[float]:
    lower, upper = as_counts(member, given)
    return [lower - 1, upper + 1]


def one_sided_counts(member: str, given: Given) -> list[float]:
    columns = [np.array([number(given[name])]) for name in EVERY[member].needs]
    found = EVERY[member].function(*columns, tail_of(float(given["confidence"]), "upper"))
    return [round(float(limit[0]) * int(given["population"]), 6) for limit in found]


def design_of(given: Given) -> Design:
    if given["design"] == "finite":
        return Finite(int(given["population"]))
    if given["design"] == "clustered":
        return Clustered(int(given["size"]), number(given["icc"]))
    tested = int(given["diseased_tested"]), int(given["healthy_tested"])
    return Layered(Simple(), (Classification(float(given["sensitivity"]), float(given["specificity"]), *tested),))


def exact(member: str, given: Given, figure: str) -> list[float]:
    """A figure from the exact law, no draw among it."""
    method: Method = EVERY[member]
    n, p = int(given["n"]), number(given["p"])
    law = design_of(given).view(frozenset(method.needs)).law(p, n)
    found = stack([evaluate(method, law.columns, "two-sided", 0.025)])
    return [float(measure(law, found, p, "two-sided")[figure][0])]


def shares(given: Given) -> tuple[np.ndarray, ...]:
    weights = counts(given["population"]).astype(float)
    return counts(given["events"]), counts(given["trials"]), weights / weights.sum()


def stratified_limits(member: str, given: Given) -> list[float]:
    return [float(limit[0]) for limit in EVERY[member].function(*shares(given), tail(given))]


def stratified_estimate(member: str, given: Given) -> list[float]:
    lower, upper = EVERY["stratified-wald"].function(*shares(given), tail(given))
    return [float(lower[0] + upper[0]) / 2]


def stratified_effective_size(member: str, given: Given) -> list[float]:
    """p(1-p)/v from the plus-or-minus interval, whose half-width is z·√v."""
    lower, upper = EVERY["stratified-wald"].function(*shares(given), float(ndtr(-1.0)))
    p, v = float(lower[0] + upper[0]) / 2, float((upper[0] - lower[0]) / 2) ** 2
    return [p * (1 - p) / v]


def effective_size(member: str, given: Given) -> list[float]:
    n = float(given["trials"]) / float(given["deff"])
    if "clusters" in given:
        points = [float(student_point(f, tail(given))) for f in (int(given["trials"]) - 1, int(given["clusters"]) - 1)]
        n *= (points[0] / points[1]) ** 2
    return [n]


def effective_limits(member: str, given: Given) -> list[float]:
    (n,) = effective_size(member, given)
    share = float(given["events"]) / float(given["trials"])
    return [float(limit) for limit in EVERY["clopper-pearson"].function(share * n, n, tail(given))]


def true_proportion(member: str, given: Given) -> list[float]:
    same = corrected(Method("same", lambda a, tail: (a, a), "same", "none", "a test", needs=("apparent",)))
    values = [np.array([float(given[name])]) for name in ("apparent", "sensitivity", "specificity")]
    return [float(same.function(*values, 0.025)[0][0])]


QUANTITIES: dict[str, Callable[[str, Given], list[float]]] = {
    "limits": limits,
    "limits_with_half_a_unit": with_half_a_unit,
    "counts": as_counts,
    "first_excluded_counts": first_excluded,
    "one_sided_counts": one_sided_counts,
    "coverage": lambda member, given: exact(member, given, "coverage"),
    "width": lambda member, given: exact(member, given, "mean_width"),
    "stratified_limits": stratified_limits,
    "stratified_estimate": stratified_estimate,
    "stratified_effective_size": stratified_effective_size,
    "effective_size": effective_size,
    "effective_limits": effective_limits,
    "true_proportion": true_proportion,
}


def given_of(row: dict[str, str]) -> Given:
    return dict(pair.split("=", 1) for pair in row["input"].split())


@pytest.mark.parametrize("row", ROWS, ids=lambda row: f"{row['quantity']}-{row['member']}-{row['input'][:40]}")
def test_row(row: dict[str, str]) -> None:
    came = QUANTITIES[row["quantity"]](row["member"], given_of(row))
    wanted = [float(part) for part in row["expected"].split()]
    faults = [abs(a - b) > float(row["tolerance"]) for a, b in zip(came, wanted, strict=True)]
    assert not any(faults), f"came {came}, expected {row['expected']}: {row['source']} (status {row['status']})"


def test_every_row_is_told_where_it_comes_from() -> None:
    assert all(row["source"] and row["status"] in ("T", "M", "C") for row in ROWS)
    assert all("from memory" in row["source"] for row in ROWS if row["status"] == "M")


def test_every_quantity_has_a_row() -> None:
    assert set(QUANTITIES) == {row["quantity"] for row in ROWS}


def test_a_wrong_row_fails() -> None:
    row = next(row for row in ROWS if row["quantity"] == "coverage")
    with pytest.raises(AssertionError, match=r"expected 0\.5"):
        test_row({**row, "expected": "0.5"})


def test_estimates_plugged_in_as_if_known_fail() -> None:
    """The nominal 95 % is missed by far, at the very cell where the two methods that know better hold."""
    rows = [row for row in ROWS if "design=estimated" in row["input"]]
    came = {row["member"]: exact(row["member"], given_of(row), "coverage")[0] for row in rows}
    assert came["corrected-wilson"] < 0.84
    assert min(came["corrected-adjusted"], came["corrected-delta"]) > 0.945
