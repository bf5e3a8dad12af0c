"""Blaker's, Sterne's and the shortest exact intervals against brute force from their definitions.

The brute force below shares nothing with the solvers: whole tables of binomial probabilities, an acceptance
probability for every p of a grid, and for the shortest table one bisection after another on its worst coverage.
"""

from math import comb
from time import process_time

import numpy as np
import pytest
from scipy import stats

from coverage_lab.intervals import blaker, clopper_pearson, exact_shortest, shortest_exact, sterne
from coverage_lab.probability import at_least, at_most, point

SAME = 1 + 1e-13  # the brute force takes probabilities this close as tied


def point_table(n, p):
    """Binomial probabilities, one row a p."""
    k = np.arange(n + 1)
    choose = np.array([float(comb(n, i)) for i in k])
    return choose * np.power.outer(p, k) * np.power.outer(1 - p, n - k)


def blaker_acceptance(n, p):
    """P(smaller tail of X <= smaller tail of x) for every p (rows) and x (columns)."""
    b = point_table(n, p)
    smaller = np.minimum(np.cumsum(b, 1), np.cumsum(b[:, ::-1], 1)[:, ::-1])
    return (b[:, None, :] * (smaller[:, None, :] <= smaller[:, :, None] * SAME)).sum(2)


def sterne_acceptance(n, p):
    """P(b(X) <= b(x)) for every p (rows) and x (columns)."""
    b = point_table(n, p)
    return (b[:, None, :] * (b[:, None, :] <= b[:, :, None] * SAME)).sum(2)


PAIRS = {"blaker": (blaker, blaker_acceptance), "sterne": (sterne, sterne_acceptance)}


@pytest.mark.parametrize("name", PAIRS)
@pytest.mark.parametrize("n", [1, 2, 3, 5, 10, 21, 30, 31, 47])
@pytest.mark.parametrize("tail", [0.1, 0.025, 0.005, 5e-5])
def test_hulls_agree_with_the_definition(name, n, tail):
    function, acceptance = PAIRS[name]
    grid = np.linspace(0, 1, 801)
    accepted = acceptance(n, grid) > 2 * tail
    away = np.logspace(-12, -1, 12)
    lower, upper = function(np.arange(n + 1), n, tail)
    for x, (low, high) in enumerate(zip(lower, upper, strict=True)):
        inside = grid[accepted[:, x]]
        assert low * (1 - 1e-12) <= inside.min()
        assert inside.max() <= high * (1 + 1e-12)
        if low > 0:
            assert (acceptance(n, low * (1 - away))[:, x] <= 2 * tail).all()
            assert acceptance(n, np.array([low * (1 + 1e-12)]))[0, x] > 2 * tail
        if high < 1:
            assert (acceptance(n, np.minimum(high * (1 + away), 1))[:, x] <= 2 * tail).all()
            assert acceptance(n, np.array([high * (1 - 1e-12)]))[0, x] > 2 * tail


@pytest.mark.parametrize(
    ("name", "n", "x", "tail"),
    [
        ("blaker", 31, 1, 0.025),
        ("blaker", 21, 0, 0.05),
        ("blaker", 27, 2, 0.005),
        ("sterne", 30, 1, 0.025),
        ("sterne", 18, 0, 0.05),
        ("sterne", 27, 2, 0.005),
    ],
)
def test_gaps_inside_the_hull_are_filled(name, n, x, tail):
    """The set of accepted p has a gap here, and at no smaller n for any x; the limits are those of its outer parts."""
    function, acceptance = PAIRS[name]
    grid = np.linspace(0, 1, 200_001)[1:-1]
    low, high = function(x, n, tail)
    between = grid[(grid > low) & (grid < high)]
    refused = np.concatenate([acceptance(n, part)[:, x] <= 2 * tail for part in np.array_split(between, 60)])
    assert refused.any(), "no gap where one is known"
    assert not refused[0]
    assert not refused[-1]


def acceptance_left(name, x, n, p):
    """Acceptance of x at p below its estimate, by the definition, with the opposite tail found by bisection."""
    own = at_least(x, n, p) if name == "blaker" else point(x, n, p)
    rank = at_most if name == "blaker" else point
    low, high = -1, x if name == "blaker" else min(x, int((n + 1) * p))
    while high - low > 1:
        middle = (low + high) // 2
        low, high = (middle, high) if rank(middle, n, p) <= own * SAME else (low, middle)
    return at_least(x, n, p) + at_most(low, n, p)


@pytest.mark.parametrize("name", PAIRS)
@pytest.mark.parametrize("tail", [0.1, 0.025, 5e-7])
def test_limits_of_a_million_trials_are_located_from_both_sides(name, tail):
    n = 1_000_000
    counts = np.array([1, 2, 5, 100, 20_000, 500_000, 999_999, n])
    lower, upper = PAIRS[name][0](counts, n, tail)
    for x, low in zip(counts.tolist(), lower, strict=True):
        assert acceptance_left(name, x, n, low * (1 + 2e-12)) > 2 * tail
        spread = np.sqrt((1 - low) / (n * low))
        for step in (2e-12, 1e-9, 1e-6, *(spread * np.array([1e-3, 0.01, 0.1, 0.3, 1, 2]))):
            assert acceptance_left(name, x, n, low * max(1 - step, 1e-9)) <= 2 * tail
    mirrored = PAIRS[name][0](n - counts, n, tail)
    np.testing.assert_allclose(mirrored[1], 1 - lower, rtol=0, atol=1e-15)
    np.testing.assert_allclose(mirrored[0], 1 - upper, rtol=0, atol=1e-15)


def worst_coverage(n, lower, upper):
    """Smallest coverage, looked for at both ends of every piece on which the covering set stays the same."""
    ends = np.sort(np.concatenate([lower, upper]))
    ends = ends[(ends > 0) & (ends < 1)]
    apart = np.concatenate([[True], np.diff(ends) > 1e-13 * ends[1:]])
    cuts = np.concatenate([[0.0], ends[apart], [1.0]])
    middle = ((cuts[1:] + cuts[:-1]) / 2)[:, None]
    covered = (lower <= middle) & (middle <= upper)
    b = point_table(n, cuts)
    return min((b[:-1] * covered).sum(1).min(), (b[1:] * covered).sum(1).min())


def shortest_by_bisection(n, alpha):
    """The stated construction taken literally: each limit moved by bisection on the whole table's worst coverage."""
    k = np.arange(n + 1)
    lower = np.where(k == 0, 0.0, stats.beta.ppf(alpha / 2, np.maximum(k, 1), n - k + 1))
    upper = 1 - lower[::-1]
    for x in range(n, 0, -1):
        good, bad = lower[x], 1.0
        while bad - good > 1e-13:
            trial = (good + bad) / 2
            lower[x], upper[n - x] = trial, 1 - trial
            good, bad = (trial, bad) if worst_coverage(n, lower, upper) >= 1 - alpha - 1e-12 else (good, trial)
        lower[x], upper[n - x] = good, 1 - good
    return lower, upper


@pytest.mark.parametrize("n", [1, 2, 3, 5, 6, 10, 13, 20, 31, 47])
@pytest.mark.parametrize("alpha", [0.2, 0.05, 0.01])
def test_shortest_table_agrees_with_its_construction_taken_literally(n, alpha):
    lower, upper = shortest_exact(np.arange(n + 1), n, alpha / 2)
    slow_lower, slow_upper = shortest_by_bisection(n, alpha)
    np.testing.assert_allclose(lower, slow_lower, rtol=0, atol=1e-10)
    np.testing.assert_allclose(upper, slow_upper, rtol=0, atol=1e-10)


@pytest.mark.parametrize("function", [blaker, sterne, shortest_exact])
@pytest.mark.parametrize("n", [31, 250, 600])
@pytest.mark.parametrize("tail", [0.1, 0.025, 0.005])
def test_tables_hold_their_confidence_and_share_their_end_points(function, n, tail):
    lower, upper = function(np.arange(n + 1), n, tail)
    ends = np.unique(np.concatenate([lower, upper]))
    ends = ends[(ends > 0) & (ends < 1)]
    gaps = np.diff(ends) / ends[1:]
    rounding = 2e-14 if function is blaker else 0.0  # its ties are solved twice, the others' are one number
    assert not np.any((gaps > rounding) & (gaps < 1e-9)), "end points that should be one are not"
    apart = np.concatenate([[True], gaps > 1e-13])
    cuts = np.concatenate([[0.0], ends[apart], [1.0]])
    middle = (cuts[1:] + cuts[:-1]) / 2
    first, last = np.searchsorted(upper, middle), np.searchsorted(lower, middle, side="right") - 1
    missed = [at_most(first - 1, n, end) + at_least(last + 1, n, end) for end in (cuts[:-1], cuts[1:])]
    assert np.max(missed) <= 2 * tail * (1 + 1e-9)


def test_blaker_lies_inside_clopper_pearson_and_sterne_may_not():
    x = np.arange(11)
    outer = clopper_pearson(x, 10, 0.025)
    inner = blaker(x, 10, 0.025)
    assert (inner[0] >= outer[0]).all()
    assert (inner[1] <= outer[1]).all()
    assert sterne(1, 10, 0.025)[1] > outer[1][1]  # .4465 against .4450


def test_the_shortest_table_is_not_nested_in_confidence():
    at_95, at_945 = shortest_exact(10, 10, 0.025)[0], shortest_exact(10, 10, 0.0275)[0]
    assert (round(float(at_95), 4), round(float(at_945), 4)) == (0.7330, 0.7324)


# Recomputed from the stated definitions with grids and bisection; five and four decimals.
SINGLE = [
    (sterne, 81, 263, 0.25446, 0.36676),
    (sterne, 15, 148, 0.05941, 0.16136),
    (sterne, 0, 20, 0.0, 0.16682),
    (sterne, 1, 29, 0.00177, 0.16882),
    (blaker, 81, 263, 0.25392, 0.36646),
    (blaker, 15, 148, 0.05796, 0.16012),
    (blaker, 0, 20, 0.0, 0.16013),
    (blaker, 1, 29, 0.00177, 0.16604),
]


@pytest.mark.parametrize(("function", "x", "n", "low", "high"), SINGLE)
def test_single_intervals_at_95_percent(function, x, n, low, high):
    np.testing.assert_allclose(function(x, n, 0.025), (low, high), rtol=0, atol=5.1e-6)


# n = 10, x = 0..5, 95 %: the shortest table is printed by Blyth & Still 1983 and Casella 1986 (from memory), the others
# are recomputed from their definitions.
TEN = {
    sterne: [(0, 0.2909), (0.0051, 0.4465), (0.0368, 0.5535), (0.0873, 0.6194), (0.1500, 0.7091), (0.2224, 0.7776)],
    blaker: [(0, 0.2829), (0.0051, 0.4444), (0.0368, 0.5556), (0.0873, 0.6194), (0.1500, 0.7171), (0.2224, 0.7776)],
    shortest_exact: [(0, 0.267), (0.0051, 0.4439), (0.0368, 0.5561), (0.0873, 0.6194), (0.15, 0.733), (0.2224, 0.7776)],
}


@pytest.mark.parametrize("function", TEN)
def test_tables_of_ten_trials(function):
    found = np.stack(function(np.arange(6), 10, 0.025), axis=1)
    np.testing.assert_allclose(found, TEN[function], rtol=0, atol=5.1e-5)


def test_a_mixed_request_gives_each_element_its_own_table():
    x, n, tail = np.array([[0], [1], [4]]), np.array([5, 10]), 0.025
    for function in (blaker, sterne, shortest_exact):
        lower, upper = function(x, n, tail)
        assert lower.shape == upper.shape == (3, 2)
        for i, j in np.ndindex(3, 2):
            assert (lower[i, j], upper[i, j]) == function(x[i, 0], n[j], tail)


def test_the_kept_table_cannot_be_changed_by_a_caller():
    before = shortest_exact(np.arange(8), 7, 0.025)
    before[0][:] = before[1][:] = -1.0
    after = shortest_exact(np.arange(8), 7, 0.025)
    assert after[0].min() == 0
    with pytest.raises(ValueError, match="read-only"):
        exact_shortest._table(7, 0.025)[0][0] = 1.0


def seconds(function, n, tail):
    def once():
        exact_shortest._table.cache_clear()
        start = process_time()
        function(np.arange(n + 1), n, tail)
        return process_time() - start

    return min(once() for _ in range(3))


def test_whole_tables_of_a_thousand_trials_are_quick():
    unit = seconds(clopper_pearson, 1000, 0.025)
    assert seconds(blaker, 1000, 0.025) < 250 * unit
    assert seconds(sterne, 1000, 0.025) < 250 * unit
    assert seconds(shortest_exact, 1000, 0.025) < 1.0
