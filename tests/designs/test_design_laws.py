"""Laws over all designs: probabilities sum to 1, draws agree with them, the truth is the population's proportion."""

import math

import numpy as np
import pytest
from design_cases import CASES, FRAMES, LAYERS, STRATA, Case
from scipy.special import chdtrc

from coverage_lab.designs import Classification, Clustered, Finite, Layered, Loss, Simple, Stratified
from coverage_lab.designs.lens import CLEAR
from coverage_lab.engine.cross import goodness_of_fit
from coverage_lab.engine.exact import figures, listed
from coverage_lab.engine.means import Range
from coverage_lab.engine.tally import simulated, tally, union
from coverage_lab.intervals import CATALOGUE, EVERY
from coverage_lab.records import Design

TRUTHS = (0.0, 0.02, 0.3, 0.97, 1.0)
DRAWS = 20_000
RARE = 1e-7  # a sound run fails once in about 70 000: some 140 fits at this level
PLAIN = [method for method in CATALOGUE.values() if "two-sided" in method.sides and method.largest_n is None]

by_case = pytest.mark.parametrize("case", CASES, ids=lambda case: case.name)


def settled(case: Case, p: float) -> float:
    return case.design.settle(p, case.n)[0]


@by_case
@pytest.mark.parametrize("p", TRUTHS)
def test_probabilities_sum_to_one(case: Case, p: float) -> None:
    for design in case.views():
        law = design.law(settled(case, p), case.n)
        if law is not None:
            assert math.fsum(law.weight) == pytest.approx(1, abs=1e-12)
            assert (law.weight > 0).all()
            assert set(law.columns) == set(design.columns)
    parts = [design.parts(case.n) for design in case.views()]
    assert all(math.fsum(part.weight for part in found) == pytest.approx(1, abs=1e-12) for found in parts if found)


@by_case
def test_samples_are_possible(case: Case) -> None:
    """Drawn or listed: 0 <= events <= trials <= n, and the columns are the stated ones."""
    rng = np.random.default_rng(1)
    for design in case.views():
        law = design.law(settled(case, 0.3), case.n)
        drawn = design.draw(settled(case, 0.3), case.n, 500, rng)
        for columns in (drawn, *([law.columns] if law else [])):
            assert set(columns) == set(design.columns)
            assert (columns["events"] >= 0).all()
            assert (columns["events"] <= columns["trials"]).all()
            if "random" not in case.name:
                assert (columns["trials"] <= case.n).all()


@by_case
def test_draws_agree_with_the_law(case: Case) -> None:
    """Chi-square goodness of fit of 20 000 draws, classes pooled to at least 5 expected draws."""
    for k, design in enumerate(case.views()):
        p = settled(case, 0.12)
        law = design.law(p, case.n)
        if law is None:
            continue
        columns = design.draw(p, case.n, DRAWS, np.random.default_rng([11, k]))
        drawn = simulated(*tally(columns))
        places = union([law.columns, drawn.columns])[1]
        statistic, freedom = goodness_of_fit(law, drawn, (places[0], places[1]))
        assert freedom > 0
        assert chdtrc(freedom, statistic) > RARE


@pytest.mark.parametrize("frame", FRAMES)
@pytest.mark.parametrize("stack", LAYERS)
def test_the_truth_is_the_population_proportion(frame: str, stack: str) -> None:
    """The mean record is what the layers make of p true events per unit, within 5 standard errors; p itself stays."""
    bare, n = FRAMES[frame]
    design = Layered(bare, LAYERS[stack]) if LAYERS[stack] else bare
    p, _ = design.settle(0.3, n)
    assert p == bare.settle(0.3, n)[0]
    assert abs(p - 0.3) <= 1 / 800
    columns = design.draw(p, n, DRAWS, np.random.default_rng(3))
    wanted = recorded_shares(design, bare, p, n)
    total = columns["trials"] / (1 - wanted[2])
    gap = columns["events"] - wanted[0] * (total if len(total) > 1 else total[0])
    assert abs(gap.mean()) < 5 * gap.std() / math.sqrt(DRAWS)


def recorded_shares(design: Design, bare: Design, p: float, n: int) -> np.ndarray:
    """Shares of the planned units that are recorded as events, as others, and lost, by the layers' chances."""
    lens = design.lens if isinstance(design, Layered) else CLEAR
    shares, sizes = (bare.proportions(p), bare.sizes(n)) if isinstance(bare, Stratified) else (np.array([p]), [n])
    true = np.array([np.average(shares, weights=sizes), 1 - np.average(shares, weights=sizes)])
    return true @ np.array([lens.event, lens.other])


SAME = {
    "finite, endless": (Finite(math.inf), 60),
    "a perfect test": (Layered(Simple(), (Classification(1.0, 1.0),)), 60),
    "nothing lost": (Layered(Simple(), (Loss(0.0, 0.0),)), 60),
    "all three": (Layered(Finite(math.inf), (Loss(0.0, 0.0, "events"), Classification(1.0, 1.0))), 60),
    "clusters without correlation": (Clustered(6, 0.0), 60),
    "listed clusters without correlation": (Clustered((10, 20, 30), 0.0), 60),
    "clusters and layers that do nothing": (
        Layered(Clustered(6, 0.0), (Loss(0.0, 0.0), Classification(1.0, 1.0))),
        60,
    ),
}
RANGES = [Range(0.05, 0.2, (1.0, 1.0)), Range(0.3, 0.3, (1.0, 1.0)), Range(0.0, 1.0, (2.0, 5.0))]


@pytest.mark.parametrize("name", SAME)
@pytest.mark.parametrize("p", [1e-12, 0.013, 0.3, 0.5, 0.999])
def test_a_design_without_effect_has_the_simple_law_digit_for_digit(name: str, p: float) -> None:
    design, n = SAME[name]
    law, simple = design.view(frozenset({"events", "trials"})).law(p, n), Simple().law(p, n)
    assert law.weight.tolist() == simple.weight.tolist()
    assert law.columns["events"].tolist() == simple.columns["events"].tolist()
    assert law.columns["trials"].tolist() == [n]


@pytest.mark.parametrize("name", SAME)
@pytest.mark.parametrize("over", RANGES, ids=lambda over: f"{over.low}-{over.high}")
def test_a_design_without_effect_has_the_simple_figures_digit_for_digit(name: str, over: Range) -> None:
    design, n = SAME[name]
    view = design.view(frozenset({"events", "trials"}))
    found, simple = (
        figures(listed(d, PLAIN, n, (over.low, over.high), "two-sided", 0.025), over, "two-sided")
        for d in (view, Simple())
    )
    assert found == simple


TWINS = {
    "wilson-fpc": ("wilson", Finite(math.inf)),
    "hypergeometric-exact": ("clopper-pearson", Finite(math.inf)),
    "hypergeometric-mid-p": ("mid-p", Finite(math.inf)),
    "wilson-deff-planned": ("wilson", Clustered(6, 0.0)),
    "clopper-pearson-deff-planned": ("clopper-pearson", Clustered(6, 0.0)),
    **{
        f"corrected-{name}": (name, Layered(Simple(), (Classification(1.0, 1.0),)))
        for name in ("wilson", "clopper-pearson", "jeffreys", "mid-p", "blaker")
    },
}


@pytest.mark.parametrize("name", TWINS)
def test_a_method_without_anything_to_correct_is_its_plain_twin_digit_for_digit(name: str) -> None:
    twin, design = TWINS[name]
    over = Range(0.02, 0.4, (1.0, 1.0))
    sides: list[tuple[Design, str]] = [(design.view(frozenset(EVERY[name].needs)), name), (Simple(), twin)]
    found, simple = (
        figures(listed(d, [EVERY[m]], 60, (over.low, over.high), "two-sided", 0.025), over, "two-sided")
        for d, m in sides
    )
    assert found == simple


@pytest.mark.parametrize("population", [10**4, 10**6])
def test_a_large_population_comes_near_the_simple_figures(population: int) -> None:
    """The difference shrinks like n/N."""
    over = Range(0.1, 0.3, (1.0, 1.0))
    rows = [
        figures(listed(d, PLAIN[:3], 40, (over.low, over.high), "two-sided", 0.025), over, "two-sided")
        for d in (Finite(population), Simple())
    ]
    for finite, simple in zip(*rows, strict=True):
        assert finite["mean_coverage"] == pytest.approx(simple["mean_coverage"], abs=2 * 40 / population)
        assert finite["mean_width"] == pytest.approx(simple["mean_width"], abs=2 * 40 / population)


def test_one_stratum_and_equal_ratios_have_the_simple_totals() -> None:
    same = Stratified(tuple(type(s)(s.name, s.weight, s.size) for s in STRATA))
    totals = same.view(frozenset({"events", "trials"})).law(0.2, 100)
    simple = Simple().law(0.2, 100)
    rows = np.isin(totals.columns["events"], simple.columns["events"])
    assert np.allclose(totals.weight[rows], simple.weight, rtol=1e-9, atol=1e-17)
