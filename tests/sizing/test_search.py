"""First and safe n: what they promise, the horizon, and what is said beyond it."""

from dataclasses import replace

import numpy as np
import pytest
from scipy.special import ndtri
from sizing_plans import STANDARDS, plan

from coverage_lab.designs import Simple
from coverage_lab.engine.exact import figures, listed
from coverage_lab.engine.means import Range
from coverage_lab.intervals import CATALOGUE
from coverage_lab.records import Plan, Precision
from coverage_lab.sizing.far import Terrain, bracket, look
from coverage_lab.sizing.formula import wilson_size
from coverage_lab.sizing.scan import Scanned, scanned
from coverage_lab.sizing.search import Search, default_horizon, search, targets_of
from coverage_lab.sizing.widths import TIES
from coverage_lab.verdict import meets


def searched(asked: Plan, coverage: bool = True, **other) -> Search:
    items = [scanned(method, coverage) for method in asked.methods]
    return search(asked, items, targets_of(asked, coverage), **other)


def meets_at(asked: Plan, name: str, n: int) -> bool:
    """The verdict's standard at one n, by the engine that the audit uses."""
    over = Range(asked.outcome.low, asked.outcome.high, asked.outcome.prior)
    parts = listed(Simple(), [CATALOGUE[name]], n, (over.low, over.high), asked.side, asked.tail)
    row = figures(parts, over, asked.side)[0]
    return meets(asked, n, row["worst_miss"], row["mean_miss"])


CASES = [
    ("wilson", 0.01, 0.1, "bradley"),
    ("wilson", 0.005, 0.05, "bradley"),
    ("wald", 0.2, 0.5, "bradley"),
    ("jeffreys", 0.02, 0.08, "bradley"),
    ("agresti-coull", 0.05, 0.1, "bradley"),
    ("clopper-pearson", 0.01, 0.1, "guaranteed"),
]


@pytest.mark.parametrize(("name", "low", "high", "kind"), CASES)
def test_the_standard_holds_from_the_safe_n_on_and_not_before(name: str, low: float, high: float, kind: str) -> None:
    asked = plan(low, high, methods=(name,), standard=STANDARDS[kind], horizon=900)
    found = searched(asked).by_method[name]["coverage"]
    assert found.safe_n is not None
    assert found.first_n <= found.safe_n
    larger = np.random.default_rng(7).integers(found.safe_n, 901, 200)
    for n in (found.safe_n, found.first_n, *np.unique(larger)):
        assert meets_at(asked, name, int(n)), n
    if found.safe_n > 1:
        assert not meets_at(asked, name, found.safe_n - 1)


@pytest.mark.parametrize("name", ["wilson", "clopper-pearson", "wald"])
def test_widths_hold_from_the_safe_n_on_and_not_before(name: str) -> None:
    asked = plan(0.02, 0.1, 0.06, methods=(name,), precision=Precision(0.05, 0.9))
    found = searched(asked, coverage=False)
    mine = found.figures[found.figures["method"] == name].set_index("n")
    for target, column in (("expected_width", "half_width"), ("assurance", "assurance")):
        safe = found.by_method[name][target].safe_n
        good = mine[column] <= 0.05 * (1 + TIES) if target == "expected_width" else mine[column] >= 0.9
        assert good.loc[safe:].all()
        assert not good.loc[safe - 1]


def test_lucky_n_are_told_apart() -> None:
    """Assurance saws: 173 meets it, 174 does not; 176 and all later ones do."""
    asked = plan(0.1, 0.1, methods=("wilson",), precision=Precision(0.05, 0.9))
    found = searched(asked, coverage=False).by_method["wilson"]["assurance"]
    assert (found.first_n, found.safe_n) == (173, 176)
    assert found.checked == "every n from 1 to 2000 checked"


def test_without_a_target_nothing_is_claimed_for_it() -> None:
    found = searched(plan(methods=("wilson",), horizon=50)).by_method["wilson"]
    assert found["expected_width"] is None
    assert found["assurance"] is None
    assert found["coverage"] is not None


def test_a_method_that_is_not_scanned_for_coverage_has_none() -> None:
    asked = plan(methods=("wilson", "jeffreys"), prefer=("wilson",), horizon=60)
    items = [scanned(CATALOGUE["wilson"], True), scanned(CATALOGUE["jeffreys"], False)]
    assert search(asked, items, targets_of(asked, True)).by_method["jeffreys"]["coverage"] is None


def test_the_default_horizon() -> None:
    assert [default_horizon(n) for n in (0, 1333, 1334, 2001, 13_333, 13_334, 10**6)] == [
        *(2000, 2000, 2001, 3002, 20_000, 20_000, 20_000)
    ]


def test_the_default_horizon_follows_the_widths() -> None:
    asked = plan(0.02, 0.02, methods=("wilson",), precision=Precision(0.005))
    found = searched(asked, coverage=False)
    assert found.horizon == default_horizon(found.by_method["wilson"]["expected_width"].safe_n) > 2000
    assert found.figures["n"].max() == found.horizon


def test_rare_outcomes_and_decisions_extend_the_default_horizon() -> None:
    assert searched(plan(0.4, 0.4, methods=("wald",)), others=1500).horizon == 2250


def test_the_plans_own_horizon_is_the_last_word() -> None:
    asked = plan(0.02, 0.02, methods=("wilson",), precision=Precision(0.005), horizon=300)
    found = searched(asked, coverage=False)
    assert found.horizon == 300
    assert found.by_method["wilson"]["expected_width"].safe_n is None


def test_beyond_the_exact_scan_the_answer_says_what_was_looked_at(monkeypatch: pytest.MonkeyPatch) -> None:
    """With the exact scan cut short, bracket and neighbourhood find what the full scan finds."""
    asked = plan(0.1, 0.1, methods=("wilson", "clopper-pearson"), precision=Precision(0.05, 0.9), horizon=3000)
    exact = searched(asked, coverage=False)
    monkeypatch.setattr("coverage_lab.sizing.search.EXACT_UP_TO", 60)
    far = searched(asked, coverage=False)
    assert far.figures["n"].max() == 60
    for name in ("wilson", "clopper-pearson"):
        for target in ("expected_width", "assurance"):
            found = far.by_method[name][target]
            assert found.safe_n == exact.by_method[name][target].safe_n
            assert found.checked.startswith("every n from 1 to 60 checked; bracketed; every n from ")


def test_coverage_is_looked_at_again_around_a_far_n(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("coverage_lab.sizing.search.EXACT_UP_TO", 60)
    asked = plan(0.1, 0.2, methods=("clopper-pearson",), precision=Precision(0.05), horizon=2000)
    found = searched(asked).by_method["clopper-pearson"]["coverage"]
    assert found.safe_n == 1
    assert "bracketed; every n from " in found.checked


def test_an_n_beyond_twenty_thousand_is_where_the_closed_form_says() -> None:
    asked = plan(0.5, 0.5, methods=("wilson",), precision=Precision(0.006))
    found = searched(asked, coverage=False).by_method["wilson"]["expected_width"]
    assert found.safe_n == pytest.approx(wilson_size(0.5, 0.006, -ndtri(0.025)), abs=3)
    assert found.safe_n > 20_000


def test_a_method_with_a_largest_n_ends_there() -> None:
    short = replace(CATALOGUE["wilson"], largest_n=150)
    asked = plan(0.1, 0.1, prefer=(), methods=(), precision=Precision(0.05), horizon=400)
    item = Scanned(short, coverage=False, steady=False)
    found = search(asked, [item], targets_of(asked, False)).by_method["wilson"]["expected_width"]
    assert found.safe_n == 139
    assert found.checked == "every n from 1 to 150 checked"


def saw(n: np.ndarray) -> np.ndarray:
    """Fails below 5000, then at every multiple of 7 up to 5100, then holds."""
    return (n >= 5000) & ((n % 7 != 0) | (n > 5100))


def test_a_neighbourhood_grows_until_it_holds_the_last_failure() -> None:
    found = look(saw, 100, 10**6, Terrain(0.5, lambda _: 10.0))
    assert found.safe_n == 5097  # 5096 is the last multiple of 7 up to 5100
    assert not saw(np.array([found.safe_n - 1]))[0]
    assert saw(np.arange(found.safe_n, 6000)).all()


def long_teeth(n: np.ndarray) -> np.ndarray:
    """Holds from 4000 on, but for a gap of 60 sizes after every 500 up to 7000."""
    return (n >= 4000) & ((n % 500 >= 60) | (n >= 7060))


def test_teeth_far_beyond_the_brackets_place_are_combed() -> None:
    """At p = .002 a tooth is 500 long; the last one lies 3000 beyond the first n that holds."""
    found = look(long_teeth, 100, 10**6, Terrain(0.002, lambda _: 40.0))
    assert found.safe_n == 7060
    assert found.first_n < found.safe_n


def test_a_comb_moves_on_with_what_it_finds() -> None:
    """Each comb finds a failure near its end, and the next one starts there."""
    found = look(lambda n: (n >= 1000) & ((n % 700 >= 30) | (n > 20_000)), 100, 10**6, Terrain(0.01, lambda _: 40.0))
    assert found.safe_n == 19_630


def test_nothing_found_is_said() -> None:
    found = look(lambda n: np.zeros(len(n), dtype=bool), 100, 5000, Terrain(0.5, lambda _: 10.0))
    assert (found.first_n, found.safe_n) == (None, None)
    assert "without success" in found.checked


def test_a_bracket_finds_a_step() -> None:
    assert bracket(lambda n: n >= 777, 1, 10**6) == 777
    assert bracket(lambda n: n >= 777, 800, 10**6) == 800
    assert bracket(lambda n: n >= 777, 1, 500) is None
