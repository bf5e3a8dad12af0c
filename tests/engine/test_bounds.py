"""From a formula to limits in use: truncation, sides, nothing evaluated, and faults of a user's own method."""

import numpy as np
import pytest

from coverage_lab.checks import InputFault
from coverage_lab.engine.bounds import evaluate, inapplicable
from coverage_lab.intervals import CATALOGUE
from coverage_lab.records import Method

COLUMNS = {"events": np.array([0, 1, 5]), "trials": np.array([5])}


def own(function) -> Method:
    return Method("house-rule", function, "house rule", "your own", "a test")


def test_limits_are_truncated_and_the_raw_ones_kept() -> None:
    limits = evaluate(CATALOGUE["wald"], COLUMNS, "two-sided", 0.025)
    assert limits.raw_lower[1] < 0 == limits.lower[1]
    assert list(limits.raw_upper - limits.raw_lower)[::2] == [0.0, 0.0]


@pytest.mark.parametrize(("side", "fixed"), [("upper", "lower"), ("lower", "upper")])
def test_a_one_sided_bound_leaves_the_other_end_of_the_scale(side: str, fixed: str) -> None:
    limits = evaluate(CATALOGUE["wilson"], COLUMNS, side, 0.05)
    both = evaluate(CATALOGUE["wilson"], COLUMNS, "two-sided", 0.05)
    assert set(getattr(limits, fixed)) == {0.0 if fixed == "lower" else 1.0}
    assert list(getattr(limits, side)) == list(getattr(both, side))


def test_nothing_evaluated_says_nothing() -> None:
    limits = evaluate(CATALOGUE["wilson"], {"events": np.array([0, 0]), "trials": np.array([0, 3])}, "two-sided", 0.025)
    assert (limits.lower[0], limits.upper[0]) == (0.0, 1.0)
    assert limits.upper[1] < 1


@pytest.mark.parametrize(
    ("function", "message"),
    [
        (lambda x, n, tail: (x / n, np.ones(2)), r"'house-rule': expected \(lower, upper\), two arrays of length 3"),
        (lambda x, n, tail: x / n, r"expected \(lower, upper\).* came an array of shape \(3,\)"),
        (lambda x, n, tail: None, "came NoneType"),
        (
            lambda x, n, tail: (np.where(x == 1, np.nan, 0.0), np.ones(3)),
            r"'house-rule': NaN at events = 1, trials = 5: \(nan, 1\)",
        ),
        (lambda x, n, tail: (x / n, 0.5 * np.ones(3)), r"lower > upper at events = 5, trials = 5: \(1, 0.5\)"),
    ],
)
def test_a_wrong_method_is_refused_by_name_with_the_first_offending_count(function, message: str) -> None:
    with pytest.raises(InputFault, match=message):
        evaluate(own(function), COLUMNS, "two-sided", 0.025)


@pytest.mark.parametrize(
    ("method", "n", "side", "reason"),
    [
        ("blaker", 10, "upper", "two-sided only"),
        ("second-order", 10, "two-sided", "one-sided only"),
        ("shortest-exact", 1001, "two-sided", "computed only up to n = 1000"),
        ("wilson", 10**7, "lower", None),
    ],
)
def test_why_a_method_does_not_apply(method: str, n: int, side: str, reason: str | None) -> None:
    assert inapplicable(CATALOGUE[method], ("events", "trials"), n, side) == reason


def test_a_method_that_needs_more_than_the_design_gives_is_not_asked() -> None:
    needy = Method("needy", CATALOGUE["wald"].function, "needy", "none", "a test", needs=("events", "clusters"))
    assert "needs clusters" in inapplicable(needy, ("events", "trials"), 10, "two-sided")
