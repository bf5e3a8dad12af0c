"""Coverage at points, mean coverage and infima against the values in tests/check_values/coverage.csv."""

import csv
import io
from pathlib import Path

import numpy as np
import pytest

from coverage_lab.designs import Simple
from coverage_lab.engine.exact import listed, means_of, minimum_of
from coverage_lab.engine.means import Range
from coverage_lab.intervals import CATALOGUE
from coverage_lab.records import tail_of

VALUES = Path(__file__).parents[1] / "check_values" / "coverage.csv"
ROWS = list(csv.DictReader(io.StringIO(VALUES.read_text(encoding="utf-8"))))


def computed(row: dict[str, str]) -> float:
    low, high, n = float(row["p_low"]), float(row["p_high"]), int(row["n"])
    tail = tail_of(float(row["confidence"]), "two-sided")
    parts = listed(Simple(), [CATALOGUE[row["member"]]], n, (low, high), "two-sided", tail)
    if row["quantity"] == "mean":
        means = means_of(parts, Range(low, high, (1.0, 1.0)), "two-sided")
        return 1 - float(means["missed_below"][0] + means["missed_above"][0])
    return minimum_of(parts, 0, low, high).coverage


@pytest.mark.parametrize("row", ROWS, ids=lambda row: f"{row['quantity']}-{row['member']}-{row['n']}-{row['p_low']}")
def test_value(row: dict[str, str]) -> None:
    came = computed(row)
    assert abs(came - float(row["expected"])) <= float(row["tolerance"]), (
        f"{row['source']} ({row['status']}): expected {row['expected']}, came {came:.12g}"
    )


def test_every_kind_is_there() -> None:
    assert {row["quantity"] for row in ROWS} >= {"point", "mean", "infimum"}
    assert np.all([row["source"] for row in ROWS])
