"""Layers: one stochastic matrix each, their product, the treatments of what is lost, the errors of a test."""

import numpy as np
import pytest

from coverage_lab.designs import Classification, Clustered, Layered, Loss, Simple
from coverage_lab.designs.lens import CLEAR, Lens, stacked
from coverage_lab.engine.exact import listed, means_of, minimum_of
from coverage_lab.engine.means import Range
from coverage_lab.engine.search import figures as searched
from coverage_lab.intervals import CATALOGUE, EVERY

TAIL = 0.025
LAYERS = [
    Classification(0.9, 0.95),
    Classification(0.9, 0.95, 50, 100),
    Loss(0.1, 0.3),
    Loss(0.1, 0.3, "events"),
    Loss(0.0, 0.0),
]


@pytest.mark.parametrize("layer", LAYERS, ids=repr)
def test_matrices_are_stochastic(layer: Classification | Loss) -> None:
    for matrix in (layer.matrix, layer.treatment):
        assert matrix.shape == (3, 3)
        assert (matrix >= 0).all()
        assert np.allclose(matrix.sum(axis=1), 1, atol=1e-15)
        assert matrix[2, 2] in (0, 1)


def test_a_stack_is_a_product_in_the_order_in_which_layers_act() -> None:
    found = Layered(Simple(), (Loss(0.2, 0.1), Classification(0.9, 0.7))).lens
    assert np.allclose(found.event, (0.8 * 0.9, 0.8 * 0.1, 0.2))
    assert np.allclose(found.other, (0.9 * 0.3, 0.9 * 0.7, 0.1))
    swapped = Layered(Simple(), (Classification(0.9, 0.7), Loss(0.2, 0.1))).lens
    assert np.allclose(swapped.event, (0.9 * 0.8, 0.1 * 0.9, 0.9 * 0.2 + 0.1 * 0.1))
    assert stacked([]) == CLEAR


@pytest.mark.parametrize(
    ("treatment", "event", "other"),
    [
        ("excluded", (0.72, 0.08, 0.2), (0.27, 0.63, 0.1)),
        ("events", (0.92, 0.08, 0.0), (0.37, 0.63, 0.0)),
        ("non-events", (0.72, 0.28, 0.0), (0.27, 0.73, 0.0)),
    ],
)
def test_the_lost_are_treated_last(treatment: str, event: tuple, other: tuple) -> None:
    found = Layered(Simple(), (Loss(0.2, 0.1, treatment), Classification(0.9, 0.7))).lens
    assert np.allclose(found.event, event)
    assert np.allclose(found.other, other)


def test_three_analyses_have_three_coverages() -> None:
    """8 % lost of 100: left out, counted as events, counted as non-events; only the first is near the nominal 95 %."""
    coverage = {}
    for treatment in ("excluded", "events", "non-events"):
        design = Layered(Simple(), (Loss(0.08, 0.08, treatment),))
        parts = listed(design, [CATALOGUE["wilson"]], 100, (0.1, 0.1), "two-sided", TAIL)
        coverage[treatment] = minimum_of(parts, 0, 0.1, 0.1).coverage
    assert coverage["excluded"] > 0.93
    assert coverage["events"] < 0.4
    assert coverage["non-events"] == pytest.approx(0.93, abs=0.03)
    assert len(set(coverage.values())) == 3


@pytest.mark.parametrize("method", ["wilson", "clopper-pearson", "jeffreys", "blaker"])
def test_a_known_test_only_moves_the_range(method: str) -> None:
    """Coverage of the mapped limits at p is that of the plain ones at pSe + (1-p)(1-Sp), so are minima and means."""
    se, sp, n = 0.9, 0.85, 70
    design = Layered(Simple(), (Classification(se, sp),))
    low, high = 0.05, 0.4
    ends = tuple(p * se + (1 - p) * (1 - sp) for p in (low, high))
    mapped = listed(design, [EVERY[f"corrected-{method}"]], n, (low, high), "two-sided", TAIL)
    plain = listed(Simple(), [EVERY[method]], n, ends, "two-sided", TAIL)
    found, wanted = minimum_of(mapped, 0, low, high), minimum_of(plain, 0, *ends)
    assert found.certified
    assert found.coverage == pytest.approx(wanted.coverage, abs=1e-11)
    assert found.at * se + (1 - found.at) * (1 - sp) == pytest.approx(wanted.at, abs=1e-11)
    uniform = (1.0, 1.0)
    means = [means_of(p, Range(*r, uniform), "two-sided") for p, r in ((mapped, (low, high)), (plain, ends))]
    for name in ("missed_below", "missed_above"):
        assert means[0][name][0] == pytest.approx(means[1][name][0], abs=1e-11)


def test_means_under_another_prior_agree_with_the_closed_form() -> None:
    """Truth by truth, under weights that make the closed form impossible; then nearly uniform ones against it."""
    design = Layered(Simple(), (Classification(0.9, 0.85),))
    parts = listed(design, [EVERY["corrected-wilson"]], 60, (0.1, 0.3), "two-sided", TAIL)
    closed, points = (means_of(parts, Range(0.1, 0.3, prior), "two-sided") for prior in ((1.0, 1.0), (1.0 + 1e-9, 1.0)))
    for name, values in closed.items():
        assert points[name][0] == pytest.approx(values[0], abs=5e-5), name


def test_false_positives_set_a_floor() -> None:
    """With specificity .99 and 250 units the plain interval misses a true 0.5 % half of the time."""
    design = Layered(Simple(), (Classification(0.95, 0.99),))
    parts = listed(design, [CATALOGUE["wilson"]], 250, (0.005, 0.005), "two-sided", TAIL)
    assert minimum_of(parts, 0, 0.005, 0.005).coverage < 0.6


def test_what_nothing_needs_is_not_estimated() -> None:
    """Methods that do not ask for the validation counts see the known test behind them: exact parts."""
    design = Layered(Simple(), (Classification(0.9, 0.95, 50, 100),))
    assert design.parts(100) is None
    assert len(design.law(0.1, 100).weight) > 10_000
    plain = design.view(frozenset({"events", "trials"}))
    assert plain == Layered(Simple(), (Classification(0.9, 0.95),))
    assert len(plain.parts(100)) == 1
    assert design.view(frozenset(EVERY["corrected-adjusted"].needs)) == design
    assert design.view(frozenset(EVERY["corrected-wilson"].needs)) == design


def test_estimates_are_drawn_anew_in_every_sample() -> None:
    columns = Layered(Simple(), (Classification(0.9, 0.95, 50, 100),)).draw(0.1, 100, 4000, np.random.default_rng(1))
    assert columns["sensitivity"].std() == pytest.approx((0.9 * 0.1 / 50) ** 0.5, rel=0.1)
    assert columns["specificity"].mean() == pytest.approx(0.95, abs=0.002)
    assert np.array_equal(columns["sensitivity"], columns["diseased_positive"] / 50)


def test_methods_are_told_the_planned_chances() -> None:
    design = Layered(Simple(), (Classification(0.9, 0.95, planned_sensitivity=1.0),))
    assert design.law(0.1, 30).columns["sensitivity"].tolist() == [1.0]
    assert design.law(0.1, 30).columns["specificity"].tolist() == [0.95]
    assert design.lens.event[0] == 0.9


def test_a_lens_keeps_whole_units() -> None:
    rng = np.random.default_rng(2)
    events, others = rng.binomial(20, 0.3, (500, 4)), rng.binomial(20, 0.7, (500, 4))
    x, y = Lens((0.5, 0.2, 0.3), (0.1, 0.9, 0.0)).seen(events, others, rng)
    assert ((x >= 0) & (y >= 0) & (x + y <= events + others)).all()
    assert x.mean() == pytest.approx(events.mean() * 0.5 + others.mean() * 0.1, rel=0.05)
    assert Lens().seen(events, others, rng) == (events, others)


def test_random_loss_is_a_mixture_and_its_minimum_that_of_a_dense_scan() -> None:
    design = Layered(Simple(), (Loss(0.1, 0.1),))
    methods = [CATALOGUE[name] for name in ("wilson", "wald")]
    parts = listed(design, methods, 40, (0.05, 0.3), "two-sided", TAIL)
    assert sum(part.part.weight for part in parts) == pytest.approx(1, abs=1e-12)
    over = Range(0.05, 0.3, (1.0, 1.0))
    rows, every = searched(design, methods, 40, over, "two-sided", TAIL)
    assert not every
    for k, row in enumerate(rows):
        found = minimum_of(parts, k, 0.05, 0.3)
        assert found.certified
        assert found.coverage <= row["minimum_coverage"] + 1e-9
        assert found.coverage == pytest.approx(row["minimum_coverage"], abs=2e-3)
        seen = [minimum_of(parts, k, float(p), float(p)).coverage for p in np.linspace(0.05, 0.3, 101)]
        assert found.coverage <= min(seen) + 1e-10
        assert found.coverage == pytest.approx(min(seen), abs=1e-2)


def test_loss_in_clusters_is_drawn_unit_by_unit() -> None:
    design = Layered(Clustered(10, 0.1), (Loss(0.1, 0.1),))
    trials = design.draw(0.3, 100, 4000, np.random.default_rng(3))["trials"]
    assert trials.mean() == pytest.approx(90, abs=0.3)
    assert trials.var() == pytest.approx(9, rel=0.15)
