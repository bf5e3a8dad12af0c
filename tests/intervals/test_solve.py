"""The root finder: known roots, relative accuracy, hard functions, and that finished elements cost nothing more."""

import numpy as np
import pytest

from coverage_lab.intervals.solve import root


@pytest.mark.parametrize(
    ("function", "low", "high", "expected"),
    [
        (lambda x: x * x - 2, 0.0, 2.0, np.sqrt(2)),
        (lambda x: np.cos(x) - x, 0.0, 1.0, 0.7390851332151607),  # the fixed point of the cosine
        (lambda x: np.exp(x) - 5, 0.0, 10.0, np.log(5)),
        (lambda x: (x - 0.3) ** 9, -1.0, 2.0, 0.3),  # very flat
        (lambda x: np.sign(x - 0.7), 0.0, 1.0, 0.7),  # a jump has no other root than its place
        (lambda x: 1 - x, 0.5, 5.0, 1.0),  # falling
    ],
)
def test_known_roots_are_found_to_the_last_bits(function, low, high, expected):
    assert float(root(function, low, high)) == pytest.approx(expected, rel=1e-15, abs=0)


@pytest.mark.parametrize("place", [1e-300, 1e-12, 1e-5, 0.9999999, 123456.789])
def test_a_root_is_located_relative_to_its_own_size(place):
    found = root(lambda x, p: (x - p) / (x + p), 0.0, 2.5 * max(place, 0.4), place)
    assert float(abs(found - place)) <= 1e-15 * place


def test_either_order_of_the_ends_will_do():
    assert float(root(lambda x: x - 0.25, 1.0, 0.0)) == 0.25


def test_infinite_values_at_the_ends_are_allowed():
    with np.errstate(divide="ignore"):
        found = root(lambda x: np.log(x) - np.log1p(-x), 0.0, [0.9, 1.0])
    np.testing.assert_allclose(found, 0.5, rtol=1e-15)


def test_an_end_that_is_the_root_is_returned_unchanged():
    found = root(lambda x: x * (x - 1), [0.0, 0.5], [0.5, 1.0])
    np.testing.assert_array_equal(found, [0.0, 1.0])


def test_where_rounding_hides_the_change_of_sign_the_end_nearer_to_zero_is_the_root():
    found = root(lambda x: x - 1 + 1e-16, [1.0, -3.0], [2.0, 0.9999999999999999])
    np.testing.assert_array_equal(found, [1.0, 0.9999999999999999])


def test_everything_broadcasts_to_one_shape():
    low, high, target = np.zeros((3, 1)), np.full((1, 4), 9.0), np.arange(1.0, 4.0)[:, None]
    found = root(lambda x, t: x * x - t, low, high, target)
    assert found.shape == (3, 4)
    np.testing.assert_allclose(found, np.sqrt(target) * np.ones((3, 4)), rtol=1e-15)
    assert root(lambda x, t: x - t, 0.0, 1.0, 0.5).shape == ()
    assert root(lambda x, t: x - t, [], 1.0, 0.5).shape == (0,)


def test_each_element_has_its_own_parameters_to_the_end():
    target = np.random.default_rng(5).uniform(1e-9, 1, 500)
    power = np.tile([0.2, 1.0, 3.0, 11.0, 40.0], 100)
    found = root(lambda x, t, k: x**k - t, 0.0, 1.0, target, power)
    np.testing.assert_allclose(found, target ** (1 / power), rtol=3e-15)


def test_finished_elements_drop_out():
    sizes = []

    def watched(x, target):
        sizes.append(x.size)
        return np.where(target > 0, x - target, np.exp(40 * x) - 2)

    root(watched, 0.0, 1.0, [0.5] * 99 + [-1.0])  # 99 need one step, one needs many
    assert sizes[:3] == [100, 100, 100]
    assert set(sizes[3:]) == {1}


def test_smooth_functions_take_few_rounds_and_hard_ones_no_more_than_a_few_bisections():
    rounds = []

    def counted(function):
        def inner(x):
            rounds[-1] += 1
            return function(x)

        rounds.append(0)
        return inner

    root(counted(lambda x: np.exp(x) - 5), 0.0, 10.0)
    root(counted(lambda x: np.sign(x - 1e-9)), 0.0, 1.0)
    assert rounds[0] < 20
    assert rounds[1] < 100


def test_an_absolute_tolerance_stops_sooner():
    calls = []

    def counted(x):
        calls.append(x.size)
        return np.sign(x - 1e-9)

    found = root(counted, -1.0, 1.0, absolute=1e-4)
    assert abs(float(found) - 1e-9) < 2e-4
    assert len(calls) < 20


def test_a_function_that_is_not_a_number_is_a_fault():
    with pytest.raises(ArithmeticError, match="not a number"):
        root(lambda x: np.where(x > 0.4, np.nan, -1.0), 0.0, 1.0)
    with pytest.raises(ArithmeticError, match="not a number"):
        root(lambda x: np.where((x > 0.4) & (x < 0.6), np.nan, x - 0.5), 0.0, 1.0)
