"""The two routes: tallies, streams, workers, kept blocks, measures, the cross-check."""

from pathlib import Path

import numpy as np
import pytest

from coverage_lab.designs import Simple
from coverage_lab.engine import work
from coverage_lab.engine.audit import measure
from coverage_lab.engine.bounds import evaluate
from coverage_lab.engine.cross import cross_check, goodness_of_fit, paired, tail_chances, z_scores
from coverage_lab.engine.kept import Kept
from coverage_lab.engine.measures import measure as measures_of
from coverage_lab.engine.measures import stack
from coverage_lab.engine.tally import joined, merged, simulated, tally, union
from coverage_lab.engine.work import Block, Cell
from coverage_lab.intervals import CATALOGUE
from coverage_lab.plan import make_plan
from coverage_lab.records import Plan


def plan(**changes) -> Plan:
    keys = {
        "outcome": {"range": [0.005, 0.05]},
        "sample": {"n": 60},
        "simulation": {"replicates": 4000, "seed": 7, "grid": [0.005, 0.02, 0.05]},
        "methods": {"only": ["wilson", "clopper-pearson", "wald"]},
    }
    return make_plan({**keys, **changes})


def test_a_tally_counts_equal_samples_once() -> None:
    columns = {"events": np.array([3, 1, 3, 0]), "others": np.array([5, 5, 5, 9]), "trials": np.array([9])}
    distinct, counts = tally(columns)
    rows = set(zip(distinct["events"], distinct["others"], counts, strict=True))
    assert rows == {(3, 5, 2), (1, 5, 1), (0, 9, 1)}
    assert list(distinct["trials"]) == [9]


def test_a_tally_of_far_apart_values_needs_no_dense_array() -> None:
    columns = {"events": np.array([0, 10**7, 0]), "trials": np.array([10**7, 10**7, 10**7 + 1])}
    distinct, counts = tally(columns)
    assert sorted(zip(distinct["events"], distinct["trials"], counts, strict=True)) == [
        (0, 10**7, 1),
        (0, 10**7 + 1, 1),
        (10**7, 10**7, 1),
    ]


def test_tallies_merge_in_any_order() -> None:
    shares = [tally({"events": np.array(x), "trials": np.array([9])}) for x in ([0, 0, 0], [0, 4, 4], [1, 0, 4])]
    first, second = merged(shares), merged(shares[::-1])
    assert list(first[0]["events"]) == list(second[0]["events"]) == [0, 1, 4]
    assert list(first[1]) == list(second[1]) == [5, 1, 3]


def test_a_union_says_where_each_list_stands() -> None:
    lists = [
        {"events": np.array([5, 2]), "trials": np.array([9])},
        {"events": np.array([2, 7]), "trials": np.array([9])},
    ]
    columns, places = union(lists)
    for samples, place in zip(lists, places, strict=True):
        assert list(columns["events"][place]) == list(samples["events"])
    assert len(columns["events"]) == 3
    assert len(joined(lists)["trials"]) == 1


def test_streams_do_not_depend_on_the_rest_of_the_grid() -> None:
    few, many = plan(), plan(simulation={"replicates": 4000, "seed": 7, "grid": [0.05, 0.03, 0.02]})
    a, b = (work.simulate(p, work.cells(p)) for p in (few, many))
    cell = Cell(60, 0.02)
    assert list(a[cell].weight) == list(b[cell].weight)
    other = work.stream(Simple(), Block(cell, 0, 10), 8).random(4)
    assert list(other) != list(work.stream(Simple(), Block(cell, 0, 10), 7).random(4))


def test_one_worker_and_two_give_the_same_draws(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(work, "POOL_WORTH", 0.0)
    monkeypatch.setattr(work, "BLOCK", 1000)
    p = plan()
    one, two = (work.simulate(p, work.cells(p), workers) for workers in (1, 2))
    for cell, outcomes in one.items():
        assert list(outcomes.weight) == list(two[cell].weight)
        assert list(outcomes.columns["events"]) == list(two[cell].columns["events"])
        assert two[cell].draws == 4000


def test_an_interrupted_run_goes_on_where_it_was(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    monkeypatch.setattr(work, "POOL_WORTH", 0.0)
    monkeypatch.setattr(work, "BLOCK", 500)
    p, keep = plan(), tmp_path / "kept"
    whole = work.simulate(p, work.cells(p))

    def stop_half_way(label: str, share: float) -> None:
        if share > 0.5:
            raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        work.simulate(p, work.cells(p), 1, stop_half_way, keep)
    with Kept(keep) as kept:
        assert kept.get(work.identity(p.design, Block(Cell(60, 0.005), 3, 500), 7)) is not None
    drawn = []
    original = work.draw_block
    monkeypatch.setattr(work, "draw_block", lambda *block: drawn.append(block) or original(*block))
    resumed = work.simulate(p, work.cells(p), 1, None, keep)
    assert len(drawn) < 0.6 * 24
    assert not keep.exists()
    for cell, outcomes in whole.items():
        assert list(outcomes.weight) == list(resumed[cell].weight)


@pytest.mark.parametrize("side", ["two-sided", "upper", "lower"])
def test_enumerated_and_simulated_agree_within_four_standard_errors(side: str) -> None:
    """Failure budget: 9 cells of 3 methods at |z| < 4, chance below 27 x 6.4e-5 = 0.2 %; the seed is fixed."""
    measured = measure(plan(side=side))
    both = paired(measured.cells)
    assert len(both) == 9
    assert np.abs(both["z"]).max() < 4
    assert measured.cross_check.chi_square_p > 1e-4


def test_a_biased_simulation_is_caught() -> None:
    """Draws at a slightly wrong p: both tests of the cross-check must see it."""
    n, p, draws = 60, 0.05, 200_000
    law = Simple().law(p, n)
    wrong = simulated(*tally(Simple().draw(p + 0.003, n, draws, np.random.default_rng(1))))
    right = simulated(*tally(Simple().draw(p, n, draws, np.random.default_rng(1))))
    _, places = union([law.columns, wrong.columns])
    statistic, freedom = goodness_of_fit(law, wrong, tuple(places))
    assert statistic > 3 * freedom
    _, places = union([law.columns, right.columns])
    statistic, freedom = goodness_of_fit(law, right, tuple(places))
    assert statistic < 3 * freedom


def test_certain_coverage_allows_no_difference() -> None:
    exact, drawn, draws = np.array([1.0, 1.0, 0.0, 0.95]), np.array([1.0, 0.999, 0.0, 0.95]), np.full(4, 1000.0)
    assert list(z_scores(exact, drawn, draws)) == [0.0, -np.inf, 0.0, 0.0]
    assert tail_chances(exact, drawn, draws)[1] == 0.0
    assert (tail_chances(exact, drawn, draws)[[0, 2, 3]] > 0.9).all()


def test_simulated_shares_carry_the_binomial_standard_error() -> None:
    """sqrt(C(1-C)/R) (Morris, White & Crowther 2019): .005 takes 1900 draws at C = .95."""
    n = 50
    drawn = simulated(*tally(Simple().draw(0.1, n, 1900, np.random.default_rng(3))))
    limits = stack([evaluate(CATALOGUE["wilson"], drawn.columns, "two-sided", 0.025)])
    values = measures_of(drawn, limits, 0.1, "two-sided")
    c = values["coverage"][0]
    assert values["standard_error"][0] == pytest.approx(np.sqrt(c * (1 - c) / 1900))
    assert np.sqrt(0.95 * 0.05 / 1900) == pytest.approx(0.005, abs=1e-12)
    widths = np.repeat((limits.upper - limits.lower)[0], np.rint(drawn.weight * 1900).astype(int))
    assert values["mean_width_error"][0] == pytest.approx(widths.std() / np.sqrt(1900))


def test_a_left_out_route_leaves_no_figures() -> None:
    exact = measure(plan(simulation={"routes": ["enumerated"], "grid": [0.02]}))
    assert set(exact.cells["route"]) == {"enumerated"}
    assert exact.cross_check is None
    assert exact.methods["simulated_coverage_min"].isna().all()
    drawn = measure(plan(simulation={"routes": ["simulated"], "grid": [0.02], "replicates": 500}))
    assert set(drawn.cells["route"]) == {"simulated"}
    assert drawn.curve.empty
    assert set(drawn.methods["minimum_is"]) == {"simulated"}


def test_cells_are_one_row_each() -> None:
    p = plan(simulation={"replicates": 100, "grid": [0.02, 0.02, 0.05]}, sample={"candidates": [50, 60]})
    cells = measure(p).cells
    assert len(cells) == 2 * 2 * 3 * 2
    assert not cells.duplicated(["n", "p", "method", "route"]).any()
    total = cells["coverage"] + cells["missed_below"] + cells["missed_above"]
    assert total.to_numpy() == pytest.approx(1.0, abs=1e-13)


def test_no_cross_check_without_pairs() -> None:
    cells = measure(plan()).cells
    assert cross_check(cells[cells["route"] == "simulated"], []) is None
