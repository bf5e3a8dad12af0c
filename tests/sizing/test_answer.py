"""The whole answer: the three questions of the first screen, the recommendation's rule, the document, and bad input."""

import json
import math
import re
from dataclasses import replace

import numpy as np
import pandas as pd
import pytest
from scipy import stats
from sizing_plans import STANDARDS, plan

from coverage_lab.checks import InputFault
from coverage_lab.intervals import CATALOGUE
from coverage_lab.records import Decision, Method, Precision, Rare, Study
from coverage_lab.records_sizing import Inflation, Sizing
from coverage_lab.sizing import Interrupted, size
from coverage_lab.sizing.recommend import chosen_rare, pick


@pytest.fixture(scope="module")
def fleet() -> Sizing:
    """± 2 points with 90 % assurance around 2 %, fleet of 6200, expecting to lose 5 %."""
    names = ("wilson", "clopper-pearson", "jeffreys", "wald")
    asked = plan(0.01, 0.04, 0.02, methods=names, prefer=names[:2], precision=Precision(0.02, 0.9))
    return size(asked, Inflation(population=6200, loss=0.05))


def test_the_fleet(fleet: Sizing) -> None:
    verdict = fleet.verdict
    assert (verdict.status, verdict.method, verdict.n, verdict.units) == ("recommended", "wilson", 380, 377)
    assert fleet.inflated.document() == {
        "base": 380,
        "design_effect": 380,
        "finite": 359,
        "loss": 377,
        "units": 377,
        "whole_clusters": None,
        "census": False,
    }
    assert verdict.sentence == (
        "n = 380 units; then 359 in the finite population, 377 to make up for losses. Report the Wilson score interval "
        "at 95 % confidence. At n = 380 and at every larger n up to 2000: expected half-width at most 2 points at the "
        "worst proportion of the planned range; half-width at most 2 points with probability at least 90 % at 2 %; "
        "coverage at least 92.5 % everywhere in the range and 94.5 % on average."
    )


def test_every_target_has_its_two_numbers(fleet: Sizing) -> None:
    row = fleet.methods.set_index("method").loc["wilson"]
    assert row["safe_n"] == max(row[f"{name}_safe_n"] for name in ("expected_width", "assurance", "coverage"))
    assert row["assurance_first_n"] < row["assurance_safe_n"]
    mine = fleet.scan[fleet.scan["method"] == "wilson"].set_index("n")
    assert (mine.loc[380:, "half_width"] <= 0.02).all()
    assert mine.loc[379, "half_width"] > 0.02


def test_coverage_is_scanned_for_the_list_and_for_plus_or_minus_only(fleet: Sizing) -> None:
    by = fleet.by_method
    assert [name for name in by if by[name]["coverage"] is not None] == ["wilson", "clopper-pearson", "wald"]
    assert by["jeffreys"]["expected_width"].safe_n == 368
    assert by["wald"]["coverage"].safe_n is None


def test_what_the_plan_names_in_only_is_scanned_for_coverage() -> None:
    names = ("wilson", "jeffreys")
    asked = plan(methods=names, prefer=names[:1], document={"methods": {"only": list(names)}}, horizon=200)
    assert size(asked).by_method["jeffreys"]["coverage"] is not None


def test_the_taught_formula_beside_what_it_delivers(fleet: Sizing) -> None:
    formula = fleet.formula
    assert (formula.worst_case_n, formula.guess_n, formula.guess_at) == (2401, 369, 0.04)
    delivers = formula.delivers.set_index(["n", "method"])
    assert delivers.loc[(369, "wald"), "minimum_coverage"] < 0.86
    assert delivers.loc[(369, "wilson"), "minimum_coverage"] > 0.925
    assert delivers.loc[(369, "wilson"), "half_width"] > 0.02


def test_alternatives_are_priced_in_units(fleet: Sizing) -> None:
    found = {item["method"]: item for item in fleet.verdict.alternatives}
    assert found["clopper-pearson"]["more_units"] == 34
    assert found["wald"]["safe_n"] is None
    assert "the coverage standard not reached for good up to n = 2000" in found["wald"]["against"]
    assert "its coverage was not scanned" in found["jeffreys"]["against"]


def test_rule_out_one_per_cent() -> None:
    """Rule out 1 % with at most 1 failure, hoping for 0.1 %."""
    answer = size(plan(5e-4, 2e-3, 1e-3, rare=Rare(0.01, (1,), 0.001)))
    assert answer.verdict.n == 473
    assert answer.scan.empty
    assert answer.verdict.sentence == (
        "n = 473 units. With at most 1 event in 473 units, a rate of 1 % or more is ruled out at 95 % confidence "
        "(one-sided); at a true rate of 0.1 % that happens with probability 91.7 %."
    )


def test_ruling_out_is_one_sided_in_a_two_sided_plan_too() -> None:
    answer = size(plan(rare=Rare(0.02, (0,))))
    assert answer.rare.loc[0, "n"] == 149
    assert answer.zero_events.startswith("If no event is seen in 149 units")


def test_reliability_above_ninety_per_cent() -> None:
    """Show that reliability is above 90 % when I believe 97 %, power 80 %."""
    answer = size(plan(0.95, 0.985, 0.97, methods=("wilson", "wald"), decision=Decision(0.9, 0.97, 0.025, 0.8)))
    assert (answer.decision.found.first_n, answer.verdict.n, answer.decision.critical) == (100, 114, 109)
    assert answer.decision.by_method["method"].tolist() == ["wilson", "wald"]
    assert answer.verdict.sentence == (
        "n = 114 units. Claim that the proportion is above 90 % at 109 events or more in 114 units (exact test, "
        "one-sided): wrongly with probability at most 2.4 %, rightly with 87.1 % if it is 97 %."
    )


def test_the_largest_target_decides() -> None:
    asked = plan(0.01, 0.04, 0.02, precision=Precision(0.03), rare=Rare(0.02, (0, 1), 0.0005, 1, 0.005, 0.95))
    answer = size(replace(asked, horizon=700))
    assert answer.verdict.needs == {"rare": 149, "seen": 598, "interval": 175}
    assert answer.verdict.n == 598
    assert "which seeing enough events asks for" in answer.verdict.sentence


def test_counts_for_a_finite_population_are_not_corrected_again() -> None:
    answer = size(plan(rare=Rare(0.05, (0,))), Inflation(population=100, loss=0.1))
    assert answer.verdict.n == 45
    assert [rung.ceiling for rung in answer.inflated.rungs] == [45, 45, 45, 50, 50]
    assert answer.verdict.method is None


def test_the_process_has_no_population() -> None:
    asked = plan(rare=Rare(0.05, (0,)), study=Study(target="process"))
    assert size(asked, Inflation(population=100)).verdict.n == 59


def test_a_census_is_said() -> None:
    answer = size(plan(rare=Rare(0.02, (0,)), confidence=0.999), Inflation(population=50))
    assert answer.cautions == (
        "With a population of 50 the answer is a census: every unit is needed.",
        "Allowing 0 events takes a census: all 50 units.",
    )
    assert "the answer is a census" in answer.zero_events


def test_a_width_that_leaves_the_unit_interval_is_a_caution() -> None:
    answer = size(plan(0.01, 0.04, 0.02, methods=("wilson",), precision=Precision(0.03), horizon=400))
    assert answer.cautions[0] == (
        "Around 1 % an interval of half-width 3 points would reach beyond 0: intervals are cut there, and the width of "
        "what is left counts."
    )


def test_no_n_within_the_horizon_gives_the_best_found() -> None:
    answer = size(plan(0.01, 0.04, 0.02, methods=("wald",), precision=Precision(0.02, 0.9)))
    verdict = answer.verdict
    assert (verdict.status, verdict.n, verdict.method, answer.inflated) == ("none", None, None, None)
    assert verdict.best["meets"] == ["expected_width", "assurance"]
    assert verdict.sentence == (
        "No n up to 2000 meets the targets for the interval there and at every larger n. Of the stated list "
        "(plus-or-minus (Wald)), closest is plus-or-minus (Wald) at n = 2000: worst coverage 92.2 %, expected "
        "half-width 0.8574 points, assurance over 99.99 %."
    )


def test_a_decision_without_an_n() -> None:
    verdict = size(plan(decision=Decision(0.5, 0.51, 0.025, 0.8), horizon=200)).verdict
    assert verdict.status == "none"
    assert verdict.sentence == (
        "No n up to 200 meets the targets for the claim about the goal there and at every larger n."
    )


def test_slow_methods_are_left_out_unless_named() -> None:
    slow = replace(CATALOGUE["jeffreys"], slow=True)
    asked = plan(methods=("wilson",), horizon=60)
    both = replace(asked, methods=(*asked.methods, slow))
    answer = size(both)
    assert "jeffreys" not in answer.by_method
    assert 'Name them in [methods] "only" to have them scanned.' in answer.cautions[-1]
    named = size(replace(both, document={"methods": {"only": ["jeffreys"]}}))
    assert named.by_method["jeffreys"]["coverage"] is not None


def test_a_method_that_does_not_answer_the_side_is_not_scanned() -> None:
    names = ("clopper-pearson", "blaker")
    asked = plan(0.05, 0.2, methods=names, prefer=names[:1], side="upper", horizon=50)
    assert list(size(asked).by_method) == ["clopper-pearson", "wald"]


def test_the_guaranteed_standard_names_an_exact_method() -> None:
    answer = size(plan(0.1, 0.3, standard=STANDARDS["guaranteed"], precision=Precision(0.08), horizon=400))
    assert answer.verdict.method == "clopper-pearson"


@pytest.mark.parametrize(
    ("sizes", "named"),
    [
        ({"a": 105, "b": 100}, "a"),
        ({"a": 106, "b": 100}, "b"),
        ({"b": 100, "c": 90}, "c"),
        ({"a": 94, "b": 91, "c": 90}, "a"),
        ({}, None),
    ],
)
def test_an_earlier_method_wins_when_it_asks_for_little_more(sizes: dict[str, int], named: str | None) -> None:
    assert pick(sizes, ("a", "b", "c")) == named


def test_the_fewest_events_that_give_a_fair_chance() -> None:
    table = pd.DataFrame({"events": [0, 1, 2], "n": [60, 90, 120], "probability_at_hoped_for": [0.7, 0.85, 0.9]})
    assert chosen_rare(table, 0.8)["events"] == 1
    assert chosen_rare(table, 0.95)["events"] == 2
    assert chosen_rare(table.assign(probability_at_hoped_for=np.nan), 0.8)["events"] == 0


def test_the_document_is_plain_json_with_the_stable_keys(fleet: Sizing) -> None:
    document = fleet.document()
    text = json.dumps(document, allow_nan=False)
    assert "NaN" not in text
    assert set(document) >= {"methods", "formula", "rare", "seen", "decision", "inflated", "verdict"}
    first = document["methods"][0]
    assert set(first) == {"method", "first_n", "safe_n", "by"}
    assert set(first["by"]) == {"expected_width", "assurance", "coverage"}
    assert first["by"]["assurance"]["first_n"] == 302
    assert {"worst_case", "guess"} <= set(document["formula"])
    assert set(document["inflated"]) >= {"design_effect", "finite", "loss", "whole_clusters", "units"}
    assert document["rare"] == []
    assert document["seen"] is None


def test_the_document_of_counts_and_decisions() -> None:
    asked = plan(rare=Rare(0.05, (0, 1), 0.005, 1, 0.01, 0.95), decision=Decision(0.05, 0.01, 0.025, 0.8))
    document = size(asked).document()
    assert json.loads(json.dumps(document, allow_nan=False))["rare"][1] == {
        "events": 1,
        "n": 93,
        "bound": pytest.approx(stats.beta.isf(0.05, 2, 92), rel=1e-10),
        "probability_at_hoped_for": pytest.approx(stats.binom.cdf(1, 93, 0.005), rel=1e-10),
        "census": False,
    }
    assert document["seen"]["n"] == 299
    assert {"first_n", "safe_n", "critical", "size", "power", "by_method"} <= set(document["decision"])
    assert set(document["decision"]["by_method"][0]) >= {"method", "critical", "worst_size", "power"}
    assert document["methods"] == []


SHARE = "expected a number strictly between 0 and 1"
WHOLE = "expected a whole number of at least"
FAULTS = [
    ({"precision": Precision(0.0)}, {}, f"precision.half_width = 0.0: {SHARE}"),
    ({"precision": Precision(0.1, -0.1)}, {}, f"precision.assurance = -0.1: {SHARE}"),
    (
        {"precision": Precision(0.1, 1.0)},
        {},
        f"precision.assurance = 1.0: {SHARE}; no sample short of the whole population is certain",
    ),
    ({"rare": Rare(0.01, (0,), 0.02)}, {}, "rare.hoped_for = 0.02: expected a rate below rare.limit = 0.01"),
    ({"rare": Rare(0.01, (0,), 0.01)}, {}, "rare.hoped_for = 0.01: expected a rate below rare.limit = 0.01"),
    ({"rare": Rare(1.0, (0,))}, {}, f"rare.limit = 1.0: {SHARE}"),
    ({"rare": Rare(0.01, (-1,))}, {}, f"rare.events = -1: {WHOLE} 0"),
    ({"rare": Rare(0.01, (10,)), "sizes": (10,)}, {}, "rare.events = 10: expected fewer than sample.n = 10"),
    (
        {"rare": Rare(0.01, (1,))},
        {"population": 100},
        "rare.events = 1: expected fewer than 1, which is 1 % of the population of 100",
    ),
    (
        {"rare": Rare(None, (), None, 3, 0.01)},
        {"population": 200},
        "rare.see_at_least = 3: expected at most 2, which is 1 % of the population of 200",
    ),
    ({"rare": Rare(None, (), None, 0, 0.01)}, {}, f"rare.see_at_least = 0: {WHOLE} 1"),
    ({"rare": Rare(None, (), None, 1, None)}, {}, "rare.at_rate = None: expected a number above 0 and at most 1"),
    ({"rare": Rare(None, (), None, 1, 0.1, 1.0)}, {}, f"rare.with_probability = 1.0: {SHARE}"),
    (
        {"decision": Decision(0.9, 0.9, 0.025, 0.8)},
        {},
        "decision.believed = 0.9: expected a proportion other than decision.goal = 0.9",
    ),
    ({"decision": Decision(1.0, 0.9, 0.025, 0.8)}, {}, f"decision.goal = 1.0: {SHARE}"),
    (
        {"decision": Decision(0.9, 0.95, 0.5, 0.8)},
        {},
        "decision.alpha = 0.5: expected a number strictly between 0 and 0.5",
    ),
    (
        {"decision": Decision(0.9, 0.95, 0.1, 0.05)},
        {},
        "decision.power = 0.05: expected a number above decision.alpha = 0.1 and below 1",
    ),
    ({"horizon": 10**8}, {}, "sample.horizon = 100000000: expected a whole number from 1 to 10000000"),
    ({}, {"loss": 1.0}, "loss = 1.0: expected a share of at least 0 and below 1"),
    ({}, {"population": 0}, f"population = 0: {WHOLE} 1"),
    ({}, {"design_effect": math.inf}, "design effect = inf: expected a number above 0"),
    ({}, {"cluster_size": 0}, f"cluster size = 0: {WHOLE} 1"),
]


@pytest.mark.parametrize(("targets", "inflation", "line"), FAULTS, ids=[line[:44] for _, _, line in FAULTS])
def test_bad_input_is_one_clear_line(targets: dict, inflation: dict, line: str) -> None:
    with pytest.raises(InputFault, match=f"^{re.escape(line)}$"):
        size(plan(**targets), Inflation(**inflation))


def test_all_faults_come_at_once() -> None:
    with pytest.raises(InputFault, match=r"assurance") as caught:
        size(plan(precision=Precision(2.0, 1.0), rare=Rare(0.01, (0,), 0.5)), Inflation(loss=2))
    assert len(caught.value.faults) == 4


def test_interrupting_says_what_was_finished() -> None:
    def stop(label: str, share: float) -> None:
        assert label == "scanning n"
        raise KeyboardInterrupt

    with pytest.raises(Interrupted, match=r"^finished the scan up to n = \d+ of 2000$"):
        size(plan(0.2, 0.8, 0.5, methods=("wilson",), precision=Precision(0.1)), progress=stop)


def own_rule(events, trials, tail):
    return CATALOGUE["wilson"].function(events, trials, tail)


def test_a_rule_of_ones_own_is_sized_like_any_other() -> None:
    own = Method("house", own_rule, "house rule", "own", "test")
    asked = plan(0.1, 0.1, methods=("wilson",), precision=Precision(0.05), horizon=300)
    answer = size(replace(asked, methods=(*asked.methods, own), prefer=(own,)))
    assert answer.by_method["house"]["expected_width"].safe_n == 139
