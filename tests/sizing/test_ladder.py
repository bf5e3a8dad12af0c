"""The taught formula, Wilson's closed form against a search, and the ladder."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.special import ndtri

from coverage_lab.intervals import CATALOGUE
from coverage_lab.records_sizing import Inflation
from coverage_lab.sizing.formula import ceiling, ladder, margin_of_error, nearest_half, wilson_size


@pytest.mark.parametrize("p", [0.5, 0.3, 0.1, 0.05, 0.01, 1e-4, 0.93])
@pytest.mark.parametrize("half_width", [0.2, 0.05, 0.02, 0.01, 0.004])
@pytest.mark.parametrize("confidence", [0.8, 0.95, 0.99])
def test_the_closed_form_equals_the_search(p: float, half_width: float, confidence: float) -> None:
    """The smallest n at which Wilson's interval around an estimate equal to p is that narrow, looking at every n."""
    tail = (1 - confidence) / 2
    n = np.arange(1, 200_001)
    lower, upper = CATALOGUE["wilson"].function(n * p, n, tail)
    wanted = int(n[np.argmax((upper - lower) / 2 <= half_width)])
    assert max(1, math.ceil(wilson_size(p, half_width, float(-ndtri(tail))))) == wanted


def test_a_ceiling_is_blind_to_the_last_rounding() -> None:
    assert 2.576**2 * 0.25 / 0.046**2 > 784
    assert ceiling(2.576**2 * 0.25 / 0.046**2) == 784
    assert ceiling(588.0000000000001) == 588
    assert ceiling(588.001) == 589


def test_the_order_of_the_rungs_matters() -> None:
    steps = ladder(384.15, Inflation(design_effect=2, population=1000))
    assert [rung.ceiling for rung in steps.rungs] == [385, 769, 435, 435, 435]
    finite_first = ladder(ladder(384.15, Inflation(population=1000)).rungs[2].value, Inflation(design_effect=2))
    assert finite_first.units == 556


def test_rungs_carry_unrounded_values() -> None:
    steps = ladder(384.15, Inflation(loss=0.15))
    assert steps.units == 452
    assert ladder(385, Inflation(loss=0.15)).units == 453


def test_every_rung_together() -> None:
    steps = ladder(192.08, Inflation(design_effect=2, population=6200, loss=0.05, cluster_size=7))
    widened = 384.16
    finite = widened / (1 + (widened - 1) / 6200)
    assert [rung.name for rung in steps.rungs] == ["base", "design_effect", "finite", "loss", "units"]
    assert [rung.value for rung in steps.rungs][:4] == pytest.approx([192.08, widened, finite, finite / 0.95])
    assert steps.clusters == math.ceil(finite / 0.95 / 7)
    assert steps.document() == {
        "base": 193,
        "design_effect": 385,
        "finite": 362,
        "loss": 381,
        "units": 385,
        "whole_clusters": 55,
        "census": False,
    }


def test_never_more_units_than_there_are() -> None:
    steps = ladder(900, Inflation(population=50, loss=0.2))
    assert steps.units == 50
    assert steps.census
    assert max(rung.ceiling for rung in steps.rungs) == 50


def test_a_size_for_the_finite_population_is_not_corrected_again() -> None:
    assert ladder(45, Inflation(population=100), finite=False).units == 45
    assert ladder(45, Inflation(population=100)).units == 32


@settings(deadline=None)
@given(
    base=st.floats(1, 1e6),
    deff=st.floats(1, 10),
    population=st.integers(1, 10**7),
    loss=st.floats(0, 0.9),
)
def test_the_ladder_stays_within_its_bounds(base: float, deff: float, population: int, loss: float) -> None:
    steps = ladder(base, Inflation(deff, population, loss))
    assert 1 <= steps.units <= population
    values = [rung.value for rung in steps.rungs]
    assert values[1] >= values[0]
    assert values[2] <= min(values[1], population) * (1 + 1e-12)
    assert values[3] >= values[2]


def test_the_least_precise_value_of_a_range() -> None:
    assert [nearest_half(*ends) for ends in ((0.1, 0.2), (0.3, 0.7), (0.8, 0.9))] == [0.2, 0.5, 0.8]


def test_the_taught_formula_is_symmetric() -> None:
    assert margin_of_error(0.2, 0.03, 1.96) == pytest.approx(margin_of_error(0.8, 0.03, 1.96))
