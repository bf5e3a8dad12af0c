"""The recommendation: who may be named, when, what is said beside it, and how far it carries."""

import math

import pytest
from scipy.special import ndtri

from coverage_lab.engine.audit import measure
from coverage_lab.engine.exact import listed, means_of, minimum_of
from coverage_lab.engine.means import Range
from coverage_lab.intervals import CATALOGUE
from coverage_lab.plan import make_plan
from coverage_lab.records import Measurements, Plan, Verdict
from coverage_lab.verdict import decide, judged, overall, thresholds


def plan(n=250, low=0.005, high=0.05, **changes) -> Plan:
    keys = {
        "outcome": {"range": [low, high]},
        "sample": {"n": n},
        "simulation": {"routes": ["enumerated"], "grid": [low, high]},
        "methods": {"only": ["wilson", "clopper-pearson", "jeffreys", "wald"]},
    }
    return make_plan({**keys, **changes})


def decided(p: Plan) -> tuple[Verdict, Measurements]:
    measured = measure(p)
    return decide(measured, judged(measured), p.sizes[0]), measured


def test_the_first_of_the_list_that_holds_is_named() -> None:
    verdict, measured = decided(plan())
    assert (verdict.status, verdict.method) == ("recommended", "wilson")
    row = measured.methods.set_index("method").loc["wilson"]
    assert row["worst_miss"] <= 1.5 * 0.05
    assert row["mean_miss"] <= 1.1 * 0.05
    assert [item["n"] for item in verdict.steady] == list(range(247, 254))
    assert all(item["passes"] for item in verdict.steady)
    assert "at least 92.5 % everywhere in the planned range and 94.5 % on average" in verdict.sentence
    assert "at least 92.7 % everywhere" in verdict.sentence


def test_a_guarantee_takes_the_exact_interval() -> None:
    """Clopper & Pearson 1934: coverage at least nominal everywhere; wilson dips below."""
    verdict, _ = decided(plan(standard={"kind": "guaranteed"}))
    assert verdict.method == "clopper-pearson"


def test_a_wider_first_choice_gives_way() -> None:
    """With the exact interval first, wilson later on the list is more than 5 % shorter and takes its place."""
    wide = plan(40, 0.2, 0.4, methods={"prefer": ["clopper-pearson", "wilson"]})
    verdict, measured = decided(wide)
    width = measured.methods.set_index("method")["mean_width"]
    assert width["clopper-pearson"] > 1.05 * width["wilson"]
    assert verdict.method == "wilson"


def test_nothing_on_the_list_passes() -> None:
    verdict, _ = decided(plan(methods={"prefer": ["wald"]}))
    assert (verdict.status, verdict.method) == ("none", None)
    assert verdict.closest["method"] == "wald"
    assert verdict.closest["worst_miss"] > 0.2
    assert {item["method"] for item in verdict.alternatives} >= {"wilson", "clopper-pearson"}
    assert verdict.sentence.startswith(
        "No method on the stated list (plus-or-minus (Wald)) meets the standard at n = 250"
    )


def test_alternatives_carry_what_speaks_against_them() -> None:
    verdict, measured = decided(plan(methods={}))
    against = {item["method"]: item for item in verdict.alternatives}
    assert verdict.method not in against
    assert "wald" not in against
    assert (
        "later on the preference list" in against["clopper-pearson"]["against"]
        or "wider" in against["clopper-pearson"]["against"]
    )
    assert "not on the preference list" in against["blaker"]["against"]
    assert "two-sided only" in against["blaker"]["against"]
    width = measured.methods.set_index("method")["mean_width"]
    assert against["blaker"]["relative_width"] == pytest.approx(width["blaker"] / width["wilson"])


@pytest.mark.parametrize(("name", "needed"), [("clopper-pearson", 72), ("wilson", 73)])
def test_too_small_to_learn_from(name: str, needed: int) -> None:
    """n = 20: even 0 events exclude nothing below 5 %. Closed forms: ln(tail)/ln(1-b) and z²(1-b)/b, rounded up."""
    b, z = 0.05, -ndtri(0.025)
    assert needed == math.ceil(math.log(0.025) / math.log(1 - b) if name == "clopper-pearson" else z * z * (1 - b) / b)
    lenient = {"kind": "custom", "worst_miss": 19, "mean_miss": 19}
    verdict, _ = decided(plan(20, 0.005, b, methods={"only": [name]}, standard=lenient))
    assert verdict.too_small["n_needed"] == needed
    assert verdict.too_small["limit"] > b
    mirrored, _ = decided(plan(20, 1 - b, 0.995, methods={"only": [name]}, standard=lenient))
    assert mirrored.too_small["n_needed"] == needed
    assert decided(plan(250))[0].too_small is None


def test_one_sided_answers_print_the_bound_at_few_events() -> None:
    """Hanley & Lippman-Hand 1983, JAMA 249:1743: one-sided 95 % upper bound at 0 of n is 1 - .05^(1/n)."""
    verdict, _ = decided(plan(112, side="upper"))
    assert verdict.method == "clopper-pearson"
    assert [item["events"] for item in verdict.bounds_at] == [0, 1, 2]
    assert verdict.bounds_at[0]["bound"] == pytest.approx(0.02639, abs=5e-6)
    lower, _ = decided(plan(112, 0.95, 0.995, side="lower"))
    assert [item["events"] for item in lower.bounds_at] == [112, 111, 110]
    assert lower.bounds_at[0]["bound"] == pytest.approx(1 - 0.02639, abs=5e-6)


def test_lopsided_misses_are_said() -> None:
    verdict, _ = decided(plan())
    assert "too high in 3.5 % of samples on average, against 2.5 % per side" in verdict.balance
    assert decided(plan(250, 0.45, 0.55))[0].balance is None


@pytest.mark.parametrize("n", [60, 250])
def test_the_range_on_which_it_holds_is_as_wide_as_it_can_be(n: int) -> None:
    p = plan(n, 0.1, 0.3)
    verdict, _ = decided(p)
    low, high = verdict.holds_on
    assert verdict.method == "wilson"
    assert low <= 0.1
    assert high >= 0.3
    worst, mean = thresholds(p)
    parts = listed(p.design, [CATALOGUE["wilson"]], n, (0, 1), "two-sided", 0.025)
    inside = minimum_of(parts, 0, low, high)
    assert inside.miss <= worst + 1e-9
    means = means_of(parts, Range(low, high, (1.0, 1.0)), "two-sided")
    assert means["missed_below"][0] + means["missed_above"][0] <= mean
    assert minimum_of(parts, 0, max(low - 1e-3, 0), high).miss > worst
    assert minimum_of(parts, 0, low, min(high + 1e-3, 1)).miss > worst


def test_an_exact_method_holds_everywhere() -> None:
    verdict, _ = decided(plan(standard={"kind": "guaranteed"}))
    assert verdict.holds_on == (0.0, 1.0)


def test_simulated_figures_near_the_limit_stay_undecided() -> None:
    """Worst miss near 7.3 % against 7.5 % cannot be told apart with 400 draws; with the exact route it is."""
    few = {"routes": ["simulated"], "replicates": 400, "grid": [0.006239, 0.05]}
    verdict, measured = decided(plan(simulation=few, methods={"only": ["wilson"]}))
    row = measured.methods.iloc[0]
    assert row["minimum_is"] == "simulated"
    assert verdict.status == "undecided"
    assert verdict.sentence.startswith("Undecided at n = 250")
    assert verdict.holds_on is None


def test_several_sizes_have_a_verdict_each() -> None:
    p = plan(sample={"candidates": [8, 250, 100]}, methods={"only": ["wilson"]})
    measured = measure(p)
    by_n = [decide(measured, judged(measured), n) for n in p.sizes]
    passing = [item.n for item in by_n if item.status == "recommended"]
    assert overall(by_n).n == min(passing)


def test_the_switch_to_wilson_comes_near_forty() -> None:
    """At 95 % with 2.5 expected events the exact interval is named for small n, wilson from n of some 35 on."""
    names = {n: decided(plan(n, 1.25 / n, 5 / n, methods={}))[0].method for n in (15, 25, 60, 120)}
    assert names == {15: "clopper-pearson", 25: "clopper-pearson", 60: "wilson", 120: "wilson"}


def test_rounding_of_limits_near_one_breaks_no_guarantee() -> None:
    """At confidence 0.999999 a limit near 1 is rounded by 1e-16: Clopper-Pearson must still count as guaranteed."""
    p = plan(250, 0.5, 1.0, confidence=0.999999, standard={"kind": "guaranteed"}, methods={"only": ["clopper-pearson"]})
    assert decided(p)[0].method == "clopper-pearson"
