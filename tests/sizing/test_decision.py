"""A claim about a goal: the exact test against brute force, power that saws, and the same claim by intervals."""

import numpy as np
import pytest
from scipy import stats

from coverage_lab.intervals import CATALOGUE
from coverage_lab.records import Decision, Method
from coverage_lab.sizing.decision import by_method, by_n, critical, decide, rough_size

UP = Decision(goal=0.2, believed=0.4, alpha=0.05, power=0.8)
DOWN = Decision(goal=0.8, believed=0.6, alpha=0.05, power=0.8)


@pytest.mark.parametrize("decision", [UP, Decision(0.9, 0.97, 0.025, 0.8), Decision(0.001, 0.01, 0.01, 0.9)])
def test_the_critical_count_is_the_smallest_that_keeps_alpha(decision: Decision) -> None:
    n = np.arange(1, 120)
    for size, count in zip(n, critical(decision, n), strict=True):
        chances = stats.binom.sf(np.arange(-1, size + 1), size, decision.goal)  # P(X >= 0 … n+1)
        assert count == np.flatnonzero(chances <= decision.alpha)[0]


def test_above_and_below_are_mirror_images() -> None:
    n = np.arange(1, 90)
    up, down = by_n(UP, n), by_n(DOWN, n)
    assert (down["critical"] == n - up["critical"]).all()
    np.testing.assert_allclose(down["size"], up["size"], rtol=1e-12)
    np.testing.assert_allclose(down["power"], up["power"], rtol=1e-12)


def test_where_no_outcome_allows_the_claim_it_is_never_made() -> None:
    table = by_n(Decision(0.9, 0.97, 0.025, 0.8), np.array([1, 10]))
    assert table["critical"].tolist() == [2, 11]
    assert table["power"].tolist() == [0.0, 0.0]


def test_power_saws() -> None:
    found = decide(UP, (), 2000, 2000)
    assert (found.found.first_n, found.found.safe_n) == (35, 38)
    powers = found.by_n.set_index("n")["power"]
    assert powers[35] >= 0.8 > powers[37]
    assert (powers.loc[38:] >= 0.8).all()


def test_reliability_above_ninety_per_cent() -> None:
    found = decide(Decision(0.9, 0.97, 0.025, 0.8), tuple(CATALOGUE.values()), 2000, 2000)
    assert (found.claim, found.found.first_n, found.n, found.critical) == ("above", 100, 114, 109)
    assert found.size == pytest.approx(stats.binom.sf(108, 114, 0.9), rel=1e-12)
    assert found.power == pytest.approx(stats.binom.sf(108, 114, 0.97), rel=1e-12)


def test_plus_or_minus_errs_most_near_an_end() -> None:
    """Its limit clears the goal one event too early, so that the claim is wrong more than twice as often as agreed."""
    decision = Decision(0.9, 0.97, 0.025, 0.8)
    table = by_method(decision, tuple(CATALOGUE.values()), 114).set_index("method")
    assert table.loc["wald", "worst_size"] == table["worst_size"].max() > 2 * decision.alpha
    assert table.loc["clopper-pearson", "worst_size"] <= decision.alpha


@pytest.mark.parametrize("decision", [UP, DOWN, Decision(0.05, 0.01, 0.025, 0.8)])
def test_the_exact_interval_takes_the_exact_tests_decision(decision: Decision) -> None:
    for n in (20, 57, 173):
        row = by_method(decision, (CATALOGUE["clopper-pearson"],), n).iloc[0]
        test = by_n(decision, np.array([n])).iloc[0]
        if 0 <= test["critical"] <= n:
            assert row["critical"] == test["critical"]
            assert row["worst_size"] == pytest.approx(test["size"], rel=1e-12)
            assert row["power"] == pytest.approx(test["power"], rel=1e-12)
        else:
            assert row["power"] == 0.0


def odd_rule(events, trials, tail):
    """Claims at 5 events and at 18 or more of 20, and nowhere else."""
    x, _ = np.broadcast_arrays(np.asarray(events, dtype=float), np.asarray(trials, dtype=float))
    lower = np.where((x == 5) | (x >= 18), 0.6, 0.0)
    return lower, np.ones_like(lower)


def test_the_worst_size_is_sought_over_the_whole_wrong_side() -> None:
    own = Method("odd", odd_rule, "odd", "own", "test")
    table = by_method(Decision(0.5, 0.8, 0.05, 0.8), (own,), 20)
    p = np.linspace(0.0, 0.5, 200_001)
    chance = stats.binom.pmf(5, 20, p) + stats.binom.sf(17, 20, p)
    assert table["worst_size"][0] == pytest.approx(chance.max(), abs=1e-9)
    assert table["worst_size"][0] > 10 * chance[-1]
    assert table["critical"].isna().all()


@pytest.mark.parametrize("question", [(0.002, 0.003, 0.025, 0.8), (0.5, 0.52, 0.025, 0.9), (0.99, 0.995, 0.05, 0.8)])
def test_beyond_the_scan_a_comb_finds_what_every_n_would_show(question: tuple[float, float, float, float]) -> None:
    """Teeth reach far: at a goal of .002 the last failing n lies thousands above the first one that has the power."""
    decision = Decision(*question)
    exact = decide(decision, (), 60_000, 60_000).found
    found = decide(decision, (), 100, 10**7).found
    assert "bracketed" in found.checked
    assert found.safe_n == exact.safe_n


def test_no_n_within_the_horizon() -> None:
    found = decide(Decision(0.5, 0.51, 0.025, 0.8), (), 300, 300)
    assert found.n is None
    assert found.found.safe_n is None
    assert found.by_method.empty


@pytest.mark.parametrize("decision", [UP, DOWN, Decision(0.9, 0.97, 0.025, 0.8), Decision(0.05, 0.01, 0.025, 0.8)])
def test_the_rough_size_is_in_the_neighbourhood(decision: Decision) -> None:
    assert decide(decision, (), 2000, 2000).n == pytest.approx(rough_size(decision), rel=0.35)
