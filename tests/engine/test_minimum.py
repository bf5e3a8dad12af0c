"""The certified infimum: published and derived minima, a covering set with a gap, shared end points, a fine scan."""

import numpy as np
import pytest
from scipy import stats

from coverage_lab.designs import Simple
from coverage_lab.engine.branch import branch_and_bound
from coverage_lab.engine.exact import listed, minimum_of
from coverage_lab.engine.minimum import Piece, covering_runs, identity, minimum, segments
from coverage_lab.intervals import CATALOGUE


def piece(method: str, n: int, confidence: float = 0.95, change=None) -> Piece:
    tail = (1 - confidence) / 2
    lower, upper = (np.clip(x, 0, 1) for x in CATALOGUE[method].function(np.arange(n + 1), np.array([n]), tail))
    if change is not None:
        change(lower, upper)
    return Piece(n, 1.0, 0, lower, upper)


def scan(item: Piece, low: float, high: float, points: int = 20_001) -> float:
    """The smallest coverage on a fine grid, by scipy's binomial distribution."""
    p = np.linspace(low, high, points)[:, None]
    x = np.arange(item.trials + 1)
    covers = (item.lower <= p) & (p <= item.upper)
    return float((stats.binom.pmf(x, item.trials, p) * covers).sum(axis=1).min())


def with_a_gap(lower: np.ndarray, upper: np.ndarray) -> None:
    lower[1], upper[1] = 0.2, 0.45


def test_a_minimum_inside_a_segment_is_found() -> None:
    """Derived by hand: with [.2, .45] for x = 1 of n = 10 the covering set is {0, 2, 3, 4} on this open segment."""
    left, right = 0.10779126740630, 0.16818032970624
    found = minimum([piece("wilson", 10, change=with_a_gap)], left, right)
    assert found.coverage == pytest.approx(0.5962296, abs=1e-7)
    assert found.at == pytest.approx(0.117494, abs=2e-6)
    assert found.certified
    ends = segments([piece("wilson", 10, change=with_a_gap)], left, right)
    assert not ends.ordered.any()
    assert found.coverage < 0.59723 < 0.60763


def test_shared_end_points_are_one() -> None:
    """Blaker's limits share end points exactly; taken as two they leave slivers with a false .9379 between them."""
    assert minimum([piece("blaker", 250)], 0.0, 1.0).coverage == pytest.approx(0.9500, abs=5e-5)


@pytest.mark.parametrize("method", ["wald", "wilson", "clopper-pearson", "logit", "cloglog", "mid-p", "arcsine"])
@pytest.mark.parametrize("n", [7, 40, 250])
@pytest.mark.parametrize("confidence", [0.8, 0.95, 0.999])
def test_never_above_a_fine_scan(method: str, n: int, confidence: float) -> None:
    """A scan sees no less than the infimum, and on a fine grid not much more."""
    item = piece(method, n, confidence)
    seen = scan(item, 0.01, 0.9, 4001)
    found = minimum([item], 0.01, 0.9).coverage
    assert found <= seen + 1e-12
    assert found >= seen - 0.05 * max(1 - seen, 0.01) - 0.03


@pytest.mark.parametrize("seed", range(12))
def test_any_order_of_limits_is_measured(seed: int) -> None:
    """Limits shuffled at random: branch-and-bound agrees with a scan refined around its own minimum."""
    rng = np.random.default_rng(seed)

    def shuffle(lower: np.ndarray, upper: np.ndarray) -> None:
        rows = rng.permutation(len(lower))[:4]
        lower[rows], upper[rows] = lower[np.sort(rows)], upper[np.sort(rows)]

    item = piece("wilson", 15, change=shuffle)
    found = minimum([item], 0.02, 0.97)
    assert found.coverage <= scan(item, 0.02, 0.97) + 1e-10
    near = np.clip([found.at - 1e-9, found.at, found.at + 1e-9], 0, 1)
    assert min(scan(item, p, p, 1) for p in near) == pytest.approx(found.coverage, abs=1e-6)


def test_branch_and_bound_equals_the_end_points_where_sets_are_runs() -> None:
    item = piece("clopper-pearson", 30)
    cut = segments([item], 0.05, 0.6)
    runs = covering_runs([item], (cut.left + cut.right) / 2)
    coverage, _ = branch_and_bound(runs, cut.left, cut.right, identity, 1.0)
    assert coverage == pytest.approx(minimum([item], 0.05, 0.6).coverage, abs=1e-10)


def test_one_proportion_is_a_range_too() -> None:
    item = piece("wald", 30)
    for p in (0.0, 0.2, 1.0):
        assert minimum([item], p, p).coverage == pytest.approx(scan(item, p, p, 1), abs=1e-13)
    gap = piece("wilson", 10, change=with_a_gap)
    assert minimum([gap], 0.12, 0.12).coverage == pytest.approx(scan(gap, 0.12, 0.12, 1), abs=1e-13)


@pytest.mark.parametrize(("n", "low", "high"), [(20_000, 0.0, 1.0), (1_000_000, 1e-5, 1e-4)])
def test_large_n(n: int, low: float, high: float) -> None:
    """Clopper-Pearson keeps its promise at any n (Clopper & Pearson 1934, Biometrika 26:404)."""
    parts = listed(Simple(), [CATALOGUE["clopper-pearson"]], n, (low, high), "two-sided", 0.025)
    found = minimum_of(parts, 0, low, high)
    assert 0.95 - 1e-12 <= found.coverage < 0.957


def test_misses_keep_their_digits_at_high_confidence() -> None:
    """At confidence 0.999999 Clopper-Pearson's miss rate stays below 1e-6, to relative accuracy."""
    parts = listed(Simple(), [CATALOGUE["clopper-pearson"]], 200, (0.0, 1.0), "two-sided", 5e-7)
    found = minimum_of(parts, 0, 0.0, 1.0)
    assert 5e-7 < found.miss <= 1e-6 * (1 + 1e-9)
