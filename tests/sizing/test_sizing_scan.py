"""The scan of many n at once against the engine one n at a time, against fine grids, and against a general library."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import stats
from sizing_plans import plan

from coverage_lab.designs import Simple
from coverage_lab.engine.bounds import evaluate
from coverage_lab.engine.exact import figures, listed
from coverage_lab.intervals import CATALOGUE
from coverage_lab.records import Method, Precision, tail_of
from coverage_lab.sizing.pool import Interrupted, run
from coverage_lab.sizing.scan import COVERAGE_COLUMNS, Asked, asked, scan, scanned
from coverage_lab.sizing.search import first_and_safe

SIZES = np.array([1, 2, 3, 7, 20, 41, 60, 118, 250, 251, 400])


def question(low, high, expected=None, *, confidence=0.95, side="two-sided", prior=(1.0, 1.0)) -> Asked:
    middle = expected if expected is not None else (low + high) / 2
    return Asked(low, high, prior, middle, 0.05, side, tail_of(confidence, side))


def engine_figures(method: Method, asking: Asked, n: int) -> dict[str, float]:
    parts = listed(Simple(), [method], n, (asking.low, asking.high), asking.side, asking.tail)
    return figures(parts, asking.over, asking.side)[0]


RANGES = [(0.005, 0.05), (0.01, 0.01), (0.3, 0.7), (0.9, 0.99), (0.0, 0.2), (0.5, 1.0), (1e-4, 1e-3)]


@pytest.mark.parametrize(("low", "high"), RANGES)
@pytest.mark.parametrize("name", ["wilson", "clopper-pearson", "jeffreys", "wald", "logit", "arcsine", "uniform-bayes"])
def test_equals_the_engine(name: str, low: float, high: float) -> None:
    asking = question(low, high)
    found = scan(asking, [scanned(CATALOGUE[name], coverage=True)], SIZES).set_index("n")
    for n in SIZES:
        wanted = engine_figures(CATALOGUE[name], asking, int(n))
        assert found.loc[n, "worst_miss"] == pytest.approx(wanted["worst_miss"], rel=1e-11, abs=1e-15)
        assert found.loc[n, "mean_miss"] == pytest.approx(wanted["mean_miss"], rel=1e-9, abs=1e-14)


@pytest.mark.parametrize("name", ["blaker", "sterne", "mid-p", "shortest-exact", "jeffreys-hpd"])
def test_equals_the_engine_for_tables_with_shared_end_points(name: str) -> None:
    asking = question(0.02, 0.4)
    sizes = np.array([5, 17, 31, 60])
    found = scan(asking, [scanned(CATALOGUE[name], coverage=True)], sizes).set_index("n")
    for n in sizes:
        wanted = engine_figures(CATALOGUE[name], asking, int(n))
        assert found.loc[n, "worst_miss"] == pytest.approx(wanted["worst_miss"], rel=1e-10)


def test_limits_that_are_one_up_to_rounding_leave_no_false_minimum() -> None:
    """Blaker's limits of different counts coincide; between two copies of one limit coverage would seem to be .9379."""
    asking = question(0.02, 0.5)
    found = scan(asking, [scanned(CATALOGUE["blaker"], coverage=True)], np.array([250]))
    wanted = engine_figures(CATALOGUE["blaker"], asking, 250)["worst_miss"]
    assert found["worst_miss"][0] == pytest.approx(wanted, rel=1e-10)
    assert found["worst_miss"][0] < 0.0501


@pytest.mark.parametrize("n", [20, 150])
@pytest.mark.parametrize("confidence", [0.8, 0.95])
def test_where_the_narrow_window_is_too_narrow_the_whole_one_is_taken(n: int, confidence: float) -> None:
    """Poisson limits are far too wide near 1: counts far outside the narrow window still cover."""
    asking = replace(question(0.9, 0.99, confidence=confidence), columns=COVERAGE_COLUMNS)
    found = scan(asking, [scanned(CATALOGUE["poisson-exact"], coverage=True)], np.array([n]))
    wanted = engine_figures(CATALOGUE["poisson-exact"], asking, n)
    assert found["worst_miss"][0] == pytest.approx(wanted["worst_miss"], rel=1e-9)
    assert found["mean_miss"][0] == pytest.approx(wanted["mean_miss"], rel=1e-8)


@pytest.mark.parametrize("confidence", [0.8, 0.99, 0.9999])
@pytest.mark.parametrize("name", ["logit", "logit-half", "cloglog", "wilson"])
def test_limits_that_turn_back_are_left_to_the_engine(name: str, confidence: float) -> None:
    asking = question(0.02, 0.3, confidence=confidence)
    found = scan(asking, [scanned(CATALOGUE[name], coverage=True)], SIZES).set_index("n")
    for n in SIZES:
        wanted = engine_figures(CATALOGUE[name], asking, int(n))
        assert found.loc[n, "worst_miss"] == pytest.approx(wanted["worst_miss"], rel=1e-10, abs=1e-15)


@pytest.mark.parametrize("side", ["upper", "lower"])
@pytest.mark.parametrize("name", ["clopper-pearson", "second-order", "wilson"])
def test_one_sided_bounds_equal_the_engine(name: str, side: str) -> None:
    asking = question(0.01, 0.1, side=side, prior=(2.0, 30.0))
    found = scan(asking, [scanned(CATALOGUE[name], coverage=True)], SIZES).set_index("n")
    for n in SIZES:
        wanted = engine_figures(CATALOGUE[name], asking, int(n))
        assert found.loc[n, "worst_miss"] == pytest.approx(wanted["worst_miss"], rel=1e-11, abs=1e-15)
        assert found.loc[n, "mean_miss"] == pytest.approx(wanted["mean_miss"], rel=1e-9, abs=1e-14)


def gap_rule(events, trials, tail):
    """Wilson, but with an interval far off for 2 events: neither ordered nor a run."""
    lower, upper = CATALOGUE["wilson"].function(events, trials, tail)
    return np.where(events == 2, 0.5, lower), np.where(events == 2, 0.6, upper)


def test_a_rule_of_ones_own_is_not_taken_to_be_ordered() -> None:
    own = Method("gap", gap_rule, "gap", "own", "test")
    asking = question(0.02, 0.55)
    item = scanned(own, coverage=True)
    assert not item.steady
    found = scan(asking, [item], SIZES[2:]).set_index("n")
    for n in SIZES[2:]:
        wanted = engine_figures(own, asking, int(n))
        assert found.loc[n, "worst_miss"] == pytest.approx(wanted["worst_miss"], rel=1e-9)


@settings(max_examples=40, deadline=None)
@given(
    ends=st.tuples(st.floats(1e-4, 0.9999), st.floats(1e-4, 0.9999)),
    start=st.integers(1, 300),
    name=st.sampled_from(["wilson", "clopper-pearson", "agresti-coull", "wald", "plus-four", "wilson-cc"]),
    confidence=st.sampled_from([0.8, 0.9, 0.95, 0.99]),
)
def test_any_range_equals_the_engine(ends, start, name, confidence) -> None:
    low, high = min(ends), max(ends)
    asking = question(low, high, confidence=confidence)
    sizes = np.array([start, start + 1, start + 17])
    found = scan(asking, [scanned(CATALOGUE[name], coverage=True)], sizes)
    for n, miss in zip(sizes, found["worst_miss"], strict=True):
        wanted = engine_figures(CATALOGUE[name], asking, int(n))["worst_miss"]
        assert miss == pytest.approx(wanted, rel=1e-9, abs=1e-14)


def grid_half_width(name: str, n: int, asking: Asked, points: int = 2001) -> float:
    """The largest expected half-width on a fine grid, by scipy's binomial distribution."""
    x = np.arange(n + 1)
    limits = evaluate(CATALOGUE[name], {"events": x, "trials": np.array([n])}, asking.side, asking.tail)
    p = np.linspace(asking.low, asking.high, points)[:, None]
    spread = {
        "two-sided": (limits.upper - limits.lower) / 2 + 0 * p,
        "upper": limits.upper - p,
        "lower": p - limits.lower,
    }[asking.side]
    return float((stats.binom.pmf(x, n, p) * spread).sum(axis=1).max())


@pytest.mark.parametrize(("low", "high"), [(0.005, 0.05), (0.3, 0.7), (0.4, 0.9), (0.85, 0.99), (0.02, 0.98)])
@pytest.mark.parametrize("name", ["wilson", "clopper-pearson", "wald", "cloglog", "poisson-exact", "blaker"])
def test_expected_half_width_is_the_largest_of_the_range(name: str, low: float, high: float) -> None:
    asking = question(low, high)
    sizes = np.array([3, 25, 60])
    found = scan(asking, [scanned(CATALOGUE[name], coverage=False)], sizes)
    for n, came in zip(sizes, found["half_width"], strict=True):
        assert came == pytest.approx(grid_half_width(name, int(n), asking), rel=2e-6)


@pytest.mark.parametrize("side", ["upper", "lower"])
def test_expected_excess_of_a_bound(side: str) -> None:
    asking = question(0.02, 0.3, side=side)
    found = scan(asking, [scanned(CATALOGUE["clopper-pearson"], coverage=False)], np.array([10, 80]))
    for n, came in zip((10, 80), found["half_width"], strict=True):
        assert came == pytest.approx(grid_half_width("clopper-pearson", n, asking), rel=2e-6)


@pytest.mark.parametrize("side", ["two-sided", "upper", "lower"])
@pytest.mark.parametrize("p", [1e-3, 0.1, 0.5, 0.93])
def test_assurance_against_a_general_library(side: str, p: float) -> None:
    asking = question(p, p, side=side)
    found = scan(asking, [scanned(CATALOGUE["wilson"], coverage=False)], SIZES)
    for n, came in zip(SIZES, found["assurance"], strict=True):
        x = np.arange(n + 1)
        limits = evaluate(CATALOGUE["wilson"], {"events": x, "trials": np.array([n])}, side, asking.tail)
        spread = {"two-sided": (limits.upper - limits.lower) / 2, "upper": limits.upper - p, "lower": p - limits.lower}
        wanted = stats.binom.pmf(x, n, p)[spread[side] <= 0.05].sum()
        assert came == pytest.approx(wanted, abs=1e-12)


def test_only_what_is_asked_for_is_computed() -> None:
    asking = replace(question(0.01, 0.05), columns=("assurance",))
    found = scan(asking, [scanned(CATALOGUE["wilson"], coverage=False)], SIZES)
    assert found[["worst_miss", "mean_miss", "half_width"]].isna().all().all()
    assert found["assurance"].notna().all()


def test_a_method_is_scanned_no_farther_than_it_is_computed() -> None:
    short = replace(CATALOGUE["wilson"], largest_n=40)
    found = scan(question(0.1, 0.2), [scanned(short, True), scanned(CATALOGUE["wald"], True)], np.arange(1, 80))
    assert found.groupby("method")["n"].max().to_dict() == {"wilson": 40, "wald": 79}


def square(k: int) -> int:
    return k * k


def test_the_number_of_workers_changes_no_digit(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("coverage_lab.sizing.pool.POOL_WORTH", 0.0)
    monkeypatch.setattr("coverage_lab.sizing.pool.TIMED", 0.0)
    monkeypatch.setattr("coverage_lab.sizing.scan.EVENTS", 2000)
    items = [scanned(CATALOGUE[name], coverage=True) for name in ("wilson", "wald")]
    one = scan(question(0.01, 0.1), items, np.arange(1, 200), workers=1)
    two = scan(question(0.01, 0.1), items, np.arange(1, 200), workers=2)
    assert one.equals(two)


def test_progress_reaches_one_and_never_turns_back() -> None:
    seen: list[float] = []
    wilson = scanned(CATALOGUE["wilson"], coverage=True)
    scan(question(0.3, 0.7), [wilson], np.arange(1, 500), progress=lambda _, share: seen.append(share))
    assert seen == sorted(seen)
    assert len(seen) > 2
    assert seen[-1] == pytest.approx(1.0)


def test_an_interrupted_scan_says_what_was_finished(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("coverage_lab.sizing.scan.EVENTS", 2000)

    def stop(_: str, share: float) -> None:
        if share > 0.5:
            raise KeyboardInterrupt

    with pytest.raises(Interrupted, match=r"finished the scan up to n = \d+ of 300") as caught:
        scan(question(0.01, 0.1), [scanned(CATALOGUE["wilson"], True)], np.arange(1, 301), progress=stop)
    assert isinstance(caught.value, KeyboardInterrupt)
    assert 100 < int(str(caught.value).split("=")[1].split()[0]) < 300


def test_tasks_come_back_in_order() -> None:
    assert run(square, [(k,) for k in range(20)], [1.0] * 20) == [k * k for k in range(20)]


def test_first_and_safe() -> None:
    n = np.array([10, 11, 12, 13, 14])
    assert first_and_safe(n, np.array([False, True, False, True, True])) == (11, 13)
    assert first_and_safe(n, np.array([True] * 5)) == (10, 10)
    assert first_and_safe(n, np.array([False, True, True, True, False])) == (11, None)
    assert first_and_safe(n, np.zeros(5, dtype=bool)) == (None, None)


def test_the_plan_asks_the_question() -> None:
    assert asked(plan()).columns == ("worst_miss", "minimum_at", "mean_miss")
    assert "half_width" in asked(plan(precision=Precision(0.05))).columns
