"""The engine at the ends of its reach, against mpmath: p = 1e-12, n = 1 000 000, confidence 0.999999."""

import mpmath as mp
import numpy as np
import pytest

from coverage_lab.designs import Simple
from coverage_lab.engine.bounds import evaluate
from coverage_lab.engine.exact import listed, means_of, minimum_of
from coverage_lab.engine.means import Range
from coverage_lab.engine.measures import measure, stack
from coverage_lab.intervals import CATALOGUE

CONFIDENT = 5e-7  # the tail of a two-sided interval at 0.999999


def exact_miss(lower: np.ndarray, upper: np.ndarray, first: int, n: int, p: float) -> mp.mpf:
    """The chance of a count whose interval leaves out p, summed in 60 digits."""
    with mp.workdps(60):
        q = mp.mpf(p)
        missed = np.flatnonzero((lower > p) | (upper < p)) + first
        return mp.fsum(mp.binomial(n, int(x)) * q ** int(x) * (1 - q) ** (n - int(x)) for x in missed)


@pytest.mark.parametrize("method", ["wilson", "clopper-pearson", "jeffreys", "likelihood-ratio", "logit"])
@pytest.mark.parametrize(("n", "p"), [(1_000_000, 1e-12), (1_000_000, 3e-6), (200, 1e-12), (200, 1 - 1e-6), (50, 0.5)])
def test_the_miss_rate_at_a_point(method: str, n: int, p: float) -> None:
    parts = listed(Simple(), [CATALOGUE[method]], n, (p, p), "two-sided", CONFIDENT)
    piece = parts[0].piece(0)
    expected = exact_miss(piece.lower, piece.upper, piece.first, n, p)
    assert minimum_of(parts, 0, p, p).miss == pytest.approx(float(expected), rel=1e-9, abs=1e-18)


@pytest.mark.parametrize(("n", "p"), [(1_000_000, 1e-12), (1_000_000, 0.5), (10_000_000, 0.01), (1, 0.3)])
def test_probabilities_sum_to_one(n: int, p: float) -> None:
    assert Simple().law(p, n).weight.sum() == pytest.approx(1.0, abs=2e-13)


def test_nothing_is_nan_or_negative_at_the_ends() -> None:
    methods = [m for m in CATALOGUE.values() if "two-sided" in m.sides]
    for n, p in ((1, 0.0), (1, 1.0), (5, 1e-12), (30, 1.0)):
        law = Simple().law(p, n)
        limits = stack([evaluate(m, law.columns, "two-sided", CONFIDENT) for m in methods])
        for values in measure(law, limits, p, "two-sided").values():
            assert np.isfinite(values).all()
            assert (values >= 0).all()


def test_mean_misses_keep_their_digits_at_high_confidence() -> None:
    """Against the sum of exact misses on a fine midpoint grid of a narrow range: relative 1e-4 of a rate near 1e-7."""
    n, low, high = 60, 0.2, 0.3
    parts = listed(Simple(), [CATALOGUE["clopper-pearson"]], n, (low, high), "two-sided", CONFIDENT)
    means = means_of(parts, Range(low, high, (1.0, 1.0)), "two-sided")
    grid = low + (np.arange(4000) + 0.5) * (high - low) / 4000
    seen = np.mean([minimum_of(parts, 0, float(p), float(p)).miss for p in grid])
    assert float(means["missed_below"][0] + means["missed_above"][0]) == pytest.approx(seen, rel=2e-3)
