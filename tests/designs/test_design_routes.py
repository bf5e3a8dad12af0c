"""Which figures are certified, searched or simulated; that the routes agree; the catalogues of designs and methods."""

from dataclasses import replace

import numpy as np
import pandas as pd
import pytest
from design_cases import FRAMES, LAYERS, STRATA

from coverage_lab import designs
from coverage_lab.designs import Classification, Clustered, Finite, Layered, Loss, Simple, Stratified, preferred
from coverage_lab.engine.audit import measure
from coverage_lab.engine.bounds import inapplicable
from coverage_lab.engine.means import Range
from coverage_lab.engine.search import figures as searched
from coverage_lab.intervals import CATALOGUE, DESIGN_AWARE, EVERY
from coverage_lab.plan import make_plan
from coverage_lab.records import Design, Measurements, Plan

SOME = ("wilson", "clopper-pearson", "wald", *DESIGN_AWARE)
SLOW = ("corrected-blaker", "corrected-mid-p")


def plan_for(design: Design, n: int, low: float, high: float, replicates: int = 4000) -> Plan:
    plan = make_plan(
        {
            "outcome": {"name": "event", "range": [low, high]},
            "sample": {"n": n},
            "simulation": {"replicates": replicates, "seed": 3, "grid": [low, (low + high) / 2, high]},
        }
    )
    methods = tuple(
        EVERY[name]
        for name in SOME
        if name not in SLOW and inapplicable(EVERY[name], design.columns, n, "two-sided") is None
    )
    return replace(plan, design=design, methods=methods, prefer=methods[:1])


ROUTES = {
    "simple-clear": "certified",
    "simple-known": "certified",
    "simple-lost": "certified",
    "simple-lost_by_outcome": "searched",
    "simple-lost_as_events": "certified",
    "finite-clear": "certified",
    "finite-known": "certified",
    "finite-lost": "certified",
    "finite-lost_by_outcome_and_known": "simulated",
    "endless-clear": "certified",
    "random-clear": "simulated",
    "clusters-lost": "simulated",
}
BY_METHOD = {
    "simple-estimated": {"wilson": "certified", "corrected-adjusted": "searched", "corrected-wilson": "searched"},
    "clusters-clear": {"wilson": "searched", "wilson-deff-planned": "searched", "korn-graubard": "searched"},
    "clusters-known": {"corrected-wilson": "searched", "corrected-korn-graubard": "searched"},
    "listed-clear": {"wilson-deff-planned": "searched", "korn-graubard": "simulated"},
    "independent-clear": {"wilson": "certified", "wilson-deff-planned": "certified", "cluster-wald": "searched"},
    "strata-clear": {"wilson": "searched", "stratified-wilson": "searched"},
    "strata-lost": {"wilson": "simulated", "stratified-wilson": "simulated"},
}
MEASURED: dict[str, Measurements] = {}


def measured(name: str) -> Measurements:
    """Each case measured once."""
    if name not in MEASURED:
        frame, stack = name.split("-")
        design, n = FRAMES[frame]
        layered = Layered(design, LAYERS[stack]) if LAYERS[stack] else design
        MEASURED[name] = measure(plan_for(layered, n, 0.05, 0.25))
    return MEASURED[name]


@pytest.mark.parametrize("name", [*ROUTES, *BY_METHOD])
def test_what_a_minimum_is_follows_from_what_the_design_offers(name: str) -> None:
    found = measured(name).methods.set_index("method")["minimum_is"]
    if name in ROUTES:
        assert set(found) == {ROUTES[name]}
    else:
        assert {method: found[method] for method in BY_METHOD[name]} == BY_METHOD[name]


@pytest.mark.parametrize("name", [*ROUTES, *BY_METHOD])
def test_the_routes_agree(name: str) -> None:
    """All cells and methods, Bonferroni p at least 1e-4; the tallies' goodness of fit too."""
    check = measured(name).cross_check
    if check is not None:
        assert check.p_value > 1e-4
        assert check.chi_square_p > 1e-6


@pytest.mark.parametrize("name", [*ROUTES, *BY_METHOD])
def test_no_minimum_is_above_what_was_seen(name: str) -> None:
    """An exact or searched minimum is at most every enumerated coverage of the range's cells."""
    result = measured(name)
    exact = result.cells[result.cells["route"] == "enumerated"]
    if exact.empty:
        return
    least = exact.groupby("method")["coverage"].min()
    table = result.methods.set_index("method").loc[least.index]
    assert (table["minimum_coverage"] <= least + 1e-9).all()
    assert (table["minimum_at"].between(0.05, 0.25)).all()


@pytest.mark.parametrize("name", [*ROUTES, *BY_METHOD])
def test_every_figure_is_there(name: str) -> None:
    table = measured(name).methods
    columns = ["minimum_coverage", "minimum_at", "worst_miss", "mean_coverage", "mean_width", "missed_below"]
    assert not table[columns].isna().to_numpy().any()
    cells = measured(name).cells
    assert not cells.duplicated(["n", "p", "method", "route"]).any()
    assert set(cells["method"]) == set(table["method"])


def test_neighbours_are_looked_at_where_that_is_exact() -> None:
    assert set(measured("finite-clear").steady["n"]) == set(range(57, 64))
    assert measured("clusters-clear").steady.empty
    lost = measured("simple-lost").steady
    assert set(lost["method"]) == {"wilson"}


def test_a_search_finds_the_jumps() -> None:
    """A clustered design without correlation, searched instead of certified: the same minima to a millionth."""
    design = Clustered(6, 0.0).view(frozenset({"events", "trials"}))
    methods = [CATALOGUE[name] for name in ("wilson", "clopper-pearson", "wald", "jeffreys", "logit")]
    rows, every = searched(design, methods, 60, Range(0.05, 0.25, (1.0, 1.0)), "two-sided", 0.025)
    assert not every
    exact = measure(replace(plan_for(Simple(), 60, 0.05, 0.25), methods=tuple(methods))).methods
    for row, wanted in zip(rows, exact.to_dict("records"), strict=True):
        assert row["minimum_coverage"] == pytest.approx(wanted["minimum_coverage"], abs=1e-6)
        assert row["mean_coverage"] == pytest.approx(wanted["mean_coverage"], abs=2e-4)
        assert row["mean_width"] == pytest.approx(wanted["mean_width"], abs=1e-5)


def test_a_single_proportion_is_a_range_for_every_design() -> None:
    for design, n in ((Clustered(6, 0.1), 60), (Stratified(STRATA), 100), (Layered(Simple(), (Loss(0.3, 0.05),)), 60)):
        table = measure(plan_for(design, n, 0.1, 0.1, replicates=500)).methods
        assert (table["minimum_at"] == 0.1).all()
        assert np.allclose(table["minimum_coverage"], table["mean_coverage"], atol=1e-12)


@pytest.mark.parametrize("side", ["upper", "lower"])
def test_one_sided_bounds_of_every_design(side: str) -> None:
    for name in ("finite-clear", "clusters-known", "strata-clear"):
        frame, stack = name.split("-")
        design, n = FRAMES[frame]
        design = Layered(design, LAYERS[stack]) if LAYERS[stack] else design
        plan = replace(plan_for(design, n, 0.05, 0.25, replicates=2000), side=side)
        table = measure(plan).methods
        assert (table["missed_below" if side == "lower" else "missed_above"] == 0).all()
        exact = table.set_index("method")["minimum_coverage"]
        if design.kind == "finite":
            assert exact["hypergeometric-exact"] >= 0.95
        if design.kind == "clustered":
            assert exact["corrected-clopper-pearson-deff-planned"] > 0.93


def test_workers_change_no_digit_of_clusters() -> None:
    plan = plan_for(Layered(Clustered(6, 0.1), (Loss(0.1, 0.1),)), 60, 0.05, 0.25, replicates=300_000)
    one, two = (measure(plan, workers=k).cells for k in (1, 2))
    pd.testing.assert_frame_equal(one, two, check_exact=True)


@pytest.mark.parametrize("kind", designs.EVERY)
@pytest.mark.parametrize("side", ["two-sided", "upper", "lower"])
@pytest.mark.parametrize("stack", ["clear", "known", "estimated"])
def test_the_methods_that_may_be_named_apply(kind: str, side: str, stack: str) -> None:
    design = next(design for design, _ in FRAMES.values() if design.kind == kind)
    design = Layered(design, LAYERS[stack]) if LAYERS[stack] else design
    names = preferred(design, side)
    assert names
    assert all(inapplicable(EVERY[name], design.columns, 60, side) is None for name in names)


def test_catalogues_are_complete() -> None:
    for kind, entry in designs.EVERY.items():
        assert entry.frame.kind == kind
        assert entry.label
        assert any(character.isdigit() for character in entry.source)
    assert {type(layer).kind for stack in LAYERS.values() for layer in stack} == set(designs.LAYERS)
    assert {frame.kind for frame, _ in FRAMES.values()} == set(designs.EVERY)
    assert set(designs.CATALOGUE) <= set(designs.EVERY)
    assert list(EVERY)[: len(CATALOGUE)] == list(CATALOGUE)


def test_the_weigh_test_of_a_fleet() -> None:
    """Ten depots of 25, a test with Se .95 and Sp .99, 5 % not found: what the wrong simplifications would claim."""
    layers = (Loss(0.05, 0.05), Classification(0.95, 0.99))
    design = Layered(Clustered(25, 0.05, population=6200), layers)
    table = measure(plan_for(design, 250, 0.01, 0.05)).methods.set_index("method")["mean_coverage"]
    assert table["wilson"] < 0.85
    assert table["corrected-wilson"] < 0.92
    assert table["wilson-deff-estimated"] < 0.94
    assert table["corrected-korn-graubard"] > 0.94
    assert Finite(6200).faults(250) == ()
