"""Clusters: the fast draws against literal ones, the laws against brute force, the correlation itself."""

import itertools
import math
from collections import Counter

import numpy as np
import pytest
from scipy import stats

from coverage_lab.designs import Classification, Clustered, Layered, Loss, guide
from coverage_lab.designs.cluster_law import NEVER, RandomSizes, cluster_counts, cluster_pairs, joint_law, total_law
from coverage_lab.designs.lens import CLEAR, Lens
from coverage_lab.engine.tally import tally, union

RARE = 1e-7  # a sound run of this file fails once in about 300 000: some 30 tests at this level
LOSING = Lens((0.9, 0.0, 0.1), (0.0, 0.9, 0.1))
ERRING = Lens((0.81, 0.09, 0.1), (0.045, 0.855, 0.1))
ENTANGLED = Lens((0.63, 0.07, 0.3), (0.0475, 0.9025, 0.05))


def two_sample_p(one: dict[str, np.ndarray], other: dict[str, np.ndarray]) -> float:
    """Chi-square test that two lists of samples have one law; rare classes pooled."""
    (first, seen), (second, drawn) = tally(one), tally(other)
    _, places = union([first, second])
    size = max(place.max() for place in places) + 1
    table = np.stack([np.bincount(place, count, size) for place, count in zip(places, (seen, drawn), strict=True)])
    common = table.sum(axis=0) >= 20
    table = np.column_stack([table[:, common], table[:, ~common].sum(axis=1)])
    return float(stats.chi2_contingency(table[:, table.sum(axis=0) > 0]).pvalue)


@pytest.mark.parametrize("lens", [CLEAR, LOSING, ERRING, ENTANGLED], ids=["clear", "losing", "erring", "entangled"])
@pytest.mark.parametrize(
    "frame",
    [Clustered(4, 0.15), Clustered((2, 2, 3, 5), 0.15), Clustered(3, 0.15, cv=0.5)],
    ids=["equal", "listed", "random"],
)
@pytest.mark.parametrize("p", [0.03, 0.4])
def test_fast_draws_have_the_law_of_literal_ones(frame: Clustered, lens: Lens, p: float) -> None:
    """Joint statistics of 40 000 table draws against 40 000 beta-then-binomial draws, thinned unit by unit."""
    n = 12
    assert frame._groups(Counter(frame.sizes(n)), p, lens) is not None, "not drawn by table"
    fast = frame.drawn(p, n, 40_000, np.random.default_rng(1), lens)
    rng = np.random.default_rng(2)
    literal = frame.gather(*lens.seen(*frame.units(p, n, 40_000, rng), rng))
    assert two_sample_p(fast, literal) > RARE


def test_a_wrong_law_is_noticed() -> None:
    rng = np.random.default_rng(3)
    one, other = (Clustered(4, icc).draw(0.4, 12, 40_000, rng) for icc in (0.15, 0.12))
    assert two_sample_p(one, other) < RARE


def test_every_outcome_has_its_own_probability() -> None:
    """A law with a very rare outcome, an impossible one, and steps inside buckets: 400 000 draws of one group."""
    chances = np.array([0.5 - 1e-5, 0.0, 0.3, 0.2 - 1e-5, 2e-5])
    statistics = np.arange(5)[:, None]
    sums = guide.draw_sums([guide.Group(chances, statistics, 1)], 400_000, np.random.default_rng(4))[0]
    seen = np.bincount(sums, minlength=5)
    assert seen[1] == 0
    real = chances > 0
    assert stats.chisquare(seen[real], chances[real] * 400_000).pvalue > RARE


def test_sums_too_wide_for_one_word_are_carried_in_several() -> None:
    """Constant outcomes whose sums fill several 64-bit words come back whole."""
    statistics = np.array([[10**12, 3 * 10**12, 5, 10**15, 10**17]])
    sums = guide.draw_sums([guide.Group(np.ones(1), statistics, 7)], 3, np.random.default_rng(5))
    assert sums.tolist() == [[7 * int(value)] * 3 for value in statistics[0]]


def test_several_groups_add_up() -> None:
    groups = [guide.Group(np.array([0.5, 0.5]), np.array([[0, 1], [1, 0]]), k) for k in (3, 4)]
    sums = guide.draw_sums(groups, 1000, np.random.default_rng(6))
    assert (sums.sum(axis=0) == 7).all()
    assert 3.3 < sums[0].mean() < 3.7


@pytest.mark.parametrize("icc", [0.01, 0.2, 0.9])
@pytest.mark.parametrize("p", [1e-6, 0.1, 0.5])
def test_the_correlation_is_the_stated_one(p: float, icc: float) -> None:
    """Var X = m·p·(1-p)·(1 + (m-1)·icc), from the exact law of a cluster."""
    m = 9
    law = cluster_counts(m, p, icc, CLEAR)
    x = np.arange(m + 1)
    mean = law @ x
    assert mean == pytest.approx(m * p, rel=1e-12)
    assert law @ (x - mean) ** 2 == pytest.approx(m * p * (1 - p) * (1 + (m - 1) * icc), rel=1e-10)


def brute_force(law: np.ndarray, count: int) -> dict[tuple[int, int], float]:
    found: dict[tuple[int, int], float] = {}
    for outcome in itertools.product(range(len(law)), repeat=count):
        key = sum(outcome), sum(x * x for x in outcome)
        found[key] = found.get(key, 0.0) + math.prod(law[x] for x in outcome)
    return found


@pytest.mark.parametrize("p", [0.1, 0.5, 0.9])
def test_joint_law_and_totals_by_brute_force(p: float) -> None:
    law = cluster_counts(4, p, 0.2, CLEAR)
    wanted = brute_force(law, 4)
    events, squares, chance = joint_law(law, 4)
    found = dict(zip(zip(events.tolist(), squares.tolist(), strict=True), chance, strict=True))
    assert set(found) == set(wanted)
    assert all(found[key] == pytest.approx(wanted[key], rel=1e-12) for key in wanted)
    totals, weights = total_law([(law, 2), (law, 2)])
    for x, weight in zip(totals.tolist(), weights, strict=True):
        assert weight == pytest.approx(sum(chance for (total, _), chance in wanted.items() if total == x), rel=1e-12)


def test_a_joint_law_that_is_too_large_is_left_alone() -> None:
    assert joint_law(cluster_counts(60, 0.5, 0.3, CLEAR), 200) is None
    assert Clustered(60, 0.3).law(0.5, 12_000) is None


@pytest.mark.parametrize("lens", [LOSING, ERRING, ENTANGLED], ids=["losing", "erring", "entangled"])
def test_the_law_of_a_recorded_cluster_by_brute_force(lens: Lens) -> None:
    """Every unit of a cluster of 3, every state and every fate."""
    m, p, icc = 3, 0.3, 0.2
    true = cluster_counts(m, p, icc, CLEAR)
    wanted = np.zeros((m + 1, m + 1))
    for events, fates in itertools.product(range(m + 1), itertools.product(range(3), repeat=m)):
        rows = [lens.event] * events + [lens.other] * (m - events)
        chance = math.prod(row[fate] for row, fate in zip(rows, fates, strict=True))
        wanted[fates.count(0), fates.count(1)] += true[events] * chance
    assert np.allclose(cluster_pairs(m, p, icc, lens), wanted, rtol=1e-12, atol=1e-18)


@pytest.mark.parametrize(("mean", "cv"), [(6, 0.5), (25, 0.3), (2, 1.2)])
def test_the_law_of_random_sizes(mean: int, cv: float) -> None:
    """Rounded gamma numbers, at least 1: against scipy's distribution, and against literal draws."""
    sizes = RandomSizes(mean, cv)
    law = sizes.law()
    assert math.fsum(law) == pytest.approx(1, abs=1e-13)
    gamma = stats.gamma(1 / cv**2, scale=mean * cv**2)
    assert law[1] == pytest.approx(gamma.cdf(1.5), rel=1e-12)
    middle = np.arange(2, min(len(law) - 1, 4 * mean))
    assert np.allclose(law[middle], gamma.cdf(middle + 0.5) - gamma.cdf(middle - 0.5), rtol=1e-8, atol=1e-15)
    assert gamma.sf(sizes.largest) <= 2 * NEVER
    drawn = np.bincount(sizes.draw((400, 100), np.random.default_rng(7)).ravel(), minlength=len(law))[: len(law)]
    common = law * 40_000 >= 5
    seen, wanted = ([*x[common], x[~common].sum()] for x in (drawn, law * 40_000))
    assert stats.chisquare(seen, np.array(wanted) * (sum(seen) / sum(wanted))).pvalue > RARE


def test_sizes() -> None:
    assert Clustered(10, 0.1).sizes(95) == (10,) * 10
    assert Clustered(10, 0.1).settle(0.2, 95) == (0.2, 100)
    assert Clustered((3, 4), 0.1).settle(0.2, 7) == (0.2, 7)
    assert Clustered(10, 0.1).draw(0.2, 95, 5, np.random.default_rng(1))["trials"].tolist() == [100]


def test_a_cluster_that_is_lost_whole_is_no_cluster() -> None:
    columns = Layered(Clustered(2, 0.5), (Loss(0.6, 0.6),)).draw(0.5, 10, 2000, np.random.default_rng(8))
    assert columns["clusters"].min() < 5
    assert (columns["clusters"] <= columns["trials"]).all()
    assert ((columns["clusters"] > 0) == (columns["trials"] > 0)).all()


def test_methods_are_told_the_planned_correlation() -> None:
    design = Clustered(10, 0.05, planned_icc=0.01)
    assert design.draw(0.2, 100, 3, np.random.default_rng(1))["planned_icc"].tolist() == [0.01]
    assert design.view(frozenset({"events", "planned_icc"})).law(0.2, 100).columns["planned_icc"].tolist() == [0.01]


def test_a_test_that_errs_inside_clusters_has_the_joint_law_of_its_draws() -> None:
    design = Layered(Clustered(5, 0.2), (Classification(0.9, 0.8),))
    law = design.law(0.2, 20)
    mean = law.weight @ law.columns["events"] / 20
    assert mean == pytest.approx(0.2 * 0.9 + 0.8 * 0.2, rel=1e-12)
