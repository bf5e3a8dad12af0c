"""Every catalogue entry has check values, every check value an entry, and every entry says what a reader must know."""

import csv
import re
from pathlib import Path

import pytest

from coverage_lab import intervals
from coverage_lab.intervals import CATALOGUE
from coverage_lab.records import SIDES, Method

CHECK_VALUES = Path(__file__).with_name("check_values")
# By standing in published guidance, which is also the order of every table and legend.
STANDING = [
    "wilson",
    "clopper-pearson",
    "jeffreys",
    "agresti-coull",
    "mid-p",
    "blaker",
    "shortest-exact",
    "sterne",
    "second-order",
    "likelihood-ratio",
    "jeffreys-modified",
    "wilson-cc",
    "uniform-bayes",
    "jeffreys-hpd",
    "arcsine",
    "logit",
    "logit-half",
    "cloglog",
    "plus-four",
    "poisson-exact",
    "wald-cc",
    "wald",
]
TWO_SIDED_ONLY = {"blaker", "sterne", "shortest-exact", "jeffreys-hpd"}


def rows_of(pattern: str) -> list[dict[str, str]]:
    rows = []
    for path in sorted(CHECK_VALUES.glob(pattern)):
        with path.open(newline="", encoding="utf-8") as file:
            rows += list(csv.DictReader(file))
    return rows


def test_every_entry_has_a_row() -> None:
    """Methods that need more than events and trials may have theirs in another intervals*.csv, with columns to fit."""
    assert set(CATALOGUE) <= {row["member"] for row in rows_of("intervals*.csv")}


def test_every_row_has_an_entry() -> None:
    members = {row["member"] for row in [*rows_of("intervals*.csv"), *rows_of("coverage.csv")]}
    assert members <= set(CATALOGUE), members - set(CATALOGUE)


def test_every_method_of_events_and_trials_has_derived_interval_rows() -> None:
    derived = {row["member"] for row in rows_of("intervals.csv") if row["status"] == "derived"}
    assert derived == {name for name, method in CATALOGUE.items() if method.needs == ("events", "trials")}


def test_order_is_the_standing() -> None:
    assert [name for name, method in CATALOGUE.items() if method.needs == ("events", "trials")] == STANDING
    assert list(CATALOGUE)[: len(STANDING)] == STANDING


@pytest.mark.parametrize(("name", "method"), CATALOGUE.items(), ids=CATALOGUE)
def test_every_entry_is_complete(name: str, method: Method) -> None:
    assert method.name == name
    assert re.fullmatch(r"[a-z0-9]+(-[a-z0-9]+)*", name)
    for field in ("label", "family", "source", "formula", "ends", "faults"):
        text = getattr(method, field)
        assert text == text.strip(), field
        assert text, field
    assert re.search(r"\b(1[789]|20)\d\d\b", method.source) or name not in STANDING, "a source without a year"
    assert set(method.sides) <= set(SIDES)
    assert method.sides
    assert method.needs
    assert all(reason.strip() for reason in method.exemptions.values())


def test_labels_and_functions_are_told_apart() -> None:
    assert len({method.label for method in CATALOGUE.values()}) == len(CATALOGUE)
    assert len({method.function for method in CATALOGUE.values()}) == len(CATALOGUE)


@pytest.mark.parametrize("name", STANDING)
def test_function_is_public_under_the_catalogue_name(name: str) -> None:
    function = CATALOGUE[name].function
    assert getattr(intervals, name.replace("-", "_")) is function
    assert function.__doc__


def test_sides() -> None:
    one_sided_only = {name for name in STANDING if "two-sided" not in CATALOGUE[name].sides}
    two_sided_only = {name for name in STANDING if CATALOGUE[name].sides == ("two-sided",)}
    assert one_sided_only == {"second-order"}
    assert two_sided_only == TWO_SIDED_ONLY
    assert CATALOGUE["shortest-exact"].largest_n == 1000


def test_rows_ask_only_for_sides_that_apply() -> None:
    wrong = [row for row in rows_of("intervals.csv") if row["side"] not in CATALOGUE[row["member"]].sides]
    assert not wrong
