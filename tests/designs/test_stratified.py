"""Strata: proportions that average to the truth, sizes that follow n, the product law by brute force."""

import itertools
import math

import mpmath
import numpy as np
import pytest
from design_cases import STRATA

from coverage_lab.checks import InputFault
from coverage_lab.designs import Classification, Layered, Stratified, Stratum
from coverage_lab.designs.simple import Simple
from coverage_lab.engine.bounds import evaluate
from coverage_lab.probability import point
from coverage_lab.records import Method

DESIGN = Stratified(STRATA)


@pytest.mark.parametrize("p", [1e-12, 1e-5, 0.02, 0.5, 0.93, 1 - 1e-9])
def test_proportions_average_to_the_truth_in_the_stated_odds(p: float) -> None:
    shares = DESIGN.proportions(p)
    with mpmath.workdps(40):
        exact = [mpmath.mpf(float(share)) for share in shares]
        mean = sum(mpmath.mpf(s.weight) * share for s, share in zip(STRATA, exact, strict=True))
        assert abs(mean - mpmath.mpf(p)) <= 1e-13 * mpmath.mpf(p)
        odds = [share / (1 - share) for share in exact]
        for stratum, value in zip(STRATA, odds, strict=True):
            ratio = value / odds[0] * STRATA[0].odds_ratio
            assert abs(ratio / stratum.odds_ratio - 1) < 1e-12 + 1e-15 / (1 - p)


def test_degenerate_truths_and_equal_ratios() -> None:
    assert DESIGN.proportions(0.0).tolist() == [0.0] * 3
    assert DESIGN.proportions(1.0).tolist() == [1.0] * 3
    same = Stratified(tuple(Stratum(s.name, s.weight, s.size, 7.0) for s in STRATA))
    assert same.proportions(0.123).tolist() == [0.123] * 3


@pytest.mark.parametrize("n", [6, 7, 50, 99, 100, 101, 1000])
def test_sizes_follow_n(n: int) -> None:
    sizes = DESIGN.sizes(n)
    assert sizes.sum() == n
    assert (np.abs(sizes - n * np.array([0.4, 0.3, 0.3])) < 1).all()
    assert DESIGN.sizes(100).tolist() == [40, 30, 30]


def test_the_law_is_the_product_of_the_strata() -> None:
    design = Stratified((Stratum("a", 0.7, 2), Stratum("b", 0.3, 3, 5.0)))
    law = design.law(0.3, 5)
    shares = design.proportions(0.3)
    found = dict(zip(map(tuple, law.columns["stratum_events"].tolist()), law.weight, strict=True))
    for x in itertools.product(range(3), range(4)):
        wanted = math.prod(float(point(k, m, p)) for k, m, p in zip(x, (2, 3), shares, strict=True))
        assert found[x] == pytest.approx(wanted, rel=1e-13)
    assert law.columns["stratum_trials"].tolist() == [[2, 3]]
    assert law.columns["stratum_weights"].tolist() == [[0.7, 0.3]]


def test_totals_are_the_sum_of_the_strata() -> None:
    law = DESIGN.law(0.2, 100)
    totals = DESIGN.view(frozenset({"events", "trials"})).law(0.2, 100)
    summed = np.bincount(law.columns["events"], law.weight, minlength=101)
    assert np.allclose(summed[totals.columns["events"]], totals.weight, rtol=1e-9, atol=1e-15)


def test_a_test_that_errs_in_every_stratum() -> None:
    lens = Classification(0.9, 0.8)
    law = Layered(DESIGN, (lens,)).view(frozenset({"events"})).law(0.2, 100)
    shares = DESIGN.proportions(0.2)
    mean = sum(m * (0.9 * p + 0.2 * (1 - p)) for m, p in zip(DESIGN.sizes(100), shares, strict=True))
    assert law.weight @ law.columns["events"] == pytest.approx(mean, rel=1e-12)


def test_a_product_that_is_too_long_is_not_listed() -> None:
    many = Stratified(tuple(Stratum(str(k), 0.1, 200) for k in range(10)))
    assert many.law(0.3, 2000) is None
    assert many.view(frozenset({"events", "trials"})).law(0.3, 2000) is not None
    assert Simple().law(0.3, 2000) is not None


def test_a_method_that_is_wrong_for_strata_is_told_the_sample() -> None:
    wrong = Method(
        "wrong", lambda x, tail: (x[:, 0] * np.nan, x[:, 0]), "wrong", "none", "a test", needs=("stratum_events",)
    )
    columns = {"stratum_events": np.array([[1, 0, 2]]), "events": np.array([3]), "trials": np.array([9])}
    with pytest.raises(InputFault, match=r"NaN at stratum_events = 1 0 2, events = 3, trials = 9"):
        evaluate(wrong, columns, "two-sided", 0.025)
