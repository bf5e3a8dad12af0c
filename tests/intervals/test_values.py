"""Every row of intervals.csv, the derivation behind it, and whole tables of two general statistics libraries."""

import csv
import importlib
import math
from collections.abc import Callable, Iterator
from pathlib import Path

import numpy as np
import pytest
from scipy.stats import binom, binomtest
from statsmodels.stats.proportion import proportion_confint

from coverage_lab.intervals import CATALOGUE
from coverage_lab.records import alpha_of, tail_of

FOLDER = Path(__file__).parents[1] / "check_values"


def read_rows() -> list[dict[str, str]]:
    with (FOLDER / "intervals.csv").open(newline="", encoding="utf-8") as file:
        return list(csv.DictReader(file))


ROWS = read_rows()


def on_side(lower: object, upper: object, side: str) -> tuple[object, object]:
    """The pair with the limit that the side does not ask for put at 0 or 1."""
    return (0.0 if side == "upper" else lower), (1.0 if side == "lower" else upper)


def is_near(came: float, row: dict[str, str], end: str) -> bool:
    wanted = float(row[end])
    scale = abs(wanted) if row["kind"] == "relative" else 1.0
    return abs(came - wanted) <= float(row["tolerance"]) * scale


def row_fault(row: dict[str, str], function: Callable) -> str:
    """What is wrong with the raw limits that the function gives for a row; nothing when they agree."""
    events, trials, side = int(row["events"]), int(row["trials"]), row["side"]
    lower, upper = on_side(*function(events, trials, tail_of(float(row["confidence"]), side)), side)
    if is_near(float(lower), row, "lower") and is_near(float(upper), row, "upper"):
        return ""
    return (
        f"{row['member']} {events}/{trials} {row['confidence']} {side}: came {float(lower)!r} {float(upper)!r}, "
        f"expected {row['lower']} {row['upper']} within {row['tolerance']} {row['kind']}; "
        f"{row['source']} (status {row['status']})"
    )


def name_of(row: dict[str, str]) -> str:
    return "-".join(row[key] for key in ("member", "events", "trials", "confidence", "side", "status"))


@pytest.mark.parametrize("row", ROWS, ids=name_of)
def test_row(row: dict[str, str]) -> None:
    fault = row_fault(row, CATALOGUE[row["member"]].function)
    assert not fault, fault


def test_rows_are_what_the_derivation_gives(monkeypatch: pytest.MonkeyPatch) -> None:
    """The published rows too: the route without the package's code agrees with the outside sources."""
    monkeypatch.syspath_prepend(str(FOLDER))
    derive = importlib.import_module("derive")
    faults = []
    for row in ROWS:
        quick = int(row["trials"]) <= 10 and row["confidence"] == "0.95"
        if quick or (row["status"] != "derived" and int(row["trials"]) <= 60):
            counts = int(row["events"]), int(row["trials"])
            came = derive.row(row["member"], *counts, row["confidence"], row["side"])
            if not all(is_near(float(came[end]), row, end) for end in ("lower", "upper")):
                faults.append(f"{name_of(row)}: {row['source']}: derived {came['lower']} {came['upper']}")
    assert not faults, "\n".join(faults)


def test_rows_are_well_formed() -> None:
    keys = [tuple(row[key] for key in ("member", "events", "trials", "confidence", "side", "source")) for row in ROWS]
    assert len(set(keys)) == len(keys)
    for row in ROWS:
        assert row["status"] in {"T", "M", "C", "derived"}, row
        assert ("from memory" in row["source"]) == (row["status"] == "M"), row
        assert float(row["lower"]) <= float(row["upper"]), row
        assert 0 < float(row["tolerance"]) <= 5e-4, row


# --- exact sets, literally --------------------------------------------------------------------------------------------
def blaker_acceptance(x: int, n: int, p: np.ndarray) -> np.ndarray:
    """P(the lesser tail of X is as small as that of x), at each p."""
    k = np.arange(n + 1)
    lesser = np.minimum(binom.cdf(k, n, p[:, None]), binom.sf(k - 1, n, p[:, None]))
    chances = binom.pmf(k, n, p[:, None])
    return np.sum(chances, axis=1, where=lesser <= lesser[:, [x]] * (1 + 1e-11))


def sterne_acceptance(x: int, n: int, p: np.ndarray) -> np.ndarray:
    """P(X is as improbable as x), at each p."""
    chances = binom.pmf(np.arange(n + 1), n, p[:, None])
    return np.sum(chances, axis=1, where=chances <= chances[:, [x]] * (1 + 1e-11))


@pytest.mark.parametrize(("n", "confidence"), [(5, 0.8), (10, 0.95), (21, 0.9), (27, 0.99), (31, 0.95)])
@pytest.mark.parametrize(("name", "acceptance"), [("blaker", blaker_acceptance), ("sterne", sterne_acceptance)])
def test_limits_are_the_outermost_accepted_proportions(
    name: str, acceptance: Callable, n: int, confidence: float
) -> None:
    alpha, grid = alpha_of(confidence), np.linspace(0, 1, 4001)[1:-1]
    lower, upper = CATALOGUE[name].function(np.arange(n + 1), n, alpha / 2)
    for x in range(n + 1):
        accepted = grid[acceptance(x, n, grid) > alpha]
        assert lower[x] <= accepted[0], x
        assert accepted[-1] <= upper[x], x
        just_inside = np.array([lower[x] + 1e-9 if x else 1e-9, upper[x] - 1e-9])
        assert np.all(acceptance(x, n, just_inside) > alpha), x


# --- whole tables of the general libraries --------------------------------------------------------------------------
TRIALS = (1, 2, 20, 137)
CONFIDENCES = (0.8, 0.95, 0.99)
# Which hypothesis each library means when it bounds the proportion on one side: they are named in opposite ways.
SCIPY_SIDES = {"two-sided": "two-sided", "upper": "less", "lower": "greater"}
STATSMODELS_SIDES = {"two-sided": "two-sided", "upper": "larger", "lower": "smaller"}


def tables() -> Iterator[tuple[int, float, str]]:
    return ((n, confidence, side) for n in TRIALS for confidence in CONFIDENCES for side in SCIPY_SIDES)


def table(name: str, n: int, confidence: float, side: str) -> np.ndarray:
    """Limits of all n + 1 outcomes held in [0, 1]: array (2, n + 1)."""
    lower, upper = CATALOGUE[name].function(np.arange(n + 1), n, tail_of(confidence, side))
    lower, upper = on_side(lower, upper, side)
    return np.clip(np.stack([np.broadcast_to(lower, n + 1), np.broadcast_to(upper, n + 1)]), 0, 1)


@pytest.mark.parametrize(("name", "theirs"), [("clopper-pearson", "exact"), ("wilson", "wilson")])
def test_table_of_scipy(name: str, theirs: str) -> None:
    for n, confidence, side in tables():
        tests = [binomtest(x, n, alternative=SCIPY_SIDES[side]) for x in range(n + 1)]
        wanted = np.array([test.proportion_ci(confidence, method=theirs) for test in tests]).T
        np.testing.assert_allclose(table(name, n, confidence, side), wanted, rtol=0, atol=2e-12, err_msg=f"{n} {side}")


def test_table_of_scipy_with_continuity_correction() -> None:
    """It uses the expanded quadratic, and sets 0 and 1 at the ends, where that is another curve."""
    for n, confidence, side in tables():
        ours = table("wilson-cc", n, confidence, side)
        for x in range(n + 1):
            wanted = binomtest(x, n, alternative=SCIPY_SIDES[side]).proportion_ci(confidence, method="wilsoncc")
            np.testing.assert_allclose(ours[:, x], wanted, rtol=0, atol=2e-12, err_msg=f"{x}/{n} {side}")


STATSMODELS_NAMES = {
    "wald": "normal",
    "agresti-coull": "agresti_coull",
    "clopper-pearson": "beta",
    "wilson": "wilson",
    "jeffreys": "jeffreys",
}


@pytest.mark.parametrize("name", STATSMODELS_NAMES)
def test_table_of_statsmodels(name: str) -> None:
    for n, confidence, side in tables():
        inside = slice(1, n) if name == "jeffreys" else slice(0, n + 1)
        wanted = proportion_confint(
            np.arange(n + 1),
            n,
            alpha=1 - confidence,
            method=STATSMODELS_NAMES[name],
            alternative=STATSMODELS_SIDES[side],
        )
        wanted = np.stack([np.broadcast_to(limit, n + 1) for limit in wanted])[:, inside]
        ours = table(name, n, confidence, side)[:, inside]
        np.testing.assert_allclose(ours, wanted, rtol=0, atol=2e-12, err_msg=f"{n} {confidence} {side}")


def test_the_libraries_name_one_sided_bounds_in_opposite_ways() -> None:
    less = binomtest(3, 20, alternative="less").proportion_ci(0.95)
    smaller = proportion_confint(3, 20, alpha=0.05, method="beta", alternative="smaller")
    assert (less.low, smaller[1]) == (0, 1)
    assert table("clopper-pearson", 20, 0.95, "upper")[1, 3] == pytest.approx(less.high, abs=1e-11)
    assert table("clopper-pearson", 20, 0.95, "lower")[0, 3] == pytest.approx(smaller[0], abs=1e-11)


def test_jeffreys_is_set_at_no_events_where_a_library_leaves_it() -> None:
    left, _ = proportion_confint(0, 20, method="jeffreys")
    assert left == pytest.approx(2.4e-5, abs=5e-7)
    assert table("jeffreys", 20, 0.95, "two-sided")[0, 0] == 0
    assert table("jeffreys", 20, 0.95, "two-sided")[1, 20] == 1


def test_expanded_quadratic_is_not_used_for_wilson_cc() -> None:
    """At 0 events it is .0092 for 10 trials at 95 %, and no number at all once z^2 < 2 + 1/n."""
    z_squared, n = 1.959963984540054**2, 10
    expanded = (z_squared - 1 - math.sqrt(z_squared) * math.sqrt(z_squared - 2 - 1 / n)) / (2 * (n + z_squared))
    assert expanded == pytest.approx(0.0092, abs=5e-5)
    assert table("wilson-cc", n, 0.95, "two-sided")[0, 0] == 0
    assert table("wilson-cc", n, 0.8, "two-sided")[0, 0] == 0
