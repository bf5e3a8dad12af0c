"""Every row of sizing.csv, exactly where it gives a whole number."""

import csv
import math
from functools import cache
from pathlib import Path

import pytest
from scipy.special import ndtri
from sizing_plans import plan

from coverage_lab.intervals import CATALOGUE
from coverage_lab.records import Decision, Precision, tail_of
from coverage_lab.records_sizing import Inflation
from coverage_lab.sizing.decision import decide
from coverage_lab.sizing.formula import ceiling, ladder, margin_of_error, wilson_size
from coverage_lab.sizing.rare import bound, ruling_out, seeing
from coverage_lab.sizing.scan import scanned
from coverage_lab.sizing.search import search, targets_of

VALUES = Path(__file__).parents[1] / "check_values" / "sizing.csv"


def read_rows() -> list[dict[str, str]]:
    with VALUES.open(newline="", encoding="utf-8") as file:
        return list(csv.DictReader(file))


ROWS = read_rows()


def inputs(row: dict[str, str]) -> dict[str, object]:
    """key=value pairs; numbers as numbers."""
    pairs = (pair.split("=") for pair in row["input"].split())
    return {key: int(value) if value.isdigit() else _number(value) for key, value in pairs}


def _number(text: str) -> object:
    try:
        return float(text)
    except ValueError:
        return text


def shown(value: float, show: str) -> float:
    return {"value": float, "ceiling": ceiling, "nearest": round}[show](value)


def from_ladder(quantity: str, base: float, show: str, **inflation: float) -> float:
    steps = ladder(base, Inflation(**inflation))
    if show == "clusters":
        return steps.clusters
    rung = next(rung for rung in steps.rungs if rung.name == quantity)
    return {"value": rung.value, "ceiling": rung.ceiling, "nearest": round(rung.value)}[show]


@cache
def searched(method: str, p: float, half_width: float, assurance: float | None):
    asked = plan(p, p, methods=(method,), precision=Precision(half_width, assurance), horizon=400)
    found = search(asked, [scanned(CATALOGUE[method], coverage=False)], targets_of(asked, coverage=False))
    return found.by_method[method]


@cache
def decided(**question: float):
    return decide(Decision(**question), (), 1000, 1000).found


def z_of(z: float | None, confidence: float | None) -> float:
    return z if z is not None else -ndtri(tail_of(confidence, "two-sided"))


def margin(p: float, half_width: float, show: str, z: float | None = None, confidence: float | None = None) -> float:
    return shown(margin_of_error(p, half_width, z_of(z, confidence)), show)


def of_first_or_safe(found, which: str) -> int:
    return found.first_n if which == "first" else found.safe_n


COUNTS = {"ruling_out": ruling_out, "seeing": seeing, "bound": bound, "margin_of_error": margin}


def computed(quantity: str, given: dict) -> float:
    if quantity in COUNTS:
        return COUNTS[quantity](**given)
    if quantity == "bound_count":
        return round(bound(**given) * given["population"])
    if quantity == "wilson_size":
        return math.ceil(wilson_size(given["p"], given["half_width"], z_of(None, given["confidence"])))
    if quantity.startswith("expected_width"):
        return of_first_or_safe(searched(**given, assurance=None)["expected_width"], quantity.split("_")[-1])
    if quantity.startswith("assurance"):
        return of_first_or_safe(searched(**given)["assurance"], quantity.split("_")[-1])
    if quantity.startswith("decision"):
        return of_first_or_safe(decided(**given), quantity.split("_")[-1])
    return from_ladder(quantity, **given)


@pytest.mark.parametrize("row", ROWS, ids=lambda row: f"{row['quantity']}-{row['input'].replace(' ', '-')}")
def test_value(row: dict[str, str]) -> None:
    came = computed(row["quantity"], inputs(row))
    assert came == pytest.approx(float(row["expected"]), abs=float(row["tolerance"]), rel=0), (
        f"{row['source']} (status {row['status']})"
    )


def test_every_row_has_a_source_and_says_from_memory_where_it_is() -> None:
    for row in ROWS:
        assert row["source"]
        assert ("(from memory)" in row["source"]) == (row["status"] == "M"), row
        assert ("(common practice)" in row["source"]) == (row["status"] == "common practice"), row
