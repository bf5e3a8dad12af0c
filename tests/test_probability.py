"""Probabilities against high-precision sums (mpmath), exact fractions and a general statistics library."""

from fractions import Fraction
from math import comb

import mpmath as mp
import numpy as np
import pytest
from scipy import stats

from coverage_lab import probability

EXTREME_P = [1e-12, 1e-6, 0.001, 0.1, 0.3, 0.5, 0.77, 0.999, 1 - 1e-9]
SIZES = [2, 30, 1000, 100_000, 1_000_000]


@pytest.fixture(autouse=True)
def fifty_digits():
    with mp.workdps(50):
        yield


def exact_point(x, n, p):
    p = mp.mpf(p)
    log_choose = mp.loggamma(n + 1) - mp.loggamma(x + 1) - mp.loggamma(n - x + 1)
    return mp.exp(log_choose + x * mp.log(p) + (n - x) * mp.log(1 - p))


def exact_sum(x, n, p, step):
    """Point probabilities from x outward, upward (step 1) or downward (-1), until they no longer matter."""
    p = mp.mpf(p)
    odds = p / (1 - p)
    term, total = exact_point(x, n, p), mp.mpf(0)
    while 0 <= x <= n and term > total * mp.mpf(10) ** -30:
        total += term
        term *= (n - x) * odds / (x + 1) if step > 0 else x / odds / (n - x + 1)
        x += step
    return total


def counts_around(n, p):
    mean, spread = n * p, (n * p * (1 - p)) ** 0.5
    near = {round(mean + z * spread + (2 if z > 0 else 0)) for z in (-30, -8, -4, -1, 0, 1, 4, 8, 30)}
    return sorted(x for x in near if 0 <= x <= n and exact_point(x, n, p) > 1e-290)


def relative(value, truth):
    return float(abs(mp.mpf(float(value)) - truth) / truth)


def digits_at_stake(truth):
    """An exponent of size E, rounded a few times, moves the value by a few E ulps."""
    return 4e-15 + 8e-16 * float(abs(mp.log(truth)))


@pytest.mark.parametrize("n", SIZES)
@pytest.mark.parametrize("p", EXTREME_P)
def test_points_have_full_relative_accuracy(n, p):
    for x in counts_around(n, p):
        truth = exact_point(x, n, p)
        assert relative(probability.point(x, n, p), truth) < digits_at_stake(truth), x


def test_points_of_a_million_trials_are_good_to_one_part_in_ten_to_the_fourteen():
    x = np.arange(499_000, 501_001, 125)
    truths = [exact_point(int(k), 1_000_000, 0.5) for k in x]
    assert max(map(relative, probability.point(x, 1_000_000, 0.5), truths)) < 1e-14


@pytest.mark.parametrize("n", SIZES)
@pytest.mark.parametrize("p", EXTREME_P)
def test_tails_have_full_relative_accuracy(n, p):
    # The condition number of a tail in p is about |x - np|/(1-p); an ulp of p or 1-p may move it by that many ulps.
    for x in counts_around(n, p):
        tail, step = (probability.at_most, -1) if x <= n * p else (probability.at_least, +1)
        truth = exact_sum(x, n, p, step)
        room = 2e-14 + 4e-16 * abs(x - n * p) / (1 - p) + digits_at_stake(truth)
        assert relative(tail(x, n, p), truth) < room, x


def test_a_tiny_p_is_not_lost_in_its_complement():
    # P(X >= 1) = 1 - (1 - p)^n = 1e-6 - 4.999995e-13 + ... at n = 10**6, p = 1e-12
    truth = -mp.expm1(1_000_000 * mp.log1p(-mp.mpf(1e-12)))
    assert relative(probability.at_least(1, 1_000_000, 1e-12), truth) < 1e-15


def test_points_and_tails_agree_with_exact_fractions():
    n, p = 12, Fraction(3, 8)
    points = [comb(n, x) * p**x * (1 - p) ** (n - x) for x in range(n + 1)]
    x = np.arange(n + 1)
    np.testing.assert_allclose(probability.point(x, n, 0.375), [float(b) for b in points], rtol=2e-15)
    below = [float(sum(points[: k + 1])) for k in x]
    above = [float(sum(points[k:])) for k in x]
    np.testing.assert_allclose(probability.at_most(x, n, 0.375), below, rtol=4e-15)
    np.testing.assert_allclose(probability.at_least(x, n, 0.375), above, rtol=4e-15)


def test_a_general_library_agrees():
    x = np.arange(0, 201)
    law = stats.binom(200, 0.07)
    np.testing.assert_allclose(probability.point(x, 200, 0.07), law.pmf(x), rtol=1e-11)
    np.testing.assert_allclose(probability.at_most(x, 200, 0.07), law.cdf(x), rtol=1e-11)
    np.testing.assert_allclose(probability.at_least(x, 200, 0.07), law.sf(x - 1), rtol=1e-11)


@pytest.mark.parametrize(
    ("function", "x", "n", "p", "expected"),
    [
        (probability.point, [-1, 0, 1, 2, 3], 2, 0.0, [0, 1, 0, 0, 0]),
        (probability.point, [-1, 0, 1, 2, 3], 2, 1.0, [0, 0, 0, 1, 0]),
        (probability.point, [-1, 0, 2, 3], 2, 0.5, [0, 0.25, 0.25, 0]),
        (probability.point, [0, 1], 0, 0.3, [1, 0]),
        (probability.at_most, [-1, 0, 1, 2, 3], 2, 0.0, [0, 1, 1, 1, 1]),
        (probability.at_most, [-1, 0, 1, 2, 3], 2, 1.0, [0, 0, 0, 1, 1]),
        (probability.at_most, [-1, 0, 1], 0, 0.3, [0, 1, 1]),
        (probability.at_least, [-1, 0, 1, 2, 3], 2, 0.0, [1, 1, 0, 0, 0]),
        (probability.at_least, [-1, 0, 1, 2, 3], 2, 1.0, [1, 1, 1, 1, 0]),
        (probability.at_least, [-1, 0, 1], 0, 0.3, [1, 1, 0]),
    ],
)
def test_values_at_the_edges_are_exact(function, x, n, p, expected):
    np.testing.assert_array_equal(function(x, n, p), expected)


def test_everything_broadcasts():
    shape = (2, 3, 4)
    x, n, p = np.ones((3, 1), dtype=int), np.full((2, 1, 1), 9), np.linspace(0.1, 0.4, 4)
    for function in (probability.point, probability.at_most, probability.at_least):
        assert function(x, n, p).shape == shape
    assert probability.betabinomial(x, n, p, 1.5).shape == shape


@pytest.mark.parametrize(
    ("n", "low", "high"),
    [(1_000_000, 1e-6, 1e-4), (1000, 0.2, 0.3), (10, 0.0, 1.0), (50, 0.0, 0.0), (50, 1.0, 1.0), (400, 0.5, 0.5)],
)
def test_window_is_the_smallest_that_holds_every_probable_count(n, low, high):
    first, last = probability.window(n, low, high)
    ends = np.array([low, high])
    if first > 0:
        assert (probability.point(first - 1, n, ends) <= 1e-18).all()
    if last < n:
        assert (probability.point(last + 1, n, ends) <= 1e-18).all()
    assert (probability.point(np.array([[first], [last]]), n, ends) > 1e-18).any(axis=1).all()


def test_window_of_rare_events_in_a_million_stays_small():
    first, last = probability.window(1_000_000, 1e-6, 1e-4)
    assert first == 0
    assert last < 250


@pytest.mark.parametrize("x", [0.0, 0.25, 1.0, 37.0, 1e6])
@pytest.mark.parametrize("ratio", [1e-9, 0.3, 0.8, 0.9, 1 - 1e-9, 1.0, 1 + 1e-6, 1.2, 3.0, 1e9])
def test_deviance_keeps_its_digits(x, ratio):
    m = x * ratio if x else ratio
    truth = mp.mpf(m) - mp.mpf(x) + (mp.mpf(x) * mp.log(mp.mpf(x) / mp.mpf(m)) if x else 0)
    assert float(abs(probability.deviance(x, m) - truth)) <= 4e-15 * float(truth)


def test_deviance_from_a_mean_of_zero():
    np.testing.assert_array_equal(probability.deviance([0.0, 2.0], 0.0), [0.0, np.inf])


@pytest.mark.parametrize("z", [1e-3, 0.5, 1.0, 1.4, 3.7, 15.0, 16.0, 40.0, 1e3, 1e6])
@pytest.mark.parametrize("end", [5e-4, 0.5, 1.0, 2.0, 14.5, 80.0, 1e6])
def test_log_rising_is_accurate_relative_to_its_result(z, end):
    for m in (end - z, 1e-9, 0.0):
        check_log_rising(z, m)


def check_log_rising(z, m):
    truth = mp.loggamma(mp.mpf(z) + mp.mpf(m)) - mp.loggamma(mp.mpf(z))
    # Near its zero (digamma vanishes at 1.46) the value is the small difference of terms of size m.
    room = 2e-14 * float(abs(truth)) + 2e-15 * min(abs(m), 1.0)
    assert float(abs(probability.log_rising(z, m) - truth)) <= room


@pytest.mark.parametrize(("a", "b"), [(0.5, 0.5), (1.0, 3.0), (2.0, 98.0), (300.0, 700.5), (0.02, 0.3), (1e-3, 5.0)])
@pytest.mark.parametrize("n", [1, 2, 7, 100, 10_000, 1_000_000])
def test_betabinomial_is_accurate_to_a_million_trials(a, b, n):
    for x in sorted({0, 1, n // 7, n // 3, n - 1, n}):
        log_choose = mp.loggamma(n + 1) - mp.loggamma(x + 1) - mp.loggamma(n - x + 1)
        log_betas = mp.log(mp.beta(x + mp.mpf(a), n - x + mp.mpf(b))) - mp.log(mp.beta(a, b))
        truth = mp.exp(log_choose + log_betas)
        if truth > 1e-290:
            assert relative(probability.betabinomial(x, n, a, b), truth) < 1e-12, x


def test_betabinomial_with_a_uniform_prior_is_uniform():
    x = np.array([0, 1, 500_000, 1_000_000])
    np.testing.assert_array_equal(probability.betabinomial(x, 1_000_000, 1, 1), 1 / 1_000_001)
    np.testing.assert_array_equal(probability.betabinomial([-1, 0, 1, 2], 1, 1, 1), [0, 0.5, 0.5, 0])


def test_betabinomial_agrees_with_a_general_library_and_sums_to_one():
    x = np.arange(61)
    chances = probability.betabinomial(x, 60, 1.3, 8.0)
    np.testing.assert_allclose(chances, stats.betabinom(60, 1.3, 8.0).pmf(x), rtol=1e-10)
    assert chances.sum() == pytest.approx(1, abs=1e-14)
    assert probability.betabinomial(0, 0, 2.0, 3.0) == 1
