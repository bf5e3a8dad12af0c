"""Hypergeometric points and tails against mpmath and exact fractions, up to populations of ten million."""

from fractions import Fraction
from math import comb

import mpmath
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from coverage_lab.probability_finite import finite_at_least, finite_at_most, finite_point


def choose(n: int, k: int) -> mpmath.mpf:
    return mpmath.exp(mpmath.loggamma(n + 1) - mpmath.loggamma(k + 1) - mpmath.loggamma(n - k + 1))


def exact_point(x: int, n: int, population: int, marked: int) -> mpmath.mpf:
    return choose(marked, x) * choose(population - marked, n - x) / choose(population, n)


def exact_at_most(x: int, n: int, population: int, marked: int) -> mpmath.mpf:
    """Added from x down by the ratio of neighbours, until terms vanish."""
    term = total = exact_point(x, n, population, marked)
    for k in range(x, max(0, n + marked - population), -1):
        term *= mpmath.mpf(k) * (population - marked - n + k) / (mpmath.mpf(marked - k + 1) * (n - k + 1))
        total += term
        if term < total * mpmath.mpf(10) ** -35:
            break
    return total


CASES = [
    (0, 59, 1000, 48),
    (3, 5000, 10**7, 20_000),
    (30, 1000, 10**7, 10**6),
    (90, 1000, 10**7, 10**6),
    (499_000, 10**6, 10**7, 5 * 10**6),
    (0, 10**6, 10**7, 120),
    (5, 9_999_990, 10**7, 12),
]


@pytest.mark.parametrize(("x", "n", "population", "marked"), CASES)
def test_points_and_tails_against_mpmath(x: int, n: int, population: int, marked: int) -> None:
    with mpmath.workdps(40):
        point = exact_point(x, n, population, marked)
        below = exact_at_most(x, n, population, marked)
        assert abs(finite_point(x, n, population, marked) / point - 1) < 1e-12
        assert abs(finite_at_most(x, n, population, marked) / below - 1) < 1e-12
        above = 1 - below + point
        assert abs(finite_at_least(x, n, population, marked) - above) < 1e-14 + 1e-12 * above


def fraction(x: int, n: int, population: int, marked: int) -> Fraction:
    if not (0 <= x <= marked and 0 <= n - x <= population - marked):
        return Fraction(0)
    return Fraction(comb(marked, x) * comb(population - marked, n - x), comb(population, n))


@settings(deadline=None, max_examples=40)
@given(st.data())
def test_small_populations_against_exact_fractions(data: st.DataObject) -> None:
    population = data.draw(st.integers(1, 60))
    marked, n = data.draw(st.integers(0, population)), data.draw(st.integers(0, population))
    below = Fraction(0)
    for x in range(-1, population + 2):
        point = fraction(x, n, population, marked)
        assert finite_at_least(x, n, population, marked) == pytest.approx(float(1 - below), rel=1e-12, abs=0)
        below += point
        assert float(finite_point(x, n, population, marked)) == pytest.approx(float(point), rel=1e-12, abs=0)
        assert finite_at_most(x, n, population, marked) == pytest.approx(float(below), rel=1e-12, abs=0)


def test_a_census_and_the_edges() -> None:
    assert finite_point(np.array([4, 5, 6]), 50, 50, 5).tolist() == [0.0, 1.0, 0.0]
    assert finite_at_most(5, 50, 50, 5) == 1.0
    assert finite_at_most(4, 50, 50, 5) == 0.0
    assert finite_at_least(1, 10, 50, 0) == 0.0
    assert finite_at_most(-1, 10, 50, 5) == 0.0


def test_tails_far_out_keep_their_digits() -> None:
    with mpmath.workdps(40):
        wanted = exact_at_most(10, 20_000, 10**6, 10_000)
        assert wanted < 1e-60
        assert abs(finite_at_most(10, 20_000, 10**6, 10_000) / wanted - 1) < 1e-11
