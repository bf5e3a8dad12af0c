"""Quick bounds of tails hold the exact ones between them, and the scan agrees with the engine at extremes."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from coverage_lab.designs import Simple
from coverage_lab.engine.exact import figures, listed
from coverage_lab.intervals import CATALOGUE
from coverage_lab.probability import at_least, at_most
from coverage_lab.records import tail_of
from coverage_lab.sizing.scan import Asked, scan, scanned
from coverage_lab.sizing.tails import outside_bounds


@settings(deadline=None)
@given(
    n=st.integers(1, 5000),
    p=st.one_of(st.floats(1e-9, 1 - 1e-9), st.sampled_from([0.0, 1.0, 0.5, 1e-300])),
    run=st.tuples(st.floats(-5, 5), st.floats(-5, 5)),
)
def test_bounds_hold_the_exact_tails_between_them(n: int, p: float, run: tuple[float, float]) -> None:
    spread = np.sqrt(n * p * (1 - p)) + 1
    first = int(np.clip(np.rint(n * p + run[0] * spread), 0, n + 1))
    after = int(np.clip(np.rint(n * p + run[1] * spread), first, n + 1))
    low, high = outside_bounds(np.array([first]), np.array([after]), np.array([n]), np.array([p]))
    exact = float(at_most(first - 1, n, p) + at_least(after, n, p))
    assert low[0] <= exact + 1e-300
    assert exact <= high[0] * (1 + 1e-12)


def test_bounds_are_close_where_it_matters() -> None:
    """Two standard errors out at sd = 9.5 they are 6 % apart at most: close enough to leave few places."""
    low, high = outside_bounds(np.array([82]), np.array([120]), np.array([1000]), np.array([0.1]))
    assert 1 < high[0] / low[0] < 1.06


EXTREMES = [
    ("wilson", 1e-6, 1e-5, 0.95, [10_000, 1_000_000]),
    ("clopper-pearson", 1e-6, 1e-5, 0.999999, [1_000_000]),
    ("wald", 1e-4, 1e-3, 0.95, [20_000]),
    ("wilson", 1 - 1e-4, 1 - 1e-5, 0.99, [50, 100_000]),
    ("jeffreys", 0.0, 1.0, 0.95, [1, 2, 30, 500]),
    ("agresti-coull", 0.499, 0.501, 0.9, [9999, 10_000]),
]


@pytest.mark.parametrize(("name", "low", "high", "confidence", "sizes"), EXTREMES)
def test_extremes_equal_the_engine(name: str, low: float, high: float, confidence: float, sizes: list[int]) -> None:
    tail = tail_of(confidence, "two-sided")
    question = Asked(low, high, (1.0, 1.0), (low + high) / 2, None, "two-sided", tail, ("worst_miss", "mean_miss"))
    found = scan(question, [scanned(CATALOGUE[name], coverage=True)], np.array(sizes)).set_index("n")
    for n in sizes:
        parts = listed(Simple(), [CATALOGUE[name]], n, (low, high), "two-sided", question.tail)
        wanted = figures(parts, question.over, "two-sided")[0]
        assert found.loc[n, "worst_miss"] == pytest.approx(wanted["worst_miss"], rel=1e-9)
        assert found.loc[n, "mean_miss"] == pytest.approx(wanted["mean_miss"], rel=1e-7, abs=1e-13)
