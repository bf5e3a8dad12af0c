"""Plans that name designs: what is built, what is refused, and that a saved plan reads back to the same."""

import tomllib
from pathlib import Path
from typing import Any

import pytest

from coverage_lab.cautions import of_design
from coverage_lab.checks import InputFault
from coverage_lab.designs import Classification, Clustered, Finite, Layered, Loss, Simple, Stratified, Stratum
from coverage_lab.plan import make_plan, read_plan
from coverage_lab.plan_text import plan_text
from coverage_lab.records import Plan

BASE: dict[str, Any] = {"outcome": {"range": [0.005, 0.05]}, "sample": {"n": 250}}
NORTH, SOUTH = {"name": "north", "weight": 0.4, "n": 100}, {"name": "south", "weight": 0.6, "n": 150, "odds_ratio": 2.0}
CLUSTERS = {"kind": "clustered", "cluster_size": 25, "icc": 0.02}
TEST = {"sensitivity": 0.95, "specificity": 0.99}
TESTED = {**TEST, "diseased_tested": 50, "healthy_tested": 100}

BUILT = [
    ({"kind": "finite", "population": 6200}, Finite(6200), ["wilson-fpc", "hypergeometric-exact"]),
    (CLUSTERS, Clustered(25, 0.02), ["wilson-deff-estimated", "korn-graubard"]),
    ({**CLUSTERS, "cluster_cv": 0.4}, Clustered(25, 0.02, 0.4), ["wilson-deff-estimated", "korn-graubard"]),
    (
        {**CLUSTERS, "cluster_size": [100, 150], "population": 6200},
        Clustered((100, 150), 0.02, population=6200),
        ["wilson-deff-estimated", "korn-graubard"],
    ),
    (
        {"kind": "stratified", "strata": [NORTH, SOUTH]},
        Stratified((Stratum("north", 0.4, 100), Stratum("south", 0.6, 150, 2.0))),
        ["stratified-wilson", "stratified-korn-graubard"],
    ),
    (
        {"classification": TEST},
        Layered(Simple(), (Classification(0.95, 0.99),)),
        ["corrected-wilson", "corrected-clopper-pearson"],
    ),
    ({"classification": TESTED}, Layered(Simple(), (Classification(0.95, 0.99, 50, 100),)), ["corrected-adjusted"]),
    (
        {**CLUSTERS, "loss": {"rate": 0.05}, "classification": TEST},
        Layered(Clustered(25, 0.02), (Loss(0.05, 0.05), Classification(0.95, 0.99))),
        ["corrected-wilson-deff-estimated", "corrected-korn-graubard"],
    ),
    (
        {"loss": {"rate_events": 0.1, "rate_others": 0.05, "treat_as": "events"}},
        Layered(Simple(), (Loss(0.1, 0.05, "events"),)),
        ["wilson", "clopper-pearson"],
    ),
]


def planned(design: dict[str, Any], **other: Any) -> Plan:
    return make_plan({**BASE, **other, "design": design}, audited=True)


@pytest.mark.parametrize(("said", "design", "preferred"), BUILT)
def test_a_plan_builds_its_design_and_prefers_methods_that_know_it(
    said: dict[str, Any], design: object, preferred: list[str]
) -> None:
    plan = planned(said)
    assert plan.design == design
    assert [method.name for method in plan.prefer] == preferred
    assert all(set(method.needs) <= set(plan.design.columns) for method in plan.methods)
    assert "wald" in [method.name for method in plan.methods], "what ignoring the design would claim is shown, too"


@pytest.mark.parametrize("said", [item[0] for item in BUILT])
def test_a_saved_plan_reads_back_to_the_same(said: dict[str, Any]) -> None:
    plan = planned(said)
    again = make_plan(tomllib.loads(plan_text(plan.document)), audited=True)
    assert again.document == plan.document
    assert again.design == plan.design


REFUSED = [
    ({"kind": "finite"}, '[design]: expected the key population, since kind = "finite"'),
    ({"kind": "clustered"}, '[design]: expected the keys cluster_size and icc, since kind = "clustered"'),
    ({"kind": "finite", "population": 100}, "[sample] n = 250: expected at most the population of 100"),
    ({**CLUSTERS, "population": 100}, "[sample] n = 250: expected at most the population of 100"),
    (
        {"kind": "finite", "population": 6200, "icc": 0.1},
        '[design] icc = 0.1: expected to be left out unless kind = "clustered"',
    ),
    ({**CLUSTERS, "icc": 1.0}, "[design] icc = 1.0: expected a number of at least 0 and below 1"),
    ({**CLUSTERS, "icc": -0.1}, "[design] icc = -0.1: expected a number of at least 0 and below 1"),
    ({**CLUSTERS, "icc": [0.01, 0.05]}, "[design] icc = [0.01, 0.05]: expected a number of at least 0 and below 1"),
    (
        {**CLUSTERS, "cluster_size": 1},
        "[design] icc = 0.02: expected 0, since clusters of one unit leave nothing to be alike",
    ),
    (
        {**CLUSTERS, "cluster_size": 300},
        "[sample] n = 250: expected at least 2 clusters: one alone shows no variance between clusters",
    ),
    (
        {**CLUSTERS, "cluster_size": [100, 100]},
        "[sample] n = 250: expected 200, the sum of the listed cluster sizes",
    ),
    (
        {"kind": "stratified", "strata": [{**NORTH, "weight": 0.5}, SOUTH]},
        "[design.strata] sum of the weights = 1.1: expected 1",
    ),
    (
        {"kind": "stratified", "strata": [{**NORTH, "n": 1}, SOUTH]},
        "[design.strata] north: n = 1: expected at least 2 units",
    ),
    (
        {"kind": "stratified", "strata": [{"name": "x"}]},
        "[design] strata, item 1 = {'name': 'x'}: expected name (text), weight (a number), n (a whole number) and, if "
        "needed, odds_ratio (a number)",
    ),
    (
        {"classification": {"sensitivity": 0.5, "specificity": 0.5}},
        "[design.classification] sensitivity + specificity = 1.0: expected more than 1: a test that errs more tells "
        "nothing",
    ),
    (
        {"classification": {**TESTED, "healthy_tested": 0}},
        "[design.classification] healthy_tested = 0: expected a whole number from 1 to 1000000",
    ),
    (
        {"classification": {**TEST, "diseased_tested": 4}},
        "[design.classification] healthy_tested = None: expected a whole number of at least 1",
    ),
    ({"loss": {"rate": 1.0}}, "[design.loss] rate = 1.0: expected a number of at least 0 and below 1"),
    (
        {"loss": {"rate_events": 0.1}},
        "[design.loss]: expected the key rate, or both rate_events and rate_others, came only rate_events",
    ),
    (
        {"loss": {"rate": 0.1, "rate_events": 0.1}},
        "[design.loss] rate_events = 0.1: expected to be left out, since rate is given",
    ),
    (
        {"loss": {"rate": 0.1, "treat_as": "no"}},
        "[design.loss] treat_as = 'no': expected excluded, events or non-events",
    ),
]


@pytest.mark.parametrize(("said", "line"), REFUSED)
def test_what_a_design_cannot_be_is_one_clear_line(said: dict[str, Any], line: str) -> None:
    with pytest.raises(InputFault) as raised:
        planned(said)
    assert raised.value.faults == (line,)


def test_a_range_without_a_reachable_proportion_is_refused() -> None:
    with pytest.raises(InputFault) as raised:
        planned({"kind": "finite", "population": 100}, outcome={"range": [0.011, 0.019]}, sample={"n": 50})
    assert raised.value.faults == ("[outcome] range = [0.011, 0.019]: expected a reachable proportion, like 0.02",)


def test_several_faults_come_at_once_and_with_their_lines(tmp_path: Path) -> None:
    file = tmp_path / "plan.toml"
    file.write_text(
        "[outcome]\nexpected = 0.02\n[sample]\nn = 250\n[design]\nkind = 'stratified'\n[[design.strata]]\nname = 'a'\n"
        "weight = 0.5\nn = 1\n[[design.strata]]\nname = 'b'\nweight = 0.5\nn = 100\n[design.loss]\nrate = 0.1\n"
        "[design.classification]\nsensitivity = 0.4\nspecificity = 0.4\n"
    )
    with pytest.raises(InputFault) as raised:
        read_plan(file)
    first, second = raised.value.faults
    assert first == f"{file}:7: [design.strata] a: n = 1: expected at least 2 units"
    assert second.startswith(
        f"{file}:17: [design.classification] sensitivity + specificity = 0.8: expected more than 1"
    )


@pytest.mark.parametrize(
    ("key", "line"),
    [
        (
            "prefer",
            "[methods] prefer, item 1 = 'korn-graubard': expected a method for this design, which does not give ",
        ),
        (
            "only",
            "[methods] only = ['korn-graubard']: expected a method that can be computed from what this design gives",
        ),
    ],
)
def test_methods_that_need_another_design_cannot_be_asked_to_decide(key: str, line: str) -> None:
    with pytest.raises(InputFault) as raised:
        planned({"kind": "simple"}, methods={key: ["korn-graubard"]})
    assert raised.value.faults[0].startswith(line)


def test_a_process_has_no_finite_correction_and_the_reason_is_said() -> None:
    plan = planned({"kind": "finite", "population": 300}, study={"target": "process"})
    assert plan.design == Simple()
    assert "finite correction is left out" in of_design(plan)[0]
    assert of_design(planned({"kind": "finite", "population": 300})) == []


def test_cautions_name_the_assumptions_of_the_design() -> None:
    plan = planned({**CLUSTERS, "classification": TESTED, "loss": {"rate_events": 0.1, "rate_others": 0.0}})
    said = " ".join(of_design(plan))
    for word in (
        "exchangeable",
        "fewer than 30 clusters",
        "independently",
        "floor",
        "estimates",
        "depend on the outcome",
    ):
        assert word in said, word
