"""A method of the user's own is audited like any other, and a wrong one is caught."""

import re

import numpy as np
import pytest
from scipy.stats import binom

import coverage_lab as cl
from coverage_lab.engine.cross import cross_check
from coverage_lab.records import Plan


def plan(**methods) -> Plan:
    keys = {
        "outcome": {"range": [0.005, 0.05]},
        "sample": {"n": 250},
        "simulation": {"replicates": 2000, "grid": [0.005, 0.02, 0.05]},
    }
    return cl.make_plan({**keys, "methods": {"only": ["wilson", "wald"], **methods}})


def house_rule(events, trials, tail):
    """Plus-or-minus when both counts are at least 5, else Clopper-Pearson."""
    enough = (events >= 5) & (trials - events >= 5)
    pairs = zip(
        cl.intervals.wald(events, trials, tail), cl.intervals.clopper_pearson(events, trials, tail), strict=True
    )
    return tuple(np.where(enough, a, b) for a, b in pairs)


def test_a_rule_that_is_not_monotone_is_audited_exactly() -> None:
    audit = cl.audit(plan(), extra={"house-rule": house_rule})
    row = audit.methods.set_index("method").loc["house-rule"]
    assert (row["minimum_is"], row["family"]) == ("certified", "your own")
    assert row["minimum_coverage"] == pytest.approx(0.902544, abs=1e-6)
    assert row["passes"] is False
    p = np.linspace(0.005, 0.05, 3001)
    x = np.arange(251)
    lower, upper = house_rule(x, np.array([250]), 0.025)

    covers = (lower <= p[:, None]) & (p[:, None] <= upper)
    seen = (binom.pmf(x, 250, p[:, None]) * covers).sum(axis=1).min()
    assert row["minimum_coverage"] <= seen < row["minimum_coverage"] + 0.005


def test_a_wrong_rule_is_refused_by_name() -> None:
    def broken(events, trials, tail):
        return np.where(events == 3, 0.9, 0.0), np.full(np.shape(events), 0.5)

    with pytest.raises(cl.InputFault, match=re.escape("'broken': lower > upper at events = 3, trials = 250")):
        cl.audit(plan(), extra={"broken": broken})


def test_a_rule_that_raises_is_a_fault_that_names_it() -> None:
    def impatient(events, trials, tail):
        raise ZeroDivisionError("no trials")

    with pytest.raises(cl.InputFault, match="method 'impatient' failed: ZeroDivisionError: no trials"):
        cl.audit(plan(), extra={"impatient": impatient})


def test_a_plan_made_with_the_rule_measures_it_once() -> None:
    mine = cl.make_plan(
        {"outcome": {"range": [0.005, 0.05]}, "sample": {"n": 60}, "simulation": {"routes": ["enumerated"]}},
        extra={"house-rule": house_rule},
    )
    methods = cl.audit(mine, extra={"house-rule": house_rule}).methods["method"]
    assert list(methods).count("house-rule") == 1


@pytest.mark.parametrize("between", [(0.2, "x"), (0.5, 0.1), 0.3, (0.1, 0.2, 0.3), (-1, 0.5), (float("nan"), 0.5)])
def test_an_unusable_range_is_one_line(between) -> None:
    with pytest.raises(cl.InputFault, match=r"^between = "):
        cl.minimum_coverage("wilson", 20, between)


def test_a_taken_name_is_refused() -> None:
    with pytest.raises(cl.InputFault, match="wilson"):
        cl.audit(plan(), extra={"wilson": house_rule})


def test_an_own_method_may_be_preferred_and_named() -> None:
    extra = {"careful": cl.intervals.clopper_pearson}
    mine = cl.make_plan(
        {
            "outcome": {"range": [0.005, 0.05]},
            "sample": {"n": 250},
            "simulation": {"routes": ["enumerated"]},
            "methods": {"only": ["careful", "wald"], "prefer": ["careful"]},
        },
        extra=extra,
    )
    assert cl.audit(mine).verdict.method == "careful"


def test_simulation_of_another_truth_fails_the_cross_check() -> None:
    """The cross-check itself can fail: the same counts, paired with the enumerated figures of swapped methods."""
    cells = cl.audit(plan()).cells
    assert cross_check(cells, []).p_value > 0.001
    swapped = cells.copy()
    drawn = swapped["route"] == "simulated"
    names = {"wilson": "wald", "wald": "wilson"}
    swapped.loc[drawn, "method"] = swapped.loc[drawn, "method"].map(names)
    assert cross_check(swapped, []).p_value < 1e-6
