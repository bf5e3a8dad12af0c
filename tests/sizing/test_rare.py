"""Rare outcomes: definitions against brute force, finite populations, operating characteristics and the words."""

import numpy as np
import pytest
from scipy import stats

from coverage_lab.intervals import CATALOGUE
from coverage_lab.records import Rare
from coverage_lab.sizing.rare import (
    bound,
    chance_at_least,
    chance_at_most,
    characteristic,
    marked,
    rare_table,
    ruling_out,
    seeing,
    seen,
    zero_statement,
)


@pytest.mark.parametrize("events", [0, 1, 4])
@pytest.mark.parametrize("limit", [0.001, 0.013, 0.2])
@pytest.mark.parametrize("confidence", [0.8, 0.95, 0.999])
def test_the_smallest_n_rules_out_and_one_less_does_not(events: int, limit: float, confidence: float) -> None:
    n = ruling_out(events, limit, confidence)
    assert stats.binom.cdf(events, n, limit) <= 1 - confidence < stats.binom.cdf(events, n - 1, limit)
    upper = CATALOGUE["clopper-pearson"].function(events, np.array([n - 1, n]), 1 - confidence)[1]
    assert upper[1] <= limit < upper[0]


FINITE = [(0, 0.03, 180), (2, 0.05, 400), (1, 0.3, 17), (0, 0.001, 5000)]


@pytest.mark.parametrize(("events", "limit", "population"), FINITE)
def test_finite_populations_by_brute_force(events: int, limit: float, population: int) -> None:
    most = int(np.ceil(round(limit * population, 9)))
    sizes = np.arange(population + 1)
    enough = np.flatnonzero(stats.hypergeom.cdf(events, population, most, sizes) <= 0.05)
    n = ruling_out(events, limit, 0.95, population)
    assert n == enough[0]
    left = [m for m in range(population + 1) if stats.hypergeom.cdf(events, population, m, n) > 0.05]
    assert bound(events, n, 0.95, population) == max(left) / population < limit


def test_a_large_population_is_like_none() -> None:
    assert ruling_out(3, 0.001, 0.95, 10**7) == pytest.approx(ruling_out(3, 0.001, 0.95), rel=1e-3)


def test_a_rate_of_a_population_is_whole_events_rounded_up() -> None:
    assert [marked(0.05, n) for n in (100, 200, 101)] == [5, 10, 6]
    assert marked(0.07, 300) == 21  # .07 x 300 is 21.000000000000004


def test_so_many_events_that_even_a_census_cannot_tell() -> None:
    assert ruling_out(1, 0.01, 0.95, 100) is None
    table = rare_table(Rare(0.01, (0, 1)), 0.95, 100)
    assert table["n"].isna().tolist() == [False, True]


def test_a_small_population_takes_a_census() -> None:
    table = rare_table(Rare(0.02, (0,), 0.0), 0.999, 50)
    assert table.loc[0, "n"] == 50
    assert table.loc[0, "census"]
    assert zero_statement(table, 0.999, 50) == (
        "With a population of 50 the answer is a census: if none of all 50 units is an event, there is none."
    )


def test_chances_of_success_at_the_hoped_for_rate() -> None:
    table = rare_table(Rare(0.01, (1,), 0.001), 0.95)
    assert table.loc[0, ["events", "n"]].tolist() == [1, 473]
    assert table.loc[0, "probability_at_hoped_for"] == pytest.approx(stats.binom.cdf(1, 473, 0.001), rel=1e-12)
    assert rare_table(Rare(0.01, (1,)), 0.95)["probability_at_hoped_for"].isna().all()


def test_an_answer_without_a_plan_for_it_is_empty() -> None:
    assert rare_table(None, 0.95).empty
    assert rare_table(Rare(None), 0.95).empty
    assert zero_statement(rare_table(None, 0.95), 0.95) is None
    assert zero_statement(rare_table(Rare(0.01, (1,)), 0.95), 0.95) is None
    assert characteristic(rare_table(None, 0.95), None).empty
    assert seen(Rare(0.01)) is None


@pytest.mark.parametrize("population", [None, 300])
def test_seeing_events(population: int | None) -> None:
    found = seen(Rare(None, (), None, 2, 0.03, 0.9), population)
    assert found.n == seeing(2, 0.03, 0.9, population)
    assert chance_at_least(2, found.n - 1, 0.03, population) < 0.9 <= found.probability
    assert found.probability == chance_at_least(2, found.n, 0.03, population)


def test_seeing_more_than_there_are_is_impossible() -> None:
    assert seeing(10, 0.03, 0.9, 300) is None


def test_operating_characteristics_fall_from_one_to_the_error_at_the_limit() -> None:
    target = Rare(0.02, (0, 2), 0.005)
    curve = characteristic(rare_table(target, 0.95), target)
    for events in (0, 2):
        mine = curve[curve["events"] == events]
        assert mine["probability"].iloc[0] == 1.0
        assert (np.diff(mine["probability"]) < 0).all()
        at_limit = mine.loc[(mine["p"] - 0.02).abs().idxmin(), "probability"]
        assert at_limit == pytest.approx(chance_at_most(events, int(mine["n"].iloc[0]), 0.02), rel=1e-9)
        assert at_limit <= 0.05


def test_a_finite_characteristic_has_only_rates_that_exist() -> None:
    target = Rare(0.1, (0,), 0.0)
    curve = characteristic(rare_table(target, 0.95, 60), target, 60)
    assert np.allclose(curve["p"] * 60, np.rint(curve["p"] * 60))
    assert curve["p"].is_unique


def test_no_event_in_words_is_rounded_outward_and_claims_no_zero() -> None:
    table = rare_table(Rare(0.02, (0,)), 0.95)
    assert zero_statement(table, 0.95) == (
        "If no event is seen in 149 units, the true rate is at most 2 % with 95 % confidence (one-sided); this does "
        "not show that the rate is zero."
    )
